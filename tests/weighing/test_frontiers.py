"""Frontiers: convex, exact and complete; held against posing, a closed form and projections."""

from __future__ import annotations

import itertools
import random
from collections.abc import Sequence
from dataclasses import replace
from fractions import Fraction

import pytest
from hypothesis import HealthCheck, assume, given, settings
from hypothesis import strategies as st

from designer import Demands, pose, weigh
from designer.demands.terms import Terms
from designer.engines.highs import HIGHS
from designer.engines.watch import Watch
from designer.posing import pose_terms
from designer.setting.setting import Setting
from designer.weighing.averages import on_average
from designer.weighing.frontier import TRIPLE, Frontier, bends, corner_list, trace
from designer.weighing.hull import LowerHull
from designer.weighing.relaxed import Relaxed
from designer.weighing.surface import Surface
from designer.weighing.tradeoff import Tradeoff
from tests.oracles.brute import best_of_efficient, net_worth
from tests.oracles.settings import small_settings
from tests.oracles.simplex import Row, maximise
from tests.published.corpus import as_setting, setting_of
from tests.published.families import midpoints, trade
from tests.weighing.posed import HAIR, STRICT, lowered, mix_of, possible, with_allowances

Corner = tuple[Fraction, ...]
BALANCED = Demands(balance="ex-post")


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


def at(found: Frontier, x: Fraction) -> Fraction:
    """The least y at an x between the ends, on the line through the corners."""
    for left, right in itertools.pairwise(found.corners):
        if left[0] <= x <= right[0]:
            return left[1] + (right[1] - left[1]) * (x - left[0]) / (right[0] - left[0])
    (x0, y0) = found.corners[-1]
    assert x >= x0
    return y0


def had(setting: Setting, terms: Terms, found: Frontier, x: Fraction, y: Fraction) -> bool:
    """Whether `pose` finds a table with these two criteria."""
    allowances = {found.x: x, found.y: y}
    if "welfare" in allowances:
        allowances["welfare_at_least"] = best(setting) - allowances.pop("welfare")
    return possible(setting, with_allowances(terms, allowances))


def convex(found: Frontier) -> None:
    """Falling, and ever less steeply; no corner on the line between its neighbours."""
    slopes = [
        (right[1] - left[1]) / (right[0] - left[0])
        for left, right in itertools.pairwise(found.corners)
    ]
    assert all(slope < 0 for slope in slopes)
    assert all(one < two for one, two in itertools.pairwise(slopes))


def consistent(setting: Setting, terms: Terms, found: Frontier) -> None:
    """Posing at and between corners gives just what the frontier says, and nothing a hair below."""
    convex(found)
    xs = [corner[0] for corner in found.corners]
    xs += [(left + right) / 2 for left, right in itertools.pairwise(xs)]
    if found.x != "money":  # money must be used up where the pot is to come out exactly
        xs.append(xs[-1] + 1)
    for x in xs:
        y = at(found, x)
        assert had(setting, terms, found, x, y), (found.x, found.y, x, y)
        if y >= HAIR + (terms.subsidy if found.y == "money" else 0):
            assert not had(setting, terms, found, x, y - HAIR), (found.x, found.y, x, y)
    allowed_already = terms.subsidy if found.x == "money" else Fraction(0)
    if found.corners[0][0] >= allowed_already + HAIR:
        huge = found.corners[0][1] + 1000
        assert not had(setting, terms, found, found.corners[0][0] - HAIR, huge)


@settings(max_examples=12, deadline=None, suppress_health_check=list(HealthCheck))
@given(small_settings(most_profiles=6, most_options=2), STRICT)
def test_posing_at_and_between_corners(setting: Setting, demands: Demands) -> None:
    terms = demands.over(setting)
    assume(not possible(setting, terms))
    page = weigh(setting, demands, only=["frontiers"])
    assert page.complete
    assert page.frontiers
    for found in page.frontiers:
        assert found.proved, (found.x, found.y)
        assert found.complete
        if found.corners:
            consistent(setting, page.terms, found)


# -- closed form -------------------------------------------------------------------------------


def knapsack(size: int) -> list[Corner]:
    """Money against welfare for uniform trade on midpoints, from the knapsack of entry B03.

    Trades by index difference d have weight (K-d)/K**2, gain d/K and budget (2d-K+1)/K each; the
    best are filled from the top, and outside money pays for those that run out of budget.
    """
    gains = {d: Fraction((size - d) * d, size**3) for d in range(1, size)}
    budgets = {d: Fraction((size - d) * (2 * d - size + 1), size**3) for d in range(1, size)}
    lost, budget = sum(gains.values()), Fraction(0)
    corners: list[Corner] = []
    for d in range(size - 1, 0, -1):
        before, budget_before = lost, budget
        lost, budget = lost - gains[d], budget + budgets[d]
        if budget < 0:
            if not corners:
                part = budget_before / -budgets[d]
                corners.append((Fraction(0), before - part * gains[d]))
            corners.append((-budget, lost))
    return bends(corners)


@pytest.mark.parametrize("size", [6, 7, 9, 12, 16])
def test_money_against_welfare_in_trade_is_the_knapsack(size: int) -> None:
    """Every corner of the frontier, exactly (Myerson and Satterthwaite 1983; entry B03)."""
    expected = knapsack(size)
    assert expected[-1][0] == Fraction((size - 1) * (size - 5), 6 * size**2)
    assert not expected[-1][1]
    page = weigh(as_setting(trade(midpoints(size))), BALANCED, only=["frontiers"])
    by_name = {(one.x, one.y): one for one in page.frontiers}
    assert list(by_name["money", "welfare"].corners) == expected
    # A floor lowered for both parties alike is worth two units of money.
    halved = [(x / 2, y) for x, y in expected]
    assert list(by_name["shortfall", "welfare"].corners) == halved
    assert all(one.proved and one.complete for one in page.frontiers)


# -- independent rational simplex ----------------------------------------------------------------


@settings(max_examples=6, deadline=None, suppress_health_check=list(HealthCheck))
@given(small_settings(most_profiles=4, most_options=2), STRICT)
def test_against_a_simplex_of_our_own(setting: Setting, demands: Demands) -> None:
    """Without ties the decision is given, and money is the least over payments alone."""
    demands = replace(demands, decision="efficient", limits=None)
    worths = [
        [net_worth(setting, k, p) for k in range(len(setting.options))]
        for p in range(setting.profiles)
    ]
    assume(all(row.count(max(row)) == 1 for row in worths))
    assume(not possible(setting, demands.over(setting)))
    for found in weigh(setting, demands, only=["frontiers"]).frontiers:
        if (found.x, found.y) not in (("money", "shortfall"), ("lies", "money")):
            continue
        for left, right in itertools.pairwise(found.corners):
            for corner in (
                left,
                right,
                tuple((a + b) / 2 for a, b in zip(left, right, strict=True)),
            ):
                money = dict(zip((found.x, found.y), corner, strict=True))["money"]
                other = "shortfall" if found.y == "shortfall" else "lies"
                much = dict(zip((found.x, found.y), corner, strict=True))[other]
                asked = replace(demands, goal="outside-money", slack=much if other == "lies" else 0)
                names = tuple(p.name for p in setting.parties) if other == "shortfall" else ()
                status, least = best_of_efficient(lowered(setting, names, much), asked)
                assert status == "possible"
                assert least is not None
                assert max(least, Fraction(demands.subsidy or 0)) == money


# -- three at once -----------------------------------------------------------------------------


def envelope(corners: Sequence[Corner], money: Fraction, shortfall: Fraction) -> Fraction | None:
    """The least third criterion on mixtures of corners with so much of the first two."""
    count = len(corners)
    rows: list[Row] = [({i: Fraction(1)}, ">=", Fraction(0)) for i in range(count)]
    rows.append((dict.fromkeys(range(count), Fraction(1)), "=", Fraction(1)))
    for place, most in ((0, money), (1, shortfall)):
        rows.append(({i: -c[place] for i, c in enumerate(corners)}, ">=", -most))
    status, value = maximise({i: -c[2] for i, c in enumerate(corners)}, rows, count)
    return None if value is None or status != "possible" else -value


def three_hold(setting: Setting, page: Tradeoff, seed: int) -> None:
    """The corner list against posing the second best at points drawn in the plane."""
    found = page.corners
    assert found is not None
    assert found.complete
    assert found.proved
    assert found.criteria == TRIPLE
    corners = found.corners
    for place, corner in enumerate(corners):  # each is extreme: no mixture of others is as good
        others = [c for i, c in enumerate(corners) if i != place]
        least = envelope(others, corner[0], corner[1]) if others else None
        assert least is None or least > corner[2]
    rng = random.Random(seed)  # noqa: S311 - draws points, no secrets
    most = [max(c[place] for c in corners) for place in range(2)]
    names = tuple(party.name for party in setting.parties)
    points = [(c[0], c[1]) for c in corners]
    points += [(most[0] * rng.randint(0, 8) / 8, most[1] * rng.randint(0, 8) / 8) for _ in range(8)]
    for drawn, shortfall in points:
        money = max(drawn, page.terms.subsidy)  # the page speaks of no less than what is asked
        asked = replace(
            page.terms, decision="randomized", goals=("welfare",), subsidy=money, tidy="none"
        )
        verdict = pose_terms(lowered(setting, names, shortfall), asked, path="full")
        assert verdict.proved
        least = envelope(corners, money, shortfall)
        if least is None:
            assert verdict.status == "impossible"
        else:
            assert verdict.goal_value == best(setting) - least


@settings(max_examples=10, deadline=None, suppress_health_check=list(HealthCheck))
@given(small_settings(most_profiles=6, most_options=2), STRICT)
def test_three_criteria_against_posing(setting: Setting, demands: Demands) -> None:
    demands = replace(demands, limits=None)
    assume(not possible(setting, demands.over(setting)))
    page = weigh(setting, demands, only=["frontiers"])
    assume(page.corners is not None and page.corners.corners)
    three_hold(setting, page, seed=1)


@pytest.mark.parametrize("size", [7, 12])
def test_three_criteria_of_trade(size: int) -> None:
    setting = as_setting(trade(midpoints(size)))
    page = weigh(setting, BALANCED, only=["frontiers"])
    three_hold(setting, page, seed=size)
    assert page.corners is not None
    # Money and a lowered floor trade at one rate throughout: each corner of a pair appears twice.
    expected = knapsack(size)
    both = {(x, Fraction(0), y) for x, y in expected} | {
        (Fraction(0), x / 2, y) for x, y in expected
    }
    assert set(page.corners.corners) == both


def test_nothing_known_beforehand_gives_the_same_list() -> None:
    setting = as_setting(trade(midpoints(12)))
    page = weigh(setting, BALANCED, only=["frontiers"])
    surface = Surface(mix_of(setting, BALANCED).program(decided=False))
    *before, last = corner_list(surface)
    assert last == page.corners
    assert before
    assert not any(one.complete for one in before)


def test_a_frontier_grows_from_its_ends() -> None:
    setting = as_setting(trade(midpoints(12)))
    surface = Surface(mix_of(setting, BALANCED).program(decided=False))
    *before, last = trace(surface, "money", "welfare")
    assert last.complete
    assert [len(one.corners) for one in before] == sorted(len(one.corners) for one in before)
    for one in before:
        assert not one.complete
        # What is known so far can be had: it lies on the frontier or above it.
        assert all(y >= at(last, x) for x, y in one.corners)


# -- the hull alone ------------------------------------------------------------------------------


@pytest.mark.parametrize("seed", range(12))
def test_the_hull_of_points_drawn_at_random(seed: int) -> None:
    """Its corners are just the points that no mixture of the others matches."""
    rng = random.Random(seed)  # noqa: S311 - draws points, no secrets
    size = 4 if seed % 2 else 12
    drawn = [tuple(Fraction(rng.randint(0, size)) for _ in range(3)) for _ in range(14)]
    hull = LowerHull(drawn[0])
    for point in drawn[1:]:
        hull.add(point)
    points = sorted(set(drawn))
    expected = []
    for place, point in enumerate(points):
        others = [p for i, p in enumerate(points) if i != place]
        least = envelope(others, point[0], point[1])
        if least is None or least > point[2]:
            expected.append(point)
    assert hull.corners() == expected
    for face in hull.faces:
        assert all(part >= 0 for part in face.weights)
        values = [sum(w * x for w, x in zip(face.weights, p, strict=True)) for p in drawn]
        assert min(values) == face.level


# -- averages ----------------------------------------------------------------------------------


@settings(max_examples=20, deadline=None, suppress_health_check=list(HealthCheck))
@given(
    small_settings(most_profiles=6, most_options=2),
    STRICT,
    st.sampled_from(("none", "bayesian")),
    st.sampled_from(("none", "ex-ante", "interim")),
)
def test_averages_decide_what_profiles_do(
    setting: Setting, demands: Demands, ic: str, ir: str
) -> None:
    """Where payments enter on average only, the least money is that of the full program."""
    demands = replace(demands, ic=ic, limits=None, ir=ir)
    terms = demands.over(setting)
    reduced = on_average(setting, terms)
    assume(reduced is not None)
    relaxed = Relaxed(setting, terms, {"subsidy": (None, None)}, HIGHS, Watch())
    assert relaxed.averaged
    answer = relaxed.minimise({"money": Fraction(1)})
    verdict = pose(setting, replace(demands, goal="outside-money", tidy="none"), path="full")
    words = {"optimal": "possible", "infeasible": "impossible", "unbounded": "unbounded"}
    assert verdict.status == words[answer.status]
    if answer.status == "optimal" and answer.at is not None:
        assert verdict.goal_value == answer.at["money"]


def test_profiles_that_matter_are_kept() -> None:
    setting = setting_of("B06_base")
    for asked in (
        Demands(ic="dominant"),
        Demands(ir="ex-post"),
        Demands(even_handed=True),
    ):
        assert on_average(setting, asked.over(setting)) is None
    assert on_average(setting_of("A04_corr"), BALANCED.over(setting_of("A04_corr"))) is None
