"""Collisions against brute force: every subset of the groups, posed one by one."""

from __future__ import annotations

import itertools
from dataclasses import replace
from fractions import Fraction

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from designer import Demands, weigh
from designer.setting.setting import Chance, Limits, Setting, Side
from designer.weighing.collisions import GroupSet, explore
from designer.weighing.groups import groups_of, without
from tests.oracles.settings import small_settings
from tests.published.corpus import as_setting, setting_of
from tests.published.families import endpoints, even, midpoints, one_item, trade
from tests.weighing.posed import STRICT, mix_of, possible


def by_brute_force(
    setting: Setting, demands: Demands
) -> tuple[set[frozenset[str]], set[frozenset[str]]]:
    """The minimal impossible and maximal possible sets among all 2**n, by posing each."""
    terms = demands.over(setting)
    groups = groups_of(setting, terms)
    held: dict[frozenset[str], bool] = {}
    for size in range(len(groups) + 1):
        for chosen in itertools.combinations(groups, size):
            kept = frozenset(chosen)
            held[kept] = possible(setting, without(terms, set(groups) - kept))
    minimal = {
        kept
        for kept, holds in held.items()
        if not holds and all(held[kept - {group}] for group in kept)
    }
    maximal = {
        kept
        for kept, holds in held.items()
        if holds and not any(held[kept | {group}] for group in set(groups) - kept)
    }
    return minimal, maximal


def agree(setting: Setting, demands: Demands) -> list[GroupSet]:
    found = list(explore(mix_of(setting, demands)))
    assert all(one.proved for one in found)
    collisions = [frozenset(one.groups) for one in found if one.collides]
    kept = [frozenset(one.groups) for one in found if not one.collides]
    assert len(set(collisions)) == len(collisions)
    assert len(set(kept)) == len(kept)
    assert (set(collisions), set(kept)) == by_brute_force(setting, demands)
    return found


@settings(max_examples=25, deadline=None, suppress_health_check=list(HealthCheck))
@given(small_settings(most_profiles=4, most_options=2), STRICT)
def test_all_subsets_of_random_mixes(setting: Setting, demands: Demands) -> None:
    agree(setting, demands)


@settings(max_examples=6, deadline=None, suppress_health_check=list(HealthCheck))
@given(small_settings(most_profiles=4, most_options=2, with_rule=True), st.booleans())
def test_all_subsets_under_a_given_rule(setting: Setting, even_handed: bool) -> None:
    agree(setting, Demands(decision="table", ir="ex-post", even_handed=even_handed))


def test_all_subsets_without_lotteries() -> None:
    data = one_item([midpoints(2), endpoints(2)])
    side = Side(welfare_at_least=Fraction(3, 5), revenue_at_least=Fraction(1, 2))
    demands = Demands(decision="deterministic", balance="none")
    agree(as_setting(data, side=side), demands)


def test_side_demands_collide_under_their_own_names() -> None:
    """At (low, low), half of either type's cases, both shares would have to be 3/4 or more."""
    item = as_setting(one_item([midpoints(2), midpoints(2)]))
    chances = (
        Chance(party=0, type=0, option=1, at_least=Fraction(7, 8)),
        Chance(party=1, type=0, option=2, at_least=Fraction(7, 8)),
        Chance(party=1, type=1, option=2, at_least=Fraction(1, 2)),
    )
    setting = replace(item, side=Side(welfare_at_least=Fraction(1, 2), chances=chances))
    found = agree(setting, Demands(decision="randomized", balance="none"))
    collisions = {frozenset(one.groups) for one in found if one.collides}
    assert frozenset({"side:chance[0]", "side:chance[1]"}) in collisions
    assert all(any(group.startswith("side:") for group in one) for one in collisions)


def test_limits_collide_under_their_own_names() -> None:
    """Nobody pays more than 0, yet the outlay is to be covered whenever it is made."""
    setting = as_setting(one_item([midpoints(2), midpoints(2)]))
    setting = replace(setting, outlay=setting.outlay + 1)
    demands = Demands(
        decision="randomized",
        ic="none",
        ir="none",
        budget="no-deficit",
        limits=Limits(pays_at_most=Fraction(0), only_when_served=True),
    )
    found = agree(setting, demands)
    served = frozenset({"limit:only_when_served", "balance"})
    assert served in {frozenset(one.groups) for one in found if one.collides}


# Green and Laffont 1979; Walker 1980 (entries D01 and D04 of the corpus): dominant strategies,
# the efficient project and exact balance collide, for all parties together, without anyone
# having to take part; a party whose type is known takes up what is left over.


@pytest.mark.parametrize("instance", ["D01_n2_m2_1_3", "D01_n2_m3_m1_2", "D01_n3_m3_m1_1_3"])
def test_dominant_efficient_and_balanced_collide(instance: str) -> None:
    setting = setting_of(instance)
    demands = Demands(decision="efficient", ic="dominant", ir="none", balance="ex-post")
    found = weigh(setting, demands, only=["collisions"])
    assert (found.status, found.proved, found.complete) == ("impossible", True, True)
    honest = {f"ic:{party.name}" for party in setting.parties}
    everything = frozenset({"decision", "balance"} | honest)
    assert [frozenset(one.groups) for one in found.collisions] == [everything]
    kept = {frozenset(one.groups) for one in found.possible_sets}
    assert kept == {everything - {group} for group in everything}
    assert all(one.proved for one in found.sets)


def test_a_party_of_known_type_resolves_the_collision() -> None:
    demands = Demands(decision="efficient", ic="dominant", ir="none", balance="ex-post")
    found = weigh(setting_of("D04_with_sink"), demands)
    assert (found.status, found.collisions) == ("possible", ())
    assert [one.groups for one in found.possible_sets] == [found.groups]


def test_efficient_trade_collides_as_a_whole() -> None:
    """Myerson and Satterthwaite 1983, six midpoints: every demand is needed for it."""
    found = weigh(as_setting(trade(midpoints(6))), Demands(balance="ex-post"), only=["collisions"])
    assert [one.groups for one in found.collisions] == [found.groups]
    assert len(found.possible_sets) == len(found.groups) == 6


# -- many groups ----------------------------------------------------------------------------


def test_dozens_of_groups_take_few_programs() -> None:
    """Two dozen groups have 2**24 subsets; what is learnt settles nearly all of them."""
    size = 4
    item = as_setting(one_item([midpoints(2)] * size, [even(2)] * size))
    wanted = [
        Chance(party=i, type=a, option=i + 1, at_least=Fraction(share, 8))
        for i in range(size)
        for a, share in ((0, 3), (1, 4))
    ]
    refused = [
        Chance(party=i, type=a, option=0, at_most=Fraction(1, 2))
        for i in range(size)
        for a in range(2)
    ]
    setting = replace(
        item, side=Side(welfare_at_least=Fraction(1, 4), chances=tuple(wanted + refused))
    )
    mix = mix_of(setting, Demands(decision="randomized", balance="ex-post"))
    assert len(mix.groups) >= 24
    found = list(explore(mix))
    collisions = [frozenset(one.groups) for one in found if one.collides]
    kept = [frozenset(one.groups) for one in found if not one.collides]
    assert collisions
    assert all(one.proved for one in found)
    # Duality (Reiter 1987): the complements of the possible sets are exactly the minimal ways
    # to hit every collision.
    everything = frozenset(mix.groups)
    for one in kept:
        left = everything - one
        assert all(left & core for core in collisions)
        assert all(any(core & left == {group} for core in collisions) for group in left)
    assert not any(core <= one for core in collisions for one in kept)
    assert mix.posed <= 4 * (len(found) + len(mix.groups))
