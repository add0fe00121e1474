"""Exact numbers in and out of text."""

from __future__ import annotations

from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from designer.setting import exact


@pytest.mark.parametrize(
    ("written", "value"),
    [
        ("0.1", Fraction(1, 10)),
        (" -2/6 ", Fraction(-1, 3)),
        ("+3", Fraction(3)),
        ("5.", Fraction(5)),
        (".5", Fraction(1, 2)),
        ("1e3", Fraction(1000)),
        ("2.5E-3", Fraction(1, 400)),
        ("0x1f", Fraction(31)),
        ("-0x1/0x3", Fraction(-1, 3)),
        ("007", Fraction(7)),
    ],
)
def test_numbers_read(written: str, value: Fraction) -> None:
    assert exact.number(written) == value


@pytest.mark.parametrize(
    "written",
    [
        "",
        " ",
        "nan",
        "inf",
        "1/0",
        "0x1/0x0",
        "0x",
        "0xg",
        "1e1000",
        "1/2e3",
        "1_000",
        "1,5",
        "½",
        "٣",
        "1 2",
        "--1",
        "1" * 4001,
        "0x1/",
        "1\n2",
    ],
)
def test_what_is_no_exact_number_is_refused(written: str) -> None:
    with pytest.raises(ValueError, match=r"exact number|zero denominator"):
        exact.number(written)


@given(st.fractions())
def test_text_reads_back(value: Fraction) -> None:
    assert exact.number(exact.text(value)) == value


@given(st.integers(6_000, 30_000), st.integers(1, 30_000), st.booleans())
def test_numbers_too_long_for_decimals_read_back(top: int, bottom: int, minus: bool) -> None:
    value = Fraction((-1 if minus else 1) * (2**top + 1), 2**bottom - 1 or 1)
    assert exact.number(exact.text(value)) == value


def test_decimals_are_for_reading_only() -> None:
    assert exact.decimal(Fraction(2, 3)) == "0.666667"
    assert exact.decimal(Fraction(10**11)) == "100000000000"
    assert exact.decimal(Fraction(10**12)) == "1e+12"
    assert exact.decimal(Fraction(-(2**2000), 3)) == "-about 2**1999"
