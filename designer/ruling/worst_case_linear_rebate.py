"""The linear rebate that leaves the smallest share of the pivotal payments in the worst case.

n parties, m identical units, one to a party, m < n - 1. With v_[j] the j-th highest worth among
the others,

    r_i = sum over j = m+1..n-1 of c_j v_[j],
    c_j = (-1)^(j+m-1) (n-m) C(n-1, m-1) / (j C(n-1, j) S) * sum over l = j..n-1 of C(n-1, l),
    S   = sum over l = m..n-1 of C(n-1, l),

and at every profile at least the share 1 - C(n-1, m)/S of the payments goes back, with never a
deficit; no linear rebate, and no rebate at all that keeps a Groves rule efficient, promises more.

Sources: M. Guo and V. Conitzer (2009), Worst-case optimal redistribution of VCG payments in
multi-unit auctions, Games and Economic Behavior 67:69-98; H. Moulin (2009), Almost
budget-balanced VCG mechanisms to assign multiple objects, Journal of Economic Theory
144:96-119 (formula from memory, held in tests against the published shares).
"""

from __future__ import annotations

from fractions import Fraction
from math import comb

import numpy as np

from designer.ruling import checks
from designer.ruling.amounts import Amounts, total
from designer.ruling.kinds import Built, Refusal, Rule
from designer.ruling.profiles import TIES
from designer.ruling.rebates import pivotal_parts, with_rebates
from designer.ruling.units import alike, bids, recognised
from designer.setting.exact import text
from designer.setting.setting import Setting


def coefficients(n: int, m: int) -> list[Fraction]:
    """c_j for j = m+1..n-1, in that order.

    >>> coefficients(3, 1)
    [Fraction(1, 3)]
    """
    whole = _tail(n, m)
    return [
        Fraction((-1) ** (j + m - 1) * (n - m) * comb(n - 1, m - 1), j * comb(n - 1, j) * whole)
        * _tail(n, j)
        for j in range(m + 1, n)
    ]


def share(n: int, m: int) -> Fraction:
    """The share of the payments that is sure to go back.

    >>> share(4, 1)
    Fraction(4, 7)
    """
    return 1 - Fraction(comb(n - 1, m), _tail(n, m))


def _tail(n: int, first: int) -> int:
    return sum(comb(n - 1, j) for j in range(first, n))


def more_parties(setting: Setting) -> Refusal | None:
    """Check that there are two parties more than units."""
    n, m = len(setting.parties), recognised(setting).count
    if m < n - 1:
        return None
    return Refusal(
        "at least two parties more than units",
        f"{n} for {m}",
        "With fewer nothing can be promised back: use cavallo-rebate.",
    )


def build(setting: Setting) -> Built:
    """Build the pivotal rule less the linear rebates."""
    found = recognised(setting)
    n, m = len(setting.parties), found.count
    choice, paid = pivotal_parts(setting)
    worths, den = bids(setting, found)
    factors = coefficients(n, m)
    rebates = []
    for i in range(n):
        # The others' worths from the highest down: row j - 1 is v_[j].
        ranked = -np.sort(-np.delete(worths, i, axis=0), axis=0)
        rebates.append(
            total(
                [
                    Amounts(ranked[j - 1], den).times(factor)
                    for j, factor in zip(range(m + 1, n), factors, strict=True)
                ]
            )
        )
    note = f"At least {text(share(n, m))} of the pivotal payments goes back in every case."
    return Built(with_rebates(setting, choice, paid, rebates), (TIES, note))


RULE = Rule(
    name="worst-case-linear-rebate",
    source="Moulin 2009, Guo and Conitzer 2009",
    assumes="identical units, one to a party, two parties more than units",
    checks=(checks.tabulated, checks.private, alike, more_parties, checks.pure_transfer),
    build=build,
)
