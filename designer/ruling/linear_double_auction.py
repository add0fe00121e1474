"""The truthful counterpart of the split-the-difference double auction, for uniform worths.

With both worths uniform on [lo, hi], the linear equilibrium of the k = 1/2 double auction is

    buyer bids 2v/3 + lo/4 + hi/12 ,   seller asks 2c/3 + lo/12 + hi/4

so that, asked for worths directly, one trades where v - c >= (hi - lo)/4 at the price
(v + c)/3 + (lo + hi)/6. An even grid is read as the midpoints of equal steps. The source speaks
of the continuum, where this is the second best as well; that the grid's table is honest too,
to the last fraction, is what the audit finds at every size tried. On the grid, second-best does
a little better.

Source: K. Chatterjee and W. Samuelson (1983), Bargaining under incomplete information,
Operations Research 31:835-851 (from memory).
"""

from __future__ import annotations

import itertools
from fractions import Fraction

import numpy as np

from designer.ruling import checks
from designer.ruling.amounts import Amounts, stacked
from designer.ruling.deal import Deal, a_trade, buyer, nets, recognised
from designer.ruling.kinds import Built, Refusal, Rule
from designer.ruling.profiles import certain
from designer.setting.exact import text
from designer.setting.setting import Setting
from designer.table import Table


def _ends(setting: Setting, found: Deal) -> tuple[Fraction, Fraction] | None:
    """(lo, hi) if both worths are uniform on one even grid, else None."""
    seen = set()
    for i, party in enumerate(setting.parties):
        sign = 1 if buyer(found) == i else -1
        levels = sorted(sign * level for level in found.net[i].fractions())
        steps = {high - low for low, high in itertools.pairwise(levels)}
        if len(set(party.weights)) > 1 or len(steps) != 1 or 0 in steps:
            return None
        half = steps.pop() / 2
        seen.add((levels[0] - half, levels[-1] + half))
    return seen.pop() if len(seen) == 1 else None


def even(setting: Setting) -> Refusal | None:
    """Check that both worths are uniform on one even grid."""
    if _ends(setting, recognised(setting)) is not None:
        return None
    return Refusal(
        "both parties' worths equally likely on one even grid",
        "another prior or grid",
        "Use second-best, which takes any prior.",
    )


def build(setting: Setting) -> Built:
    """Build trade across the quarter, at the equilibrium price."""
    found = recognised(setting)
    buys, ends = buyer(found), _ends(setting, found)
    if buys is None or ends is None:
        raise ValueError("not a trade on one even grid")
    low, high = ends
    rows, den = nets(setting, found)
    bought, sold = Amounts(rows[buys], den), Amounts(rows[1 - buys], den)
    gain = bought + sold
    traded = (gain - Amounts.of([(high - low) / 4])).num >= 0
    price = (bought - sold).times(Fraction(1, 3)) + Amounts.of([(low + high) / 6])
    paid = Amounts(price.num * traded.astype(int), price.den)
    pays = [paid, paid.times(-1)] if buys == 0 else [paid.times(-1), paid]
    choice = np.where(traded, found.on, found.off)
    note = f"Trade where the gain is {text((high - low) / 4)} {setting.money} or more."
    return Built(Table(certain(setting, choice), 1, *stacked(pays)), (note,))


RULE = Rule(
    name="linear-double-auction",
    source="Chatterjee and Samuelson 1983",
    assumes="a trade between two, both worths uniform on one even grid",
    checks=(checks.tabulated, checks.private, checks.independent_types, a_trade, even),
    build=build,
)
