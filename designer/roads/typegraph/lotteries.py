"""The program of the only goal where the rule's ties are open: columns at tied profiles alone.

    columns  E[t_i]; the chance x_k(theta) of each efficient option at each tied profile; the
             expectations that the rule fixes; per bound and torn profile of the others what
             the party pays there on average over its own types
    rows     the demands; lotteries; what the rule fixes, as forms in x; `at most`: E[t_i] is no
             more than a constant, from the classes that no tie touches, plus the average of
             the columns; `paths`: each of these is no more than the length of some paths, a
             form in x

Every row holds for every table that keeps honesty and participation, whatever paths are
listed: more of them only describe the payments better.

Where several types of a party are worst off together, no single paths tell what it can be made
to pay. It is then *spelled*: its payments by class and torn profile are columns, and rows are
participation type by type and the lies that are listed.

Where pots are asked case by case, rows `pots` say of listed profiles that the lengths of
some paths, one per party, cover the outlay.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from functools import cached_property

import numpy as np

from designer.demands.formulate import Formulation
from designer.demands.terms import Terms
from designer.program.affine import Affine, of_columns
from designer.program.labels import (
    AtMost,
    Decides,
    Label,
    Lottery,
    OnAverage,
    Paths,
    PaysAgainst,
)
from designer.program.linear import IndexArray
from designer.program.program import Program
from designer.roads.typegraph.bases import OWN, Root, kind
from designer.roads.typegraph.decided import Decided, Indices
from designer.roads.typegraph.fibers import Fibers
from designer.roads.typegraph.openpots import Pot, pot_rows
from designer.roads.typegraph.spelled import Spelled
from designer.roads.typegraph.torn import Torn, even_sum, spelled, sums, torn
from designer.roads.typegraph.totals import Figures, TotalsDraft, spending
from designer.setting.setting import IntArray, Setting

NOBODY = "·"
"""Stands for the own type of a party in a label about the others' reports."""


@dataclass(frozen=True, eq=False)
class Bound:
    """One bound on what a party pays on average, by paths that end where it keeps its room.

    root   OWN: at any type's room; or one type, the room on average over the others' types
    even   int (E, T): the trees of the classes that no tie touches
    graph  int (C,): per cut which of the torn profiles it is about, ascending
    trees  int (C, T): per cut its tree
    """

    root: Root
    even: IntArray
    graph: Indices
    trees: Indices


@dataclass(frozen=True, eq=False)
class Lies:
    """A party that is spelled: the lies that have a row, int (L, 3), (graph, true, told)."""

    listed: IntArray


Parts = list[list[Bound] | Lies]
"""Per party its bounds, or its lies."""


class Opened:
    """What ties leave open under a rule: the same whatever paths are listed."""

    def __init__(self, setting: Setting, terms: Terms, works: list[Fibers]) -> None:
        """`works` are the parties' classes under the options first listed where tied."""
        self.setting, self.terms, self.works = setting, terms, works
        self.decided: Decided = works[0].decided
        self.torn: list[Torn] = [torn(work) for work in works]
        self._spelled: dict[int, Torn] = {}

    def spelled(self, party: int) -> Torn:
        """Every graph of a party once."""
        if party not in self._spelled:
            self._spelled[party] = spelled(self.torn[party])
        return self._spelled[party]

    @cached_property
    def figures(self) -> Figures:
        """What the rule fixes at the options first listed; `most` is E[room] where that binds."""
        worth, most = [], []
        for work in self.works:
            total = room = 0
            for _, lengths in work.blocks():
                total += work.sum(lengths.sinks, lengths.worth)
                room += work.sum(lengths.sinks, lengths.room)
            den = work.den * work.total
            worth.append(Fraction(total, den))
            most.append(Fraction(room, den) if on_average(work) else None)
        outlay, designer = spending(self.setting, self.works[0])
        return Figures(tuple(most), tuple(worth), outlay, designer, True)

    @cached_property
    def cells(self) -> Indices:
        """Tied profile (by place) and option of each decision column, int (X, 2)."""
        found: Indices = np.argwhere(self.decided.torn)
        return found

    @cached_property
    def column(self) -> Indices:
        """The decision column of each tied profile and option, -1 for none, int (M, K)."""
        found = np.full(self.decided.torn.shape, -1, dtype=np.int64)
        found[self.decided.torn] = np.arange(len(self.cells))
        return found

    def others(self, party: int, graph: int) -> tuple[str, ...]:
        """The others' reports at a torn profile, for labels."""
        work = self.torn[party]
        step = math.prod(self.setting.shape[party + 1 :])
        other = int(work.others[graph])
        labels = list(self.setting.labels_at(other // step * step * work.work.types + other % step))
        labels[party] = NOBODY
        return tuple(labels)


def on_average(work: Fibers) -> bool:
    """Whether participation bounds nothing but the average payment."""
    trusted = work.setting.parties[work.party].name in work.terms.trusted
    return kind(work) == "mean" or (kind(work) == "types" and trusted)


class LotteryDraft(TotalsDraft):
    """The columns and rows above."""

    def __init__(
        self,
        setting: Setting,
        terms: Terms,
        opened: Opened,
        parts: Parts,
        pots: Sequence[Pot] = (),
    ) -> None:
        """Write everything but the demands."""
        self.opened, self.parts, self.pots = opened, parts, pots
        super().__init__(setting, terms, opened.figures)

    def _lay_out(self) -> None:
        self.dtype = np.dtype(object)
        setting = self.setting
        names = [party.name for party in setting.parties]
        self.totals = self.add_columns(
            "pays on average", len(names), lambda j: OnAverage("pays", names[j])
        )
        self._lay_out_lotteries()
        self._lay_out_fixed(names)
        for i, work in enumerate(self.opened.works):
            if on_average(work):
                self._on_average(i)
            part = self.parts[i]
            if isinstance(part, Lies):
                Spelled(self, i, part.listed).write()
                continue
            for bound in part:
                self._bounded(i, bound)
        pot_rows(self, self.pots)

    def _lay_out_lotteries(self) -> None:
        setting, opened = self.setting, self.opened
        tied, cells = opened.decided.tied, opened.cells

        def decides(j: int) -> Label:
            row, option = (int(part) for part in cells[j])
            return Decides(setting.options[option], setting.labels_at(int(tied[row])))

        self.chances_at = self.add_columns("decides", len(cells), decides, Fraction(0))
        ones = np.ones(len(tied), dtype=self.dtype)
        form = Affine(
            cells[:, 0], self.chances_at, np.ones(len(cells), dtype=self.dtype), -ones, ones
        )
        self.require(form, "=", "lottery", lambda j: Lottery(setting.labels_at(int(tied[j]))))

    def _lay_out_fixed(self, names: list[str]) -> None:
        """Columns for what the rule fixes, each a form in the chances at ties."""
        setting, figures = self.setting, self.figures
        labels = [OnAverage("worth", name) for name in names]
        labels += [OnAverage("outlay"), OnAverage("designer's worth")]
        amounts = [*figures.worth, figures.outlay, figures.designer]
        columns = self.add_columns("fixed by the rule", len(labels), lambda j: labels[j])
        self._fixed = [of_columns(columns[j : j + 1], self.dtype) for j in range(len(labels))]
        decided = self.opened.decided
        row, option = self.opened.cells.T
        weights = setting.weights[decided.tied].astype(object)
        rows = np.arange(len(decided.tied))
        forms = []
        for j, amount in enumerate(amounts):
            each = self._each(j) * weights[:, None]
            den = setting.grain * setting.total_weight
            settled = amount - Fraction(int(each[rows, decided.choices].sum()), den)
            some = each[row, option]
            kept = np.flatnonzero(some != 0)
            common = math.lcm(den, settled.denominator)
            form = Affine(
                np.zeros(len(kept), dtype=np.int64),
                self.chances_at[kept],
                some[kept] * (common // den),
                np.array([int(settled * common)], dtype=object),
                np.array([common], dtype=object),
            )
            forms.append(self._fixed[j] - form)
        self.require(_stacked(forms), "=", "rule", lambda j: labels[j])

    def _each(self, j: int) -> IntArray:
        """What is averaged, at every tied profile and option, int (M, K)."""
        setting, decided = self.setting, self.opened.decided
        if j == len(setting.parties):
            return np.broadcast_to(setting.outlay.astype(object), decided.torn.shape)
        if j > len(setting.parties):
            return np.broadcast_to(setting.worth.astype(object), decided.torn.shape)
        party = setting.parties[j]
        step = math.prod(setting.shape[j + 1 :])
        at = decided.tied if party.depends else decided.tied // step % setting.shape[j]
        found: IntArray = party.value[at].astype(object)
        return found

    def _on_average(self, i: int) -> None:
        """E[t_i] <= E[worth_i] + what outside options and the shortfall add to it."""
        most = self.figures.most[i]
        if most is None:
            raise AssertionError("participation on average has a room")
        rest = self._constant(most - self.figures.worth[i])
        paid = of_columns(self.totals[i : i + 1], self.dtype)
        name = self.setting.parties[i].name
        self.require(rest + self._fixed[i] - paid, ">=", "at most", lambda _: AtMost(name))

    def _bounded(self, i: int, bound: Bound) -> None:
        """E[t_i] by columns per torn profile of the others, and these by paths."""
        found, name = self.opened.torn[i], self.setting.parties[i].name
        work = found.work
        worst = None
        if bound.root != OWN:
            worst = self.setting.parties[i].types[int(bound.root)].label
        sinks = found.sinks().astype(object).sum(axis=1)
        columns = self.add_columns(
            "pays against",
            len(found.others),
            lambda j: PaysAgainst(name, self.opened.others(i, j), worst),
        )
        den = work.den * work.total
        constant = Fraction(even_sum(found, bound.even), den)
        weights = sinks * found.masses.astype(object)
        form = Affine(
            np.zeros(len(columns), dtype=np.int64),
            columns,
            weights,
            np.zeros(1, dtype=object),
            np.array([work.total], dtype=object),
        )
        paid = of_columns(self.totals[i : i + 1], self.dtype)
        self.require(
            self._constant(constant) + form - paid, ">=", "at most", lambda _: AtMost(name, worst)
        )
        self._cut(i, bound, columns, sinks, worst)

    def _cut(
        self, i: int, bound: Bound, columns: IndexArray, sinks: IntArray, worst: str | None
    ) -> None:
        found = self.opened.torn[i]
        coef, const = sums(found, bound.graph, bound.trees)
        at = found.place[bound.graph]
        column = np.where(at[:, :, None] >= 0, self.opened.column[at], -1)
        cut, a, option = np.nonzero((column >= 0) & (coef != 0))
        rows = np.arange(len(bound.graph), dtype=np.int64)
        whole = sinks[bound.graph]
        den = found.work.den
        form = Affine(
            np.concatenate([cut, rows]).astype(np.int64),
            np.concatenate([self.chances_at[column[cut, a, option]], columns[bound.graph]]),
            np.concatenate([coef[cut, a, option].astype(object), -whole * den]),
            const.astype(object),
            whole * den,
        )
        self.require(form, ">=", "paths", self._paths(i, bound, worst))

    def _paths(self, i: int, bound: Bound, worst: str | None) -> Callable[[int], Label]:
        name = self.setting.parties[i].name
        first = np.searchsorted(bound.graph, bound.graph)

        def label(j: int) -> Label:
            others = self.opened.others(i, int(bound.graph[j]))
            return Paths(name, others, j - int(first[j]), worst)

        return label


def _stacked(forms: list[Affine]) -> Affine:
    """Vectors of forms one below the other."""
    starts = np.cumsum([0, *(len(form) for form in forms)])
    return Affine(
        np.concatenate([form.row + start for form, start in zip(forms, starts, strict=False)]),
        np.concatenate([form.col for form in forms]),
        np.concatenate([form.num for form in forms]),
        np.concatenate([form.const for form in forms]),
        np.concatenate([form.den for form in forms]),
    )


def lottery_program(
    setting: Setting, terms: Terms, opened: Opened, parts: Parts, pots: Sequence[Pot] = ()
) -> Program:
    """The program of the only goal with the listed paths."""
    balance = "ex-ante" if terms.balance == "ex-ante" else "none"
    inner = replace(terms, ic="none", ir="none", balance=balance, tidy="none")
    draft = LotteryDraft(setting, inner, opened, parts, pots)
    return Formulation(setting, inner, draft=draft).pose(terms.goals[0])
