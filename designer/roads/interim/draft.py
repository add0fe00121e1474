"""A draft without profiles: interim payments and interim probabilities are its columns.

With independent types and private worths every Bayesian honesty row, every ex-ante or interim
participation row, balance on average and the expectations in the goals can be written in
m_i(a) and q_i(k, a) alone. The demand and goal files write their rows on it unchanged.
"""

from __future__ import annotations

from fractions import Fraction

import numpy as np

from designer.program.affine import Affine, constants, of_columns
from designer.program.draft import Draft
from designer.program.labels import ExpectedDecision, ExpectedPay, Share, Slice
from designer.program.linear import IndexArray
from designer.roads.interim.merged import merged
from designer.roads.interim.rule import Counts
from designer.setting.setting import Chance, IntArray, Setting

Lies = tuple[tuple[tuple[int, int], ...], ...]
"""Per party, pairs of positions (true, told)."""

ANY = "any type"
"""What the one slice is called where there is no lead party."""


class InterimDraft(Draft):
    """Columns m_i(a), q_i(k, a) and the shares of the rules that q mixes.

    The shares lambda_{g,r} >= 0 sum to one over r for every type g of the lead party (or once,
    without a lead party):

        q_i(k, a) = sum_{g,r} lambda_{g,r} * taken_r[g][i][a, k] / weight(theta_i = a).

    Options that are all one to a party (`merged`) share one q, that of any of them.
    """

    def __init__(
        self,
        setting: Setting,
        decision: str,
        amounts: tuple[Fraction, ...] = (),
        *,
        lead: int | None = None,
        columns: tuple[tuple[int, Counts], ...] = (),
        lies: Lies | None = None,
        chances: tuple[Chance, ...] = (),
    ) -> None:
        """`columns` lists (g, counts of the rule) per share column.

        `lies` lists the pairs (true, told) to be written per party; None writes all. `chances`
        are demands on single options.
        """
        self.lead, self.shares, self.written = lead, columns, lies
        self.merged = merged(setting, chances)
        super().__init__(setting, decision, amounts)

    def _lay_out(self) -> None:
        self._probabilities: dict[int, IndexArray] = {}
        self._pays: dict[int, IndexArray] = {}
        setting = self.setting
        count = len(self.shares)
        self.share_columns = self.add_columns(
            "share", count, lambda j: Share(self._lead_type(self.shares[j][0]), j), Fraction(0)
        )
        size = 1 if self.lead is None else setting.shape[self.lead]
        of = np.array([g for g, _ in self.shares], dtype=np.int64)
        whole = Affine(
            of,
            self.share_columns,
            np.ones(count, dtype=self.dtype),
            np.full(size, -1, dtype=self.dtype),
            np.ones(size, dtype=self.dtype),
        )
        self.require(whole, "=", "slice", lambda g: Slice(self._lead_type(g)))
        for index in range(len(setting.parties)):
            self._define(index)

    def _lead_type(self, g: int) -> str:
        if self.lead is None:
            return ANY
        return self.setting.parties[self.lead].types[g].label

    def _define(self, index: int) -> None:
        """The rows that tie q_i(k, a) to the shares."""
        setting, party = self.setting, self.setting.parties[index]
        classes = self.merged[index]
        options = classes.size

        def label(j: int) -> ExpectedDecision:
            a, c = divmod(j, options)
            option = setting.options[classes.first[c]]
            others = int((classes.of == c).sum()) - 1
            return ExpectedDecision(party.name, party.types[a].label, option, others)

        columns = self.add_columns("expected decision", party.size * options, label)
        self._probabilities[index] = columns.reshape(party.size, options)
        total = setting.total_weight // sum(party.weights)
        weight = np.repeat(
            np.array([total * own for own in party.weights], dtype=self.dtype), options
        )
        rows, cols, nums = [], [], []
        for share, (g, counts) in enumerate(self.shares):
            taken = classes.sums(counts.taken[g][index]).ravel()
            place = np.flatnonzero(taken)
            rows.append(place)
            cols.append(np.full(len(place), self.share_columns[share]))
            nums.append(taken[place].astype(self.dtype) * (self.chances_den // counts.den))
        form = Affine(
            np.concatenate(rows).astype(np.int64) if rows else np.empty(0, dtype=np.int64),
            np.concatenate(cols).astype(np.int64) if cols else np.empty(0, dtype=np.int64),
            np.concatenate(nums) if nums else np.empty(0, dtype=self.dtype),
            np.zeros(len(weight), dtype=self.dtype),
            weight * self.chances_den,
        )
        self.require(form - of_columns(columns, self.dtype), "=", "expected decision", label)

    def lies(self, index: int) -> tuple[IndexArray, IndexArray]:
        """The lies that are written; the others are for the road to watch."""
        if self.written is None:
            return super().lies(index)
        pairs = np.array(self.written[index], dtype=np.int64).reshape(-1, 2)
        return pairs[:, 0], pairs[:, 1]

    @property
    def chances_den(self) -> int:
        """The denominator of the given table's lotteries, 1 for index rules."""
        return self.setting.rule_den if self.decision == "table" else 1

    def expected_pay(self, index: int) -> IndexArray:
        """The columns m_i(a)."""
        if index not in self._pays:
            party = self.setting.parties[index]
            self._pays[index] = self.add_columns(
                "expected pay", party.size, lambda a: ExpectedPay(party.name, party.types[a].label)
            )
        return self._pays[index]

    @property
    def pays_columns(self) -> dict[int, IndexArray]:
        """The columns m_i(a) of the parties whose payments the demands mention."""
        return self._pays

    def expected_decision(self, index: int) -> tuple[IndexArray, IntArray]:
        """The columns q_i(k, a), (T_i, C) over classes of options; none is constant."""
        columns = self._probabilities[index]
        return columns, np.zeros(columns.shape, dtype=self.dtype)

    def interim_pay(self, index: int, true: IndexArray, told: IndexArray) -> Affine:
        """m_i(told)."""
        return of_columns(self.expected_pay(index)[told], self.dtype)

    def interim_worth(self, index: int, true: IndexArray, told: IndexArray) -> Affine:
        """sum_k v_i(k, true) q_i(k, told)."""
        party = self.setting.parties[index]
        value = party.value[:, self.merged[index].first].astype(self.dtype)[true]
        row, option = np.nonzero(value)
        return Affine(
            row.astype(np.int64),
            self._probabilities[index][told[row], option],
            value[row, option],
            np.zeros(len(true), dtype=self.dtype),
            np.full(len(true), self.setting.grain, dtype=self.dtype),
        )

    def interim_chance(self, index: int, types: IndexArray, option: int) -> Affine:
        """q_i(option, a), of an option that the draft was told a chance is demanded of."""
        return of_columns(
            self._probabilities[index][types, self.merged[index].of[option]], self.dtype
        )

    def expected_worth(self, index: int) -> Affine:
        """E[sum_k x_k v_i(k)] = sum_a P(a) sum_k v_i(k, a) q_i(k, a)."""
        types = np.arange(self.setting.shape[index], dtype=np.int64)
        return self.interim_worth(index, types, types).mean(self.marginal(index))

    def expected_choice(self, worth: IntArray) -> Affine:
        """E[sum_k x_k worth(k)], worth int (K,) in units of 1/grain, made of outlay and worth."""
        worth = worth[self.merged[0].first]
        size, options = self._probabilities[0].shape
        form = Affine(
            np.repeat(np.arange(size, dtype=np.int64), options),
            self._probabilities[0].ravel(),
            np.tile(worth.astype(self.dtype), size),
            np.zeros(size, dtype=self.dtype),
            np.full(size, self.setting.grain, dtype=self.dtype),
        )
        return form.mean(self.marginal(0))

    def expected_welfare(self) -> Affine:
        """E[sum_i worth_i] + E[sum_k x_k (worth(k) - outlay(k))]."""
        form = self.expected_choice(self.setting.worth - self.setting.outlay)
        for index in range(len(self.setting.parties)):
            form = form + self.expected_worth(index)
        return form

    def expected_outside(self, index: int) -> Affine:
        """E[outside_i]."""
        party = self.setting.parties[index]
        return constants(party.outside, self.setting.grain, self.dtype).mean(self.marginal(index))
