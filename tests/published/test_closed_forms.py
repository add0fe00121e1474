"""Published closed forms at sizes that the corpus does not list, and the claims it cannot pose.

'Looked up' and 'from memory' say how the source was confirmed, as in the corpus.
"""

from __future__ import annotations

import itertools
from collections import Counter
from fractions import Fraction
from math import comb

import pytest

from designer import Demands, pose
from designer.proof.recheck import recheck
from designer.verdict import Verdict
from tests.published.corpus import as_setting, entries
from tests.published.families import (
    Data,
    even,
    exchange,
    market,
    midpoints,
    one_item,
    partnership,
    project,
    qualities,
    trade,
)

BEST = Demands(balance="none", goal="revenue", tidy="none")
SECOND_BEST = Demands(decision="randomized", balance="ex-post", goal="welfare", tidy="none")
PRICED = Demands(
    decision="randomized",
    ic="dominant",
    ir="ex-post",
    balance="ex-post",
    goal="welfare",
    tidy="none",
)


def settle(data: Data, demands: Demands, path: str | None = None) -> Verdict:
    """Pose, insisting on a proof that the independent checker accepts."""
    verdict = pose(as_setting(data), demands, path=path)
    assert verdict.proved, verdict.reason
    assert recheck(verdict.proof).holds
    return verdict


def stored(entry: str) -> dict[str, Fraction]:
    """The values of an entry that are no plain queries, by tag."""
    return {item["tag"]: Fraction(item["value"]) for item in entries()[entry]["beyond"]}


# -- a knapsack that several entries share: fill from the most worthy, break where money ends


def knapsack(items: list[tuple[Fraction, Fraction, Fraction]]) -> tuple[Fraction, Fraction]:
    """The most gain, and the weight it takes, of (weight, gain, budget) filled in this order."""
    gain, budget, filled = Fraction(0), Fraction(0), Fraction(0)
    for weight, worth, each in items:
        part = Fraction(1)
        if budget + weight * each < 0:
            part = budget / (-weight * each)
        gain += part * weight * worth
        budget += part * weight * each
        filled += part * weight
        if part < 1:
            break
    return gain, filled


def several_traders(buyers: int, sellers: int, size: int) -> Fraction:
    """Entry M03: the j-th highest buyer meets the j-th lowest seller; budget (2d-K+1)/K each.

    A trade across a difference of d grid steps gains d/K; it is less and less of a burden as d
    grows, so that trades are filled from the largest d.
    """
    meetings: Counter[int] = Counter()
    for types in itertools.product(range(size), repeat=buyers + sellers):
        high = sorted(types[:buyers], reverse=True)
        low = sorted(types[buyers:])
        meetings.update(b - s for b, s in zip(high, low, strict=False))
    everyone = size ** (buyers + sellers)
    return knapsack(
        [
            (Fraction(meetings[d], everyone), Fraction(d, size), Fraction(2 * d - size + 1, size))
            for d in range(size - 1, 0, -1)
        ]
    )[0]


# -- Gresik and Satterthwaite 1989, JET 48:304-332 (from memory): entry M03


def test_the_knapsack_gives_every_stored_second_best_of_several_traders() -> None:
    for tag, value in stored("M03").items():
        assert several_traders(2, 2, int(tag.removeprefix("2x2_mid"))) == value, tag
    for query in entries()["M03"]["queries"]:
        size = int(query["tag"].removeprefix("2x1_mid"))
        assert several_traders(2, 1, size) == Fraction(query["value"])
    assert several_traders(2, 1, 10) == Fraction(837, 3500)


@pytest.mark.parametrize("size", [5, 9, 10])
def test_second_best_of_two_buyers_and_a_seller(size: int) -> None:
    verdict = settle(market(2, midpoints(size)), SECOND_BEST, "full")
    assert verdict.goal_value == several_traders(2, 1, size)


@pytest.mark.parametrize("size", [3, 5, 6])
def test_second_best_of_two_buyers_and_two_sellers(size: int) -> None:
    verdict = settle(exchange(2, 2, midpoints(size)), SECOND_BEST, "full")
    assert verdict.goal_value == several_traders(2, 2, size)


@pytest.mark.parametrize("size", [6, 8, 12, 16])
def test_the_same_in_interim_quantities(size: int) -> None:
    """Every stored size, up to 65,536 profiles; on the plain program twelve points take 50 s."""
    verdict = settle(exchange(2, 2, midpoints(size)), SECOND_BEST, "interim")
    assert verdict.goal_value == several_traders(2, 2, size)


# -- Mailath and Postlewaite 1990, RES 57:351-367 (from memory): entry G01


def provision(parties: int, share: Fraction) -> tuple[Fraction, Fraction]:
    """Second-best welfare and chance of a project, over the number j of those who want it."""
    cost = share * parties
    return knapsack(
        [
            (Fraction(comb(parties, j), 2**parties), j - cost, 2 * j - parties - cost)
            for j in range(parties, -1, -1)
            if j > cost
        ]
    )


def test_the_knapsack_gives_every_stored_chance_of_provision() -> None:
    """100 parties included: the chance vanishes as the parties grow."""
    assert len(stored("G01")) == 8
    for tag, value in stored("G01").items():
        share, parties, _ = tag.split("_")
        head = Fraction(*(int(part) for part in share.removeprefix("c").split("over")))
        assert provision(int(parties.removeprefix("n")), head)[1] == value, tag
    for query in entries()["G01"]["queries"]:
        if query["demands"]["goal"] == "welfare":
            share, parties = query["tag"].split("_")
            head = Fraction(*(int(part) for part in share.removeprefix("c").split("over")))
            welfare = provision(int(parties.removeprefix("n")), head)[0]
            assert welfare == Fraction(query["value"]), query["tag"]


@pytest.mark.parametrize("parties", [7, 8, 10])
@pytest.mark.parametrize("share", [Fraction(1, 4), Fraction(2, 5)])
def test_second_best_provision(parties: int, share: Fraction) -> None:
    """Welfare as posed, and the chance of the project in the very table that attains it."""
    verdict = settle(project(parties, share), SECOND_BEST, "full")
    welfare, chance = provision(parties, share)
    assert verdict.goal_value == welfare
    table, setting = verdict.table, verdict.setting
    assert table is not None
    built = sum(
        (
            setting.probability(p) * Fraction(int(table.decides[p, 1]), table.decides_den)
            for p in range(setting.profiles)
        ),
        Fraction(0),
    )
    assert built == chance


@pytest.mark.parametrize("tag", stored("G01"))
def test_second_best_provision_among_many(tag: str) -> None:
    """Up to 2**100 profiles in interim quantities; a balanced pot's payments tell the chance."""
    share = Fraction(1, 4) if "1over4" in tag else Fraction(2, 5)
    parties = int(tag.split("_")[1].removeprefix("n"))
    verdict = settle(project(parties, share), SECOND_BEST, "interim")
    assert verdict.goal_value == provision(parties, share)[0]
    paid = sum((s.probability * s.pays for s in verdict.standings), Fraction(0))
    assert paid / (parties * share) == stored("G01")[tag]


# -- bilateral trade: sources as in entries B02, B05, B09 and B12


@pytest.mark.parametrize("size", [5, 7, 10])
def test_trading_at_ties_costs_the_whole_gain(size: int) -> None:
    """Entry B02, Myerson and Satterthwaite 1983 on a grid: -(K^2-1)/(6K^2)."""
    data = trade(midpoints(size))
    data["given_rule"] = [int(v >= c) for v in range(size) for c in range(size)]
    verdict = settle(data, Demands(decision="table", balance="none", goal="revenue"))
    assert verdict.goal_value == -Fraction(size**2 - 1, 6 * size**2)


@pytest.mark.parametrize("size", [7, 9, 12])
def test_dominant_balanced_trade_is_a_posted_price(size: int) -> None:
    """Entry B05, Hagerty and Rogerson 1987, JET 42:94-107 (first page looked up)."""
    best = Fraction((size + 2) * (size - 1), 8 * size**2)
    if size % 2:
        best = Fraction((size + 1) ** 2 * (size - 1), 8 * size**3)
    assert settle(trade(midpoints(size)), PRICED).goal_value == best


@pytest.mark.parametrize("size", [5, 7, 10])
def test_participation_before_types_are_known_costs_nothing(size: int) -> None:
    """Entry B09, d'Aspremont and Gerard-Varet 1979: the first best, (K^2-1)/(6K^2)."""
    demands = Demands(
        decision="randomized", ir="ex-ante", balance="ex-post", goal="welfare", tidy="none"
    )
    value = settle(trade(midpoints(size)), demands).goal_value
    assert value == Fraction(size**2 - 1, 6 * size**2)


@pytest.mark.parametrize("size", [5, 7])
def test_dominant_trade_is_as_good_when_balance_is_on_average(size: int) -> None:
    """Entry B12, Gershkov et al. 2013, Econometrica 81:197-220 (abstract looked up)."""
    demands = Demands(
        decision="randomized",
        ic="dominant",
        ir="ex-post",
        balance="ex-ante",
        budget="no-deficit",
        goal="welfare",
        tidy="none",
    )
    assert settle(trade(midpoints(size)), demands).goal_value == several_traders(1, 1, size)


# -- one item: sources as in entries U01, U05, U06, D06


@pytest.mark.parametrize("size", [6, 10, 32, 64])
def test_one_bidder_is_worth_a_quarter_and_a_little(size: int) -> None:
    """Entry U01, Myerson 1981: 1/4 + 1/(4K) for even K."""
    demands = Demands(decision="randomized", balance="none", goal="revenue", tidy="none")
    value = settle(one_item([midpoints(size)]), demands).goal_value
    assert value == Fraction(1, 4) + Fraction(1, 4 * size)


@pytest.mark.parametrize("size", [6, 7, 12])
@pytest.mark.parametrize(("ic", "ir"), [("bayesian", "interim"), ("dominant", "ex-post")])
def test_most_revenue_of_an_efficient_auction(size: int, ic: str, ir: str) -> None:
    """Entries U05 and U06: two bidders, always sold: (2K-1)(K+2)/(6K^2)."""
    data = one_item([midpoints(size)] * 2)
    # Always sold: the option of keeping the item is left out.
    for party in data["agents"]:
        party["values"] = [row[1:] for row in party["values"]]
    data["decisions"] = data["decisions"][1:]
    demands = Demands(ic=ic, ir=ir, balance="none", goal="revenue", tidy="none")
    value = settle(data, demands).goal_value
    assert value == Fraction((2 * size - 1) * (size + 2), 6 * size**2)
    # One more bidder beats the best reserve (Bulow and Klemperer 1996, AER 86:180-194).
    assert value > Fraction(1, 4) + Fraction(1, 4 * size) - Fraction(size % 2, 4 * size**2)


# -- Mussa and Rosen 1978, JET 18:301-317; Maskin and Riley 1984 (from memory): entry S01


@pytest.mark.parametrize("size", [3, 6, 7, 12])
def test_qualities_of_a_monopolist(size: int) -> None:
    """Entry S01: the best quality of type k is max(0, phi_k), worth sum (1/K) max(0, phi_k)^2/2."""
    grid = midpoints(size)
    virtual = [v - Fraction(size - k, size) for k, v in enumerate(grid, start=1)]
    offered = sorted({max(Fraction(0), phi) for phi in virtual} | {Fraction(0)})
    demands = Demands(decision="randomized", balance="none", goal="revenue", tidy="none")
    value = settle(qualities(grid, even(size), offered), demands).goal_value
    assert value == sum(q * q / (2 * size) for q in (max(Fraction(0), phi) for phi in virtual))


# -- Cramton, Gibbons and Klemperer 1987, Econometrica 55:615-632 (abstract looked up): entry P01


@pytest.mark.parametrize("size", [5, 6, 8, 10, 12, 16, 20, 24, 32])
def test_the_largest_share_that_dissolves(size: int) -> None:
    """Not by bisection: the largest pot f(r) is concave in the larger share r (one program in r).

    With f(1/2) > 0 and f(r*) = 0, any r > r* with f(r) >= 0 would make f(r*) > 0: r* is the
    largest share. The whole, r* = 1, needs f(1) >= 0 only.
    """
    share = stored("P01")[f"maxshare_mid{size}"]

    def pot(larger: Fraction) -> Fraction:
        data = partnership(midpoints(size), even(size), [larger, 1 - larger])
        value = settle(data, BEST, "full").goal_value
        assert value is not None
        return value

    assert pot(Fraction(1, 2)) > 0
    assert pot(share) == 0
    posed = {share: "possible"}
    if share < 1:
        posed[share + Fraction(1, 10**9)] = "impossible"
    for larger, status in posed.items():
        data = partnership(midpoints(size), even(size), [larger, 1 - larger])
        demands = Demands(balance="ex-ante", budget="no-deficit", goal="any", tidy="none")
        assert settle(data, demands).status == status
