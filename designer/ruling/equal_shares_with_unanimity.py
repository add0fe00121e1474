"""Equal shares with unanimity: the deal is done if everyone wants it at 1/n of its outlay.

    t_i(theta) = outlay/n if d_j(theta_j) >= outlay/n for every party j, and nothing is done and
    paid otherwise.

Truth is dominant, nobody loses by taking part, the pot is 0 in every case; what it gives up is
every deal that is worth its cost in sum but not to each. Indifferent parties agree.

Source: the unanimity rule of H. R. Bowen (1943), The interpretation of voting in the allocation
of economic resources, Quarterly Journal of Economics 58:27-48, for the share; H. Moulin (1994),
Serial cost-sharing of excludable public goods, Review of Economic Studies 61:305-325, for its
honesty (both from memory).
"""

from __future__ import annotations

from designer.ruling import checks
from designer.ruling.deal import a_deal, priced, recognised
from designer.ruling.kinds import Built, Rule
from designer.setting.exact import text
from designer.setting.setting import Setting


def build(setting: Setting) -> Built:
    """Build the unanimous deal at equal shares."""
    found = recognised(setting)
    price = found.cost / len(setting.parties)
    return Built(
        priced(setting, found, [price] * len(setting.parties)),
        (f"Each party's share of the outlay is {text(price)} {setting.money}.",),
    )


RULE = Rule(
    name="equal-shares-with-unanimity",
    source="Bowen 1943, Moulin 1994",
    assumes="private worths; a deal with an outlay, or nothing",
    checks=(checks.tabulated, checks.private, checks.some_outlay, a_deal),
    build=build,
)
