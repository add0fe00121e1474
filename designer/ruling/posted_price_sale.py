"""A posted price for identical units, and the best one: first come, first served, at one price.

    t_i(theta) = p if party i is among the first m whose worth is p or more, else 0

'first' in the order of the scenario's parties. The price with the most expected pot is found by
trying every worth. Truth is dominant and nobody loses by taking part; with one party and one
unit it is the optimal auction, with more it shows what an auction adds to a price.

Source: for one buyer J. Riley and R. Zeckhauser (1983), Optimal selling strategies: when to
haggle, when to hold firm, Quarterly Journal of Economics 98:267-289 (from memory).
"""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np

from designer.ruling import checks
from designer.ruling.amounts import Amounts, stacked
from designer.ruling.kinds import Built, Refusal, Rule
from designer.ruling.profiles import certain, expected
from designer.ruling.units import alike, bids, recognised
from designer.setting.exact import text
from designer.setting.setting import IntArray, Setting
from designer.table import Table


def _takers(setting: Setting, price: Fraction) -> IntArray:
    """Who is served at a price, 0 or 1: (n, N)."""
    found = recognised(setting)
    worths, den = bids(setting, found)
    willing = (Amounts(worths, den) + Amounts.of([-price])).num >= 0
    first: IntArray = willing & (willing.cumsum(axis=0) <= found.count)
    return first.astype(np.int64)


def any_set(setting: Setting) -> Refusal | None:
    """Check that units may stay unsold, whoever wants none."""
    found = recognised(setting)
    small = sum(1 for group in found.serving if len(group) <= found.count)
    n = len(setting.parties)
    wanted = sum(math.comb(n, size) for size in range(found.count + 1))
    if small == wanted:
        return None
    return Refusal(
        "a decision for every set of parties that the units can serve, none among them",
        f"{small} of {wanted}",
        "Add the decisions that leave units unsold.",
    )


def build(setting: Setting) -> Built:
    """Build the sale at the price that fills the pot most."""
    found = recognised(setting)
    prices = sorted({price for worth in found.worth for price in worth.fractions()})
    pots = {
        price: price * expected(setting, Amounts(_takers(setting, price).sum(axis=0)))
        for price in prices
    }
    best = max(prices, key=lambda price: pots[price])
    served = _takers(setting, best)
    codes = (served * (1 << np.arange(len(served)))[:, None]).sum(axis=0)
    option = {sum(1 << i for i in group): k for group, k in found.serving.items()}
    choice = np.array([option[code] for code in codes.tolist()])
    pays = [Amounts(row).times(best) for row in served]
    note = f"The price is {text(best)} {setting.money}; parties are served in their order."
    return Built(Table(certain(setting, choice), 1, *stacked(pays)), (note,))


RULE = Rule(
    name="posted-price-sale",
    source="Riley and Zeckhauser 1983",
    assumes="identical units, one to a party, and a designer who sells them",
    checks=(checks.tabulated, checks.private, alike, any_set, checks.pure_transfer),
    build=build,
)
