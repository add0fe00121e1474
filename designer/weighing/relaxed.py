"""A set of demands with some allowances freed, to be optimised in any direction.

Criteria are what a mix can pay with, each to be made small:

    money      outside money, the same in every case (or on average, if balance is)
    shortfall  how far any type of any party may fall below its outside option
    lies       the gain from a lie that is tolerated
    welfare    expected welfare given up against the efficient decision

An allowance that is freed and not in play is *closed*: held at what the terms allow. Every
answer is exact and has passed the proof checker.
"""

from __future__ import annotations

from collections.abc import Callable, Collection, Mapping
from dataclasses import dataclass, replace
from fractions import Fraction
from typing import Any

import numpy as np

from designer.demands.formulate import Formulation, amounts_of
from designer.demands.terms import Terms
from designer.engines.highs import HIGHS
from designer.engines.hot import HotHighs
from designer.engines.report import Engine
from designer.engines.watch import Interrupted, Watch
from designer.program.affine import Affine
from designer.program.draft import Draft
from designer.program.linear import LinearProgram
from designer.program.program import Stage
from designer.proof.document import compose, plain_program
from designer.proof.face import Settled as Faced
from designer.proof.face import face, reduced_costs
from designer.proof.outcome import Outcome
from designer.proof.prove import prove
from designer.proof.recheck import recheck
from designer.proof.vector import Vector
from designer.roads.settled import GoalResult
from designer.setting.setting import IntArray, Setting
from designer.weighing.averages import AverageDraft, on_average
from designer.weighing.bounds import holding, tangent

ALLOWANCE = {"money": "subsidy", "shortfall": "shortfall", "lies": "slack"}
"""The allowance behind each criterion that is a single unknown."""

Freedom = tuple[Fraction | None, Fraction | None]
"""Lower and upper bound of a freed allowance; None: none."""

ONE = Fraction(1)


@dataclass(frozen=True, eq=False)
class Answer:
    """An optimum of a weighted sum of criteria, or why there is none.

    status  "optimal", "infeasible", "unbounded" or "undecided"; proved by the checker
    at      the value of every criterion at the optimum
    dual    multipliers over rows, in the minimising form; `farkas` for "infeasible"
    lp      the program that was answered
    """

    status: str
    proved: bool
    lp: LinearProgram
    value: Fraction | None = None
    at: Mapping[str, Fraction] | None = None
    primal: Vector | None = None
    dual: Vector | None = None
    farkas: Vector | None = None
    reason: str = ""


def _same(lp: LinearProgram) -> LinearProgram:
    return lp


class Relaxed:
    """One program with allowances freed; `forms` gives each criterion as a form."""

    def __init__(
        self,
        setting: Setting,
        terms: Terms,
        free: Mapping[str, Freedom],
        engine: Engine,
        watch: Watch,
    ) -> None:
        """Write the demands once; `free` names allowances and their bounds.

        The program is written on averages where those decide (`averages`).
        """
        self.terms, self.watch = terms, watch
        self.engine: Engine = HotHighs() if engine is HIGHS else engine
        reduced = on_average(setting, terms)
        self.averaged = reduced is not None
        draft: Draft | None = None
        if reduced is not None:
            setting, terms = reduced
            draft = AverageDraft(setting, terms.decision, amounts_of(terms))
        self.setting = setting
        work = Formulation(setting, terms, free, draft)
        self.draft = work.draft
        criterion = {allowance: name for name, allowance in ALLOWANCE.items()}
        self.forms: dict[str, Affine] = {
            criterion.get(name, name): self.draft.allowance(*_allowance(name)) for name in free
        }
        self.columns = {name: int(form.col[0]) for name, form in self.forms.items()}
        self.first_best = _first_best(self.draft)
        self.forms["welfare"] = (-self.draft.expected_welfare()).plus(self.first_best)
        self.forms["pot"] = self.draft.expected_pot()
        self.program = work.program()
        self.matrix = self.program.matrix
        self._closed: dict[frozenset[str], LinearProgram] = {}
        self._plain: tuple[object, dict[str, Any]] = (None, {})

    # -- questions -------------------------------------------------------------------------

    def minimise(
        self,
        weights: Mapping[str, Fraction],
        then: Mapping[str, Fraction] | None = None,
        closed: Collection[str] = (),
    ) -> Answer:
        """The least weighted sum of criteria; `then` breaks ties by a second one.

        `closed` allowances are held at what the terms allow.
        """
        matrix = self.closed(closed)
        answer = self.solve(self._posed(matrix, weights))
        if then is None or answer.status != "optimal" or answer.dual is None:
            return answer
        faced = Faced(answer.dual, reduced_costs(answer.lp, answer.dual), None, ONE)
        second = self.solve(face(self._posed(matrix, then), [faced]))
        if second.status != "optimal":
            return replace(answer, proved=False)
        proved = answer.proved and second.proved
        return replace(answer, at=second.at, primal=second.primal, proved=proved)

    def feasible(
        self, kept: Collection[str] = (), narrowed: Callable[[LinearProgram], LinearProgram] = _same
    ) -> Answer:
        """Whether the demands can be met with every allowance closed: "optimal", "infeasible".

        Asked as the least of one allowance that is in play (of `kept`, criteria; the first of
        money and shortfall that there is): an engine finds its way to a table much faster
        than it finds that there is none, and where more than what the terms allow is needed,
        the multipliers that prove it are a Farkas vector of the closed program:

            sum y b + sum d x_bound = least amount - amount allowed > 0.

        `narrowed` changes bounds of the program first.
        """
        useful = [n for n in ("money", "shortfall") if n in self.columns and n in kept]
        # whole numbers have no multipliers to prove it with
        elastic = useful[0] if useful and not self.matrix.integer.any() else None
        weights: dict[str, Fraction] = {elastic: ONE} if elastic else {}
        others = [name for name in self.columns if name != elastic]
        answer = self.solve(self._posed(narrowed(self.closed(others)), weights))
        if elastic is None or answer.status != "optimal" or answer.at is None:
            return answer
        if answer.at[elastic] == self.asked(elastic):
            return answer
        closed = self._posed(narrowed(self.closed(self.columns)), {})
        outcome = Outcome("infeasible", proved=True, farkas=answer.dual)
        holds = answer.proved and recheck(self._document(closed, outcome)).holds
        if not holds:
            return Answer("undecided", False, closed, reason="the checker rejects the certificate")
        return Answer("infeasible", True, closed, farkas=answer.dual)

    def rate(self, answer: Answer, partner: str, closed: Collection[str]) -> Fraction:
        """By how much the optimum falls per unit of a closed allowance, for a first small unit.

        The slope to the right of the optimal value as a function of the allowance: the least
        cost of a direction that respects every row and bound tight at the optimum, with one
        unit of the allowance. This is the largest dual price on the optimal dual face, not
        just the one that the optimal basis happens to give. NaN-free: 0 if it does not help.
        """
        if answer.primal is None:
            return Fraction(0)
        column = self.columns[partner]
        others = [self.columns[name] for name in closed if name != partner]
        lp = tangent(answer.lp, answer.primal, {column: 1, **dict.fromkeys(others, 0)})
        slope = self.solve(lp)
        return Fraction(0) if slope.value is None or not slope.proved else -slope.value

    def closed(self, names: Collection[str]) -> LinearProgram:
        """The program with these allowances held at what the terms allow."""
        key = frozenset(names)
        if key not in self._closed:
            held = {self.columns[name]: self.asked(name) for name in key}
            self._closed[key] = holding(self.matrix, held) if held else self.matrix
        return self._closed[key]

    def asked(self, name: str) -> Fraction:
        """What the terms allow of an allowance."""
        word = ALLOWANCE.get(name, name).partition(":")[0]
        for part in (self.terms, self.terms.limits, self.terms.side):
            if hasattr(part, word):
                value: Fraction | None = getattr(part, word)
                return value if value is not None else Fraction(0)
        raise KeyError(name)

    def decisions(self, answer: Answer) -> tuple[IntArray, int]:
        """The chance of every option at every profile, int (N, K), and the denominator."""
        draft, primal = self.draft, answer.primal
        if primal is None:
            raise ValueError("no optimum, no decisions")
        columns = draft.chance_col
        chances = draft.chance.astype(object) * primal.den
        free = columns >= 0
        numbers = np.array([*primal.numerators(), 0], dtype=object)
        chances[free] = numbers[columns[free]] * draft.chance_den
        return chances, primal.den * draft.chance_den

    # -- one program -------------------------------------------------------------------------

    def _posed(self, matrix: LinearProgram, weights: Mapping[str, Fraction]) -> LinearProgram:
        cost = np.zeros(self.draft.columns, dtype=object)
        den, const, form = 1, Fraction(0), None
        for name, weight in weights.items():
            if weight:
                part = _wide(self.forms[name]).times(weight)
                form = part if form is None else form + part
        if form is not None:
            den = int(form.den[0])
            np.add.at(cost, form.col, form.num)
            const = Fraction(int(form.const[0]), den)
            if max(abs(int(c)) for c in cost) < 2**62:
                cost = cost.astype(np.int64)
        else:
            cost = cost.astype(np.int64)
        return replace(matrix, cost=cost, cost_den=den, cost_const=const, sense="min")

    def solve(self, lp: LinearProgram) -> Answer:
        """The exact answer to a program over these columns, as the checker sees it.

        Raises Stopped at the time limit and after Ctrl-C.
        """
        outcome = prove(lp, engine=self.engine, watch=self.watch)
        if outcome.status == "undecided":
            self.watch.check()
            if outcome.reason.startswith(Interrupted.reason):
                raise Interrupted
            return Answer("undecided", False, lp, reason=outcome.reason)
        if outcome.status in ("infeasible", "unbounded") and not outcome.proved:
            return Answer("undecided", False, lp, reason=outcome.reason)
        holds = outcome.proved and recheck(self._document(lp, outcome)).holds
        if outcome.status != "optimal" and not holds:
            return Answer("undecided", False, lp, reason="the checker rejects the certificate")
        return Answer(
            outcome.status,
            holds,
            lp,
            outcome.value,
            self._values(outcome.primal) if outcome.primal is not None else None,
            outcome.primal,
            outcome.dual,
            outcome.farkas,
            outcome.reason,
        )

    def _document(self, lp: LinearProgram, outcome: Outcome) -> dict[str, Any]:
        stage = Stage(
            "weighted sum", "min", lp.columns, lp.rows, lp.cost, lp.cost_den, lp.cost_const
        )
        program = replace(self.program, matrix=lp, stages=(stage,))
        bounds = (lp.row_lo, lp.row_hi, lp.col_lo, lp.col_hi)
        key, plain = self._plain
        if not isinstance(key, tuple) or any(a is not b for a, b in zip(key, bounds, strict=True)):
            plain = plain_program(program)
            self._plain = bounds, plain
        verdict = {"optimal": "possible", "infeasible": "impossible"}.get(
            outcome.status, "unbounded"
        )
        return compose(
            program,
            verdict=verdict,
            scenario={"title": self.setting.title, "digest": self.setting.digest},
            terms={},
            goals=(
                GoalResult(
                    stage.goal,
                    outcome.value,
                    outcome.proved,
                    dual=outcome.dual,
                    tree=outcome.tree,
                ),
            ),
            primal=outcome.primal,
            farkas=outcome.farkas,
            tree=outcome.tree if verdict == "impossible" else None,
            ray=outcome.ray,
            plain=plain,
        )

    def _values(self, primal: Vector) -> dict[str, Fraction]:
        numbers = np.array(primal.numerators(), dtype=object)
        return {
            name: Fraction(
                int(form.const[0]) * primal.den + int((form.num * numbers[form.col]).sum()),
                int(form.den[0]) * primal.den,
            )
            for name, form in self.forms.items()
        }


def _allowance(name: str) -> tuple[str, Fraction, str]:
    """The arguments of `Draft.allowance` for an allowance that is free."""
    word, _, party = name.partition(":")
    return word, Fraction(0), party


def _wide(form: Affine) -> Affine:
    """The form in Python integers: weights may carry numbers of any length."""
    return Affine(
        form.row,
        form.col,
        form.num.astype(object),
        form.const.astype(object),
        form.den.astype(object),
    )


def _first_best(draft: Draft) -> Fraction:
    """E[max_k total worth net of outlay]: expected welfare of an efficient decision."""
    best = draft.welfare.max(axis=1).astype(object)
    total = int((best * draft.weights.astype(object)).sum())
    return Fraction(total, draft.setting.total_weight * draft.setting.grain)


def allowed(setting: Setting, terms: Terms, engine: Engine, watch: Watch) -> Relaxed:
    """The terms with every allowance freed that they can pay with, from what they allow up."""
    free: dict[str, Freedom] = {}
    if terms.balance != "none":
        free["subsidy"] = (terms.subsidy, None)
    if terms.ir != "none" and len(terms.compelled) < len(setting.parties):
        free["shortfall"] = (terms.shortfall, None)
    if terms.ic != "none":
        free["slack"] = (terms.slack, None)
    return Relaxed(setting, terms, free, engine, watch)
