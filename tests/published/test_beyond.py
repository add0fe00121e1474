"""Published closed forms at sizes that the program over all profiles can't reach.

'Looked up' and 'from memory' say how the source was confirmed, as in the corpus. Every value
is proved for the full program, too: the reduced proof is rebuilt from the setting.
"""

from __future__ import annotations

from fractions import Fraction
from math import comb

import pytest

from designer import Demands, pose
from designer.proof.document import as_bytes, parse_document
from designer.proof.recheck import recheck
from designer.rebuilding import rebuild
from tests.published.corpus import as_setting, entries
from tests.published.families import Data, agent, even, market, midpoints, one_item, trade


def value_of(data: Data, demands: Demands) -> Fraction:
    """The proved value, by the interim road, after the saved proof was held to the setting."""
    setting = as_setting(data)
    verdict = pose(setting, demands, path="interim")
    assert (verdict.status, verdict.proved, verdict.reason) == ("possible", True, "")
    document = parse_document(as_bytes(verdict.proof))
    assert recheck(document).holds
    assert isinstance(document, dict)
    assert rebuild(setting, document) == []
    assert verdict.goal_value is not None
    return verdict.goal_value


POT = Demands(balance="none", goal="revenue", tidy="none")
"""Efficient, Bayesian, interim participation: the most the pot can hold."""
RENT = Demands(decision="randomized", balance="none", goal="revenue", tidy="none")
SECOND = Demands(
    decision="randomized", balance="ex-ante", budget="no-deficit", goal="welfare", tidy="none"
)


@pytest.mark.parametrize("size", [200, 1000])
def test_efficient_trade_between_a_thousand_types(size: int) -> None:
    """B01: (K-1)(5-K)/(6K^2); Myerson & Satterthwaite 1983 (looked up; grid form re-derived)."""
    assert value_of(trade(midpoints(size)), POT) == Fraction((size - 1) * (5 - size), 6 * size**2)


@pytest.mark.parametrize("tag", [item["tag"] for item in entries()["B03"]["beyond"]])
def test_second_best_trade(tag: str) -> None:
    """B03: stored closed forms; Myerson & Satterthwaite 1983 (from memory, re-derived)."""
    (stored,) = [item["value"] for item in entries()["B03"]["beyond"] if item["tag"] == tag]
    size = int(tag.removeprefix("mid"))
    assert value_of(trade(midpoints(size)), SECOND) == Fraction(stored)


def largest_virtual_worth(bidders: int, size: int) -> Fraction:
    """E max(0, max_i phi), phi_k = v_k - (v_(k+1) - v_k)(1 - F_k)/f_k on midpoints."""
    total = Fraction(0)
    for k in range(1, size + 1):
        chance = Fraction(k**bidders - (k - 1) ** bidders, size**bidders)
        total += chance * max(Fraction(0), Fraction(2 * k - 1, 2 * size) - Fraction(size - k, size))
    return total


@pytest.mark.parametrize(("bidders", "size"), [(2, 100), (2, 400), (6, 20), (30, 20)])
def test_largest_revenue_from_one_item(bidders: int, size: int) -> None:
    """U01: Myerson 1981 (bibliography looked up; numbers re-derived)."""
    stored = {item["tag"]: item["value"] for item in entries()["U01"]["beyond"]}
    value = value_of(one_item([midpoints(size)] * bidders), RENT)
    assert value == largest_virtual_worth(bidders, size)
    if (bidders, size) == (2, 100):
        assert value == Fraction(stored["n2_mid100"])


@pytest.mark.parametrize("size", [50, 200])
def test_largest_revenue_of_an_efficient_sale(size: int) -> None:
    """U06: (2K-1)(K+2)/(6K^2); Krishna & Perry 1998 (looked up; grid form re-derived)."""
    data = one_item([midpoints(size)] * 2)
    for party in data["agents"]:
        party["values"] = [row[1:] for row in party["values"]]
    data["decisions"] = data["decisions"][1:]  # always sold
    assert value_of(data, POT) == Fraction((2 * size - 1) * (size + 2), 6 * size**2)


def knapsack(count: int, cost: Fraction) -> tuple[Fraction, Fraction]:
    """G01: second-best welfare and probability of provision with values 0 or 1, even odds.

    With j high types: weight C(n,j)/2^n, gain j - cn, budget 2j - n - cn; filled by budget.
    """
    welfare = chance = budget = Fraction(0)
    for j in range(count, -1, -1):
        weight, gain = Fraction(comb(count, j), 2**count), j - cost * count
        each = 2 * j - count - cost * count
        if gain <= 0:
            break
        part = Fraction(1)
        if budget + weight * each < 0:
            part = budget / (-weight * each)
        welfare, chance = welfare + part * weight * gain, chance + part * weight
        budget += part * weight * each
        if part < 1:
            break
    return welfare, chance


@pytest.mark.parametrize("count", [6, 20, 50, 100])
def test_public_goods_among_many(count: int) -> None:
    """G01: Mailath & Postlewaite 1990, Rob 1989 (from memory): provision dies out."""
    cost = Fraction(2, 5)
    grid = [Fraction(0), Fraction(1)]
    data: Data = {
        "agents": [agent(grid, [0, 1], even(2)) for _ in range(count)],
        "decisions": ["no", "yes"],
        "decision_cost": ["0", str(cost * count)],
    }
    setting_value = value_of(data, SECOND)
    assert setting_value == knapsack(count, cost)[0]
    # The source's limit: the probability of provision tends to 0.
    assert knapsack(count, cost)[1] < Fraction(1, 2) ** (count // 10)


def efficient_market(buyers: int, size: int) -> Fraction:
    """M01: virtual worth of the best buyer less virtual cost, where she is worth more."""
    total = Fraction(0)
    for j in range(1, size + 1):
        chance = Fraction(j**buyers - (j - 1) ** buyers, size**buyers)
        worth = Fraction(2 * j - 1, 2 * size) - Fraction(size - j, size)
        for i in range(1, j):
            cost = Fraction(2 * i - 1, 2 * size) + Fraction(i - 1, size)
            total += chance / size * (worth - cost)
    return total


@pytest.mark.parametrize(("buyers", "size"), [(4, 12), (20, 10), (50, 8)])
def test_one_seller_and_many_buyers(buyers: int, size: int) -> None:
    """M01: Williams 1999 (from memory), Krishna & Perry 1998 (looked up); grid form re-derived."""
    for item in entries()["M01"]["beyond"]:
        count, points = (int(part.strip("nmid")) for part in item["tag"].split("_"))
        assert efficient_market(count, points) == Fraction(item["value"])
    assert value_of(market(buyers, midpoints(size)), POT) == efficient_market(buyers, size)
