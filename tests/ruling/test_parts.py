"""The pieces the rules are made of, on cases that a pencil can follow."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from designer.ruling import one_way
from designer.ruling.amounts import Amounts, stacked
from designer.ruling.hull import Mixture, Point, best_mixture
from designer.ruling.kinds import Refusal
from designer.ruling.profiles import expected_by_type, independent
from designer.ruling.type_graph import largest_payments
from designer.ruling.units import units
from tests.published.corpus import as_setting, setting_of
from tests.published.families import midpoints, one_item, trade
from tests.ruling.helpers import identical_units

BIG = st.fractions(min_value=-(10**25), max_value=10**25, max_denominator=10**12)


@settings(max_examples=200, deadline=None, derandomize=True)
@given(st.lists(st.tuples(BIG, BIG), min_size=1, max_size=5), BIG)
def test_amounts_are_fractions_whatever_their_size(
    pairs: list[tuple[Fraction, Fraction]], factor: Fraction
) -> None:
    """Sums, differences and multiples beyond int64 as well as within, entry by entry."""
    mine, theirs = Amounts.of([a for a, _ in pairs]), Amounts.of([b for _, b in pairs])
    assert (mine + theirs).fractions() == [a + b for a, b in pairs]
    assert (mine - theirs).fractions() == [a - b for a, b in pairs]
    assert mine.times(factor).fractions() == [a * factor for a, _ in pairs]
    assert mine.times(factor).lowest().fractions() == [a * factor for a, _ in pairs]
    rows, den = stacked([mine, theirs])
    assert [Fraction(int(top), den) for top in rows[1]] == [b for _, b in pairs]


def test_int64_is_left_before_it_overflows() -> None:
    near = Amounts(np.array([2**61], dtype=np.int64))
    assert (near + near + near).fractions() == [3 * 2**61]
    assert near.times(2**10).fractions() == [2**71]


def test_virtual_worths_and_their_ironing() -> None:
    """Entry U03: worths 2, 3, 4, 10 at chances 3/8, 3/8, 1/8, 1/8 (published values)."""
    line = one_way.known(setting_of("U03_a"))[0]
    assert line.virtual == [Fraction(1, 3), Fraction(7, 3), Fraction(-2), Fraction(10)]
    assert line.ironed(line.virtual) == [
        Fraction(1, 3), Fraction(5, 4), Fraction(5, 4), Fraction(10)
    ]  # fmt: skip


@settings(max_examples=100, deadline=None, derandomize=True)
@given(st.lists(st.tuples(st.integers(-9, 9), st.integers(1, 5)), min_size=1, max_size=6))
def test_ironing_is_the_nearest_rising_sequence(rows: list[tuple[int, int]]) -> None:
    """Least squares over nondecreasing sequences: the max-min formula of isotonic regression.

    R. E. Barlow, D. J. Bartholomew, J. M. Bremner and H. D. Brunk (1972), Statistical inference
    under order restrictions, Theorem 1.4 (from memory).
    """
    mass = sum(weight for _, weight in rows)
    line = one_way.Line(
        level=tuple(Fraction(a) for a in range(len(rows))),
        slope=np.array([1]),
        rest=Amounts.of([0]),
        order=tuple(range(len(rows))),
        chance=tuple(Fraction(weight, mass) for _, weight in rows),
    )

    def mean(low: int, high: int) -> Fraction:
        part = rows[low : high + 1]
        return Fraction(sum(s * w for s, w in part), sum(w for _, w in part))

    size = len(rows)
    assert line.ironed([Fraction(score) for score, _ in rows]) == [
        max(min(mean(low, high) for high in range(a, size)) for low in range(a + 1))
        for a in range(size)
    ]


def test_worths_of_a_buyer_and_of_a_seller_are_one_way() -> None:
    buyer, seller = one_way.known(as_setting(trade(midpoints(3))))
    assert buyer.level == tuple(midpoints(3))
    assert seller.level == tuple(-cost for cost in midpoints(3))
    assert seller.order == (2, 1, 0)
    assert buyer.slope.tolist() == seller.slope.tolist() == [0, 1]
    owner = one_way.lines(setting_of("P01_mid6_r1over2"))
    assert isinstance(owner, Refusal)  # who owns half may gain or lose by more worth


def test_largest_payments_along_the_graph() -> None:
    """One item, one buyer of 1 or 3, even odds, sold always: 1 each; a cycle where it is unfair."""
    setting = as_setting(one_item([[Fraction(1), Fraction(3)]]))
    always = np.array([[0, 1], [0, 1]])
    payments = largest_payments(setting, 0, always, 1)
    assert payments is not None
    assert payments.fractions() == [1, 1]
    high_only = np.array([[1, 0], [0, 1]])
    payments = largest_payments(setting, 0, high_only, 1)
    assert payments is not None
    assert payments.fractions() == [0, 3]
    low_only = np.array([[0, 1], [1, 0]])
    assert largest_payments(setting, 0, low_only, 1) is None


def test_expectations_follow_the_type() -> None:
    """With correlation, P(10 | 10) = 2/3 in entry U07's example."""
    setting = setting_of("U07_rho1over3")
    other = Amounts.of([10, 100, 10, 100])
    assert expected_by_type(setting, 0, other).fractions() == [40, 70]
    assert not independent(setting)
    assert independent(setting_of("U07_rho0"))  # a joint table that is a product


def test_identical_units_are_recognised() -> None:
    found = units(as_setting(identical_units(4, 2, midpoints(2))))
    assert not isinstance(found, Refusal)
    assert found.count == 2
    assert len(found.serving) == 6
    assert isinstance(units(as_setting(trade(midpoints(2)))), Refusal)


@pytest.mark.parametrize("extra", [0, 5])
def test_the_best_mixture_of_listed_rules(extra: int) -> None:
    """Points (worth, pot) by hand: the edge from (10, -4) to (6, 2) meets pot 0 at 22/3."""
    points = [(10, -4), (6, 2), (1, 3 + extra), (7, -3), (5, 2)]

    def best(z: Fraction) -> Point:
        worth, pot = max(points, key=lambda p: ((1 - z) * p[0] + z * p[1], p[1]))
        return Point(np.zeros(1, dtype=np.int64), Fraction(worth), Fraction(pot))

    found = best_mixture(best)
    assert isinstance(found, Mixture)
    share = found.share
    worth = share * found.over.worth + (1 - share) * found.under.worth
    assert share * found.over.pot + (1 - share) * found.under.pot == 0
    # By brute force over pairs of points.
    most = max(
        Fraction(a[0]) + (Fraction(b[0]) - a[0]) * Fraction(-a[1], b[1] - a[1])
        for a in points
        for b in points
        if a[1] < 0 <= b[1]
    )
    assert worth == most == Fraction(22, 3)


def test_no_mixture_where_every_pot_is_short() -> None:
    assert best_mixture(lambda z: Point(np.zeros(1, dtype=np.int64), 1 - z, Fraction(-1))) is None
