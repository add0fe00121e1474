"""Published facts posed directly, each with its source; sizes beyond the stored corpus.

'Looked up' and 'from memory' say how the source was confirmed, as in the corpus.
"""

from __future__ import annotations

import itertools
from fractions import Fraction

import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from designer import Demands, pose
from designer.proof.recheck import recheck
from designer.setting.setting import Side
from designer.verdict import Verdict
from tests.oracles.brute import net_worth
from tests.published.corpus import as_setting, entries, setting_of
from tests.published.families import (
    Data,
    agent,
    endpoints,
    even,
    interim_chances,
    market,
    midpoints,
    one_item,
    partnership,
    trade,
)

BEST = Demands(balance="none", goal="revenue")
"""Efficient, Bayesian, interim participation: the most the pot can hold."""

BALANCED = Demands(balance="ex-post", goal="any")
"""The same, balanced in every case."""


def settle(data: Data, demands: Demands, side: Side | None = None) -> Verdict:
    """Pose, insisting on a proof that the independent checker accepts."""
    verdict = pose(as_setting(data, side=side), demands)
    assert verdict.proved, verdict.reason
    assert recheck(verdict.proof).holds
    return verdict


# -- Myerson and Satterthwaite 1983, JET 29:265-281 (abstract looked up; grid form re-derived)


def test_five_midpoints_balance_exactly_and_six_are_impossible() -> None:
    assert settle(trade(midpoints(5)), BEST).goal_value == 0
    assert settle(trade(midpoints(5)), BALANCED).status == "possible"
    assert settle(trade(midpoints(6)), BEST).goal_value == Fraction(-5, 216)
    assert settle(trade(midpoints(6)), BALANCED).status == "impossible"


@pytest.mark.parametrize("size", [7, 9, 11, 12, 16])
def test_largest_pot_of_efficient_trade_on_midpoints(size: int) -> None:
    value = settle(trade(midpoints(size)), BEST).goal_value
    assert value == Fraction((size - 1) * (5 - size), 6 * size**2)


@pytest.mark.parametrize("size", [4, 7, 10, 12])
def test_largest_pot_of_efficient_trade_on_end_points(size: int) -> None:
    assert settle(trade(endpoints(size)), BEST).goal_value == Fraction(5 - size, 6 * size)


@pytest.mark.parametrize("size", [6, 7, 9])
def test_the_least_outside_money_is_the_missing_pot(size: int) -> None:
    """Interim payments alone matter, so balance in every case costs nothing extra."""
    money = settle(trade(midpoints(size)), Demands(balance="ex-post", goal="outside-money"))
    assert money.goal_value == -Fraction((size - 1) * (5 - size), 6 * size**2)


def test_worths_that_cannot_cross_trade_at_a_price_between() -> None:
    """Without overlap a posted price does everything: dominant, ex-post, balanced."""
    data = trade(midpoints(6))
    data["agents"][0] = agent([1 + v for v in midpoints(6)], [0, 1], even(6))
    demands = Demands(ic="dominant", ir="ex-post", balance="ex-post", goal="any")
    assert settle(data, demands).status == "possible"


def second_best(size: int) -> Fraction:
    """The most gain from trade on midpoints, by the knapsack of entry B03.

    Trades by index difference d have weight (K-d)/K**2, gain d/K and budget (2d-K+1)/K; they
    are filled from the top, and broken where the budget runs out.
    """
    gain, budget = Fraction(0), Fraction(0)
    for d in range(size - 1, 0, -1):
        weight = Fraction(size - d, size**2)
        each = Fraction(2 * d - size + 1, size)
        part = Fraction(1)
        if budget + weight * each < 0:
            part = budget / (-weight * each)
        gain += part * weight * Fraction(d, size)
        budget += part * weight * each
        if part < 1:
            break
    return gain


def test_the_knapsack_gives_every_published_second_best() -> None:
    """Stored values at 20, 40 and 80 points included."""
    stored = {i["tag"]: Fraction(i["value"]) for i in entries()["B03"]["beyond"]}
    posed = {q["tag"]: Fraction(q["value"]) for q in entries()["B03"]["queries"]}
    assert len(stored) == 3
    for tag, value in {**stored, **posed}.items():
        assert second_best(int(tag.removeprefix("mid"))) == value, tag
    # The limit of the source is 9/64 (Myerson and Satterthwaite 1983), from above.
    assert Fraction(9, 64) < second_best(400) < Fraction(9, 64) + Fraction(1, 1000)


@pytest.mark.parametrize("size", [7, 9, 12, 20, 40, 80])
def test_second_best_trade_is_the_knapsack(size: int) -> None:
    demands = Demands(decision="randomized", balance="ex-post", goal="welfare", tidy="none")
    assert settle(trade(midpoints(size)), demands).goal_value == second_best(size)


def beyond(entry: str, tag: str) -> Fraction:
    """A stored value from a closed form."""
    (item,) = [item for item in entries()[entry]["beyond"] if item["tag"] == tag]
    return Fraction(item["value"])


@pytest.mark.parametrize("tag", [item["tag"] for item in entries()["M01"]["beyond"]])
def test_one_seller_and_several_buyers_at_larger_sizes(tag: str) -> None:
    """Entry M01: up to 64,000 profiles on the full program; three buyers turn at eight points."""
    buyers, size = (int(part.strip("nmid")) for part in tag.split("_"))
    demands = Demands(balance="none", goal="revenue", tidy="none")
    verdict = settle(market(buyers, midpoints(size)), demands)
    assert verdict.goal_value == beyond("M01", tag)


@pytest.mark.parametrize("tag", ["n2_mid20", "n2_mid40"])
def test_largest_revenue_from_two_bidders_at_larger_sizes(tag: str) -> None:
    """Entry U01: E max(0, virtual worths), Myerson 1981."""
    grid = midpoints(int(tag.removeprefix("n2_mid")))
    demands = Demands(decision="randomized", balance="none", goal="revenue", tidy="none")
    assert settle(one_item([grid, grid]), demands).goal_value == beyond("U01", tag)


def test_largest_revenue_from_two_bidders_of_a_hundred_points() -> None:
    """Entry U01 again: 10,000 profiles in interim quantities."""
    grid = midpoints(100)
    demands = Demands(decision="randomized", balance="none", goal="revenue", tidy="none")
    verdict = pose(as_setting(one_item([grid, grid])), demands, path="interim")
    assert verdict.proved
    assert recheck(verdict.proof).holds
    assert verdict.goal_value == beyond("U01", "n2_mid100")


# -- Arrow 1979; d'Aspremont and Gerard-Varet 1979, J. Public Economics 11:25-45


@st.composite
def independent(draw: st.DrawFn) -> Data:
    """Two or three parties, independent priors, whole worths and outlays."""
    count, options = draw(st.integers(2, 3)), draw(st.integers(2, 3))
    parties: list[Data] = []
    for _ in range(count):
        size = draw(st.integers(1, 3))
        line = st.lists(st.integers(-9, 9).map(str), min_size=options, max_size=options)
        parties.append(
            {
                "types": [str(a) for a in range(size)],
                "values": draw(st.lists(line, min_size=size, max_size=size)),
                "prior": chances(draw(st.lists(st.integers(1, 5), min_size=size, max_size=size))),
            }
        )
    costs = draw(st.lists(st.integers(0, 9).map(str), min_size=options, max_size=options))
    return {
        "agents": parties,
        "decisions": [str(k) for k in range(options)],
        "decision_cost": costs,
    }


def chances(weights: list[int]) -> list[str]:
    """The weights as exact probabilities."""
    return [str(Fraction(weight, sum(weights))) for weight in weights]


@settings(max_examples=25, deadline=None, derandomize=True)
@given(independent())
def test_without_participation_efficiency_and_balance_always_go_together(data: Data) -> None:
    demands = Demands(ic="bayesian", ir="none", balance="ex-post", goal="any")
    assert settle(data, demands).status == "possible"


# -- Cremer and McLean 1988, Econometrica 56:1247-1257, Theorems 1 and 2 (from memory)


@st.composite
def correlated_item(draw: st.DrawFn) -> tuple[Data, list[list[int]]]:
    """One item, two bidders of equally many types, a joint table of positive weights."""
    size = draw(st.integers(2, 3))
    table = draw(
        st.lists(
            st.lists(st.integers(1, 6), min_size=size, max_size=size),
            min_size=size,
            max_size=size,
        )
    )
    grid = st.lists(st.integers(0, 9), min_size=size, max_size=size, unique=True)
    data = one_item([[Fraction(v) for v in sorted(draw(grid))] for _ in range(2)])
    for party in data["agents"]:
        del party["prior"]
    data["joint"] = chances([weight for row in table for weight in row])
    return data, table


def determinant(table: list[list[int]]) -> int:
    """By Leibniz; the tables are tiny."""
    total = 0
    for order in itertools.permutations(range(len(table))):
        sign = 1
        for i, j in itertools.combinations(range(len(order)), 2):
            sign *= -1 if order[i] > order[j] else 1
        for row, column in enumerate(order):
            sign *= table[row][column]
        total += sign
    return total


@settings(max_examples=25, deadline=None, derandomize=True)
@given(correlated_item())
def test_beliefs_of_full_rank_let_the_designer_take_everything(
    case: tuple[Data, list[list[int]]],
) -> None:
    """Full rank of the joint table: the pot holds the whole first-best worth, exactly."""
    data, table = case
    assume(determinant(table) != 0)
    setting = as_setting(data)
    first_best = sum(
        setting.probability(p) * max(net_worth(setting, k, p) for k in range(3))
        for p in range(setting.profiles)
    )
    for honesty in ("bayesian", "dominant"):
        verdict = settle(data, Demands(ic=honesty, balance="none", goal="revenue"))
        assert verdict.goal_value == first_best


def test_independent_beliefs_leave_the_bidders_something() -> None:
    """The contrast: with independent types the high type keeps a rent (Myerson 1981)."""
    data = one_item([[Fraction(1), Fraction(3)]] * 2)
    verdict = settle(data, Demands(decision="randomized", balance="none", goal="revenue"))
    # Virtual worths 1 - (3 - 1) = -1 and 3: sell to a high type only, 3 * 3/4, not 5/2.
    assert verdict.goal_value == Fraction(9, 4)


# -- Cramton, Gibbons and Klemperer 1987, Econometrica 55:615-632 (abstract looked up)


@pytest.mark.parametrize(
    ("grid", "weights", "count"),
    [
        (midpoints(8), [1] * 8, 2),
        (midpoints(6), [6, 1, 2, 1, 1, 5], 2),
        ([Fraction(v) for v in (1, 2, 5, 11)], [4, 3, 2, 1], 3),
    ],
)
def test_equal_shares_dissolve(grid: list[Fraction], weights: list[int], count: int) -> None:
    """Theorem 1 of the source: equal shares can always be dissolved efficiently."""
    prior = [Fraction(weight, sum(weights)) for weight in weights]
    data = partnership(grid, prior, [Fraction(1, count)] * count)
    assert settle(data, BALANCED).status == "possible"


def test_one_owner_is_the_seller_of_a_trade() -> None:
    """The same source: with one owner this is bilateral trade, impossible from six points."""
    sole = [Fraction(1), Fraction(0)]
    assert settle(partnership(midpoints(5), even(5), sole), BALANCED).status == "possible"
    assert settle(partnership(midpoints(6), even(6), sole), BALANCED).status == "impossible"
    value = settle(partnership(midpoints(6), even(6), sole), BEST).goal_value
    assert value == Fraction(-5, 216)


# -- Border 1991, Econometrica 59:1175-1187 (looked up): entry U09


@pytest.mark.parametrize("item", entries()["U09"]["beyond"], ids=lambda item: item["tag"])
def test_interim_chances_that_one_item_can_bear(item: dict[str, str]) -> None:
    """The tag carries the case: n parties, then P(win | type) for equally likely types."""
    parties, *wins = item["tag"].split("_")
    count = int(parties.removeprefix("n"))
    chances_asked = [Fraction(win) for win in wins]
    size = len(chances_asked)
    grid = [Fraction(a) for a in range(size)]
    verdict = settle(
        one_item([grid] * count),
        Demands(decision="randomized", ic="none", ir="none", balance="none", goal="any"),
        Side(chances=interim_chances(count, chances_asked)),
    )
    assert verdict.status == {"feasible": "possible", "infeasible": "impossible"}[item["value"]]
    # The source's own inequalities, worked out apart from any program.
    slack = worst_border_slack(count, chances_asked)
    assert slack == Fraction(item["slack"])
    assert (verdict.status == "possible") == (slack >= 0)


def worst_border_slack(count: int, wins: list[Fraction]) -> Fraction:
    """Least 1 - (1 - P(A))^n - n sum over A of p_a q_a, over sets A of equally likely types.

    n parties win with a type in A at most as often as any of them has one.
    """
    size, slacks = len(wins), []
    for some in range(1, size + 1):
        for chosen in itertools.combinations(wins, some):
            nobody = Fraction(size - some, size) ** count
            slacks.append(1 - nobody - count * sum(chosen, Fraction(0)) / size)
    return min(slacks)


@pytest.mark.parametrize("item", entries()["U09"]["beyond"], ids=lambda item: item["tag"])
def test_chances_lowered_by_the_slack_are_just_bearable(item: dict[str, str]) -> None:
    """The slack priced in the program: take it off the chances where it binds, and no less.

    The top types' chances of winning, lowered by the shortage over their mass, become possible;
    lowered by a millionth less they remain impossible (raised beyond, become so).
    """
    parties, *wins = item["tag"].split("_")
    count, slack = int(parties.removeprefix("n")), Fraction(item["slack"])
    asked = [Fraction(win) for win in wins]
    size = len(asked)
    binding = next(
        some
        for some in range(1, size + 1)
        if 1 - Fraction(size - some, size) ** count - count * sum(asked[-some:]) / size == slack
    )
    step = slack * size / (count * binding)
    # Lowering all chances in the binding set leaves every smaller set with room to spare.
    for more, status in ((Fraction(0), "possible"), (Fraction(1, 10**6), "impossible")):
        moved = [q + (step + more) * (a >= size - binding) for a, q in enumerate(asked)]
        assert (worst_border_slack(count, moved) >= 0) == (status == "possible")
        verdict = settle(
            one_item([[Fraction(a) for a in range(size)]] * count),
            Demands(decision="randomized", ic="none", ir="none", balance="none", goal="any"),
            Side(chances=interim_chances(count, moved)),
        )
        assert verdict.status == status


# -- Rochet 1987, J. Mathematical Economics 16:191-200 (from memory): entry S06


def test_a_cycle_of_three_lies_defeats_what_every_pair_allows() -> None:
    demands = Demands(decision="table", ir="none", balance="none", goal="any")
    assert pose(setting_of("S06_control"), demands).status == "possible"
    cycle = setting_of("S06_cycle")
    # Every two types alone can be kept honest: v(a; d_a) + v(b; d_b) >= v(a; d_b) + v(b; d_a).
    value = cycle.parties[0].value
    assert cycle.rule is not None
    picks = cycle.rule.argmax(axis=1)
    for a, b in itertools.combinations(range(3), 2):
        assert value[a, picks[a]] + value[b, picks[b]] >= value[a, picks[b]] + value[b, picks[a]]
    verdict = pose(cycle, demands)
    assert (verdict.status, verdict.proved) == ("impossible", True)
    assert recheck(verdict.proof).holds
