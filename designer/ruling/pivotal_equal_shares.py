"""The pivotal rule over equal cost shares: the outlay is covered in every case.

    t_i(theta) = outlay(k*)/n + max over k of W~_-i(k) - W~_-i(k*(theta))

with W~_-i the sum of the others' worths net of their equal shares (see shares.py). Each term
after the share is at least 0, so the pot never runs a deficit; what a party may lose by taking
part is her share of a decision she does not want.

Source: E. H. Clarke (1971), Public Choice 11:17-33; T. N. Tideman and G. Tullock (1976), A new
and superior process for making social choices, Journal of Political Economy 84:1145-1159
(both from memory).
"""

from __future__ import annotations

from designer.ruling import checks
from designer.ruling.amounts import Amounts, stacked
from designer.ruling.kinds import Built, Rule
from designer.ruling.profiles import TIES, certain, chosen, efficient, total_worth
from designer.ruling.shares import absorbed_others, share
from designer.setting.setting import IntArray, Setting
from designer.table import Table


def taxes(setting: Setting, choice: IntArray) -> list[Amounts]:
    """What each pays above her share of the outlay, at least 0: (N,) each."""
    welfare, found = total_worth(setting), []
    for i in range(len(setting.parties)):
        rest = absorbed_others(setting, welfare, i)
        found.append(Amounts(rest.num.max(axis=1), rest.den) - chosen(rest, choice))
    return found


def build(setting: Setting) -> Built:
    """Build the shares and, on top, the pivotal payments of the absorbed worths."""
    choice = efficient(setting)
    due = chosen(share(setting), choice)
    pays = [due + tax for tax in taxes(setting, choice)]
    return Built(Table(certain(setting, choice), 1, *stacked(pays)), (TIES,))


RULE = Rule(
    name="pivotal-equal-shares",
    source="Clarke 1971, Tideman and Tullock 1976",
    assumes="private worths; everyone bears an equal share of the outlay",
    checks=(checks.tabulated, checks.private),
    build=build,
)
