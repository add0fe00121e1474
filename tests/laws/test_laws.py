"""Laws of posing, on random small settings: what must not change, and which way what changes."""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction
from typing import Any

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from designer.demands.terms import Terms
from designer.posing import pose_terms
from designer.roads.product import as_independent
from designer.setting.setting import IntArray, Party, Setting
from designer.setting.vocabulary import BALANCE, HONESTY, PARTICIPATION
from designer.verdict import Verdict
from tests.oracles.settings import small_settings

MONEY = ("outside-money", "revenue", "welfare", "parties", "floor", "swing", "margin", "worst-pot")
GOALS = (*MONEY, "returned-share")
HIGHER_IS_BETTER = {*MONEY, "returned-share"} - {"outside-money", "swing"}


@st.composite
def terms(draw: st.DrawFn, decisions: tuple[str, ...] = ("efficient", "randomized")) -> Terms:
    """Demands of every strength, one goal, no tidy stage."""
    goal = draw(st.sampled_from(GOALS))
    return Terms(
        decision=draw(st.sampled_from(decisions)),
        ic=draw(st.sampled_from(HONESTY[1:] if goal == "margin" else HONESTY)),
        ir=draw(st.sampled_from(PARTICIPATION)),
        balance=draw(st.sampled_from(BALANCE[1:] if goal == "outside-money" else BALANCE)),
        budget=draw(st.sampled_from(("exact", "no-deficit"))),
        goals=(goal,),
        tidy="none",
        subsidy=draw(st.sampled_from((Fraction(0), Fraction(1, 2), Fraction(3)))),
    )


def posed(setting: Setting, asked: Terms) -> Verdict:
    verdict = pose_terms(setting, asked, path="full")
    assert verdict.proved, verdict.reason
    return verdict


def same(one: Verdict, two: Verdict, factor: Fraction = Fraction(1)) -> None:
    assert one.status == two.status
    if one.goal_value is not None:
        assert two.goal_value == one.goal_value * factor


def reordered(setting: Setting, order: list[int]) -> Setting:
    """The parties in another order, everything else following."""
    shape = setting.shape
    old = np.arange(setting.profiles).reshape(shape).transpose(order).ravel()

    def moved(party: Party) -> Party:
        value = party.value[old] if party.depends else party.value
        outside = party.outside[old] if party.outside_depends else party.outside
        return replace(party, value=value, outside=outside)

    return replace(
        setting,
        parties=tuple(moved(setting.parties[i]) for i in order),
        joint=None if setting.joint is None else setting.joint[old],
        rule=None if setting.rule is None else setting.rule[old],
    )


@settings(max_examples=80, deadline=None, derandomize=True)
@given(small_settings(), terms(), st.randoms(use_true_random=False))
def test_reordering_the_parties_changes_only_labels(
    setting: Setting, asked: Terms, random: object
) -> None:
    order = list(range(len(setting.parties)))
    random.shuffle(order)  # type: ignore[attr-defined]
    same(posed(setting, asked), posed(reordered(setting, order), asked))


@settings(max_examples=80, deadline=None, derandomize=True)
@given(small_settings(), terms(), st.sampled_from((2, 5, 12)))
def test_a_finer_coin_scales_the_optimum(setting: Setting, asked: Terms, factor: int) -> None:
    fine = replace(setting, grain=setting.grain * factor)
    smaller = replace(asked, subsidy=asked.subsidy / factor)
    scale = Fraction(1, factor) if asked.goals[0] in MONEY else Fraction(1)
    same(posed(setting, asked), posed(fine, smaller), scale)


@settings(max_examples=60, deadline=None, derandomize=True)
@given(small_settings(), terms(), st.integers(2, 7))
def test_only_proportions_of_weights_count(setting: Setting, asked: Terms, factor: int) -> None:
    def scaled(weights: IntArray | None) -> IntArray | None:
        return None if weights is None else weights * factor

    parties = tuple(
        replace(p, weights=tuple(w * factor for w in p.weights)) for p in setting.parties
    )
    scaled_setting = replace(setting, parties=parties, joint=scaled(setting.joint))
    same(posed(setting, asked), posed(scaled_setting, asked))


STRONGER = {
    "ic": {"none": "bayesian", "bayesian": "dominant"},
    "ir": {"none": "ex-ante", "ex-ante": "interim", "interim": "ex-post"},
    "balance": {"none": "ex-ante", "ex-ante": "ex-post"},
    "budget": {"no-deficit": "exact"},
    "decision": {"randomized": "deterministic"},
}


@settings(max_examples=150, deadline=None, derandomize=True)
@given(small_settings(most_profiles=6), terms(), st.sampled_from(sorted(STRONGER)))
def test_asking_more_never_pays(setting: Setting, asked: Terms, demand: str) -> None:
    """Adding or strengthening a demand cannot turn impossible into possible nor improve."""
    more = STRONGER[demand].get(getattr(asked, demand))
    # Off the support a demand in every case says nothing about the average, and conversely.
    if more is None or setting.support_only:
        return
    changed: dict[str, Any] = {demand: more}
    weak, strong = posed(setting, asked), posed(setting, replace(asked, **changed))
    goal = asked.goals[0]
    if strong.status == "unbounded":
        assert weak.status == "unbounded"
    if strong.status == "possible":
        assert weak.status in ("possible", "unbounded")
    if weak.goal_value is not None and strong.goal_value is not None:
        if goal in HIGHER_IS_BETTER:
            assert strong.goal_value <= weak.goal_value
        else:
            assert strong.goal_value >= weak.goal_value


def twins(setting: Setting) -> Setting:
    """Every party a copy of the first, with private worths and independent types."""
    first = setting.parties[0]
    return replace(
        setting,
        parties=tuple(replace(first, name=f"twin {i}") for i in range(len(setting.parties))),
        joint=None,
        rule=None,
    )


@settings(max_examples=60, deadline=None, derandomize=True)
@given(small_settings(correlated=False, interdependent=False), terms())
def test_even_handedness_is_free_among_twins(setting: Setting, asked: Terms) -> None:
    """Averaging a table over swaps of twins keeps every demand and every goal."""
    alike = twins(setting)
    same(posed(alike, asked), posed(alike, replace(asked, even_handed=True)))


@settings(max_examples=60, deadline=None, derandomize=True)
@given(small_settings(correlated=False, interdependent=False), terms())
def test_a_product_written_as_a_joint_prior_is_independent(setting: Setting, asked: Terms) -> None:
    joint = replace(setting, joint=setting.weights.copy(), support_only=False)
    back = as_independent(joint)
    assert back is not None
    assert back.joint is None
    same(posed(joint, asked), posed(back, asked))
