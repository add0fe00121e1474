"""Sparse exact vectors."""

from __future__ import annotations

from fractions import Fraction

from hypothesis import given
from hypothesis import strategies as st

from designer.proof.vector import Vector

ENTRIES = st.lists(st.fractions(max_denominator=50), max_size=8)


@given(ENTRIES)
def test_fractions_survive_the_round_trip(values: list[Fraction]) -> None:
    vector = Vector.of(dict(enumerate(values)), len(values))
    assert vector.dense() == values
    assert vector.fractions() == {k: value for k, value in enumerate(values) if value}
    assert [vector.value(k) for k in range(len(values))] == values
    assert vector.den > 0
    assert all(vector.num)
    assert list(vector.idx) == sorted(set(vector.idx))
    assert [Fraction(n, vector.den) for n in vector.numerators()] == values
    assert Vector.over(vector.den, vector.numerators()) == vector


@given(ENTRIES, st.integers(-9, 9).filter(bool))
def test_common_factors_are_taken_out(values: list[Fraction], factor: int) -> None:
    vector = Vector.of(dict(enumerate(values)), len(values))
    again = Vector.over(vector.den * factor, [n * factor for n in vector.numerators()])
    assert again == vector


def test_nothing() -> None:
    assert Vector.zero(3) == Vector.over(7, [0, 0, 0]) == Vector.of({}, 3)
    assert Vector.zero(3).dense() == [0, 0, 0]
