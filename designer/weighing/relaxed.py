"""A set of demands with some allowances freed, to be optimised in any direction.

Criteria are what a mix can pay with, each to be made small:

    money      outside money, in every case the same (or on average, if balance is)
    shortfall  how far any type of any party may fall below its outside option
    lies       the gain from a lie that is tolerated
    welfare    expected welfare given up against the efficient decision

Every answer is exact and has passed the proof checker.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from fractions import Fraction

import numpy as np

from designer.demands.formulate import Formulation
from designer.demands.terms import Terms
from designer.engines.report import Engine
from designer.engines.watch import Watch
from designer.program.affine import Affine
from designer.program.labels import Honest, TakesPart
from designer.program.program import Axis, Program, Stage
from designer.proof.document import compose
from designer.proof.face import Settled as Faced
from designer.proof.face import face, reduced_costs
from designer.proof.outcome import Outcome
from designer.proof.prove import prove
from designer.proof.recheck import recheck
from designer.proof.vector import Vector
from designer.roads.full import table_of
from designer.roads.settled import GoalResult
from designer.setting.setting import Setting
from designer.table import Table

ALLOWANCE = {"money": "subsidy", "shortfall": "shortfall", "lies": "slack"}
"""The allowance behind each criterion that is a single unknown."""

Bounds = tuple[Fraction | None, Fraction | None]


@dataclass(frozen=True, eq=False)
class Answer:
    """An optimum of a weighted sum of criteria, or why there is none.

    status  "optimal", "infeasible", "unbounded" or "undecided"; proved by the checker
    at      the value of every criterion at the optimum
    dual    multipliers over rows, in the minimising form
    groups  for "infeasible": the labels of the rows in the certificate
    """

    status: str
    proved: bool
    value: Fraction | None = None
    at: Mapping[str, Fraction] | None = None
    primal: Vector | None = None
    dual: Vector | None = None
    farkas: Vector | None = None
    reason: str = ""


class Relaxed:
    """One program with allowances freed; `criteria` gives each criterion as a form."""

    def __init__(
        self,
        setting: Setting,
        terms: Terms,
        free: Mapping[str, Bounds],
        engine: Engine,
        watch: Watch,
    ) -> None:
        """Write the demands once; `free` names allowances and their bounds."""
        self.setting, self.terms = setting, terms
        self.engine, self.watch = engine, watch
        work = Formulation(setting, terms, free)
        self.draft = work.draft
        self.forms: dict[str, Affine] = {
            name: self.draft.allowance(allowance, Fraction(0))
            for name, allowance in ALLOWANCE.items()
            if allowance in free
        }
        for name in free:
            if name not in ALLOWANCE.values():
                self.forms[name] = self.draft.allowance(name, Fraction(0))
        welfare = self.draft.expected_welfare()
        self.forms["welfare"] = (-welfare).plus(first_best(setting))
        self.forms["pot"] = self.draft.expected_pot()
        self.program = work.program()

    def minimise(
        self, weights: Mapping[str, Fraction], then: Mapping[str, Fraction] | None = None
    ) -> Answer:
        """The least weighted sum of criteria; `then` breaks ties by a second one."""
        program = self._posed(weights)
        lp = program.stage(0)
        outcome = prove(lp, engine=self.engine, watch=self.watch)
        answer = self._judged(program, outcome)
        if then is None or answer.status != "optimal" or outcome.dual is None:
            return answer
        second = self._posed(then)
        faced = Faced(outcome.dual, reduced_costs(lp, outcome.dual), None, Fraction(1))
        outcome = prove(face(second.stage(0), [faced]), engine=self.engine, watch=self.watch)
        if outcome.status != "optimal" or outcome.primal is None:
            return answer
        at = self._values(outcome.primal)
        return replace(
            answer, at=at, primal=outcome.primal, proved=answer.proved and outcome.proved
        )

    def feasible(self) -> Answer:
        """Whether the demands can be met at all, allowances at their best."""
        return self.minimise({})

    def table(self, answer: Answer) -> Table | None:
        """The table behind an optimum."""
        return None if answer.primal is None else table_of(self.draft, answer.primal)

    def worth_of(self, answer: Answer, name: str) -> Fraction:
        """By how much the optimum falls per unit of an allowance nearby (the dual).

        For "shortfall" and "lies": the natural multipliers of the participation rows, of the
        lie rows. One-sided: what a first small unit buys, at most.
        """
        if answer.dual is None:
            return Fraction(0)
        kind = {"shortfall": TakesPart, "lies": Honest}[name]
        total = Fraction(0)
        num, den = self.program.row_scale
        for row, number in zip(answer.dual.idx, answer.dual.num, strict=True):
            if isinstance(self.program.row_axis.label(row), kind):
                total += Fraction(number * int(num[row]), answer.dual.den * int(den[row]))
        return total

    def _posed(self, weights: Mapping[str, Fraction]) -> Program:
        cost = np.zeros(self.draft.columns, dtype=object)
        den, const = 1, Fraction(0)
        form = None
        for name, weight in weights.items():
            part = self.forms[name].times(weight)
            form = part if form is None else form + part
        if form is not None:
            den = int(form.den[0])
            np.add.at(cost, form.col, form.num.astype(object))
            const = Fraction(int(form.const[0]), den)
        stage = Stage(
            "weighted sum", "min", self.draft.columns, self.program.matrix.rows, cost, den, const
        )
        return replace(self.program, stages=(stage,))

    def _values(self, primal: Vector) -> dict[str, Fraction]:
        numbers = primal.numerators()
        values = {}
        for name, form in self.forms.items():
            total = int(form.const[0]) * primal.den + sum(
                int(num) * numbers[int(col)] for num, col in zip(form.num, form.col, strict=True)
            )
            values[name] = Fraction(total, int(form.den[0]) * primal.den)
        return values

    def _judged(self, program: Program, outcome: Outcome) -> Answer:
        """What the checker says of the certificates."""
        status = outcome.status
        if status == "undecided" or (status in ("infeasible", "unbounded") and not outcome.proved):
            return Answer("undecided", False, reason=outcome.reason)
        stage = program.stages[0]
        verdict = {"optimal": "possible", "infeasible": "impossible"}.get(status, "unbounded")
        goal = GoalResult(
            stage.goal, outcome.value, outcome.proved, dual=outcome.dual, tree=outcome.tree
        )
        document = compose(
            program,
            verdict=verdict,
            scenario={"title": self.setting.title, "digest": self.setting.digest},
            terms={},
            goals=(goal,),
            primal=outcome.primal,
            farkas=outcome.farkas,
            tree=outcome.tree if verdict == "impossible" else None,
            ray=outcome.ray,
        )
        holds = recheck(document).holds
        return Answer(
            status,
            holds and outcome.proved,
            outcome.value,
            self._values(outcome.primal) if outcome.primal is not None else None,
            outcome.primal,
            outcome.dual,
            outcome.farkas,
            outcome.reason,
        )

    @property
    def row_axis(self) -> Axis:
        """The labels of the rows."""
        return self.program.row_axis


def first_best(setting: Setting) -> Fraction:
    """E[max_k total worth net of outlay]: expected welfare of an efficient decision."""
    from designer.program.draft import Draft

    draft = Draft(setting, "randomized")
    best = draft.welfare.max(axis=1).astype(object)
    total = int((best * draft.weights.astype(object)).sum())
    return Fraction(total, setting.total_weight * setting.grain)
