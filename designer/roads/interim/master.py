"""The master program: interim quantities, and shares of the rules found so far."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from fractions import Fraction

import numpy as np

from designer.demands.formulate import Formulation, amounts_of
from designer.demands.terms import Terms
from designer.engines.watch import Watch
from designer.program.linear import LinearProgram
from designer.program.program import Program
from designer.proof.face import Settled as Face
from designer.proof.face import face
from designer.proof.vector import Vector
from designer.roads.full import faced
from designer.roads.interim.counting import count
from designer.roads.interim.draft import InterimDraft, Lies
from designer.roads.interim.live import Duals, Floats
from designer.roads.interim.merged import Merged
from designer.roads.interim.rule import Counts, Index, Listed, Rule, welfare_index
from designer.roads.interim.units import additive_again
from designer.setting.setting import IntArray, Setting

COARSE = 24
"""Bits of the integer indices that float multipliers become: short words count fastest."""

Column = tuple[int, int]
"""(slice, position in the list of rules)."""


@dataclass(frozen=True, eq=False)
class Prices:
    """What a dual says of decisions: an index per party and type, and a price per slice.

    A rule that takes the counts `taken` in slice g improves when
    sum_i index_i . taken_i > slices[g], all over `den`.
    """

    parties: tuple[IntArray, ...]
    slices: tuple[Fraction, ...]
    den: int = 1

    def worth(self, counts: Counts, g: int) -> Fraction:
        """The index sum of a rule in one slice."""
        total = 0
        for table, taken in zip(self.parties, counts.taken[g], strict=True):
            total += int((table.astype(object) * taken).sum())
        return Fraction(total, self.den * counts.den)


@dataclass(frozen=True, eq=False)
class Reached:
    """A settled goal: its value and the multipliers that prove it, over rows scaled by `scale`.

    prices  what the multipliers say of decisions; None where there is nothing to decide, or
            the goal is the same everywhere
    """

    name: str
    value: Fraction
    dual: Vector
    scale: tuple[IntArray, IntArray]
    prices: Prices | None

    def stored(self, program: Program, rows: int) -> Vector:
        """The multipliers over the program's own rows, which columns may have scaled anew."""
        (num, den), (old_num, old_den) = program.row_scale, self.scale
        size = self.dual.size
        if np.array_equal(num[:size], old_num[:size]) and np.array_equal(
            den[:size], old_den[:size]
        ):
            return replace(self.dual, size=rows)
        entries = {
            row: value * int(old_num[row]) * int(den[row]) / (int(old_den[row]) * int(num[row]))
            for row, value in self.dual.fractions().items()
        }
        return Vector.of(entries, rows)


@dataclass(frozen=True, eq=False)
class Posed:
    """A program up to the goal that is asked now, and the faces that earlier goals leave."""

    draft: InterimDraft
    program: Program
    faces: list[Face]

    @property
    def whole(self) -> LinearProgram:
        """The last stage, earlier goals pinned."""
        return self.program.stage(len(self.program.stages) - 1)

    @property
    def asked(self) -> LinearProgram:
        """The same on the faces, without the pins."""
        return face(self.whole, self.faces) if self.faces else self.whole


class Master:
    """The growing list of rules, and the programs over them."""

    def __init__(
        self, setting: Setting, terms: Terms, lead: int | None, lies: Lies | None, watch: Watch
    ) -> None:
        """Start without rules; `terms` ask for balance on average at most."""
        self.setting, self.terms, self.watch = setting, terms, watch
        self.lead, self.lies = lead, lies
        self.listed: list[Listed] = []
        self.columns: list[Column] = []
        self.reached: list[Reached] = []

    @property
    def slices(self) -> int:
        """The number of slices that profiles are split into."""
        return 1 if self.lead is None else self.setting.shape[self.lead]

    def first(self) -> tuple[Index, ...]:
        """The indices that every rule must start with.

        Welfare where efficiency is demanded, and the prices of the last goal before: what is
        best at those is what that goal leaves to choose among.
        """
        first = [welfare_index(self.setting)] if self.terms.decision == "efficient" else []
        prices = next((goal.prices for goal in reversed(self.reached) if goal.prices), None)
        if prices is not None:
            first.append(Index(prices.parties, np.zeros(len(self.setting.options), dtype=object)))
        return tuple(first)

    def count(self, rule: Rule) -> Counts:
        """The exact counts of a rule."""
        return count(self.setting, rule, self.lead, self.watch)

    def add(self, listed: Listed, slices: list[int] | None = None) -> list[int]:
        """List a rule for some slices (None: all); the numbers of its columns."""
        self.listed.append(listed)
        place, first = len(self.listed) - 1, len(self.columns)
        chosen = range(self.slices) if slices is None else slices
        self.columns += [(g, place) for g in chosen]
        return list(range(first, len(self.columns)))

    def formulation(self, columns: list[Column] | None = None) -> Formulation:
        """The demands over the listed columns; no goal yet."""
        chosen = self.columns if columns is None else columns
        draft = InterimDraft(
            self.setting,
            self.terms.decision,
            amounts_of(self.terms),
            lead=self.lead,
            columns=tuple((g, self.listed[r].counts) for g, r in chosen),
            lies=self.lies,
            chances=self.terms.side.chances,
        )
        return Formulation(self.setting, self.terms, draft=draft)

    def program(self, columns: list[Column] | None = None) -> tuple[InterimDraft, Program]:
        """The draft and the program over the listed columns."""
        posed = self.posed(columns)
        return posed.draft, posed.program

    def posed(self, columns: list[Column] | None = None) -> Posed:
        """The program over the listed columns, up to the goal that is asked now."""
        work = self.formulation(columns)
        faces = []
        for goal in self.reached:
            program = work.pose(goal.name)
            if not work.stages[-1].cost.any():
                continue  # a constant goal needs no pin
            lp = program.stage(len(program.stages) - 1)
            pin = work.pin(goal.value)
            faces.append(faced(lp, goal.stored(program, lp.rows), pin, work))
        program = work.pose(self.terms.goals[len(self.reached)])
        if not isinstance(work.draft, InterimDraft):
            raise AssertionError("the master writes on an interim draft")
        return Posed(work.draft, program, faces)

    def go_on(self, goal: Reached) -> None:
        """Ask the next goal among the optima of one that is settled: other columns are dropped."""
        self.reached.append(goal)
        prices = goal.prices
        if prices is not None:
            self.columns = [
                (g, r)
                for g, r in self.columns
                if prices.worth(self.listed[r].counts, g) == prices.slices[g]
            ]

    def again(self) -> None:
        """Ask the first goal again, over the columns there are."""
        self.reached.clear()


def beyond(earlier: Prices, later: Prices) -> Fraction:
    """A multiple of earlier prices beyond which later ones decide ties alone.

    Sums of the earlier index differ by at least 1 / den where they differ at all.
    """
    if not any((table != table[:, :1]).any() for table in earlier.parties):
        return Fraction(0)
    reach = sum(max(abs(int(v)) for v in table.flat) for table in later.parties)
    return Fraction((2 * reach + 1) * earlier.den, later.den)


def averaged(terms: Terms) -> Terms:
    """The terms with balance on average: balance in every case follows by the lift."""
    balance = "none" if terms.balance == "none" else "ex-ante"
    return replace(terms, balance=balance, tidy="none")


def exact_prices(
    setting: Setting,
    lead: int | None,
    program: Program,
    dual: Vector,
    classes: tuple[Merged, ...],
) -> Prices:
    """The index that exact multipliers of the minimising form give to every decision.

    q_i(k, a) is defined with weight(theta_i = a) in the denominator, so a unit of weight at
    which k is taken is worth the row's natural multiplier over that weight.
    """
    total = setting.total_weight
    start = program.row_axis.start("slice")
    place = start + (1 if lead is None else setting.shape[lead])
    sizes = [n * own.size for n, own in zip(setting.shape, classes, strict=True)]
    cells = sum(sizes)
    # Natural multipliers are num / (den * dual.den).
    num, den = (scale[start : place + cells].astype(object) for scale in program.row_scale)
    num *= np.array(dual.numerators()[start : place + cells], dtype=object)
    size = place - start
    slices = tuple(Fraction(-n, d * dual.den) for n, d in zip(num[:size], den[:size], strict=True))
    num, den = num[size:], den[size:]
    for_party = [total // sum(party.weights) for party in setting.parties]
    masses = [
        each * weight
        for each, party, own in zip(for_party, setting.parties, classes, strict=True)
        for weight in party.weights
        for _ in range(own.size)
    ]
    den *= np.array(masses, dtype=object)
    common = math.lcm(*set((den // np.gcd(num, den)).tolist()))
    parts = np.split(num * common // den, np.cumsum(sizes)[:-1])
    tables = tuple(
        part.reshape(-1, own.size)[:, own.of] for part, own in zip(parts, classes, strict=True)
    )
    return Prices(tables, slices, common * dual.den)


def rule_for(setting: Setting, first: tuple[Index, ...], parties: tuple[IntArray, ...]) -> Rule:
    """The rule that is best at some prices."""
    zero = np.zeros(len(setting.options), dtype=object)
    return Rule((*first, Index(parties, zero)))


def rough_rule(setting: Setting, first: tuple[Index, ...], duals: Duals, bits: int) -> Rule:
    """The rule that is best at float multipliers, rounded to integers of some bits."""
    level = [table - table[:, :1] for table in duals.parties]
    level = [table - table[:1] for table in level]
    top = max((float(np.abs(table).max()) for table in level), default=0.0)
    scale = 2.0**bits / top if top else 0.0
    # What is the same for all of a party's types is kept, too: it decides between options.
    common = sum(
        ((table - table[:, :1])[0] for table in duals.parties), np.zeros(len(setting.options))
    )
    options = np.array([round(v * scale) for v in common], dtype=object)
    options = additive_again(setting, options)
    parties = tuple(np.rint(table * scale).astype(np.int64).astype(object) for table in level)
    return Rule((*first, Index(parties, options)))


def rough_worth(setting: Setting, duals: Duals, counts: Counts) -> Floats:
    """Per slice the index sum of a rule, over the total weight."""
    total = setting.total_weight * counts.den
    return np.array(
        [
            sum(
                float((table * _shares(taken, total)).sum())
                for table, taken in zip(duals.parties, row, strict=True)
            )
            for row in counts.taken
        ]
    )


def _shares(taken: IntArray, total: int) -> Floats:
    return np.array([[int(v) / total for v in row] for row in taken])
