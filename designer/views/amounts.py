"""Exact numbers as people read them: the fraction first where it is short, a decimal beside it."""

from __future__ import annotations

from fractions import Fraction

from designer.setting import exact

SHORT = 24
"""Characters up to which an exact number is written out in a sentence."""
CELL = 8
"""Characters up to which an exact number is written out in a table."""
WHOLE = 10**12
"""Size below which a number keeps all digits before its decimal point: money reads badly as 6e5."""
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

    >>> cell(Fraction(-13, 4)), cell(Fraction(123456789, 1000007)), cell(Fraction(1234567, 2))
    ('-13/4', '~123.46', '617283.5')
    """
    for written in (exact.text(value), terminating(value)):
        if written is not None and len(written) <= CELL:
            return written
    if value.denominator == 1 and abs(value) < WHOLE:
        return exact.text(value)
    return f"{ROUNDED}{approximate(value, 5)}"


def approximate(value: Fraction, places: int = 6) -> str:
    """So many significant digits, more where the whole part has more; powers of ten are "e30".

    >>> approximate(Fraction(1, 7)), approximate(Fraction(10**9, 7)), approximate(Fraction(10**30))
    ('0.142857', '142857143', '1e30')
    """
    size = abs(value)
    if not size or Fraction(1, 10**300) < size < 10**300:
        if 10 ** (places - 1) <= size < WHOLE:
            return str(round(value))
        head, mark, exponent = exact.decimal(value, places).partition("e")
        return f"{head}e{int(exponent)}" if mark else head
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
    """How many decimal digits the exact number is written with.

    >>> digits(Fraction(10**30)), digits(Fraction(-999, 1000))
    (31, 7)
    """
    parts = [abs(value.numerator), value.denominator]
    return sum(_length(part) for part in parts[: 1 if value.denominator == 1 else 2])


def _length(whole: int) -> int:
    """The number of decimal digits; Python refuses to write long numbers only to count."""
    length = max(0, whole.bit_length() - 1) * 1233 // 4096 + 1  # 1233/4096 < log10(2)
    while 10**length <= whole:
        length += 1
    return length


def counted(count: int, noun: str, plural: str | None = None) -> str:
    """The count with its noun.

    >>> counted(1, "case"), counted(1200, "case"), counted(2, "party", "parties")
    ('1 case', '1,200 cases', '2 parties')
    """
    return f"{count:,} {noun if count == 1 else plural or noun + 's'}"
