"""Every rule against the numbers its source, or the published corpus, gives for it.

The corpus was posed and proved as a linear program; the rules never see one, so that agreement
of exact fractions is agreement of two roads. 'Looked up' and 'from memory' as in the corpus.
"""

from __future__ import annotations

from fractions import Fraction
from math import comb
from pathlib import Path

import pytest

from designer import pose
from designer.ruling.registry import RULES
from designer.ruling.worst_case_linear_rebate import coefficients, share
from designer.setting.scenario import parse_scenario, read_scenario
from tests.published.corpus import Query, entries, queries, setting_of
from tests.published.families import endpoints, even, midpoints, one_item, partnership, trade
from tests.ruling.helpers import (
    as_setting,
    audit_of,
    expect,
    gathered,
    identical_units,
    joint_project,
    market,
    table_of,
)

HALF = Fraction(1, 2)
SCENARIOS = Path(__file__).parents[2] / "scenarios"


def named(query: Query) -> str:
    return query.name


def beyond(entry: str) -> dict[str, str]:
    """The entry's numbers that are not posed, by tag."""
    return {item["tag"]: item["value"] for item in entries()[entry]["beyond"]}


def asks(query: Query, **words: object) -> bool:
    """Whether a query has these demands; a tuple allows any of its words."""
    return all(
        getattr(query.demands, key) in (word if isinstance(word, tuple) else (word,))
        for key, word in words.items()
    )


# -- agreement with every posed query whose optimum a rule attains


GREATEST = [
    query
    for query in queries()
    if asks(query, decision="efficient", ic="bayesian", ir="interim", balance="none")
    and asks(query, goal="revenue")
    and RULES["revenue-greatest-efficient"].applies(setting_of(query.instance)) is None
]
TIED = ("P03_K4_share_p", "P03_K8_share_p")
"""Owners of a share may be buyers or sellers: which way a tie goes moves what they can be asked."""


@pytest.mark.parametrize("query", GREATEST, ids=named)
def test_revenue_greatest_efficient_is_the_posed_optimum(query: Query) -> None:
    """Krishna and Perry 1998; Williams 1999: entries B01, U06, M01, G01, G02, P01, P03, A01."""
    found = audit_of("revenue-greatest-efficient", setting_of(query.instance))
    assert query.value is not None
    assert found.holds["ic-bayesian"]
    assert found.holds["ir-interim"]
    assert found.decisions.efficient.holds
    if query.instance in TIED:
        assert found.pot.expected < query.value  # the file's order of ties is not the best
    else:
        assert found.pot.expected == query.value


def test_the_rules_meet_many_posed_queries() -> None:
    """The lists above and below must not run dry unnoticed."""
    assert len(GREATEST) >= 60
    assert len(OPTIMAL) >= 30
    assert len(SECOND) >= 30
    assert len(POSTED) >= 10
    assert len(EXTRACTED) >= 6


OPTIMAL = [
    query
    for query in queries()
    if asks(query, decision="randomized", balance="none", goal="revenue", ir=("interim", "ex-post"))
    and asks(query, ic=("bayesian", "dominant"))
    and RULES["optimal-auction"].applies(setting_of(query.instance)) is None
]


@pytest.mark.parametrize("query", OPTIMAL, ids=named)
def test_optimal_auction_is_the_posed_optimum(query: Query) -> None:
    """Myerson 1981: entries U01, U03, U05, U10, S01; dominant and ex-post for nothing extra."""
    found = audit_of("optimal-auction", setting_of(query.instance))
    assert found.holds["ic-dominant"]
    assert found.holds["ir-ex-post"]
    assert found.pot.expected == query.value


SECOND = [
    query
    for query in queries()
    if asks(query, decision="randomized", goal="welfare", ic="bayesian", ir="interim")
    and asks(query, balance=("ex-ante", "ex-post"))
    and RULES["second-best"].applies(setting_of(query.instance)) is None
]


@pytest.mark.parametrize("query", SECOND, ids=named)
def test_second_best_is_the_posed_optimum(query: Query) -> None:
    """Myerson and Satterthwaite 1983: entries B03, B06, G01, G02, M03, A02, A04."""
    setting = setting_of(query.instance)
    found = audit_of("second-best", setting)
    assert found.holds["ic-bayesian"]
    assert found.holds["ir-interim"]
    assert found.holds["balance-ex-post-exact"] or len(setting.parties) == 1
    assert found.decisions.welfare == query.value


POSTED = [
    query
    for query in queries()
    if asks(query, decision="randomized", goal="welfare", ic="dominant", ir="ex-post")
    and asks(query, balance="ex-post", budget="exact")
    and RULES["posted-price"].applies(setting_of(query.instance)) is None
    and query.entry in ("B05", "G02")
]


@pytest.mark.parametrize("query", POSTED, ids=named)
def test_posted_price_is_the_posed_optimum(query: Query) -> None:
    """Hagerty and Rogerson 1987 (first page looked up): entries B05 and G02."""
    found = audit_of("posted-price", setting_of(query.instance))
    assert found.holds["ic-dominant"]
    assert found.holds["ir-ex-post"]
    assert found.holds["balance-ex-post-exact"]
    assert found.decisions.welfare == query.value


def test_two_worths_each_leave_room_beyond_prices() -> None:
    """Entry B06: on so coarse a grid dominance allows 125/4, a price only 30, of 35."""
    found = audit_of("posted-price", setting_of("B06_base"))
    assert found.decisions.welfare == 30
    assert found.decisions.lost == 5
    values = {q.value for q in queries() if q.entry == "B06" and q.demands.ic == "dominant"}
    assert Fraction(125, 4) in values


EXTRACTED = [
    query
    for query in queries()
    if asks(query, balance="none", goal="revenue", ir="interim", ic=("bayesian", "dominant"))
    and RULES["full-extraction"].applies(setting_of(query.instance)) is None
]


@pytest.mark.parametrize("query", EXTRACTED, ids=named)
def test_full_extraction_is_the_posed_optimum(query: Query) -> None:
    """Cremer and McLean 1988: entries U07, A04."""
    found = audit_of("full-extraction", setting_of(query.instance))
    assert found.holds["ic-dominant"]
    assert found.holds["ir-interim"]
    assert all(standing.gain == 0 for standing in found.standings)
    assert found.pot.expected == query.value


ON_AVERAGE = [
    query
    for query in queries()
    if asks(query, balance="none", goal="revenue", ir="interim", ic="bayesian")
    and query.demands.decision != "table"
    and RULES["bayesian-full-extraction"].applies(setting_of(query.instance)) is None
]


@pytest.mark.parametrize("query", ON_AVERAGE, ids=named)
def test_bayesian_full_extraction_is_the_posed_optimum(query: Query) -> None:
    """Cremer and McLean 1988, Theorem 2 (from memory): entries U07, A04."""
    found = audit_of("bayesian-full-extraction", setting_of(query.instance))
    assert found.holds["ic-bayesian"]
    assert all(standing.gain == 0 for standing in found.standings)
    assert found.pot.expected == query.value


def test_bets_reach_the_optimum_where_beliefs_do_not_span() -> None:
    """Three types of one crew, two of the other: rank 2 at most, and still nothing is left."""
    setting = read_scenario(SCENARIOS / "wreck.toml")
    assert RULES["full-extraction"].applies(setting) is not None
    found = audit_of("bayesian-full-extraction", setting)
    assert found.holds["ic-bayesian"]
    assert not found.holds["ic-dominant"]
    assert all(standing.gain == 0 for standing in found.standings)
    assert found.pot.expected == found.decisions.welfare == pose(setting).goal_value


def test_the_example_of_ten_and_a_hundred() -> None:
    """Myerson 1981, section 7 (looked up): revenue 70, the whole of what the item is worth."""
    setting = setting_of("U07_rho1over3")
    built = RULES["full-extraction"].build(setting)
    assert "bets up to 60 " in built.notes[1]
    assert audit_of("full-extraction", setting).pot.expected == 70


# -- expected externality: entry A01


@pytest.mark.parametrize("tag", ["n2K3", "n2K5", "n3K2", "n3K3", "n4K2"])
def test_expected_externality_balances_and_is_honest(tag: str) -> None:
    """By d'Aspremont and Gerard-Varet 1979 (looked up): entry A01, every instance."""
    setting = setting_of(f"A01_{tag}")
    table = table_of("expected-externality", setting)
    found = audit_of("expected-externality", setting)
    assert setting.rule is not None
    assert (table.decides == setting.rule).all()  # 'rule GIVEN = first efficient decision'
    assert not table.pays.sum(axis=0).any()  # exactly 0 in every profile
    assert found.holds["ic-bayesian"]


def test_expected_externality_shows_what_correlation_costs() -> None:
    """Honesty is lost on entry A04's correlated prior, and the audit says so; the pot is not."""
    found = audit_of("expected-externality", setting_of("A04_corr"))
    assert found.worst["ic-bayesian"].violation == Fraction(35, 39)
    assert found.holds["balance-ex-post-exact"]


# -- closed forms at sizes beyond the corpus


@pytest.mark.parametrize("size", [20, 40, 100])
def test_optimal_auction_of_two_bidders(size: int) -> None:
    """Entry U01, beyond: E max(0, max phi), 87/200, 1363/3200 and 1051/2500."""
    setting = as_setting(one_item([midpoints(size)] * 2))
    assert audit_of("optimal-auction", setting).pot.expected == Fraction(
        beyond("U01")[f"n2_mid{size}"]
    )


@pytest.mark.parametrize("size", [2, 6, 30, 100])
def test_one_bidder_is_best_asked_a_price(size: int) -> None:
    """Myerson 1981; Riley and Zeckhauser 1983 (from memory): 1/4 + 1/(4K) for K even."""
    setting = as_setting(one_item([midpoints(size)]))
    value = Fraction(1, 4) + Fraction(1, 4 * size)
    assert audit_of("optimal-auction", setting).pot.expected == value
    assert audit_of("posted-price-sale", setting).pot.expected == value


@pytest.mark.parametrize("size", [3, 8, 40, 100])
def test_second_price_and_the_most_an_efficient_auction_raises(size: int) -> None:
    """Vickrey 1961; entry U06 (looked up): E[min], and (2K-1)(K+2)/(6K^2) on the grid."""
    setting = as_setting(one_item([midpoints(size)] * 2))
    pivotal = audit_of("pivotal", setting)
    assert pivotal.pot.expected == Fraction(2 * size**2 + 1, 6 * size**2)
    assert pivotal.holds["ic-dominant"]
    assert pivotal.holds["ir-ex-post"]
    most = audit_of("revenue-greatest-efficient", setting).pot.expected
    assert most == Fraction((2 * size - 1) * (size + 2), 6 * size**2)


@pytest.mark.parametrize("size", [7, 20, 61, 150])
def test_efficient_trade_and_what_it_lacks(size: int) -> None:
    """Entry B01: (K-1)(5-K)/(6K^2) at midpoints, (5-K)/(6K) at end points."""
    at_midpoints = as_setting(trade(midpoints(size)))
    found = audit_of("revenue-greatest-efficient", at_midpoints).pot
    assert found.expected == Fraction((size - 1) * (5 - size), 6 * size**2)
    assert found.least == found.most == found.expected
    at_end_points = as_setting(trade(endpoints(size)))
    found = audit_of("revenue-greatest-efficient", at_end_points).pot
    assert found.expected == Fraction(5 - size, 6 * size)


@pytest.mark.parametrize("size", [2, 5, 8, 33])
def test_marginal_products_cost_the_whole_gain_from_trade(size: int) -> None:
    """Entry B02: minus the expected gains, -(K^2-1)/(6K^2)."""
    found = audit_of("marginal-product", as_setting(trade(midpoints(size))))
    assert found.pot.expected == -Fraction(size**2 - 1, 6 * size**2)
    assert found.holds["ic-dominant"]
    assert found.holds["ir-ex-post"]


@pytest.mark.parametrize("size", [20, 40, 80])
def test_second_best_trade(size: int) -> None:
    """Entry B03, beyond: 323/2200, 403/2800 and 149389/1049600, on the way to 9/64."""
    found = audit_of("second-best", as_setting(trade(midpoints(size))))
    assert found.decisions.welfare == Fraction(beyond("B03")[f"mid{size}"])
    assert found.holds["balance-ex-post-exact"]
    assert found.holds["ic-bayesian"]
    assert found.holds["ir-interim"]


@pytest.mark.parametrize("size", [3, 6, 11, 30])
def test_the_best_posted_price(size: int) -> None:
    """Entry B05: (K+2)(K-1)/(8K^2) for K even, (K+1)^2(K-1)/(8K^3) for K odd."""
    found = audit_of("posted-price", as_setting(trade(midpoints(size))))
    even_size = Fraction((size + 2) * (size - 1), 8 * size**2)
    odd_size = Fraction((size + 1) ** 2 * (size - 1), 8 * size**3)
    assert found.decisions.welfare == (odd_size if size % 2 else even_size)


@pytest.mark.parametrize(("buyers", "size"), [(2, 20), (2, 40), (3, 7), (3, 8), (3, 12)])
def test_one_seller_and_several_buyers(buyers: int, size: int) -> None:
    """Entry M01, beyond: the largest pot of the efficient rule, for n/((n+1)(n+2)) at the limit."""
    found = audit_of("revenue-greatest-efficient", as_setting(gathered(buyers, midpoints(size))))
    assert found.pot.expected == Fraction(beyond("M01")[f"n{buyers}_mid{size}"])


@pytest.mark.parametrize("size", [8, 12])
def test_second_best_of_two_buyers_and_two_sellers(size: int) -> None:
    """Entry M03, beyond: 2009/5120 and 54571/139968."""
    found = audit_of("second-best", as_setting(market(midpoints(size))))
    assert found.decisions.welfare == Fraction(beyond("M03")[f"2x2_mid{size}"])


@pytest.mark.parametrize("share_of_cost", ["1/4", "2/5"])
def test_the_chance_of_a_joint_project_among_ten(share_of_cost: str) -> None:
    """Entry G01, beyond: the second-best probability of provision, ten parties."""
    tag = f"c{share_of_cost.replace('/', 'over')}_n10_prob"
    setting = parse_scenario(joint_project(10, Fraction(share_of_cost) * 10))
    table = table_of("second-best", setting)
    built = [Fraction(int(top), table.decides_den) for top in table.decides[:, 1]]
    assert expect(setting, built) == Fraction(beyond("G01")[tag])


# -- rebates: entries R01 and R02


CASES = [(n, m) for n in range(3, 9) for m in range(1, n - 1)]


@pytest.mark.parametrize(("n", "m"), CASES)
def test_the_promised_share_is_the_published_one(n: int, m: int) -> None:
    """Guo and Conitzer 2009; Moulin 2009: 1 - C(n-1,m)/sum C(n-1,j); entry R01 holds a list."""
    published = beyond("R01").get(f"groves_n{n}m{m}")
    assert published is not None
    assert share(n, m) == Fraction(published)
    assert share(n, m) == 1 - Fraction(comb(n - 1, m), sum(comb(n - 1, j) for j in range(m, n)))
    assert len(coefficients(n, m)) == n - 1 - m


@pytest.mark.parametrize(("n", "m"), [(n, m) for n, m in CASES if n <= 7])
def test_the_promised_share_is_the_worst_case(n: int, m: int) -> None:
    """On the grid {0, 1}, where the worst case lies, exactly that share goes back, never more."""
    setting = as_setting(identical_units(n, m, [Fraction(0), Fraction(1)]))
    paid, kept = table_of("pivotal", setting), table_of("worst-case-linear-rebate", setting)
    worst = Fraction(1)
    for profile in range(setting.profiles):
        before = sum((paid.payment(i, profile) for i in range(n)), Fraction(0))
        after = sum((kept.payment(i, profile) for i in range(n)), Fraction(0))
        assert after >= 0
        if before:
            worst = min(worst, 1 - after / before)
    assert worst == share(n, m)
    assert audit_of("worst-case-linear-rebate", setting).holds["ic-dominant"]


@pytest.mark.parametrize(
    ("count", "size", "value"),
    [(3, 4, "5/32"), (3, 10, "33/200"), (4, 4, "51/512"), (4, 8, "819/8192")],
)
def test_what_equal_rebates_leave_over(count: int, size: int, value: str) -> None:
    """Bailey 1997; Cavallo 2006: entry R02; (K^2-1)/(6K^2) for three bidders."""
    setting = as_setting(one_item([midpoints(size)] * count))
    for name in ("bailey-rebate", "cavallo-rebate"):
        found = audit_of(name, setting)
        assert (
            found.pot.expected == Fraction(value) == Fraction(beyond("R02")[f"n{count}_mid{size}"])
        )
        assert found.pot.least >= 0
        for demand in ("ic-dominant", "ir-ex-post", "balance-ex-post-no-deficit"):
            assert found.holds[demand]
    if count == 3:
        assert Fraction(value) == Fraction(size**2 - 1, 6 * size**2)


# -- partnerships: Cramton, Gibbons and Klemperer 1987 (abstract looked up)


@pytest.mark.parametrize("size", [5, 6, 8, 10, 12, 16, 20, 24, 32])
def test_the_largest_share_that_dissolves(size: int) -> None:
    """Entry P01, beyond: the pot is exactly 0 at the published share, short just above it."""
    largest = Fraction(beyond("P01")[f"maxshare_mid{size}"])

    def pot(share: Fraction) -> Fraction:
        data = partnership(midpoints(size), even(size), [share, 1 - share])
        return audit_of("revenue-greatest-efficient", as_setting(data)).pot.expected

    assert pot(largest) == 0
    if largest < 1:
        assert pot(largest + Fraction(1, 1000)) < 0


@pytest.mark.parametrize("size", [2, 3, 4, 6, 8, 12, 24])
@pytest.mark.parametrize("count", [2, 3])
def test_fixed_fees_dissolve_equal_shares(size: int, count: int) -> None:
    """Theorem 1 of the source: equal shares can be dissolved; fees add up to 0."""
    if count == 3 and size > 12:
        size = 10
    data = partnership(midpoints(size), even(size), [Fraction(1, count)] * count)
    found = audit_of("partnership-split", as_setting(data))
    for demand in ("ic-bayesian", "ir-interim", "balance-ex-post-exact"):
        assert found.holds[demand]
    assert found.decisions.efficient.holds


@pytest.mark.parametrize("size", [12, 24, 48])
def test_fixed_fees_dissolve_up_to_the_published_share(size: int) -> None:
    """Uniform worths, two owners: 1/2 + 1/(2 sqrt 3) = 0.788675 at the limit."""
    for share_held, dissolves in (
        (Fraction(3, 4), True),
        (Fraction(78, 100), True),
        (Fraction(80, 100), False),
        (Fraction(1), False),
    ):
        data = partnership(midpoints(size), even(size), [share_held, 1 - share_held])
        found = audit_of("partnership-split", as_setting(data))
        assert found.holds["ir-interim"] is dissolves
        assert found.holds["balance-ex-post-exact"]
    unequal = [s.gain for s in found.standings]
    assert min(unequal) < 0


# -- double auctions: Chatterjee and Samuelson 1983 (from memory)


@pytest.mark.parametrize("size", [5, 8, 13, 40])
def test_the_linear_equilibrium_has_an_exact_counterpart_on_even_grids(size: int) -> None:
    """Honest to the last fraction, in every case balanced and without loss; 9/64 at the limit."""
    found = audit_of("linear-double-auction", as_setting(trade(midpoints(size))))
    for demand in ("ic-bayesian", "ir-ex-post", "balance-ex-post-exact"):
        assert found.holds[demand]
    assert not found.holds["ic-dominant"]
    best = audit_of("second-best", as_setting(trade(midpoints(size)))).decisions.welfare
    assert found.decisions.welfare <= best
    assert abs(found.decisions.welfare - Fraction(9, 64)) <= Fraction(1, 8 * size)


@pytest.mark.parametrize("size", [6, 12, 20])
def test_bids_at_face_value_are_shaded(size: int) -> None:
    """The bare k = 1/2 rule is efficient and balanced, and a lie pays."""
    found = audit_of("k-double-auction", as_setting(trade(midpoints(size))))
    assert found.decisions.efficient.holds
    assert found.holds["balance-ex-post-exact"]
    assert found.holds["ir-ex-post"]
    assert found.worst["ic-bayesian"].violation > 0
