"""Bailey's rebate: everyone gets back 1/n of the surplus there would be without her.

    r_i(theta_-i) = (1/n) R_-i(theta_-i)

with R_-i the surplus of the pivotal rule among the other n - 1 parties, each still bearing 1/n
of the outlay. Own reports do not move r_i, so honesty stays dominant; that the rebates together
never exceed the surplus is not promised, and is for the audit to say.

Source: M. J. Bailey (1997), The demand revealing process: to distribute the surplus, Public
Choice 91:107-126 (from memory).
"""

from __future__ import annotations

from fractions import Fraction

from designer.ruling import checks
from designer.ruling.amounts import Amounts, total
from designer.ruling.kinds import Built, Rule
from designer.ruling.profiles import TIES, chosen, first_best, total_worth
from designer.ruling.rebates import pivotal_parts, with_rebates
from designer.ruling.shares import absorbed_others
from designer.setting.setting import Setting


def surplus_without(setting: Setting, welfare: Amounts, party: int) -> Amounts:
    """R_-i(theta_-i), the pivotal payments of the others among themselves: (N,)."""
    alone = absorbed_others(setting, welfare, party)
    choice = first_best(alone)
    found = []
    for j in range(len(setting.parties)):
        if j != party:
            rest = absorbed_others(setting, alone, j)
            found.append(Amounts(rest.num.max(axis=1), rest.den) - chosen(rest, choice))
    return total(found)


def build(setting: Setting) -> Built:
    """Build the pivotal rule over equal shares, less the rebates."""
    n = len(setting.parties)
    choice, paid = pivotal_parts(setting)
    welfare = total_worth(setting)
    rebates = [surplus_without(setting, welfare, i).times(Fraction(1, n)) for i in range(n)]
    return Built(with_rebates(setting, choice, paid, rebates), (TIES,))


RULE = Rule(
    name="bailey-rebate",
    source="Bailey 1997",
    assumes="private worths; two parties or more",
    checks=(checks.tabulated, checks.private, checks.at_least(2)),
    build=build,
)
