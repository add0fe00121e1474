"""The plain road: every profile's payments as columns, nothing reduced. The reference."""

from __future__ import annotations

import math
import time
from dataclasses import replace
from fractions import Fraction

import numpy as np

from designer.demands.formulate import Formulation, amounts_of
from designer.demands.terms import Terms
from designer.engines.report import Engine
from designer.engines.watch import Watch
from designer.program.draft import Draft
from designer.program.linear import Bound, LinearProgram
from designer.program.program import Program
from designer.proof.face import Settled as Faced
from designer.proof.face import face, lift, reduced_costs
from designer.proof.outcome import Outcome
from designer.proof.prove import prove
from designer.proof.vector import Vector
from designer.roads.lazy import late_lies
from designer.roads.settled import GoalResult, Settled
from designer.setting.setting import IntArray, Setting, integers
from designer.table import Table

TIDY_UP_TO = 4_000
"""Payments up to which the tidy stage runs unless it is asked for by name.

Bounding every payment undoes what presolve gains from their freedom: beyond this size the
tidy stage costs many times the answer itself.
"""


SMALL_UP_TO = 150
"""Payments up to which the plain road takes a few milliseconds: no reduction is quicker."""

SEARCHED_UP_TO = 1_000
"""The same where the reduction would have to search for rules, one program after the other."""

CELLS_UP_TO = 5_000_000
"""Payment and decision columns up to which the plain program is built (about 20 GiB)."""


def tidies(setting: Setting, terms: Terms, payments: int | None = None) -> bool:
    """Whether a closing tidy stage is due; `payments`: the unknown ones, if not all differ."""
    if terms.tidy == "none" or "swing" in terms.goals:
        return False
    if payments is None:
        payments = setting.profiles * len(setting.parties)
    return terms.tidy == "swing" or payments <= TIDY_UP_TO


def travel(setting: Setting, terms: Terms, engine: Engine, watch: Watch) -> Settled:
    """Formulate, solve and prove goal by goal; stop at the first that has no optimum."""
    since = time.perf_counter()
    draft = Draft(setting, terms.decision, amounts_of(terms))
    settled = settle(draft, terms, engine, watch, since)
    if settled.status != "possible" or settled.primal is None:
        return settled
    since = time.perf_counter()
    table = table_of(draft, settled.primal)
    settled.seconds["table"] = time.perf_counter() - since
    return replace(settled, table=table)


def settle(
    draft: Draft, terms: Terms, engine: Engine, watch: Watch, since: float, path: str = "full"
) -> Settled:
    """Settle all goals on a draft whose columns are laid out; no table yet.

    `since` is when the laying out began.
    """
    return _Journey(draft, terms, engine, watch, since, path).travel()


class _Journey:
    """One walk down the road: what has been settled so far."""

    def __init__(
        self, draft: Draft, terms: Terms, engine: Engine, watch: Watch, since: float, path: str
    ) -> None:
        self.setting, self.terms, self.engine, self.watch = draft.setting, terms, engine, watch
        self.path = path
        self.seconds: dict[str, float] = {}
        self.engines: dict[str, None] = {}
        self.work = Formulation(draft.setting, terms, draft=draft)
        self.late = late_lies(self.work)
        self._spent("formulate", since)
        self.results: list[GoalResult] = []
        self.faces: list[Faced] = []

    def travel(self) -> Settled:
        """Every goal in turn, then the tidy stage."""
        tidy = tidies(self.setting, self.terms, self.work.draft.payments)
        program, primal = None, None
        for name in self.terms.goals:
            if name == "any" and (tidy or len(self.terms.goals) > 1):
                program = self._any()
                continue
            program = self._pose(name)
            outcome = self._settle(program)
            if outcome.status == "infeasible" and self.results:
                return self._impossible_without(program)
            if outcome.status != "optimal":
                return self._stopped(program, outcome)
            primal = outcome.primal
        if tidy:
            before = program
            program = self._pose("swing")
            outcome = self._settle(program, tidy=True)
            if outcome.status == "optimal":
                primal = outcome.primal
            elif primal is None:
                return (
                    self._impossible_without(program)
                    if outcome.status == "infeasible"
                    else self._stopped(program, outcome)
                )
            else:
                # The goals are settled; only the choice among optimal tables is not.
                program = before
                self.results.append(
                    GoalResult("swing", None, False, tidy=True, reason=outcome.reason)
                )
        if program is None or primal is None:
            raise AssertionError("a possible verdict needs a table")
        return self._settled("possible", program, primal=primal)

    def _pose(self, name: str) -> Program:
        """Pin the goal before, if any, and pose the next."""
        since = time.perf_counter()
        if self.results and self.work.stages[-1].cost.any():
            before = self.results[-1]
            value = before.value
            if value is None:
                raise AssertionError("only settled goals are followed by another")
            lp = self.work.program().stage(len(self.results) - 1)
            pin = self.work.pin(value)
            if before.dual is not None and not lp.integer.any():
                self.faces.append(faced(lp, before.dual, pin, self.work))
        program = self.work.pose(name)
        self._spent("formulate", since)
        return program

    def _any(self) -> Program:
        """Nothing to optimise: the table of a later stage proves this one as well."""
        program = self._pose("any")
        rows = program.stages[-1].rows
        self.results.append(GoalResult("any", Fraction(0), True, dual=Vector.zero(rows)))
        return program

    def _settle(self, program: Program, tidy: bool = False) -> Outcome:
        """Prove the last stage of the program; keep the result if it has an optimum."""
        lp = program.stage(len(program.stages) - 1)
        whole = bool(lp.integer.any())
        asked = lp
        if whole and tidy and self.results and self.primal is not None:
            asked = _with_rule(lp, self.primal)
        elif self.faces and not whole:
            asked = face(lp, self.faces)
        outcome = self._prove(asked)
        for part, seconds in outcome.seconds.items():
            self.seconds[part] = self.seconds.get(part, 0.0) + seconds
        self.engines[outcome.engine] = None
        if outcome.status != "optimal":
            return outcome
        since = time.perf_counter()
        self.primal = outcome.primal
        dual = outcome.dual
        if asked is not lp and not whole and dual is not None:
            dual = lift(lp, self.faces, dual)
        open_choice = asked is not lp and whole
        self.results.append(
            GoalResult(
                goal=program.stages[-1].goal,
                value=outcome.value,
                proved=outcome.proved and not open_choice,
                bound=outcome.bound,
                dual=None if open_choice else dual,
                tree=None if open_choice else outcome.tree,
                tidy=tidy,
                reason=outcome.reason,
            )
        )
        self._spent("prove", since)
        return outcome

    primal: Vector | None = None

    def _prove(self, lp: LinearProgram) -> Outcome:
        """Prove a program, without the far lies as long as they hold and nothing needs them."""
        late = self.late
        if late is not None:
            # goals add rows behind the lies; a lie that a settled goal made tight stays in
            late = np.concatenate([late, np.zeros(lp.rows - len(late), dtype=bool)])
            late &= ~lp.row_hi.finite
        return prove(lp, engine=self.engine, watch=self.watch, late=late)

    def _impossible_without(self, program: Program) -> Settled:
        """The same question without goals: the certificate must speak of the demands alone."""
        self.results, self.faces = [], []
        stage = program.first(1)
        outcome = self._prove(program.stage(0))
        if outcome.status == "optimal":
            outcome = replace(
                outcome, status="undecided", proved=False, reason="the engine contradicts itself"
            )
        return self._stopped(stage, outcome)

    def _stopped(self, program: Program, outcome: Outcome) -> Settled:
        status = {"infeasible": "impossible", "unbounded": "unbounded"}.get(
            outcome.status, "undecided"
        )
        if not outcome.proved and status != "undecided":
            status = "undecided"
        goal = program.stages[-1].goal
        self.results.append(GoalResult(goal, None, outcome.proved, reason=outcome.reason))
        return self._settled(
            status,
            program,
            primal=outcome.primal if status == "unbounded" else None,
            farkas=outcome.farkas if status == "impossible" else None,
            tree=outcome.tree if status == "impossible" else None,
            ray=outcome.ray if status == "unbounded" else None,
            reason=outcome.reason,
        )

    def _settled(self, status: str, program: Program, **more: object) -> Settled:
        return Settled(
            status=status,  # type: ignore[arg-type]
            path=self.path,
            program=program,
            goals=tuple(self.results),
            engine=" + ".join(self.engines),
            seconds=self.seconds,
            **more,  # type: ignore[arg-type]
        )

    def _spent(self, part: str, since: float) -> None:
        self.seconds[part] = self.seconds.get(part, 0.0) + time.perf_counter() - since


def faced(lp: LinearProgram, dual: Vector, pin: int, work: Formulation) -> Faced:
    """A settled goal as the face it leaves, with its pin row."""
    matrix = work.program().matrix
    k = int(matrix.indptr[pin])
    column = int(matrix.indices[k])
    sign = 1 if lp.sense == "min" else -1
    cost = Fraction(sign * int(lp.cost[column]), lp.cost_den)
    return Faced(dual, reduced_costs(lp, dual), pin, int(matrix.data[k]) / cost)


def _with_rule(lp: LinearProgram, primal: Vector) -> LinearProgram:
    """The program with its whole-number columns fixed where a table has them."""
    low, high = lp.col_lo.num.copy(), lp.col_hi.num.copy()
    for column in np.flatnonzero(lp.integer):
        low[column] = high[column] = int(primal.value(int(column)) * lp.col_den)
    finite_low, finite_high = lp.col_lo.finite | lp.integer, lp.col_hi.finite | lp.integer
    return replace(
        lp,
        col_lo=Bound(low, finite_low),
        col_hi=Bound(high, finite_high),
        integer=np.zeros_like(lp.integer),
    )


def table_of(draft: Draft, primal: Vector) -> Table:
    """The decision and transfer rule that a point of the program stands for."""
    setting = draft.setting
    total, parties = setting.profiles, len(setting.parties)
    numbers = primal.numerators()
    pays, pays_den = lowest(integers(numbers[: total * parties], (parties, total)), primal.den)
    return Table(*decisions_of(draft, primal), pays, pays_den)


def decisions_of(draft: Draft, primal: Vector) -> tuple[IntArray, int]:
    """The chances at the profiles that a draft tells apart, int (N, K), and their denominator."""
    free = draft.chance_col >= 0
    if not free.any():
        return integers(draft.chance), draft.chance_den
    decides = np.zeros(draft.chance.shape, dtype=object)
    common = math.lcm(primal.den, draft.chance_den)
    columns = np.array(primal.numerators(), dtype=object)
    decides[~free] = draft.chance[~free].astype(object) * (common // draft.chance_den)
    decides[free] = columns[draft.chance_col[free]] * (common // primal.den)
    return lowest(integers(decides), common)


def lowest(values: IntArray, den: int) -> tuple[IntArray, int]:
    """Numerators and denominator divided by what they share."""
    shared = math.gcd(den, *{int(value) for value in values.flat})
    return (values // shared, den // shared) if shared > 1 else (values, den)
