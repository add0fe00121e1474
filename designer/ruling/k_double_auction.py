"""The k-double auction played at face value: trade if the bids cross, at a price between them.

    price = k v + (1 - k) c with k = 1/2, on the buyer's word v and the seller's word c

Bids are not truths here: both shade, and the audit shows what a lie wins. For uniform worths the
shading has a linear equilibrium, whose truthful counterpart is linear-double-auction; for other
priors none is known in closed form, and second-best takes its place.

Source: K. Chatterjee and W. Samuelson (1983), Bargaining under incomplete information,
Operations Research 31:835-851 (from memory).
"""

from __future__ import annotations

from fractions import Fraction

from designer.ruling import checks
from designer.ruling.amounts import Amounts, stacked
from designer.ruling.deal import a_trade, buyer, nets, recognised
from designer.ruling.kinds import Built, Rule
from designer.ruling.profiles import TIES, certain, efficient
from designer.setting.setting import Setting
from designer.table import Table

COUNTERPART = (
    "Its truthful counterpart is linear-double-auction where worths are uniform on one even "
    "grid; for other priors none is known in closed form."
)


def build(setting: Setting) -> Built:
    """Build trade at the middle of the two reports."""
    found = recognised(setting)
    buys = buyer(found)
    if buys is None:
        raise ValueError("not a trade")
    choice = efficient(setting)
    rows, den = nets(setting, found)
    # The seller's net worth is -c, so that v + c is the difference of the two.
    middle = Amounts(rows[buys], den) - Amounts(rows[1 - buys], den)
    traded = (choice == found.on).astype(int)
    price = Amounts(middle.num * traded, middle.den).times(Fraction(1, 2))
    pays = [price, price.times(-1)] if buys == 0 else [price.times(-1), price]
    return Built(Table(certain(setting, choice), 1, *stacked(pays)), (TIES, COUNTERPART))


RULE = Rule(
    name="k-double-auction",
    source="Chatterjee and Samuelson 1983",
    assumes="a trade between two; bids taken at face value (k = 1/2)",
    checks=(checks.tabulated, checks.private, a_trade),
    build=build,
)
