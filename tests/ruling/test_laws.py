"""What each rule promises, on random small settings; and agreement with the proved optimum."""

from __future__ import annotations

import itertools
from collections.abc import Callable
from fractions import Fraction

from hypothesis import HealthCheck, assume, given, settings
from hypothesis import strategies as st

from designer import Demands, Table, audit, pose
from designer.ruling import one_way
from designer.ruling.bayesian_full_extraction import bets, paid_before
from designer.ruling.deal import deal
from designer.ruling.kinds import Refusal
from designer.ruling.profiles import independent
from designer.ruling.registry import RULES
from designer.setting.setting import Setting
from tests.oracles.brute import net_worth, outside
from tests.ruling.helpers import audit_of, expect, table_of, with_rule
from tests.strategies import small_settings

Property = Callable[[Setting], None]


def laws(examples: int = 60) -> Callable[[Property], Property]:
    """A fixed number of drawn settings, the same on every run."""
    return settings(
        max_examples=examples,
        deadline=None,
        derandomize=True,
        suppress_health_check=[HealthCheck.filter_too_much, HealthCheck.too_slow],
    )


private = small_settings(interdependent=False, compelled=False)
free = small_settings(interdependent=False, compelled=False, correlated=False)


# -- what the sources promise


@laws()
@given(private)
def test_groves_rules_are_efficient_and_dominant(setting: Setting) -> None:
    """Groves 1973, Theorem 1: whatever the prior; rebates keep it (Cavallo, Bailey)."""
    names = ["groves", "pivotal", "pivotal-equal-shares"]
    if len(setting.parties) > 1:
        names += ["cavallo-rebate", "bailey-rebate"]
    if RULES["marginal-product"].applies(setting) is None:
        names.append("marginal-product")
    for name in names:
        found = audit_of(name, setting)
        assert found.worst["ic-dominant"].violation == 0, name
        assert found.decisions.efficient.holds, name
        assert found.decisions.certain


@laws()
@given(private)
def test_equal_shares_cover_the_outlay(setting: Setting) -> None:
    """Tideman and Tullock 1976: the pivotal taxes only add; Cavallo 2006 keeps that."""
    pivotal = audit_of("pivotal-equal-shares", setting)
    assert pivotal.pot.least >= 0
    if len(setting.parties) > 1:
        back = audit_of("cavallo-rebate", setting)
        assert back.pot.least >= 0
        assert back.pot.expected <= pivotal.pot.expected


@laws()
@given(private)
def test_expected_externality_balances_in_every_case(setting: Setting) -> None:
    """By d'Aspremont and Gerard-Varet 1979: outlays covered to the last unit, any prior."""
    assume(RULES["expected-externality"].applies(setting) is None)
    found = audit_of("expected-externality", setting)
    assert found.pot.least == found.pot.most == 0
    assert found.decisions.efficient.holds
    if independent(setting):
        assert found.worst["ic-bayesian"].violation == 0


@laws()
@given(private)
def test_deals_at_posted_prices_are_sound(setting: Setting) -> None:
    """Honest in every case, joined in every case, balanced in every case."""
    for name in ("posted-price", "equal-shares-with-unanimity"):
        if RULES[name].applies(setting) is None:
            found = audit_of(name, setting)
            assert found.worst["ic-dominant"].violation == 0
            assert found.worst["ir-ex-post"].violation == 0
            assert found.pot.least == found.pot.most == 0


@laws()
@given(small_settings(outlay=True, interdependent=False))
def test_shares_by_report_cover_the_outlay_and_hurt_nobody_who_is_honest(setting: Setting) -> None:
    assume(RULES["proportional-to-report"].applies(setting) is None)
    found = audit_of("proportional-to-report", setting)
    assert found.pot.least == found.pot.most == 0
    assert found.decisions.efficient.holds


# -- agreement with the proved optimum


@laws(40)
@given(free)
def test_no_honest_table_of_that_rule_fills_the_pot_more(setting: Setting) -> None:
    """Shortest paths against the program: the same decisions, the same largest pot."""
    table = table_of("revenue-greatest-efficient", setting)
    demands = Demands(
        decision="table", ic="bayesian", ir="interim", balance="none", goal="revenue", tidy="none"
    )
    verdict = pose(with_rule(setting, table), demands)
    assert verdict.proved
    found = audit(setting, table)
    assert verdict.goal_value == found.pot.expected
    assert found.worst["ic-bayesian"].violation == 0
    assert found.worst["ir-interim"].violation == 0
    if len(setting.parties) > 1:
        assert found.pot.least == found.pot.most


@st.composite
def lines(draw: st.DrawFn) -> Setting:
    """One-way settings: worths slope * x + rest, outlays, priors of their own."""
    from tests.published.corpus import as_setting

    count, options = draw(st.integers(1, 3)), draw(st.integers(2, 3))
    agents = []
    for _ in range(count):
        size = draw(st.integers(1, 3))
        level = draw(st.lists(st.integers(-6, 9), min_size=size, max_size=size))
        slope = draw(st.lists(st.integers(0, 2), min_size=options, max_size=options))
        rest = draw(st.lists(st.integers(-2, 3), min_size=options, max_size=options))
        out = draw(st.integers(-1, 1))
        weights = draw(st.lists(st.integers(1, 5), min_size=size, max_size=size))
        agents.append(
            {
                "types": [f"t{a}" for a in range(size)],
                "values": [
                    [str(q * x + r) for q, r in zip(slope, rest, strict=True)] for x in level
                ],
                "prior": [str(Fraction(w, sum(weights))) for w in weights],
                "reservation": [str(out)] * size,
            }
        )
    costs = draw(st.lists(st.integers(0, 6), min_size=options, max_size=options))
    return as_setting(
        {
            "agents": agents,
            "decisions": [str(k) for k in range(options)],
            "decision_cost": [str(cost) for cost in costs],
        }
    )


@laws(50)
@given(lines())
def test_virtual_worths_find_the_most_revenue(setting: Setting) -> None:
    """Myerson 1981 against the program, for any one-way worths; dominant and ex post besides."""
    assert one_way.fits(setting) is None
    found = audit_of("optimal-auction", setting)
    assert found.worst["ic-dominant"].violation == 0
    assert found.worst["ir-ex-post"].violation == 0
    demands = Demands(
        decision="randomized",
        ic="bayesian",
        ir="interim",
        balance="none",
        goal="revenue",
        tidy="none",
    )
    assert pose(setting, demands).goal_value == found.pot.expected


@laws(50)
@given(lines())
def test_one_multiplier_finds_the_second_best(setting: Setting) -> None:
    """Myerson and Satterthwaite 1983, Theorem 2, against the program."""
    demands = Demands(
        decision="randomized",
        ic="bayesian",
        ir="interim",
        balance="ex-ante",
        budget="no-deficit",
        goal="welfare",
        tidy="none",
    )
    verdict = pose(setting, demands)
    if RULES["second-best"].applies(setting) is not None:
        assert verdict.status == "impossible"
        return
    found = audit_of("second-best", setting)
    assert verdict.goal_value == found.decisions.welfare
    assert found.worst["ic-bayesian"].violation == 0
    assert found.worst["ir-interim"].violation == 0
    if len(setting.parties) > 1:
        assert found.pot.least == found.pot.most == 0


@laws(40)
@given(small_settings(interdependent=False, compelled=False, correlated=True, outlay=False))
def test_bets_take_everything_where_beliefs_span(setting: Setting) -> None:
    """Cremer and McLean 1988, Theorem 1: every type is left exactly its outside option."""
    assume(RULES["full-extraction"].applies(setting) is None)
    found = audit_of("full-extraction", setting)
    assert found.worst["ic-dominant"].violation == 0
    assert all(standing.gain == 0 for standing in found.standings)


correlated = small_settings(interdependent=False, compelled=False, correlated=True)


@laws(80)
@given(correlated)
def test_bets_that_follow_the_report_take_everything_where_any_can(setting: Setting) -> None:
    """Cremer and McLean 1988, Theorem 2, and its converse for the worths at hand.

    Where the rule applies nobody keeps anything and honesty pays; where it does not, the program
    with the same decisions finds no table that takes everything.
    """
    pivotal = table_of("pivotal", setting)
    everything = audit(setting, pivotal).decisions.welfare - sum(
        (
            setting.probability(p) * (outside(setting, i, p))
            for p in range(setting.profiles)
            for i in range(len(setting.parties))
        ),
        expect(setting, [designers_worth(setting, pivotal, p) for p in range(setting.profiles)]),
    )
    demands = Demands(
        decision="table", ic="bayesian", ir="interim", balance="none", goal="revenue", tidy="none"
    )
    most = pose(with_rule(setting, pivotal), demands).goal_value
    assert most is not None
    if RULES["bayesian-full-extraction"].applies(setting) is not None:
        assert most < everything
        return
    assert most == everything
    found = audit_of("bayesian-full-extraction", setting)
    assert found.worst["ic-bayesian"].violation == 0
    assert all(standing.gain == 0 for standing in found.standings)
    assert found.pot.expected == everything


def designers_worth(setting: Setting, table: Table, p: int) -> Fraction:
    """What the designer herself has from the decision: worth that is no money."""
    chances = (Fraction(int(x), table.decides_den) for x in table.decides[p])
    worths = (Fraction(int(w), setting.grain) for w in setting.worth)
    return sum((x * w for x, w in zip(chances, worths, strict=True)), Fraction(0))


@laws(40)
@given(correlated)
def test_bets_that_follow_the_report_are_the_smallest(setting: Setting) -> None:
    """Where beliefs span, the dominant bets would do as well: they are never smaller in squares."""
    assume(RULES["full-extraction"].applies(setting) is None)
    choice, paid = paid_before(setting)
    base = table_of("pivotal", setting)
    dominant = table_of("full-extraction", setting)
    for i, amounts in enumerate(paid):
        mine = bets(setting, i, choice, amounts)
        for a in range(setting.shape[i]):
            at = [p for p in range(setting.profiles) if setting.types_at(p)[i] == a]
            squares = sum((mine.at(p) ** 2 for p in at), Fraction(0))
            theirs = sum(
                ((dominant.payment(i, p) - base.payment(i, p)) ** 2 for p in at), Fraction(0)
            )
            assert squares <= theirs


# -- the search for prices, by brute force


@st.composite
def deals(draw: st.DrawFn) -> Setting:
    """A deal among two or three, at an outlay, with a prior of any kind."""
    from tests.published.corpus import as_setting

    count = draw(st.integers(1, 3))
    sizes = [draw(st.integers(1, 3)) for _ in range(count)]
    data: dict[str, object] = {
        "agents": [
            {
                "types": [f"t{a}" for a in range(size)],
                "values": [["0", str(draw(st.integers(-5, 9)))] for _ in range(size)],
            }
            for size in sizes
        ],
        "decisions": ["no", "yes"],
        "decision_cost": ["0", str(draw(st.integers(0, 8)))],
    }
    total = 1
    for size in sizes:
        total *= size
    weights = draw(st.lists(st.integers(1, 4), min_size=total, max_size=total))
    data["joint"] = [str(Fraction(w, sum(weights))) for w in weights]
    return as_setting(data)


@laws()
@given(deals())
def test_marginal_products_never_hurt(setting: Setting) -> None:
    """Makowski and Ostroy 1987: taking part pays in every case, and truth is dominant."""
    found = audit_of("marginal-product", setting)
    assert found.worst["ir-ex-post"].violation == 0
    assert found.worst["ic-dominant"].violation == 0


@laws(80)
@given(deals())
def test_no_other_prices_are_better(setting: Setting) -> None:
    """All prices that add up to the outlay on a fine grid; a price matters only at the worths."""
    found = deal(setting)
    assert not isinstance(found, Refusal)
    best = audit_of("posted-price", setting).decisions.welfare
    cost = int(found.cost)
    choices = [range(-9, 18)] * (len(setting.parties) - 1)
    for some in itertools.product(*choices):
        prices = [*some, cost - sum(some)]
        worth = Fraction(0)
        for profile in range(setting.profiles):
            types = setting.types_at(profile)
            if all(
                net.at(a) >= price for net, a, price in zip(found.net, types, prices, strict=True)
            ):
                worth += setting.probability(profile) * net_worth(setting, 1, profile)
        assert worth <= best
