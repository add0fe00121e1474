"""A posted price for a deal, and the best one: everyone says yes or no to a price of her own.

    t_i(theta) = p_i if d_j(theta_j) >= p_j for every party j, else nothing;  sum_i p_i = outlay

d_i is the net worth of the deal. In trade between two the buyer's price is p and the seller's
-p. Truth is dominant, nobody loses by taking part and the pot is 0 in every case. The prices
with the most expected worth are found by search: moving a price up to the lowest worth that
still accepts, and another's down by as much, loses nothing, so that all but one of the prices
may be taken from the parties' own worths. Prices are best for a designer who does not care; with
a worth of hers they are the best of those searched. Indifferent parties agree.

Source: K. M. Hagerty and W. P. Rogerson (1987), Robust trading mechanisms, Journal of Economic
Theory 42:94-107 (first page looked up): for trade on a continuum, posted prices and lotteries
over them are all that honesty in dominant strategies, participation and balance in every case
leave. On a coarse grid of types a little more may be possible; `designer pose` tells.
"""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np

from designer.ruling import checks
from designer.ruling.amounts import Amounts, total
from designer.ruling.deal import Deal, a_deal, nets, priced, recognised
from designer.ruling.kinds import Built, Refusal, Rule
from designer.setting.exact import text
from designer.setting.setting import IntArray, Setting
from designer.table import held, largest

MOST_PARTIES = 30
"""numpy holds no more than 64 axes."""


def few_parties(setting: Setting) -> Refusal | None:
    """Check that a search over everyone's prices is possible."""
    if len(setting.parties) <= MOST_PARTIES:
        return None
    return Refusal(
        f"{MOST_PARTIES} parties at most",
        str(len(setting.parties)),
        "Use equal-shares-with-unanimity, whose prices need no search.",
    )


def best_prices(setting: Setting, found: Deal) -> list[Fraction]:
    """Find prices that add up to the outlay and yield the most expected worth."""
    den = math.lcm(found.cost.denominator, *(net.den for net in found.net))
    cost = int(found.cost * den)
    bound = max(largest(net.num) for net in found.net) * den * len(found.net) + abs(cost)
    levels = [np.sort(held(net.num, bound) * (den // net.den)) for net in found.net]
    gains = _gains_from(setting, found)
    best: tuple[int, list[int]] | None = None
    n = len(levels)
    for rest in range(n):
        # Everyone else's price at one of her own worths; party `rest` bears what is missing.
        others = [i for i in range(n) if i != rest]
        ranks = [np.unique(levels[i], return_index=True)[1] for i in others]
        grids = np.meshgrid(*ranks, indexing="ij") if others else []
        missing: IntArray = np.full(grids[0].shape if grids else (), cost, dtype=levels[0].dtype)
        for i, grid in zip(others, grids, strict=True):
            missing = missing - levels[i][grid]
        accepts = np.searchsorted(levels[rest], missing.ravel()).reshape(missing.shape)
        index: list[IntArray] = list(grids)
        index.insert(rest, np.minimum(accepts, len(levels[rest]) - 1))
        value = np.where(accepts < len(levels[rest]), gains[tuple(index)], 0)
        at = np.unravel_index(int(value.argmax()), value.shape) if others else ()
        if best is None or int(value[at]) > best[0]:
            prices = [int(levels[i][grid[at]]) for i, grid in zip(others, grids, strict=True)]
            prices.insert(rest, int(missing[at]))
            best = (int(value[at]), prices)
    if best is None:
        raise AssertionError("a deal has parties")
    worth, prices = best
    if worth < 0 and n > 1:
        # The designer's own worth speaks against every price: ask one more than anyone gives.
        prices = [int(levels[0][-1]) + den, *[0] * (n - 1)]
        prices[1] = cost - prices[0]
    return [Fraction(price, den) for price in prices]


def _gains_from(setting: Setting, found: Deal) -> IntArray:
    """Sum up, for each rank of acceptance, the expected worth of the deal.

    Entry (a_1, ..., a_n) is proportional to the worth when party i accepts from its a_i-th
    lowest net worth on. Shape (T_1, ..., T_n).
    """
    rows, den = nets(setting, found)
    change = Amounts(setting.worth[[found.on]] - setting.worth[[found.off]], setting.grain)
    gain = total([Amounts(row, den) for row in rows]) + change + Amounts.of([-found.cost])
    bound = (largest(gain.num) + 1) * setting.total_weight
    sums: IntArray = (held(gain.num, bound) * held(setting.weights, bound)).reshape(setting.shape)
    for i, net in enumerate(found.net):
        rising = np.argsort(net.num, kind="stable")
        sums = np.flip(np.flip(sums.take(rising, axis=i), axis=i).cumsum(axis=i), axis=i)
    return sums


def build(setting: Setting) -> Built:
    """Build the deal at the best prices."""
    found = recognised(setting)
    prices = best_prices(setting, found)
    posted = ", ".join(
        f"{party.name} {text(price)}" for party, price in zip(setting.parties, prices, strict=True)
    )
    return Built(priced(setting, found, prices), (f"Prices of the deal: {posted}.",))


RULE = Rule(
    name="posted-price",
    source="Hagerty and Rogerson 1987",
    assumes="private worths; a deal or nothing",
    checks=(checks.tabulated, checks.private, a_deal, few_parties),
    build=build,
)
