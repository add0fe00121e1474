"""A draft over representatives: what differs by a trade of alike parties is one column."""

from __future__ import annotations

from fractions import Fraction

import numpy as np

from designer.program.affine import Affine, averages, constants, of_columns
from designer.program.draft import Draft
from designer.program.labels import ExpectedDecision, Label, Pays
from designer.program.linear import BoolArray, IndexArray
from designer.roads.likeness.orbits import Orbits
from designer.setting.setting import IntArray


class LikenessDraft(Draft):
    """The plain draft with t_i(theta) and x_k(theta) equal wherever a trade makes them so.

    Rows are written for the first member of each group, and at the representatives: those of
    the others are the same rows.
    """

    def __init__(self, orbits: Orbits, decision: str, amounts: tuple[Fraction, ...] = ()) -> None:
        """As a plain draft of the orbits' setting, which has independent private worths."""
        self.orbits = orbits
        super().__init__(orbits.setting, decision, amounts)

    def _lay_out_payments(self) -> None:
        setting, first = self.setting, self.orbits.first_slot
        # by party and then by representative, as the plain draft's columns are
        party, row = np.nonzero(first.T)

        def label(j: int) -> Label:
            at = setting.labels_at(int(self.everywhere[row[j]]))
            return Pays(setting.parties[int(party[j])].name, at)

        columns = self.add_columns("pays", len(row), label)
        self.payment_column = np.full(first.shape, -1, dtype=np.int64)
        self.payment_column[row, party] = columns
        for i, j in self.orbits.likeness.steps:
            same = ~first[:, j]
            self.payment_column[same, j] = self.payment_column[same, i]

    def _first_options(self) -> IndexArray:
        return self.orbits.kinds

    @property
    def judged(self) -> list[int]:
        """The first member of each group."""
        return [group[0] for group in self.orbits.likeness.groups]

    @property
    def everywhere(self) -> IndexArray:
        """The representatives."""
        return self.orbits.profiles

    def everywhere_of(self, index: int) -> IndexArray:
        """A party's profiles up to trades among the others."""
        return self.fiber(index).ravel()

    def scope_of(self, index: int) -> IndexArray:
        """The same: with independent types every profile is in scope."""
        return self.everywhere_of(index)

    def in_scope(self, profiles: IndexArray) -> BoolArray:
        """Every profile is."""
        return np.ones(len(profiles), dtype=bool)

    @property
    def weights(self) -> IntArray:
        """The weight of all profiles that each representative stands for."""
        return self.orbits.weights.astype(self.dtype)

    def _fiber(self, index: int) -> IndexArray:
        return self.orbits.fiber(index)

    def beliefs(self, index: int) -> tuple[IntArray, IntArray]:
        """Weights of the others' types up to trades, the same whatever one's own type."""
        weights = self.orbits.beliefs(index).astype(self.dtype)
        size = self.setting.shape[index]
        return (
            np.broadcast_to(weights, (size, len(weights))),
            np.full(size, int(weights.sum()), dtype=self.dtype),
        )

    def payment_columns(self, index: int, profiles: IndexArray) -> IndexArray:
        """The column of the party in the same place at the representative."""
        flat = profiles if profiles.ndim == 1 else profiles.ravel()
        place, _ = self.orbits.to_first(flat)
        columns: IndexArray = self.payment_column[place, self.orbits.slot(index, flat)]
        return columns.reshape(profiles.shape)

    def chances(self, profiles: IndexArray) -> tuple[IntArray, IndexArray]:
        """Those of the representative, options moved as the trades move them."""
        place, moved = self.orbits.to_first(profiles)
        if moved is None:
            return self.chance[place], self.chance_col[place]
        return (
            np.take_along_axis(self.chance[place], moved, axis=1),
            np.take_along_axis(self.chance_col[place], moved, axis=1),
        )

    def expected_pay(self, index: int) -> IndexArray:
        """The columns m_i(a) of the group's first member."""
        return super().expected_pay(self.orbits.likeness.group_of(index)[0])

    def expected_decision(self, index: int) -> tuple[IndexArray, IntArray]:
        """The columns q_i(k, a), one for options that trades among the others leave equal."""
        if index in self._expected_decision:
            return self._expected_decision[index]
        setting, options = self.setting, len(self.setting.options)
        party, fiber = setting.parties[index], self.fiber(index)
        first, many = self.orbits.likeness.same_to(index, options)
        same = (first == first[:, None]).astype(self.dtype)
        weights, totals = self.beliefs(index)
        chance, column = (
            part.reshape(*fiber.shape, options) for part in self.chances(fiber.ravel())
        )
        # over representatives only the sum over such options is what it is over all profiles
        summed = (chance * weights[:, :, None]).sum(axis=1).astype(self.dtype) @ same
        open_to = (column >= 0).any(axis=1)
        cells = np.argwhere(open_to & (first == np.arange(options)))
        columns = np.full(open_to.shape, -1, dtype=np.int64)

        def label(j: int) -> Label:
            a, k = (int(part) for part in cells[j])
            return ExpectedDecision(party.name, party.types[a].label, setting.options[k])

        if len(cells):
            new = self.add_columns("expected decision", len(cells), label)
            columns[cells[:, 0], cells[:, 1]] = new
            columns = columns[:, first]
            among = first == cells[:, 1][:, None]  # (cells, K)
            seen = np.where(among[:, None, :], column[cells[:, 0]], -1)  # (cells, M, K)
            row, other, option = np.nonzero(seen >= 0)
            form = Affine(
                row.astype(np.int64),
                seen[row, other, option],
                weights[0][other] * self.chance_den,
                summed[cells[:, 0], cells[:, 1]],
                totals[0] * self.chance_den * many[cells[:, 1]].astype(self.dtype),
            )
            self.require(form - of_columns(new, self.dtype), "=", "expected decision", label)
        self._expected_decision[index] = columns, summed // many.astype(self.dtype)
        return self._expected_decision[index]

    def interim_chance(self, index: int, types: IndexArray, option: int) -> Affine:
        """P(option | the party has the type): the mean over options that are the same to it."""
        first, many = self.orbits.likeness.same_to(index, len(self.setting.options))
        pick = (first == first[option]).astype(self.dtype)
        weights, totals = self.beliefs(index)
        forms = self.chosen(self.fiber(index)[types].ravel(), pick, 1)
        return averages(forms, weights[types], totals[types]).times(Fraction(1, int(many[option])))

    def expected_worth(self, index: int) -> Affine:
        """E[sum_k x_k v_i(k)], from the group's first member over its own type."""
        first = self.orbits.likeness.group_of(index)[0]
        profiles = self.everywhere_of(first)
        beliefs, _ = self.beliefs(first)
        weights = (self.marginal(first)[:, None] * beliefs).ravel()
        return self.worth(first, profiles, profiles).mean(weights)

    def expected_outside(self, index: int) -> Affine:
        """E[outside_i]."""
        party = self.setting.parties[index]
        return constants(party.outside, self.setting.grain, self.dtype).mean(self.marginal(index))
