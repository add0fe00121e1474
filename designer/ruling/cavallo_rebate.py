"""Cavallo's rebate: everyone gets back 1/n of the surplus that is certain without her word.

    r_i(theta_-i) = (1/n) min over own types a of R(a, theta_-i)

with R(theta) >= 0 the surplus of the pivotal rule over equal cost shares (rebates.py). Own
reports do not move r_i, so honesty stays dominant; r_i <= R/n, so the pot never runs a deficit.

Source: R. Cavallo (2006), Optimal decision-making with minimal waste: strategyproof
redistribution of VCG payments, AAMAS 2006 (from memory). For one item it is 1/n of the second
price among the others.
"""

from __future__ import annotations

from fractions import Fraction

import numpy as np

from designer.ruling import checks
from designer.ruling.amounts import Amounts, total
from designer.ruling.kinds import Built, Rule
from designer.ruling.profiles import TIES, split
from designer.ruling.rebates import pivotal_parts, with_rebates
from designer.setting.setting import Setting


def sure_surplus(setting: Setting, party: int, surplus: Amounts) -> Amounts:
    """Find the least surplus over the party's own types, the others' as they are: (N,)."""
    shaped = surplus.num.reshape(split(setting, party))
    least = np.broadcast_to(shaped.min(axis=1, keepdims=True), shaped.shape)
    return Amounts(least.reshape(-1), surplus.den)


def build(setting: Setting) -> Built:
    """Build the pivotal rule over equal shares, less the rebates."""
    n = len(setting.parties)
    choice, paid = pivotal_parts(setting)
    surplus = total(paid)
    rebates = [sure_surplus(setting, i, surplus).times(Fraction(1, n)) for i in range(n)]
    return Built(with_rebates(setting, choice, paid, rebates), (TIES,))


RULE = Rule(
    name="cavallo-rebate",
    source="Cavallo 2006",
    assumes="private worths; two parties or more",
    checks=(checks.tabulated, checks.private, checks.at_least(2)),
    build=build,
)
