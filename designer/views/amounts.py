"""Exact numbers as people read them: the fraction first where it is short, a decimal beside it."""

from __future__ import annotations

from fractions import Fraction

from designer.setting import exact

SHORT = 24
"""Characters up to which an exact number is written out in a sentence."""
CELL = 8
"""Characters up to which an exact number is written out in a table."""
ROUNDED = "~"
"""Stands before a number that was rounded for a table."""


def amount(value: Fraction, unit: str = "") -> str:
    """The exact number, its decimal where that says more, and the unit.

    >>> amount(Fraction(13, 4), "crowns"), amount(Fraction(1, 3)), amount(Fraction(5), "crowns")
    ('13/4 = 3.25 crowns', '1/3 ≈ 0.333333', '5 crowns')
    """
    written = exact.text(value)
    after = f" {unit}" if unit else ""
    if value.denominator == 1 and len(written) <= SHORT:
        return f"{written}{after}"
    finite = terminating(value)
    if len(written) > SHORT:
        return f"≈ {approximate(value)}{after} (exact: {digits(value):,} digits)"
    return f"{written} {'=' if finite else '≈'} {finite or approximate(value)}{after}"


def cell(value: Fraction) -> str:
    """The number for a table: exact if short, else rounded and marked so.

    >>> cell(Fraction(-13, 4)), cell(Fraction(123456789, 1000007))
    ('-13/4', '~123.46')
    """
    written = exact.text(value)
    return written if len(written) <= CELL else f"{ROUNDED}{approximate(value, 5)}"


def approximate(value: Fraction, places: int = 6) -> str:
    """So many significant digits; the power of ten where a float cannot hold the number.

    >>> approximate(Fraction(1, 7)), approximate(Fraction(1, 10**400))
    ('0.142857', '1e-400')
    """
    size = abs(value)
    if not size or Fraction(1, 10**300) < size < 10**300:
        return exact.decimal(value, places)
    # Two whole digits of the logarithm's neighbourhood are enough: 10**power <= size.
    power = (size.numerator.bit_length() - size.denominator.bit_length()) * 1233 // 4096
    while Fraction(10) ** power > size:
        power -= 1
    while Fraction(10) ** (power + 1) <= size:
        power += 1
    leading = float(value / Fraction(10) ** power)
    return f"{leading:.{places}g}e{power}"


def terminating(value: Fraction, places: int = 6) -> str | None:
    """The decimal that equals the number, if one with few places does.

    >>> terminating(Fraction(13, 4)), terminating(Fraction(1, 3))
    ('3.25', None)
    """
    scaled = abs(value) * 10**places
    if scaled.denominator != 1 or scaled.numerator >= 10**18:
        return None
    whole, rest = divmod(scaled.numerator, 10**places)
    decimals = f"{rest:0{places}d}".rstrip("0")
    return f"{'-' if value < 0 else ''}{whole}{'.' if decimals else ''}{decimals}"


def digits(value: Fraction) -> int:
    """About how many decimal digits the exact number has."""
    bits = value.numerator.bit_length() + value.denominator.bit_length()
    return max(1, bits * 1233 // 4096)


def counted(count: int, noun: str, plural: str | None = None) -> str:
    """The count with its noun.

    >>> counted(1, "case"), counted(1200, "case"), counted(2, "party", "parties")
    ('1 case', '1,200 cases', '2 parties')
    """
    return f"{count:,} {noun if count == 1 else plural or noun + 's'}"
