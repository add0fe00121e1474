"""A party whose payments are columns, by graph and type, while lotteries at ties are open."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from designer.program.affine import Affine, constants, of_columns
from designer.program.labels import AtMost, Honest, Label, Pays, TakesPart
from designer.roads.typegraph.torn import places
from designer.setting.setting import IntArray

if TYPE_CHECKING:
    from designer.roads.typegraph.lotteries import LotteryDraft


class Spelled:
    """The columns and rows of a party whose payments are told apart by graph and type."""

    def __init__(self, draft: LotteryDraft, party: int, lies: IntArray) -> None:
        """Write into a draft whose decision columns are laid out; `lies` as in `Lies.listed`."""
        self.draft, self.index, self.lies = draft, party, lies
        self.party = draft.setting.parties[party]
        self.found = draft.opened.spelled(party)
        self.at = places(self.found.work, self.found.others)

    def write(self) -> None:
        """Payments, their average, the listed lies and participation."""
        draft, at, name, dtype = self.draft, self.at, self.party.name, self.draft.dtype
        setting = draft.setting

        def pays(j: int) -> Label:
            return Pays(name, setting.labels_at(int(at.flat[j])))

        self.columns = draft.add_columns("pays", at.size, pays).reshape(at.shape)
        weights = self.found.sinks().astype(object) * self.found.masses.astype(object)[:, None]
        average = Affine(
            np.zeros(at.size, dtype=np.int64),
            self.columns.ravel(),
            weights.ravel(),
            np.zeros(1, dtype=object),
            np.array([self.found.work.total], dtype=object),
        )
        paid = of_columns(draft.totals[self.index : self.index + 1], dtype)
        draft.require(average - paid, ">=", "at most", lambda _: AtMost(name))
        self._honest()
        for a in range(self.party.size):
            self._takes_part(a)

    def _honest(self) -> None:
        draft, listed, party = self.draft, self.lies, self.party
        graph, true, told = listed.T
        honest = self._worth(graph, true, true) - self._pays(graph, true)
        lying = self._worth(graph, true, told) - self._pays(graph, told)
        slack = draft.allowance("slack", draft.opened.terms.slack).repeat(len(listed))

        def label(j: int) -> Label:
            g, a, b = (int(part) for part in listed[j])
            at = draft.setting.labels_at(int(self.at[g, a]))
            return Honest(party.name, party.types[a].label, party.types[b].label, at)

        draft.require(honest - lying + slack, ">=", "honest", label)

    def _takes_part(self, a: int) -> None:
        draft, party = self.draft, self.party
        graph = np.arange(len(self.at), dtype=np.int64)
        types = np.full(len(graph), a)
        rows = self.at[:, a] if party.outside_depends else types
        outside = constants(party.outside[rows].astype(object), draft.setting.grain, draft.dtype)
        utility = self._worth(graph, types, types) - self._pays(graph, types)
        mean = (utility - outside).mean(self.found.masses.astype(object))
        allowed = draft.allowance("shortfall", draft.opened.terms.shortfall, party.name)
        kept = TakesPart(party.name, party.types[a].label)
        draft.require(mean + allowed, ">=", "takes part", lambda _: kept)

    def _pays(self, graph: IntArray, types: IntArray) -> Affine:
        return of_columns(self.columns[graph, types], self.draft.dtype)

    def _worth(self, graph: IntArray, true: IntArray, told: IntArray) -> Affine:
        """The worth to true types of what is decided where others are told."""
        opened, draft = self.draft.opened, self.draft
        value = self.party.value.astype(object)[true]
        place = self.found.place[graph, told]
        column = np.where(place[:, None] >= 0, opened.column[place], -1)
        row, option = np.nonzero((column >= 0) & (value != 0))
        taken = opened.decided.at[self.at[graph, told]].astype(np.int64)
        settled = value[np.arange(len(graph)), np.where(place < 0, taken, 0)]
        return Affine(
            row.astype(np.int64),
            draft.chances_at[column[row, option]],
            value[row, option],
            np.where(place < 0, settled, 0).astype(object),
            np.full(len(graph), draft.setting.grain, dtype=object),
        )
