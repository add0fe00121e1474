"""Exact numbers in and out of text."""

from __future__ import annotations

import re
from fractions import Fraction

MAX_TEXT = 4000
"""Longest decimal number read from text; Python itself refuses 4,300 digits."""

_NUMBER = re.compile(r"\s*[+-]?(\d+/\d+|(\d+\.?\d*|\.\d+)([eE][+-]?\d{1,3})?)\s*", re.ASCII)
_HEX = re.compile(r"\s*[+-]?0x[0-9a-f]+(/0x[0-9a-f]+)?\s*", re.ASCII)


def text(value: Fraction | int) -> str:
    """The canonical exact text: an integer, or "p/q" in lowest terms.

    Hexadecimal ("0x…") beyond about 3,900 digits, where Python refuses decimal conversion.

    >>> text(Fraction(6, 4)), text(Fraction(4, 2))
    ('3/2', '2')
    """
    if not isinstance(value, Fraction):
        value = Fraction(value)
    if max(value.numerator.bit_length(), value.denominator.bit_length()) < 6_500:
        return str(value)  # both parts together stay below MAX_TEXT characters
    if value.denominator == 1:
        return hex(value.numerator)
    return f"{hex(value.numerator)}/{hex(value.denominator)}"


def number(written: str) -> Fraction:
    """The exact value of an integer, decimal or fraction written as text.

    Raises ValueError for anything else (nan, inf, empty, a zero denominator, huge exponents).

    >>> number("0.1"), number(" 2/6 ")
    (Fraction(1, 10), Fraction(1, 3))
    """
    try:
        if "0x" in written and _HEX.fullmatch(written):
            top, _, bottom = written.strip().partition("/")
            return Fraction(int(top, 16), int(bottom, 16) if bottom else 1)
        if len(written) <= MAX_TEXT and _NUMBER.fullmatch(written):
            return Fraction(written)
    except ZeroDivisionError:
        raise ValueError(f"a zero denominator: {written[:40]!r}") from None
    raise ValueError(f"not an exact number: {written[:40]!r}")


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
        power = value.numerator.bit_length() - value.denominator.bit_length()
        return f"{'-' if value < 0 else ''}about 2**{power}"
