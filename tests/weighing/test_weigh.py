"""The page as a whole: ladders, ledger, room, what is kept when it is stopped."""

from __future__ import annotations

import itertools
from dataclasses import replace
from fractions import Fraction

import pytest
from hypothesis import HealthCheck, assume, given, settings

from designer import Demands, weigh
from designer.demands.terms import Terms
from designer.engines import watch
from designer.errors import UsageError
from designer.setting.setting import Limits, Setting, Side
from designer.weighing.groups import groups_of, without
from designer.weighing.ladders import RUNGS, below, with_forms
from designer.weighing.tradeoff import PARTS, Tradeoff
from tests.oracles.settings import small_settings
from tests.published.corpus import as_setting, setting_of
from tests.published.families import midpoints, trade
from tests.weighing.posed import HAIR, STRICT, lowered, possible, with_allowances

BALANCED = Demands(balance="ex-post")
STRONGEST_FIRST = {
    "ic": ["dominant", "bayesian", "none"],
    "ir": ["ex-post", "interim", "ex-ante", "none"],
    "balance": ["ex-post", "ex-ante", "none"],
    "budget": ["exact", "no-deficit"],
    "decision": ["deterministic", "randomized"],
}


# -- ladders -----------------------------------------------------------------------------------


@settings(max_examples=8, deadline=None, suppress_health_check=list(HealthCheck))
@given(small_settings(most_profiles=4, most_options=2), STRICT)
def test_ladders_and_steps_against_every_combination(setting: Setting, demands: Demands) -> None:
    terms = demands.over(setting)
    assume(not possible(setting, terms))
    page = weigh(setting, demands, only=["ladders"])
    for ladder in page.ladders:
        assert ladder.proved
        forms = below(page.terms, ladder.demand)
        held = [
            form
            for form in forms
            if possible(setting, with_forms(page.terms, {ladder.demand: form}))
        ]
        assert ladder.settled == (held[0] if held else None)
    choices = {d: (getattr(page.terms, d), *below(page.terms, d)) for d in RUNGS}
    held_at = {
        rungs: possible(
            setting,
            with_forms(page.terms, {d: choices[d][r] for d, r in zip(RUNGS, rungs, strict=True)}),
        )
        for rungs in itertools.product(*(range(len(forms)) for forms in choices.values()))
    }
    best = {
        rungs
        for rungs, holds in held_at.items()
        if holds
        and not any(
            held_at[other]
            for other in held_at
            if other != rungs and all(a <= b for a, b in zip(other, rungs, strict=True))
        )
    }
    named = {
        frozenset((d, choices[d][r]) for d, r in zip(RUNGS, rungs, strict=True) if r)
        for rungs in best
    }
    assert {frozenset(step.forms) for step in page.steps} == named
    assert all(step.proved for step in page.steps)


def test_the_rungs_are_those_of_the_definitions() -> None:
    assert {name: list(forms) for name, forms in RUNGS.items()} == STRONGEST_FIRST


def test_the_ladder_of_trade() -> None:
    """Before types are known everyone takes part (d'Aspremont and Gerard-Varet 1979)."""
    page = weigh(setting_of("B06_base"), BALANCED, only=["ladders"])
    assert {one.demand: one.settled for one in page.ladders} == {
        "ic": "none",
        "ir": "ex-ante",
        "balance": "none",
        "budget": None,
        "decision": "randomized",
    }


def test_what_holds_is_climbed_upwards() -> None:
    """Two midpoints: even dominant honesty and participation in every case, for a posted price."""
    setting = as_setting(trade([Fraction(1), Fraction(2)]))
    page = weigh(setting, Demands(decision="randomized", ir="interim", balance="ex-ante"))
    assert page.status == "possible"
    assert page.prices == ()
    assert page.collisions == ()
    for step in page.steps:
        assert possible(setting, with_forms(page.terms, dict(step.forms)))
    for ladder in page.ladders:
        for form, held in ladder.tried:
            assert possible(setting, with_forms(page.terms, {ladder.demand: form})) is held


# -- room --------------------------------------------------------------------------------------


@settings(max_examples=12, deadline=None, suppress_health_check=list(HealthCheck))
@given(small_settings(most_profiles=6, most_options=2), STRICT)
def test_room_ends_where_it_says(setting: Setting, demands: Demands) -> None:
    demands = replace(demands, decision="randomized")
    assume(possible(setting, demands.over(setting)))
    page = weigh(setting, demands, only=["prices"])
    assert page.status == "possible"
    assert page.room or not page.groups
    names = tuple(party.name for party in setting.parties)
    for one in page.room:
        if one.amount is None:
            assert (one.reason, one.proved) == ("unbounded", True)
            continue
        assert one.proved
        assert one.amount >= 0
        for more, holds in ((Fraction(0), True), (HAIR, False)):
            moved, terms = setting, page.terms
            amount = one.amount + more
            if one.kind == "money":
                terms = with_allowances(terms, {"money": terms.subsidy - amount})
            elif one.kind == "shortfall":
                moved = lowered(setting, names, -amount)
            elif one.kind == "lies":
                terms = with_allowances(terms, {"lies": terms.slack - amount})
            else:
                key = one.kind.partition(":")[2]
                terms = replace(terms, limits=_tightened(terms.limits, key, amount))
            assert possible(moved, terms) is holds, one.kind


def _tightened(limits: Limits, key: str, amount: Fraction) -> Limits:
    if key == "pays_at_most":
        return replace(limits, pays_at_most=(limits.pays_at_most or Fraction(0)) - amount)
    return replace(limits, pays_at_least=(limits.pays_at_least or Fraction(0)) + amount)


def test_room_in_side_demands_and_caps() -> None:
    setting = as_setting(trade([Fraction(1), Fraction(2)]), side=Side(welfare_at_least=Fraction(0)))
    demands = Demands(decision="randomized", limits=Limits(pays_at_most=Fraction(5)))
    room = {one.kind: one for one in weigh(setting, demands, only=["prices"]).room}
    floor, cap = room["side:welfare_at_least"], room["limit:pays_at_most"]
    assert floor.becomes == Fraction(1, 4)  # all of it: 1/4 * (2 - 1)
    assert cap.becomes == 0  # nobody trades: nobody pays


# -- the ledger --------------------------------------------------------------------------------


@settings(max_examples=40, deadline=None, suppress_health_check=list(HealthCheck))
@given(small_settings(most_profiles=8, most_options=2), STRICT)
def test_the_ledger_sums_to_the_gap(setting: Setting, demands: Demands) -> None:
    """Its lines with the money allowed come to minus the gap, and the gap is the price."""
    assume(not possible(setting, demands.over(setting)))
    page = weigh(setting, demands, only=["prices", "ledger"])
    ledger, price = page.ledger, page.price("outside-money")
    assert ledger is not None
    assert ledger.proved
    if not ledger.entries:
        assert ledger.reason
        return
    assert ledger.total == -ledger.gap
    for party in setting.parties:
        worth = [e for e in ledger.entries if e.kind == "worth" and e.party == party.name]
        assert len(worth) == 1
    if price is not None and price.amount and ledger.gap > 0:
        assert ledger.gap == price.amount
    if ledger.gap <= 0:
        assert ledger.reason


def test_the_ledger_of_trade() -> None:
    """B06: 35 to share; each side's eager type must be left 40 half of the time; 5 are missing."""
    ledger = weigh(setting_of("B06_base"), BALANCED, only=["prices", "ledger"]).ledger
    assert ledger is not None
    lines = [(e.kind, e.party, e.type, int(e.amount)) for e in ledger.entries]
    assert lines == [
        ("worth", "Aster", "", 55),
        ("worth", "Briar", "", -20),
        ("rent", "Aster", "100", -20),
        ("rent", "Briar", "0", -20),
    ]
    assert (ledger.gap, ledger.allowed) == (Fraction(5), Fraction(0))


def test_what_balance_in_every_case_adds_has_a_line_of_its_own() -> None:
    """Correlated types leave nobody a rent (Cremer and McLean 1988), but bets cannot balance."""
    found = []
    for name in ("A02_corr_p13over50", "A02_corr_p1over5"):
        page = weigh(setting_of(name), BALANCED, only=["prices", "ledger"])
        if page.status == "impossible" and page.ledger is not None:
            found += [e.kind for e in page.ledger.entries]
            assert page.ledger.total == -page.ledger.gap
            assert not any(e.kind == "rent" for e in page.ledger.entries)
    assert "in-every-case" in found


def test_where_no_money_is_missing_the_ledger_says_so() -> None:
    demands = Demands(decision="efficient", ic="dominant", ir="none", balance="ex-post")
    ledger = weigh(setting_of("D01_n2_m2_1_3"), demands, only=["ledger"]).ledger
    assert ledger is not None
    assert ledger.entries == ()
    assert ledger.reason == "on average the pot can hold any amount: what is missing is not money"


# -- groups ------------------------------------------------------------------------------------


def test_groups_name_all_that_is_asked() -> None:
    setting = as_setting(trade(midpoints(2)))
    limits = Limits(Fraction(1), Fraction(-1), only_when_served=True, within_worth=True)
    side = Side(welfare_at_least=Fraction(0), revenue_at_least=Fraction(0))
    terms = Demands(limits=limits, side=side, compelled=frozenset({"Briar"})).over(setting)
    assert groups_of(setting, terms) == (
        "decision",
        "ic:Aster",
        "ic:Briar",
        "ir:Aster",
        "balance",
        "limit:pays_at_most",
        "limit:pays_at_least",
        "limit:only_when_served",
        "limit:within_worth",
        "side:welfare_at_least",
        "side:revenue_at_least",
    )


def test_dropping_every_group_asks_for_nothing() -> None:
    setting = as_setting(trade(midpoints(2)))
    terms = Demands(limits=Limits(pays_at_most=Fraction(1)), even_handed=True).over(setting)
    bare = without(terms, groups_of(setting, terms))
    assert groups_of(setting, bare) == ()


def test_a_cap_upon_service_stays_when_the_plain_cap_is_dropped() -> None:
    terms = Terms(limits=Limits(pays_at_most=Fraction(1), only_when_served=True))
    assert without(terms, {"limit:pays_at_most"}) == terms
    both = without(terms, {"limit:pays_at_most", "limit:only_when_served"})
    assert both.limits == Limits()


# -- laws --------------------------------------------------------------------------------------


@settings(max_examples=10, deadline=None, suppress_health_check=list(HealthCheck))
@given(small_settings(most_profiles=6, most_options=2), STRICT)
def test_prices_fall_with_every_relaxation(setting: Setting, demands: Demands) -> None:
    """Asking less of the rest never makes a way out dearer."""
    assume(not possible(setting, demands.over(setting)))
    prices = {p.relax: p.amount for p in weigh(setting, demands, only=["prices"]).prices}
    weaker = [replace(demands, budget="no-deficit"), replace(demands, limits=Limits())]
    if demands.ic == "dominant":
        weaker.append(replace(demands, ic="bayesian"))
    if demands.balance == "ex-post":
        weaker.append(replace(demands, balance="ex-ante"))
    for less in weaker:
        page = weigh(setting, less, only=["prices"])
        cheaper = {p.relax: p.amount for p in page.prices}
        for relax, amount in prices.items():
            if page.status == "possible" or relax not in cheaper or amount is None:
                continue
            lower = cheaper[relax]
            assert lower is not None
            assert lower <= amount, relax


# -- stopping ----------------------------------------------------------------------------------


class _Patience:
    """Presses Ctrl-C once the page has grown so often."""

    def __init__(self, times: int) -> None:
        self.left = times

    def __call__(self, page: Tradeoff) -> None:
        self.left -= 1
        if self.left == 0:
            raise KeyboardInterrupt


@pytest.mark.parametrize("times", [1, 4, 12, 25])
def test_ctrl_c_keeps_what_was_found(times: int) -> None:
    setting = as_setting(trade(midpoints(8)))
    whole = weigh(setting, BALANCED)
    page = weigh(setting, BALANCED, found=_Patience(times))
    assert not page.complete
    assert page.reasons == {"page": "interrupted"}
    assert (page.status, page.proved) == ("impossible", True)
    assert page.prices == whole.prices[: len(page.prices)]
    assert page.sets == whole.sets[: len(page.sets)]
    for one in page.frontiers:
        assert one.complete is (one in whole.frontiers)


def test_ctrl_c_inside_an_engine_stops_the_page(monkeypatch: pytest.MonkeyPatch) -> None:
    """`prove` turns Ctrl-C into an undecided answer; the page must not go on after it."""
    from designer.engines.hot import HotHighs

    asked = 0
    solve = HotHighs.solve

    def pressed(self: HotHighs, *given: object, **more: object) -> object:
        nonlocal asked
        asked += 1
        if asked == 5:
            raise KeyboardInterrupt
        return solve(self, *given, **more)  # type: ignore[arg-type]

    monkeypatch.setattr(HotHighs, "solve", pressed)
    page = weigh(as_setting(trade(midpoints(8))), BALANCED)
    assert asked == 5
    assert page.reasons == {"page": "interrupted"}
    assert page.status == "impossible"
    assert 0 < len(page.prices) < 9


def test_no_time_at_all_leaves_the_matter_undecided() -> None:
    page = weigh(setting_of("B06_base"), BALANCED, time_limit=0)
    assert (page.status, page.proved, page.complete) == ("undecided", False, False)
    assert page.reasons == {"page": watch.TimeUp.reason}


def test_the_page_tells_of_all_it_finds() -> None:
    seen: list[Tradeoff] = []
    page = weigh(setting_of("B06_base"), BALANCED, found=seen.append)
    assert page.complete
    assert seen[0].status == "impossible"
    assert [len(one.prices) for one in seen] == sorted(len(one.prices) for one in seen)
    assert seen[-1].corners == page.corners
    assert set(page.seconds) == {"verdict", *PARTS}


def test_only_some_parts() -> None:
    page = weigh(setting_of("B06_base"), BALANCED, only=["collisions"])
    assert page.sets
    assert (page.prices, page.ladders, page.frontiers, page.ledger) == ((), (), (), None)
    with pytest.raises(UsageError, match="'prizes'"):
        weigh(setting_of("B06_base"), BALANCED, only=["prizes"])


def test_without_lotteries_there_are_prices_but_no_frontiers() -> None:
    """Whole decisions leave holes; money is still priced, exactly (entry B06)."""
    setting = setting_of("B06_base")
    side = Side(welfare_at_least=Fraction(35))
    page = weigh(setting, Demands(decision="deterministic", side=side))
    assert page.status == "impossible"
    assert page.frontiers == ()
    money = page.price("outside-money")
    assert money is not None
    assert money.proved
    assert money.amount == 5
    floor = page.price("side:welfare_at_least")
    assert floor is not None
    assert floor.becomes == 30  # the best sure decisions


def test_another_engine_gives_the_same_page() -> None:
    setting = setting_of("B06_base")
    one = weigh(setting, BALANCED)
    two = weigh(setting, BALANCED, engine="pulp:HiGHS")
    assert [(p.relax, p.amount, p.buys) for p in one.prices] == [
        (p.relax, p.amount, p.buys) for p in two.prices
    ]
    assert one.frontiers == two.frontiers
    assert one.corners == two.corners
    assert set(one.sets) == set(two.sets)
