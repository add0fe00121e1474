"""A program being drafted: the columns of a setting, and rows as demands ask for them.

The payment and decision columns exist from the start. Interim payments m_i(a) and interim
decision probabilities q_i(k, a) become columns, tied by defining rows, the first time a
demand needs them: n*T^n + n*T^2 nonzeros instead of n*T^(n+1).
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from fractions import Fraction
from functools import cached_property

import numpy as np

from designer.program.affine import Affine, Rows, averages, compress, constants, of_columns
from designer.program.labels import (
    Decides,
    ExpectedDecision,
    ExpectedPay,
    Label,
    Lottery,
    Pays,
    Unknown,
)
from designer.program.linear import BoolArray, IndexArray
from designer.program.program import Block
from designer.program.width import width
from designer.setting.setting import IntArray, Setting

FREE_RULES = ("randomized", "deterministic")


class Draft:
    """The columns and rows of a program under construction (the one mutable value here)."""

    def __init__(self, setting: Setting, decision: str, amounts: tuple[Fraction, ...] = ()) -> None:
        """Lay out the payment and decision columns of `setting` under a decision demand.

        `amounts` are the exact amounts that rows will carry; with the setting's own numbers
        they decide whether every integer in sight fits 64 bits.
        """
        self.setting = setting
        self.decision = decision
        self.dtype = width(setting, amounts)
        self.column_blocks: list[Block] = []
        self.row_blocks: list[Block] = []
        self.rows: list[tuple[Rows, str]] = []
        self.bounds: list[tuple[int, int, Fraction | None, Fraction | None]] = []
        self.columns = 0
        self._fibers: dict[int, IndexArray] = {}
        self._expected_pay: dict[int, IndexArray] = {}
        self._expected_decision: dict[int, tuple[IndexArray, IntArray]] = {}
        self._allowances: dict[str, Affine] = {}
        self._lay_out()

    # -- columns -------------------------------------------------------------------------

    def add_columns(
        self,
        family: str,
        count: int,
        label: Callable[[int], Label],
        lo: Fraction | None = None,
        hi: Fraction | None = None,
    ) -> IndexArray:
        """New columns with common bounds (None: unbounded); their numbers."""
        first = self.columns
        self.column_blocks.append(Block(family, count, label))
        self.bounds.append((first, first + count, lo, hi))
        self.columns += count
        return np.arange(first, first + count, dtype=np.int64)

    def unknown(self, name: str, lo: Fraction | None = None, hi: Fraction | None = None) -> Affine:
        """One new scalar column, as a form."""
        column = self.add_columns(f"unknown:{name}", 1, lambda _: Unknown(name), lo, hi)
        return of_columns(column, self.dtype)

    def bound_payments(self, lo: Fraction | None, hi: Fraction | None) -> None:
        """Give every payment t_i(theta) a floor and a cap."""
        self.bounds.append((0, self.payments, lo, hi))

    def _lay_out(self) -> None:
        self._lay_out_payments()
        self.payments = self.columns
        self._lay_out_decisions()

    def _lay_out_payments(self) -> None:
        for party in self.setting.parties:
            self.add_columns("pays", self.setting.profiles, _pays_label(self.setting, party.name))

    def _lay_out_decisions(self) -> None:
        setting, total, options = self.setting, len(self.everywhere), len(self.setting.options)
        self.chance_den = 1
        self.chance = np.zeros((total, options), dtype=self.dtype)
        self.chance_col = np.full((total, options), -1, dtype=np.int64)
        if self.decision == "table":
            if setting.rule is None:
                raise ValueError("the setting gives no decision rule")
            self.chance = setting.rule[self.everywhere].astype(self.dtype)
            self.chance_den = setting.rule_den
            return
        if self.decision in FREE_RULES:
            open_to = np.ones((total, options), dtype=bool)
        else:
            open_to = self.welfare == self.welfare.max(axis=1, keepdims=True)
        settled = open_to.sum(axis=1) == 1
        self.chance[settled] = open_to[settled]
        open_to[settled] = False
        first = self._first_options()
        cells = np.argwhere(open_to & (first == np.arange(options)))
        at = self.everywhere
        top = Fraction(1) if self.decision == "deterministic" else None
        columns = self.add_columns(
            "decides", len(cells), _decides_label(setting, at, cells), Fraction(0), top
        )
        self.chance_col[cells[:, 0], cells[:, 1]] = columns
        row, option = np.nonzero(open_to)
        self.chance_col[row, option] = self.chance_col[row, first[row, option]]
        lotteries = np.flatnonzero(~settled)
        if len(lotteries):
            place = np.full(total, -1, dtype=np.int64)
            place[lotteries] = np.arange(len(lotteries))
            size = len(lotteries)
            form = Affine(
                place[row],
                self.chance_col[row, option],
                np.ones(len(row), dtype=self.dtype),
                np.full(size, -1, dtype=self.dtype),
                np.ones(size, dtype=self.dtype),
            )
            self.require(
                form, "=", "lottery", lambda j: Lottery(setting.labels_at(int(at[lotteries[j]])))
            )

    def _first_options(self) -> IndexArray:
        """Per profile and option, the option whose column serves it, int (N, K): itself."""
        options = np.arange(len(self.setting.options), dtype=np.int64)
        return np.broadcast_to(options, (len(self.everywhere), len(options)))

    # -- rows ----------------------------------------------------------------------------

    def require(
        self, form: Affine, relation: str, family: str, label: Callable[[int], Label]
    ) -> None:
        """Ask that every form be >= 0 (relation ">=") or = 0 (relation "=")."""
        if not len(form):
            return
        self.rows.append((compress(form), relation))
        self.row_blocks.append(Block(family, len(form), label))

    # -- what the setting gives, as arrays -----------------------------------------------

    @property
    def judged(self) -> Sequence[int]:
        """The parties whose rows are written; those of the others would say the same again."""
        return range(len(self.setting.parties))

    @cached_property
    def everywhere(self) -> IndexArray:
        """The numbers of the profiles that the program tells apart, int (N,)."""
        return np.arange(self.setting.profiles, dtype=np.int64)

    def everywhere_of(self, index: int) -> IndexArray:
        """The profiles at which a party's own rows differ, int (N,)."""
        return self.everywhere

    @cached_property
    def scope(self) -> IndexArray:
        """The profiles at which ex-post and dominant demands hold (convention 5)."""
        return self.everywhere[self.in_scope(self.everywhere)]

    def scope_of(self, index: int) -> IndexArray:
        """The profiles in scope at which a party's own rows differ."""
        return self.scope

    def in_scope(self, profiles: IndexArray) -> BoolArray:
        """Whether ex-post and dominant demands hold at the listed profiles."""
        if self.setting.support_only and self.setting.joint is not None:
            inside: BoolArray = self.setting.joint[profiles] != 0
            return inside
        return np.ones(len(profiles), dtype=bool)

    @cached_property
    def weights(self) -> IntArray:
        """The weights of the profiles `everywhere`, int (N,)."""
        return self.setting.weights.astype(self.dtype)

    @cached_property
    def welfare(self) -> IntArray:
        """Total worth net of outlay `everywhere` by option, int (N, K), units of 1/grain."""
        setting, every = self.setting, self.everywhere
        total = np.zeros((len(every), len(setting.options)), dtype=self.dtype)
        for index in range(len(setting.parties)):
            total += self.value_at(index, every)
        total += (setting.worth - setting.outlay).astype(self.dtype)
        return total

    def value_at(self, index: int, profiles: IndexArray) -> IntArray:
        """A party's worth at the listed profiles, int (R, K), units of 1/grain."""
        party = self.setting.parties[index]
        at = profiles if party.depends else self.type_at(index, profiles)
        value: IntArray = party.value[at].astype(self.dtype)
        return value

    def outside_at(self, index: int, profiles: IndexArray) -> IntArray:
        """A party's outside option at the listed profiles, int (R,), units of 1/grain."""
        party = self.setting.parties[index]
        at = profiles if party.outside_depends else self.type_at(index, profiles)
        outside: IntArray = party.outside[at].astype(self.dtype)
        return outside

    def type_at(self, index: int, profiles: IndexArray) -> IndexArray:
        """The position of a party's type at the listed profiles, int (R,)."""
        step = math.prod(self.setting.shape[index + 1 :])
        at: IndexArray = profiles // step % self.setting.shape[index]
        return at.astype(np.int64, copy=False)

    def fiber(self, index: int) -> IndexArray:
        """A party's profile numbers by own type and others' profile, int (T_i, N / T_i)."""
        if index not in self._fibers:
            self._fibers[index] = self._fiber(index)
        return self._fibers[index]

    def _fiber(self, index: int) -> IndexArray:
        grid = np.arange(self.setting.profiles, dtype=np.int64).reshape(self.setting.shape)
        own = np.ascontiguousarray(np.moveaxis(grid, index, 0))
        return own.reshape(self.setting.shape[index], -1)

    def beliefs(self, index: int) -> tuple[IntArray, IntArray]:
        """Weights of the others' profiles given one's type, int (T_i, N / T_i), and totals.

        With independent types all rows are the same: the product of the others' weights.
        """
        setting = self.setting
        fiber = self.fiber(index)
        if setting.joint is not None:
            weights = setting.joint.astype(self.dtype)[fiber]
            return weights, weights.sum(axis=1)
        product = np.ones(1, dtype=self.dtype)
        for other, party in enumerate(setting.parties):
            if other != index:
                own = np.array(party.weights, dtype=self.dtype)
                product = np.multiply.outer(product, own).ravel()
        size = fiber.shape[0]
        return (
            np.broadcast_to(product, fiber.shape),
            np.full(size, int(product.sum()), dtype=self.dtype),
        )

    def marginal(self, index: int) -> IntArray:
        """Weights of a party's types, int (T_i,)."""
        return np.array(self.setting.parties[index].weights, dtype=self.dtype)

    def lies(self, index: int) -> tuple[IndexArray, IndexArray]:
        """The lies that a party must not gain by, given its type: (true, told), all of them."""
        true, told = np.nonzero(~np.eye(self.setting.shape[index], dtype=bool))
        return true.astype(np.int64), told.astype(np.int64)

    # -- forms at profiles ---------------------------------------------------------------

    def pays(self, index: int, profiles: IndexArray) -> Affine:
        """t_i at the listed profiles."""
        return of_columns(self.payment_columns(index, profiles), self.dtype)

    def payment_columns(self, index: int, profiles: IndexArray) -> IndexArray:
        """The columns of t_i at the listed profiles, of the same shape."""
        return profiles + index * self.setting.profiles

    def chances(self, profiles: IndexArray) -> tuple[IntArray, IndexArray]:
        """What is settled of the decision, int (R, K) over `chance_den`, and columns or -1."""
        return self.chance[profiles], self.chance_col[profiles]

    def chosen(self, profiles: IndexArray, worth: IntArray, den: int) -> Affine:
        """sum_k x_k(theta_r) * worth[r, k] / den at the listed profiles; worth (R, K) or (K,)."""
        worth = np.broadcast_to(worth, (len(profiles), len(self.setting.options)))
        chance, column = self.chances(profiles)
        row, option = np.nonzero((column >= 0) & (worth != 0))
        return Affine(
            row.astype(np.int64),
            column[row, option],
            worth[row, option] * self.chance_den,
            (chance * worth).sum(axis=1).astype(self.dtype),
            np.full(len(profiles), den * self.chance_den, dtype=self.dtype),
        )

    def worth(self, index: int, true: IndexArray, told: IndexArray) -> Affine:
        """A party's worth at true profiles when the decision follows the told profiles."""
        party = self.setting.parties[index]
        rows = true if party.depends else self.type_at(index, true)
        return self.chosen(told, party.value.astype(self.dtype)[rows], self.setting.grain)

    def pot(self, profiles: IndexArray) -> Affine:
        """sum_i t_i(theta) - sum_k x_k(theta) * outlay(k) at the listed profiles."""
        size, parties = len(profiles), len(self.setting.parties)
        columns = [self.payment_columns(index, profiles) for index in range(parties)]
        outlay = self.chosen(profiles, self.setting.outlay.astype(self.dtype), self.setting.grain)
        paid = Affine(
            np.repeat(np.arange(size, dtype=np.int64), parties),
            np.stack(columns, axis=1).ravel(),
            np.ones(size * parties, dtype=self.dtype),
            np.zeros(size, dtype=self.dtype),
            np.ones(size, dtype=self.dtype),
        )
        return paid - outlay

    # -- forms given one's own type ------------------------------------------------------

    def expected_pay(self, index: int) -> IndexArray:
        """The columns m_i(a) = sum_theta_-i P(theta_-i | a) t_i(a, theta_-i), one per type."""
        if index not in self._expected_pay:
            party = self.setting.parties[index]
            columns = self.add_columns(
                "expected pay", party.size, lambda a: ExpectedPay(party.name, party.types[a].label)
            )
            types = np.arange(party.size, dtype=np.int64)
            form = self._expectation(index, types, types) - of_columns(columns, self.dtype)
            self.require(
                form, "=", "expected pay", lambda a: ExpectedPay(party.name, party.types[a].label)
            )
            self._expected_pay[index] = columns
        return self._expected_pay[index]

    def _expectation(self, index: int, true: IndexArray, told: IndexArray) -> Affine:
        """sum_theta_-i P(theta_-i | true) t_i(told, theta_-i), spelled out."""
        weights, totals = self.beliefs(index)
        chosen = weights[true]
        row, other = np.nonzero(chosen)
        return Affine(
            row.astype(np.int64),
            self.payment_columns(index, self.fiber(index)[told[row], other]),
            chosen[row, other],
            np.zeros(len(true), dtype=self.dtype),
            totals[true],
        )

    def interim_pay(self, index: int, true: IndexArray, told: IndexArray) -> Affine:
        """A party's expected payment given its true type, when it reports another."""
        columns = self.expected_pay(index)
        if self.setting.independent or np.array_equal(true, told):
            return of_columns(columns[told], self.dtype)
        return self._expectation(index, true, told)

    def interim_worth(self, index: int, true: IndexArray, told: IndexArray) -> Affine:
        """A party's expected worth given its true type, when it reports another."""
        party = self.setting.parties[index]
        if self.setting.independent and not party.depends:
            return self._worth_of_chances(index, true, told)
        weights, totals = self.beliefs(index)
        fiber = self.fiber(index)
        forms = self.worth(index, fiber[true].ravel(), fiber[told].ravel())
        return averages(forms, weights[true], totals[true])

    def interim_chance(self, index: int, types: IndexArray, option: int) -> Affine:
        """P(option | the party has the type), one form per listed type."""
        pick = np.zeros(len(self.setting.options), dtype=self.dtype)
        pick[option] = 1
        weights, totals = self.beliefs(index)
        forms = self.chosen(self.fiber(index)[types].ravel(), pick, 1)
        return averages(forms, weights[types], totals[types])

    def _worth_of_chances(self, index: int, true: IndexArray, told: IndexArray) -> Affine:
        """sum_k v_i(k, true) * q_i(k, told), over the columns q_i where they are needed."""
        party, grain = self.setting.parties[index], self.setting.grain
        columns, fixed = self.expected_decision(index)
        value = party.value.astype(self.dtype)[true]
        used = columns[told]
        row, option = np.nonzero((used >= 0) & (value != 0))
        _, totals = self.beliefs(index)
        den = totals[0] * self.chance_den
        constant = np.where(used >= 0, 0, fixed[told] * value).sum(axis=1).astype(self.dtype)
        return Affine(
            row.astype(np.int64),
            used[row, option],
            value[row, option] * den,
            constant,
            np.full(len(true), den * grain, dtype=self.dtype),
        )

    def expected_decision(self, index: int) -> tuple[IndexArray, IntArray]:
        """Columns q_i(k, a) by type and option, -1 where constant, and the constant weights.

        A constant entry stands for fixed / (sum of the others' weights * chance_den).
        """
        if index in self._expected_decision:
            return self._expected_decision[index]
        party, fiber = self.setting.parties[index], self.fiber(index)
        weights, totals = self.beliefs(index)
        shape = (*fiber.shape, len(self.setting.options))
        chance, open_column = (part.reshape(shape) for part in self.chances(fiber.ravel()))
        fixed = (chance * weights[:, :, None]).sum(axis=1).astype(self.dtype)
        open_to = (open_column >= 0).any(axis=1)
        cells = np.argwhere(open_to)
        columns = np.full(open_to.shape, -1, dtype=np.int64)

        def label(j: int) -> Label:
            a, k = (int(part) for part in cells[j])
            return ExpectedDecision(party.name, party.types[a].label, self.setting.options[k])

        if len(cells):
            new = self.add_columns("expected decision", len(cells), label)
            columns[cells[:, 0], cells[:, 1]] = new
            column = open_column[cells[:, 0], :, cells[:, 1]]
            row, other = np.nonzero(column >= 0)
            form = Affine(
                row.astype(np.int64),
                column[row, other],
                weights[0][other] * self.chance_den,
                fixed[cells[:, 0], cells[:, 1]],
                np.full(len(cells), int(totals[0]) * self.chance_den, dtype=self.dtype),
            )
            self.require(form - of_columns(new, self.dtype), "=", "expected decision", label)
        self._expected_decision[index] = columns, fixed
        return columns, fixed

    def interim_utility(self, index: int, true: IndexArray, told: IndexArray) -> Affine:
        """A party's expected utility given its true type, when it reports another."""
        return self.interim_worth(index, true, told) - self.interim_pay(index, true, told)

    def interim_outside(self, index: int) -> Affine:
        """A party's expected outside option given its type, one form per type."""
        party = self.setting.parties[index]
        if not party.outside_depends:
            return constants(party.outside, self.setting.grain, self.dtype)
        weights, totals = self.beliefs(index)
        outside = party.outside.astype(self.dtype)[self.fiber(index)]
        total = (outside * weights).sum(axis=1).astype(self.dtype)
        form = constants(total, 1, self.dtype)
        return Affine(form.row, form.col, form.num, form.const, totals * self.setting.grain)

    def interim_gain(self, index: int) -> Affine:
        """Expected utility of an honest party less its outside option, one form per type."""
        types = np.arange(self.setting.shape[index], dtype=np.int64)
        return self.interim_utility(index, types, types) - self.interim_outside(index)

    # -- forms on average ----------------------------------------------------------------

    def expected_worth(self, index: int) -> Affine:
        """E[sum_k x_k v_i(k)]."""
        return self.worth(index, self.everywhere, self.everywhere).mean(self.weights)

    def expected_utility(self, index: int) -> Affine:
        """E[u_i]."""
        paid = of_columns(self.expected_pay(index), self.dtype).mean(self.marginal(index))
        return self.expected_worth(index) - paid

    def expected_choice(self, worth: IntArray) -> Affine:
        """E[sum_k x_k worth(k)] with worth int (K,) or (N, K) in units of 1/grain."""
        form = self.chosen(self.everywhere, worth.astype(self.dtype), self.setting.grain)
        return form.mean(self.weights)

    def expected_welfare(self) -> Affine:
        """E[sum_k x_k (sum_i v_i(k) + worth(k) - outlay(k))]; worth is the designer's."""
        return self.expected_choice(self.welfare)

    def expected_outside(self, index: int) -> Affine:
        """E[outside_i]."""
        outside = self.outside_at(index, self.everywhere)
        return constants(outside, self.setting.grain, self.dtype).mean(self.weights)

    def expected_pot(self) -> Affine:
        """E[sum_i t_i - sum_k x_k outlay(k)], through the interim payments."""
        form = -self.expected_choice(self.setting.outlay)
        for index in range(len(self.setting.parties)):
            form = form + of_columns(self.expected_pay(index), self.dtype).mean(
                self.marginal(index)
            )
        return form

    # -- allowances: fixed amounts, or unknowns when a goal frees them --------------------

    def free_allowance(self, name: str, lo: Fraction | None, hi: Fraction | None) -> Affine:
        """Make an allowance an unknown column within bounds; before any demand uses it."""
        self._allowances[name] = self.unknown(name, lo, hi)
        return self._allowances[name]

    def freed(self, name: str) -> bool:
        """Whether an allowance is an unknown of this program."""
        return name in self._allowances

    def allowance(self, name: str, amount: Fraction, party: str = "") -> Affine:
        """An allowance as one form: its unknown if freed, else the fixed amount.

        An allowance freed for one party alone is called "name:PARTY".
        """
        for known in (f"{name}:{party}", name):
            if known in self._allowances:
                return self._allowances[known]
        return constants(np.zeros(1, dtype=self.dtype), 1, self.dtype).plus(amount)


def _pays_label(setting: Setting, name: str) -> Callable[[int], Label]:
    return lambda profile: Pays(name, setting.labels_at(profile))


def _decides_label(setting: Setting, at: IndexArray, cells: IndexArray) -> Callable[[int], Label]:
    return lambda j: Decides(
        setting.options[int(cells[j, 1])], setting.labels_at(int(at[cells[j, 0]]))
    )
