"""The outlay absorbed: each party's worth less an equal share of what the decision costs.

With v~_i(k) = v_i(k) - outlay(k)/n the parties' worths carry the whole outlay and the designer
keeps her worth alone. Payments s_i of a rule for the absorbed worths become

    t_i(theta) = s_i(theta) + outlay(k*(theta))/n

for which utilities are the same and the pot is sum_i s_i(theta): what the absorbed rule
balances, the real one balances after the outlay.
"""

from __future__ import annotations

from fractions import Fraction

from designer.ruling.amounts import Amounts
from designer.ruling.profiles import outlay, worth
from designer.setting.setting import Setting


def share(setting: Setting) -> Amounts:
    """Give each party's share of every decision's outlay: (K,)."""
    return outlay(setting).times(Fraction(1, len(setting.parties)))


def absorbed(setting: Setting, party: int) -> Amounts:
    """v~_i(k, theta): (N, K)."""
    return worth(setting, party) - share(setting)


def absorbed_others(setting: Setting, welfare: Amounts, *without: int) -> Amounts:
    """Sum up the absorbed worths of the other parties, and the designer's own: (N, K).

    welfare  total_worth(setting), in which the shares add up to the outlay
    """
    for party in without:
        welfare = welfare - absorbed(setting, party)
    return welfare
