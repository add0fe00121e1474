"""What `prove` returns: frozen values, complete enough for a proof document."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from fractions import Fraction
from types import MappingProxyType
from typing import Literal

from designer.proof.vector import Vector

Status = Literal["optimal", "infeasible", "unbounded", "undecided"]


@dataclass(frozen=True)
class Leaf:
    """The end of a branch: a certificate under the branch's bounds on integer columns.

    dual  multipliers over rows, signs as in `Outcome.dual`; with kind "bound" its dual value
          under the branch's bounds is no better than the table found, with kind "infeasible"
          it is a Farkas vector (cost 0) whose dual value is positive
    """

    kind: Literal["bound", "infeasible"]
    dual: Vector


@dataclass(frozen=True)
class Branch:
    """A split of the integers: x[column] <= value on the left, >= value + 1 on the right."""

    column: int
    value: int
    left: Tree
    right: Tree


Tree = Leaf | Branch


@dataclass(frozen=True)
class Outcome:
    """The answer about a linear program, with its certificates.

    status        "optimal", "infeasible", "unbounded", or "undecided" when not even the
                  engine says
    proved        True only when exact arithmetic confirmed the status; otherwise the
                  status is the engine's word
    table_proved  `primal` was checked exactly against every row, bound and integrality
    value         the objective at `primal`, in the program's own sense, over cost_den and
                  with cost_const; None without a point
    primal        x over columns; for "unbounded" the point the ray starts from
    dual          y over rows, for the MIN problem: with c the cost per column
                  (cost / cost_den; negated if sense is "max") and d = c - A'y,
                  y > 0 uses row_lo, y < 0 row_hi, d > 0 col_lo, d < 0 col_hi, and
                  sum(y * row bound) + sum(d * column bound) = c.x
                  (so for sense "max" it equals minus the maximum, without cost_const)
    ray           r over columns, for "unbounded": moving by r from any feasible point keeps
                  every row and bound, and c.r < 0 for the min problem
    farkas        y over rows, for "infeasible": with d = -A'y the same sum of bounds is
                  positive, while it can be no more than 0 at a feasible point
    tree          mixed-integer programs: branch and bound whose leaves are certificates
    bound         the best value not yet excluded, in the program's own sense: the engine's
                  word, for an unproved mixed-integer optimum
    reason        why the status is unproved or undecided, and what to try
    engine        the name of the engine that gave the hint
    seconds       by stage: "solve", "prove"
    effort        counts: "repairs", "pivots", "kernel", "nodes", ...
    """

    status: Status
    proved: bool = False
    table_proved: bool = False
    value: Fraction | None = None
    primal: Vector | None = None
    dual: Vector | None = None
    ray: Vector | None = None
    farkas: Vector | None = None
    tree: Tree | None = None
    bound: Fraction | float | None = None
    reason: str = ""
    engine: str = ""
    seconds: Mapping[str, float] = field(default_factory=lambda: MappingProxyType({}))
    effort: Mapping[str, int] = field(default_factory=lambda: MappingProxyType({}))


@dataclass(frozen=True, eq=False)
class GoalResult:
    """One settled goal.

    value   what the table reaches, exact; None if the goal was not settled
    proved  whether exact arithmetic confirmed that nothing better exists
    bound   an engine's word on what is best, where `proved` is False
    dual, tree   the certificate, over the rows of the goal's stage (minimising form)
    tidy    whether this is the closing tidy stage rather than a goal that was asked for
    """

    goal: str
    value: Fraction | None
    proved: bool
    bound: Fraction | float | None = None
    dual: Vector | None = None
    tree: Tree | None = None
    tidy: bool = False
    reason: str = ""
