"""What a road brings home: a status, the table if there is one, and certificates."""

from __future__ import annotations

from dataclasses import dataclass, field
from fractions import Fraction
from typing import Literal

from designer.program.program import Program
from designer.proof.outcome import Tree
from designer.proof.vector import Vector
from designer.table import OnDemand, Table

Status = Literal["possible", "impossible", "unbounded", "undecided"]


@dataclass(frozen=True, eq=False)
class GoalResult:
    """One settled goal.

    value   what the table reaches, exact; None if the goal was not settled
    proved  whether exact arithmetic confirmed that nothing better exists
    bound   an engine's word on what is best, where `proved` is False
    dual, tree   the certificate, over the rows of the goal's stage (minimising form)
    pin     the row that keeps the value in later stages, or None
    tidy    whether this is the closing tidy stage rather than a goal that was asked for
    """

    goal: str
    value: Fraction | None
    proved: bool
    bound: Fraction | float | None = None
    dual: Vector | None = None
    tree: Tree | None = None
    pin: int | None = None
    tidy: bool = False
    reason: str = ""


@dataclass(frozen=True, eq=False)
class Settled:
    """The end of a road.

    primal  over all columns of `program` (possible, unbounded)
    farkas  over the rows of stage 0 (impossible), or `tree` for whole-number programs
    ray     over the columns of the last stage (unbounded)
    mechanism  computes the table on demand where a road gives one
    reduction  for a road that reduces: what stands behind the program's columns
    """

    status: Status
    path: str
    program: Program
    goals: tuple[GoalResult, ...]
    table: Table | None = None
    mechanism: OnDemand | None = None
    reduction: dict[str, object] | None = None
    primal: Vector | None = None
    farkas: Vector | None = None
    tree: Tree | None = None
    ray: Vector | None = None
    reason: str = ""
    engine: str = ""
    seconds: dict[str, float] = field(default_factory=dict)
