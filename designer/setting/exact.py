"""Exact numbers in and out of text."""

from __future__ import annotations

import re
from fractions import Fraction

_NUMBER = re.compile(r"\s*[+-]?(\d+(/\d+)?|\d+\.\d*|\.\d+)([eE][+-]?\d{1,3})?\s*", re.ASCII)


def text(value: Fraction | int) -> str:
    """The canonical exact text: an integer, or "p/q" in lowest terms.

    Hexadecimal ("0x…") beyond 4,000 digits, where Python refuses decimal conversion.

    >>> text(Fraction(6, 4)), text(Fraction(4, 2))
    ('3/2', '2')
    """
    value = Fraction(value)
    if value.denominator == 1:
        return _digits(value.numerator)
    return f"{_digits(value.numerator)}/{_digits(value.denominator)}"


def number(written: str) -> Fraction:
    """The exact value of an integer, decimal or fraction written as text.

    Raises ValueError for anything else (nan, inf, empty, a zero denominator, huge exponents).

    >>> number("0.1"), number(" 2/6 ")
    (Fraction(1, 10), Fraction(1, 3))
    """
    if "0x" in written:
        top, _, bottom = written.strip().partition("/")
        return Fraction(int(top, 16), int(bottom, 16) if bottom else 1)
    if len(written) > 4000 or not _NUMBER.fullmatch(written):
        raise ValueError(f"not an exact number: {written[:40]!r}")
    try:
        return Fraction(written)
    except ZeroDivisionError:
        raise ValueError(f"a zero denominator: {written!r}") from None


def decimal(value: Fraction, digits: int = 6) -> str:
    """A decimal approximation with about `digits` significant digits, never exponent-blind.

    >>> decimal(Fraction(1, 3)), decimal(Fraction(5))
    ('0.333333', '5')
    """
    if value.denominator == 1 and abs(value.numerator) < 10**12:
        return str(value.numerator)
    try:
        return f"{float(value):.{digits}g}"
    except OverflowError:
        return f"{'-' if value < 0 else ''}about 2**{value.numerator.bit_length() - value.denominator.bit_length()}"


def _digits(value: int) -> str:
    return str(value) if value.bit_length() < 13_000 else hex(value)
