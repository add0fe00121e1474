"""A few rows of the full program: the paths of lies that decide, and the pot they end in.

The rows are word for word those of the full program, over the payments they mention and the
decisions at tied profiles they mention. Whatever they exclude is excluded by the whole.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from fractions import Fraction
from functools import cached_property

import numpy as np

from designer.demands.formulate import Formulation, amounts_of
from designer.demands.terms import Terms
from designer.program.affine import Affine, constants, of_columns
from designer.program.draft import Draft
from designer.program.labels import Decides, Honest, Label, Lottery, Pays, TakesPart
from designer.program.linear import IndexArray
from designer.program.program import Program
from designer.setting.profiles import strides
from designer.setting.setting import IntArray, Setting


@dataclass(frozen=True)
class Cases:
    """Which rows.

    lies    (party, true profile, told profile): the party's honesty at the true one
    takes   (party, profile): the party's participation
    pots    profiles whose pot is in question
    """

    lies: tuple[tuple[int, int, int], ...]
    takes: tuple[tuple[int, int], ...] = ()
    pots: tuple[int, ...] = ()

    def and_also(self, more: Cases) -> Cases:
        """These rows and more, each once."""
        return Cases(
            tuple(sorted({*self.lies, *more.lies})),
            tuple(sorted({*self.takes, *more.takes})),
            tuple(sorted({*self.pots, *more.pots})),
        )

    def profiles(self) -> list[int]:
        """Every profile that some row mentions."""
        found = {p for _, true, told in self.lies for p in (true, told)}
        return sorted(found | {p for _, p in self.takes} | set(self.pots))


class CasesDraft(Draft):
    """Columns t_i(theta) and, at tied profiles, x_k(theta), where the rows mention them."""

    def __init__(self, setting: Setting, terms: Terms, cases: Cases) -> None:
        """Lay out the columns; `write` adds the rows."""
        self.cases, self.terms = cases, terms
        self.places = np.array(cases.profiles(), dtype=np.int64)
        super().__init__(setting, terms.decision, amounts_of(terms))

    def _lay_out(self) -> None:
        setting, cases, places = self.setting, self.cases, self.places
        paid = {(i, p) for i, true, told in cases.lies for p in (true, told)} | set(cases.takes)
        paid |= {(i, p) for p in cases.pots for i in range(len(setting.parties))}
        pairs = sorted(paid)

        def label(j: int) -> Label:
            party, profile = pairs[j]
            return Pays(setting.parties[party].name, setting.labels_at(profile))

        columns = self.add_columns("pays", len(pairs), label)
        self._pays = {pair: int(column) for pair, column in zip(pairs, columns, strict=True)}
        options = len(setting.options)
        self.chance_col = np.full((len(places), options), -1, dtype=np.int64)
        self.chance_den = 1
        if self.decision == "table":
            if setting.rule is None:
                raise ValueError("the setting gives no decision rule")
            self.chance = setting.rule[places].astype(self.dtype)
            self.chance_den = setting.rule_den
            return
        welfare = np.zeros((len(places), options), dtype=self.dtype)
        for index in range(len(setting.parties)):
            welfare += self._values(index, places)
        welfare += (setting.worth - setting.outlay).astype(self.dtype)
        torn = (welfare == welfare.max(axis=1, keepdims=True)).astype(bool)
        tied = np.flatnonzero(torn.sum(axis=1) > 1)
        self.chance = torn.astype(self.dtype)
        self.chance[tied] = 0
        cells = np.argwhere(torn & (torn.sum(axis=1, keepdims=True) > 1))

        def decides(j: int) -> Label:
            row, option = (int(part) for part in cells[j])
            return Decides(setting.options[option], setting.labels_at(int(places[row])))

        new = self.add_columns("decides", len(cells), decides, Fraction(0))
        self.chance_col[cells[:, 0], cells[:, 1]] = new
        row_of = {int(t): j for j, t in enumerate(tied)}
        form = Affine(
            np.array([row_of[int(r)] for r in cells[:, 0]], dtype=np.int64),
            new,
            np.ones(len(cells), dtype=self.dtype),
            np.full(len(tied), -1, dtype=self.dtype),
            np.ones(len(tied), dtype=self.dtype),
        )
        self.require(
            form, "=", "lottery", lambda j: Lottery(setting.labels_at(int(places[tied[j]])))
        )

    @cached_property
    def scope(self) -> IndexArray:
        """The profiles whose pot is in question."""
        return np.array(self.cases.pots, dtype=np.int64)

    def pays(self, index: int, profiles: IndexArray) -> Affine:
        """t_i at listed profiles."""
        columns = [self._pays[index, int(p)] for p in profiles]
        return of_columns(np.array(columns, dtype=np.int64), self.dtype)

    def chosen(self, profiles: IndexArray, worth: IntArray, den: int) -> Affine:
        """As in the full draft, at profiles among those mentioned."""
        worth = np.broadcast_to(worth, (len(profiles), len(self.setting.options)))
        at = np.searchsorted(self.places, profiles)
        column = self.chance_col[at]
        row, option = np.nonzero((column >= 0) & (worth != 0))
        return Affine(
            row.astype(np.int64),
            column[row, option],
            worth[row, option] * self.chance_den,
            (self.chance[at] * worth).sum(axis=1).astype(self.dtype),
            np.full(len(profiles), den * self.chance_den, dtype=self.dtype),
        )

    def worth(self, index: int, true: IndexArray, told: IndexArray) -> Affine:
        """A party's worth at true profiles when the decision follows the told ones."""
        return self.chosen(told, self._values(index, true), self.setting.grain)

    def pot(self, profiles: IndexArray) -> Affine:
        """sum_i t_i - outlay at listed profiles."""
        outlay = self.setting.outlay.astype(self.dtype)
        form = -self.chosen(profiles, outlay, self.setting.grain)
        for index in range(len(self.setting.parties)):
            form = form + self.pays(index, profiles)
        return form

    def _positions(self, index: int, profiles: IndexArray) -> IndexArray:
        step = strides(self.setting.shape)[index]
        found: IndexArray = profiles // step % self.setting.shape[index]
        return found

    def _values(self, index: int, profiles: IndexArray) -> IntArray:
        party = self.setting.parties[index]
        rows = profiles if party.depends else self._positions(index, profiles)
        value: IntArray = party.value[rows].astype(self.dtype)
        return value

    def write(self) -> None:
        """The listed honesty and participation rows, party by party."""
        for index in range(len(self.setting.parties)):
            self._write_lies(index)
        for index in range(len(self.setting.parties)):
            self._write_takes(index)

    def _write_lies(self, index: int) -> None:
        mine = [(true, told) for i, true, told in self.cases.lies if i == index]
        if not mine:
            return
        true, told = (np.array(part, dtype=np.int64) for part in zip(*mine, strict=True))
        honest = self.worth(index, true, true) - self.pays(index, true)
        lying = self.worth(index, true, told) - self.pays(index, told)
        slack = self.allowance("slack", self.terms.slack).repeat(len(mine))
        self.require(honest - lying + slack, ">=", "honest", self._honest(index, mine))

    def _honest(self, index: int, mine: list[tuple[int, int]]) -> Callable[[int], Label]:
        setting = self.setting
        name = setting.parties[index].name

        def label(j: int) -> Label:
            true, told = (setting.labels_at(p) for p in mine[j])
            return Honest(name, true[index], told[index], true)

        return label

    def _write_takes(self, index: int) -> None:
        setting, party = self.setting, self.setting.parties[index]
        mine = np.array([p for i, p in self.cases.takes if i == index], dtype=np.int64)
        if not len(mine):
            return
        rows = mine if party.outside_depends else self._positions(index, mine)
        outside = constants(party.outside[rows].astype(self.dtype), setting.grain, self.dtype)
        utility = self.worth(index, mine, mine) - self.pays(index, mine)
        allowed = self.allowance("shortfall", self.terms.shortfall, party.name).repeat(len(mine))

        def label(j: int) -> Label:
            at = setting.labels_at(int(mine[j]))
            return TakesPart(party.name, at[index], at)

        self.require(utility - outside + allowed, ">=", "takes part", label)


def cases_program(setting: Setting, terms: Terms, cases: Cases, goal: str) -> Program:
    """The listed rows of the full program, with a goal."""
    balance = terms.balance if cases.pots else "none"
    goals = terms.goals if goal == "outside-money" else (goal,)
    inner = replace(terms, ic="none", ir="none", balance=balance, tidy="none", goals=goals)
    draft = CasesDraft(setting, inner, cases)
    draft.write()
    return Formulation(setting, inner, draft=draft).pose(goal)
