"""A draft in a handful of columns: what each party pays on average, and what the rule fixes.

Every demand and goal on expectations can be written in E[t_i]; honesty and participation
become one row per party, E[t_i] <= the most that its type graphs admit. Where tied profiles
leave the rule a choice, the expectations that the rule fixes are columns as well, so that
their multipliers tell what another choice would be worth.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from fractions import Fraction

import numpy as np

from designer.demands.formulate import Formulation, amounts_of
from designer.demands.terms import Terms
from designer.program.affine import Affine, constants, of_columns
from designer.program.draft import Draft
from designer.program.labels import AtMost, OnAverage
from designer.program.linear import IndexArray
from designer.program.program import Program
from designer.roads.typegraph.fibers import Fibers
from designer.setting.setting import IntArray, Setting


@dataclass(frozen=True)
class Figures:
    """Expectations under the settled rule, in money.

    most    per party the most it can pay on average, None: no bound
    worth   per party E[worth]       outlay, designer  E[outlay], E[the designer's worth]
    tied    whether some profile is tied
    """

    most: tuple[Fraction | None, ...]
    worth: tuple[Fraction, ...]
    outlay: Fraction
    designer: Fraction
    tied: bool


class TotalsDraft(Draft):
    """Columns E[t_i]; with ties also E[worth_i], E[outlay] and E[the designer's worth]."""

    def __init__(self, setting: Setting, terms: Terms, figures: Figures) -> None:
        """Write the rows that the type graphs and the rule give."""
        self.figures = figures
        super().__init__(setting, terms.decision, amounts_of(terms))

    def _lay_out(self) -> None:
        self.dtype = np.dtype(object)
        figures, parties = self.figures, self.setting.parties
        names = [party.name for party in parties]
        self.totals = self.add_columns(
            "pays on average", len(names), lambda j: OnAverage("pays", names[j])
        )
        labels = [OnAverage("worth", name) for name in names]
        labels += [OnAverage("outlay"), OnAverage("designer's worth")]
        amounts = [*figures.worth, figures.outlay, figures.designer]
        self._fixed = [self._constant(amount) for amount in amounts]
        if figures.tied:
            columns = self.add_columns("fixed by the rule", len(labels), lambda j: labels[j])
            forms = of_columns(columns, self.dtype)
            self.require(forms - self._constants(amounts), "=", "rule", lambda j: labels[j])
            self._fixed = [of_columns(columns[j : j + 1], self.dtype) for j in range(len(labels))]
        bounded = [i for i, most in enumerate(figures.most) if most is not None]
        most = self._constants([m for m in figures.most if m is not None])
        paid = of_columns(self.totals[bounded], self.dtype)
        self.require(most - paid, ">=", "at most", lambda j: AtMost(names[bounded[j]]))

    def _constants(self, amounts: list[Fraction]) -> Affine:
        tops = np.array([amount.numerator for amount in amounts], dtype=object)
        form = constants(tops, 1, self.dtype)
        dens = np.array([amount.denominator for amount in amounts], dtype=object)
        return replace(form, den=dens)

    def _constant(self, amount: Fraction) -> Affine:
        return self._constants([amount])

    def expected_pay(self, index: int) -> IndexArray:
        """E[t_i] has no types left."""
        raise NotImplementedError("payments by type are not part of this draft")

    def expected_worth(self, index: int) -> Affine:
        """E[worth_i]."""
        return self._fixed[index]

    def expected_utility(self, index: int) -> Affine:
        """E[worth_i] - E[t_i]."""
        return self._fixed[index] - of_columns(self.totals[index : index + 1], self.dtype)

    def expected_choice(self, worth: IntArray) -> Affine:
        """E[outlay] or E[the designer's worth], the only ones that demands and goals ask for."""
        if worth is self.setting.outlay:
            return self._fixed[-2]
        if worth is self.setting.worth:
            return self._fixed[-1]
        raise NotImplementedError("an expectation that the rule's figures do not hold")

    def expected_welfare(self) -> Affine:
        """E[sum_i worth_i] + E[the designer's worth] - E[outlay]."""
        form = self._fixed[-1] - self._fixed[-2]
        for index in range(len(self.setting.parties)):
            form = form + self._fixed[index]
        return form

    def expected_pot(self) -> Affine:
        """sum_i E[t_i] - E[outlay]."""
        paid = of_columns(self.totals, self.dtype)
        ones = np.zeros(len(self.totals), dtype=np.int64)
        total = Affine(
            ones,
            paid.col,
            paid.num,
            np.zeros(1, dtype=self.dtype),
            np.ones(1, dtype=self.dtype),
        )
        return total - self._fixed[-2]


def totals_program(setting: Setting, terms: Terms, figures: Figures) -> Program:
    """The program of the only goal over the parties' average payments."""
    balance = "ex-ante" if terms.balance == "ex-ante" else "none"
    inner = replace(terms, ic="none", ir="none", balance=balance, tidy="none")
    draft = TotalsDraft(setting, inner, figures)
    return Formulation(setting, inner, draft=draft).pose(terms.goals[0])


def spending(setting: Setting, work: Fibers) -> tuple[Fraction, Fraction]:
    """E[outlay] and E[the designer's worth], in money."""
    palette = work.decided.palette.astype(object)
    found = []
    for worth in (setting.outlay, setting.worth):
        each = palette @ worth.astype(object)
        total = 0
        if any(each):
            for start, lengths in work.blocks():
                rows = work.rows[start : start + len(lengths.room)]
                total += int((lengths.sinks.astype(object) * each[rows]).sum())
        found.append(Fraction(total, work.decided.den * setting.grain * work.total))
    return found[0], found[1]
