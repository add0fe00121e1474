"""Where averages decide: a draft without a payment per profile.

With independent types, Bayesian honesty and at most interim participation, payments enter the
demands only through what a party of each type pays on average, m_i(a). The pot can then be
balanced in every case exactly when it can be on average: with D(theta) what the m_i(theta_i)
leave open at a profile and D_j(theta_j) = E[D | theta_j], E[D] = 0,

    t_i(theta) = m_i(theta_i) + (D(theta) - sum_j D_j(theta_j)) / n
                 + sum_{j != i} D_j(theta_j) / (n - 1)

balances every profile and keeps every average (Borgers & Norman 2009, Economic Theory
39:477-489; n = 1 apart, convention 9). So the m_i(a) become free columns, and balance in
every case is asked on average.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from fractions import Fraction

from designer.demands.terms import Terms
from designer.program.draft import Draft
from designer.program.labels import ExpectedPay, Label
from designer.program.linear import IndexArray
from designer.roads.product import as_independent
from designer.setting.setting import Limits, Setting


class AverageDraft(Draft):
    """Columns m_i(a) in the place of t_i(theta); decisions stay profile by profile."""

    def add_columns(
        self,
        family: str,
        count: int,
        label: Callable[[int], Label],
        lo: Fraction | None = None,
        hi: Fraction | None = None,
    ) -> IndexArray:
        """As `Draft.add_columns`, but no column for a payment at a profile."""
        return super().add_columns(family, 0 if family == "pays" else count, label, lo, hi)

    def expected_pay(self, index: int) -> IndexArray:
        """The columns m_i(a), tied to nothing."""
        if index not in self._expected_pay:
            party = self.setting.parties[index]
            self._expected_pay[index] = self.add_columns(
                "expected pay", party.size, lambda a: ExpectedPay(party.name, party.types[a].label)
            )
        return self._expected_pay[index]


def on_average(setting: Setting, terms: Terms) -> tuple[Setting, Terms] | None:
    """The same question asked on average, or None where single profiles matter."""
    if terms.ic == "dominant" or terms.ir == "ex-post":
        return None
    if terms.limits != Limits() or terms.even_handed:
        return None
    if len(setting.parties) == 1 and terms.balance == "ex-post":
        return None
    own = as_independent(setting)
    if own is None:
        return None
    balance = "none" if terms.balance == "none" else "ex-ante"
    return own, replace(terms, balance=balance)
