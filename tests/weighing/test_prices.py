"""Prices: each posed again is possible, a hair below it impossible; published amounts."""

from __future__ import annotations

import itertools
from dataclasses import replace
from fractions import Fraction

import pytest
from hypothesis import HealthCheck, assume, given, settings

from designer import Demands, weigh
from designer.demands.terms import Terms
from designer.setting.setting import Limits, Setting, Side
from designer.weighing.prices import Price, Prices
from tests.oracles.brute import net_worth
from tests.oracles.settings import small_settings
from tests.published.corpus import Query, as_setting, queries, setting_of
from tests.published.families import endpoints, market, midpoints, one_item, trade
from tests.weighing.posed import HAIR, STRICT, lowered, mix_of, possible, with_allowances

BALANCED = Demands(balance="ex-post")
BEST = ("none", "revenue")


def best(setting: Setting) -> Fraction:
    """E[max_k W_k], from the definitions."""
    return sum(
        (
            setting.probability(p)
            * max(net_worth(setting, k, p) for k in range(len(setting.options)))
            for p in range(setting.profiles)
        ),
        Fraction(0),
    )


def again(setting: Setting, terms: Terms, price: Price, less: Fraction) -> bool:
    """Whether the mix is possible once a price, but for `less` of it, is paid."""
    assert price.amount is not None
    kind, _, key = price.relax.partition(":")
    amount = price.amount - less
    if price.relax == "outside-money":
        terms = with_allowances(terms, {"money": terms.subsidy + amount})
    elif price.relax == "outside-money-on-average":
        terms = replace(terms, balance="ex-ante", subsidy=terms.subsidy + amount)
    elif kind == "shortfall" and key:
        setting = lowered(setting, (key,), amount)
    elif kind == "shortfall":
        setting = lowered(setting, tuple(p.name for p in setting.parties), amount)
    elif price.relax == "lies":
        terms = with_allowances(terms, {"lies": terms.slack + amount})
    elif price.relax == "compel":
        terms = replace(terms, compelled=terms.compelled | set(price.parties))
    elif price.relax == "welfare":
        terms = with_allowances(terms, {"welfare_at_least": best(setting) - amount})
    elif kind == "limit":
        sign = 1 if key == "pays_at_most" else -1
        old = getattr(terms.limits, key)
        limits = {
            "pays_at_most": terms.limits.pays_at_most,
            "pays_at_least": terms.limits.pays_at_least,
            key: old + sign * amount,
        }
        kept = replace(
            terms.limits,
            pays_at_most=limits["pays_at_most"],
            pays_at_least=limits["pays_at_least"],
        )
        terms = replace(terms, limits=kept)
    else:
        floor = getattr(terms.side, key) - amount
        welfare = key == "welfare_at_least"
        side = (
            replace(terms.side, welfare_at_least=floor)
            if welfare
            else replace(terms.side, revenue_at_least=floor)
        )
        terms = replace(terms, side=side)
    return possible(setting, terms)


def exact(setting: Setting, demands: Demands) -> list[Price]:
    """All prices, each held against `pose` at it and a hair below it."""
    mix = mix_of(setting, demands)
    terms = mix.terms
    assume(not possible(setting, terms))
    found = list(Prices(mix))
    assert all(price.proved for price in found)
    for price in found:
        if price.amount is None:
            continue
        assert again(setting, terms, price, Fraction(0)), price.relax
        if price.amount and price.relax != "compel":
            assert not again(setting, terms, price, min(HAIR, price.amount)), price.relax
    _smallest_sets(setting, terms, [price for price in found if price.relax == "compel"])
    return found


def _smallest_sets(setting: Setting, terms: Terms, found: list[Price]) -> None:
    """All sets of parties of the smallest size that cures, by trying every set."""
    if terms.ir == "none":
        assert not found
        return
    free = [p.name for p in setting.parties if p.name not in terms.compelled]
    for size in range(len(free) + 1):
        cures = {
            chosen
            for chosen in itertools.combinations(free, size)
            if possible(setting, replace(terms, compelled=terms.compelled | set(chosen)))
        }
        if cures:
            assert {price.parties for price in found} == cures
            assert len(found) == len(cures)
            assert all(price.amount == size for price in found)
            return
    assert [price.amount for price in found] in ([None], [])


@settings(max_examples=30, deadline=None, suppress_health_check=list(HealthCheck))
@given(small_settings(most_profiles=6, most_options=2), STRICT)
def test_every_price_is_enough_and_a_hair_less_is_not(setting: Setting, demands: Demands) -> None:
    exact(setting, demands)


@settings(max_examples=8, deadline=None, suppress_health_check=list(HealthCheck))
@given(small_settings(most_profiles=6, most_options=3, interdependent=False))
def test_floors_and_caps_give_way_exactly(setting: Setting) -> None:
    """Floors that ask for all of the welfare and some revenue on top, caps that bite."""
    side = Side(welfare_at_least=best(setting), revenue_at_least=Fraction(1))
    limits = Limits(pays_at_most=Fraction(1, 2), pays_at_least=Fraction(-1))
    demands = Demands(
        decision="randomized", balance="ex-post", budget="no-deficit", side=side, limits=limits
    )
    found = {price.relax for price in exact(setting, demands)}
    assert {"limit:pays_at_most", "side:welfare_at_least", "side:revenue_at_least"} <= found


def test_money_already_allowed_counts() -> None:
    """Two of the five crowns are there: three are missing, five are needed in all."""
    found = weigh(setting_of("B06_base"), replace(BALANCED, subsidy=2), only=["prices"])
    price = found.price("outside-money")
    assert price is not None
    assert price.amount == 3
    assert price.asked == 2
    assert price.becomes == 5


def test_money_of_any_amount_does_not_buy_dominant_balance() -> None:
    """Groves payments may shift by constants: a constant subsidy changes nothing (entry D01)."""
    demands = Demands(decision="efficient", ic="dominant", ir="none", balance="ex-post")
    setting = setting_of("D01_n2_m2_1_3")
    found = weigh(setting, demands, only=["prices"])
    assert found.price("outside-money") == Price("outside-money", None, True)
    average = found.price("outside-money-on-average")
    assert average is not None
    assert average.proved
    assert average.amount == 0
    for money in (-1, 1, 1000):
        assert not possible(setting, replace(found.terms, subsidy=Fraction(money)))


def test_the_cap_of_what_is_collected_upon_service_is_not_priced_apart() -> None:
    setting = as_setting(one_item([midpoints(2), midpoints(2)]))
    setting = replace(setting, outlay=setting.outlay + 1)
    limits = Limits(pays_at_most=Fraction(1, 10), only_when_served=True)
    demands = Demands(decision="randomized", budget="no-deficit", limits=limits)
    price = weigh(setting, demands, only=["prices"]).price("limit:pays_at_most")
    assert price is not None
    assert price.amount is None
    assert "not priced" in price.reason


# -- what a unit buys ------------------------------------------------------------------------


def rates_hold(setting: Setting, demands: Demands) -> None:
    """The rate of a price against another allowance is the slope found by posing nearby.

    With V the price as a function of the other allowance, V(0) - V(h) = rate * h for all small
    h: at least for one of two h that are far apart on a logarithmic scale, by convexity for
    both if for the larger.
    """
    mix = mix_of(setting, demands)
    for price in Prices(mix):
        if price.relax not in ("outside-money", "shortfall", "lies") or price.amount is None:
            continue
        own = {"outside-money": "money"}.get(price.relax, price.relax)
        rates = {name: 1 / much for name, much in price.buys} | dict.fromkeys(
            price.idle, Fraction(0)
        )
        for name, rate in rates.items():
            step = Fraction(1, 10**12)
            base = {"money": mix.terms.subsidy, "lies": mix.terms.slack}.get(name, Fraction(0))
            asked = {"money": mix.terms.subsidy, "lies": mix.terms.slack}.get(own, Fraction(0))
            beside = with_allowances(mix.terms, {name: base + step})
            left = asked + price.amount - rate * step
            assert possible(setting, with_allowances(beside, {own: left})), (price.relax, name)
            below = with_allowances(beside, {own: left - step / 10**6})
            assert not possible(setting, below), (price.relax, name)


@settings(max_examples=15, deadline=None, suppress_health_check=list(HealthCheck))
@given(small_settings(most_profiles=6, most_options=2), STRICT)
def test_what_a_unit_buys_is_the_true_slope(setting: Setting, demands: Demands) -> None:
    assume(not possible(setting, demands.over(setting)))
    rates_hold(setting, demands)


@pytest.mark.parametrize("size", [6, 10])
def test_rates_at_kinks_of_trade(size: int) -> None:
    rates_hold(as_setting(trade(midpoints(size))), BALANCED)


# -- published amounts -------------------------------------------------------------------------


def subsidies() -> list[Query]:
    """Queries for the largest pot, where it is negative: minus that is the least subsidy."""
    return [
        query
        for query in queries()
        if query.entry in ("B01", "B02", "M01", "G02", "P01", "P03")
        and (query.demands.balance, query.demands.goal) == BEST
        and query.value is not None
        and query.value < 0
    ]


@pytest.mark.parametrize("query", subsidies(), ids=lambda query: f"{query.entry}-{query.instance}")
def test_published_subsidies_are_prices(query: Query) -> None:
    assert query.value is not None
    asked = replace(query.demands, balance="ex-post", goal=None)
    found = weigh(setting_of(query.instance), asked, only=["prices"])
    for relax in ("outside-money", "outside-money-on-average"):
        price = found.price(relax)
        assert price is not None
        assert (price.amount, price.proved) == (-query.value, True)
    # The same for every party and type is one unit of money per party.
    floor = found.price("shortfall")
    assert floor is not None
    assert floor.amount == -query.value / len(found.setting.parties)


def test_there_is_a_published_subsidy_of_every_entry() -> None:
    assert {query.entry for query in subsidies()} == {"B01", "B02", "M01", "G02", "P01", "P03"}


def second_bests() -> list[Query]:
    return [
        query
        for query in queries()
        if query.entry in ("B03", "G02")
        and query.demands.decision == "randomized"
        and query.demands.ic == "bayesian"
        and query.demands.goal == "welfare"
        and query.demands.balance == "ex-post"
        and query.value is not None
    ]


@pytest.mark.parametrize("query", second_bests(), ids=lambda query: query.name)
def test_published_second_bests_are_welfare_given_up(query: Query) -> None:
    setting = setting_of(query.instance)
    assert query.value is not None
    found = weigh(setting, replace(query.demands, decision="efficient", goal=None), only=["prices"])
    price = found.price("welfare")
    if found.status == "possible":
        assert query.value == best(setting)
        return
    assert price is not None
    assert (price.becomes, price.amount) == (query.value, best(setting) - query.value)
    assert price.proved
    changed = sum(
        (
            setting.probability(setting.profile_of(_positions(setting, at)))
            * (
                max(
                    net_worth(setting, k, setting.profile_of(_positions(setting, at)))
                    for k in range(len(setting.options))
                )
                - sum(
                    chance
                    * net_worth(
                        setting,
                        setting.options.index(option),
                        setting.profile_of(_positions(setting, at)),
                    )
                    for option, chance in lottery
                )
            )
            for at, lottery in price.changes
        ),
        Fraction(0),
    )
    assert changed == price.amount, "the listed cases account for all of the welfare given up"


def _positions(setting: Setting, at: tuple[str, ...]) -> tuple[int, ...]:
    return tuple(
        [kind.label for kind in party.types].index(label)
        for party, label in zip(setting.parties, at, strict=True)
    )


@pytest.mark.parametrize("size", [7, 12])
def test_market_and_trade_in_closed_form(size: int) -> None:
    """Entry B01: (K-1)(K-5)/(6 K^2) on midpoints, (K-5)/(6K) on end points."""
    for grid, needed in (
        (midpoints(size), Fraction((size - 1) * (size - 5), 6 * size**2)),
        (endpoints(size), Fraction(size - 5, 6 * size)),
    ):
        price = weigh(as_setting(trade(grid)), BALANCED, only=["prices"]).price("outside-money")
        assert price is not None
        assert price.amount == needed


def test_one_seller_and_two_buyers_need_outside_money_from_seven_points() -> None:
    """Entry M01: possible up to six midpoints."""
    assert weigh(as_setting(market(2, midpoints(4))), BALANCED, only=["prices"]).prices == ()


def test_the_two_by_two_trade_with_all_its_numbers() -> None:
    """Entry B06 (Myerson 2008, AER 98:586-603, section 3, numbers re-derived)."""
    setting = setting_of("B06_base")
    found = weigh(setting, BALANCED)
    amounts = {price.relax: price.amount for price in found.prices}
    assert amounts == {
        "outside-money": 5,
        "outside-money-on-average": 5,
        "shortfall": Fraction(5, 2),
        "shortfall:Aster": 5,
        "shortfall:Briar": 5,
        "compel": 1,
        "lies": 5,
        "welfare": Fraction(5, 3),
    }
    welfare = found.price("welfare")
    assert welfare is not None
    assert welfare.asked == 35
    assert welfare.becomes == Fraction(100, 3)
    # Only the case worth least, buyer 20 and seller 0, or its mirror, is traded less: by a sixth
    # of 2 * 10.
    ((_, lottery),) = welfare.changes
    assert sorted(chance for _, chance in lottery) == [Fraction(1, 3), Fraction(2, 3)]
    strictly = replace(BALANCED, ic="dominant", ir="ex-post")
    strict = weigh(setting, strictly).price("welfare")
    assert strict is not None
    assert strict.becomes == Fraction(125, 4)
