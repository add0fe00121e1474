"""Cells of CSV tables: exact numbers to text and back, types by name or value, mistakes."""

from __future__ import annotations

import math
from collections.abc import Sequence
from fractions import Fraction

import numpy as np
import numpy.typing as npt

from designer.errors import Mistake, TableError
from designer.setting.exact import number, text
from designer.setting.setting import IntArray
from designer.table import whole

MEMO = 65_536
"""Cells remembered per column: tables repeat themselves, and the rest must not pile up."""
SHOWN = 20
ROUNDED_PLACES = 6
PLAIN = 10**1000
"""Whole numbers below this are written and read without further thought."""


class Texts(dict[int, str]):
    """The exact text of n/den, remembered for the numerators met lately."""

    def __init__(self, den: int) -> None:
        """Remember nothing yet; every text will be over `den`."""
        super().__init__()
        self.den = den

    def __missing__(self, top: int) -> str:
        common = math.gcd(top, self.den)
        over, under = top // common, self.den // common
        if max(abs(over), under) >= PLAIN:
            written = text(Fraction(over, under))
        else:
            written = f"{over}/{under}" if under > 1 else str(over)
        self[top] = written
        return written

    def of(self, numerators: IntArray) -> list[str]:
        """Write each numerator over the denominator, in lowest terms."""
        if len(self) > MEMO:
            self.clear()
        return [self[top] for top in numerators.tolist()]


class Mistakes:
    """Collects mistakes: the first few whole, the others by number."""

    def __init__(self, source: str) -> None:
        """Begin with none; `source` names the file in the error."""
        self.source = source
        self.kept: list[Mistake] = []
        self.more = 0

    def add(self, place: str, found: str, expected: str, remedy: str) -> None:
        """Note a mistake."""
        if len(self.kept) < SHOWN:
            self.kept.append(Mistake(place, found, expected, remedy))
        else:
            self.more += 1

    def check(self) -> None:
        """Raise TableError if there were any."""
        if self.kept:
            raise self.error()

    def error(self) -> TableError:
        """Give all mistakes as one error."""
        kept = list(self.kept)
        if self.more:
            kept.append(
                Mistake(
                    "the rest of the file",
                    f"{self.more} more such mistakes",
                    "none",
                    "Mend the ones above first: they may have one cause.",
                )
            )
        return TableError(kept, self.source)


class Numbers(dict[str, tuple[int, int] | None]):
    """A column of exact numbers: cells to (numerator, denominator), None for no number.

    `unit` is the largest last place among the cells that look rounded, 0 if there are none;
    `place` the smallest last place among all decimals, for spreadsheets drop closing zeros.
    """

    def __init__(self) -> None:
        """Begin an empty column."""
        super().__init__()
        self.unit = self.place = Fraction(0)
        self.tops: list[IntArray] = []
        self.dens: list[IntArray] = []

    def __missing__(self, cell: str) -> tuple[int, int] | None:
        over, slash, under = cell.partition("/")
        if _digits(over.removeprefix("-")) and (not slash or (_digits(under) and under.strip("0"))):
            # The two commonest forms, without the detour over a Fraction.
            top, den = int(over), int(under or "1")
            common = math.gcd(top, den)
            parsed: tuple[int, int] | None = (top // common, den // common)
        else:
            parsed = self._parse(cell)
        self[cell] = parsed
        return parsed

    def _parse(self, cell: str) -> tuple[int, int] | None:
        value = _value(cell)
        if value is None:
            return None
        if "0x" not in cell and ("." in cell or "e" in cell.lower()):
            self.unit = max(self.unit, _last_place(cell, value))
            place = _place(cell)
            if place < 1:
                self.place = min(self.place or place, place)
        return value.numerator, value.denominator

    def read(self, cells: Sequence[str]) -> list[int]:
        """Take in the next cells; the positions of those that are no numbers."""
        if len(self) > MEMO:
            self.clear()
        parsed = [self[cell] for cell in cells]
        bad = [at for at, entry in enumerate(parsed) if entry is None]
        good = [entry or (0, 1) for entry in parsed]
        self.tops.append(whole([top for top, _ in good]))
        self.dens.append(whole([den for _, den in good]))
        return bad

    def settle(self, order: npt.NDArray[np.int64]) -> tuple[IntArray, IntArray]:
        """All numerators and denominators, by profile."""
        tops, dens = _joined(self.tops), _joined(self.dens)
        self.tops, self.dens = [], []
        return tops[order], dens[order]


def _joined(parts: Sequence[IntArray]) -> IntArray:
    """Chunks as one array: int64 if every one of them is."""
    if all(part.dtype == np.int64 for part in parts):
        return np.concatenate([part.astype(np.int64, copy=False) for part in parts])
    return np.concatenate([part.astype(object, copy=False) for part in parts])


def _digits(cell: str) -> bool:
    return cell.isascii() and cell.isdigit() and len(cell) < 1000


def _place(cell: str) -> Fraction:
    """The unit of the last place of a decimal, as it is written."""
    digits, _, exponent = cell.strip().lower().partition("e")
    return Fraction(10) ** (int(exponent or 0) - len(digits.partition(".")[2]))


def _last_place(cell: str, value: Fraction) -> Fraction:
    """Find the unit of the last place of a decimal that looks rounded, else 0.

    Kept between a 10**-12th and a millionth of the number: floats carry no more than the
    former, and 1e3 is hardly meant to the nearest thousand.
    """
    digits, _, exponent = cell.strip().lower().partition("e")
    places = len(digits.partition(".")[2])
    if not exponent and places < ROUNDED_PLACES:
        return Fraction(0)
    size = max(Fraction(1), abs(value))
    return min(max(_place(cell), size / 10**12), size / 10**6)


class Lookup(dict[str, int]):
    """Type cells to positions: by label, else by a numeric label's value; -1 for none."""

    def __init__(self, labels: Sequence[str]) -> None:
        """Know the types of a party by their labels."""
        super().__init__({label: a for a, label in enumerate(labels)})
        self.by_value: dict[Fraction, int] = {}
        for a, label in enumerate(labels):
            value = _value(label)
            if value is not None:
                # Names such as "1" and "1.0" are told apart by their text alone.
                self.by_value[value] = -1 if value in self.by_value else a

    def __missing__(self, cell: str) -> int:
        stripped = cell.strip()
        if stripped != cell and stripped in self:
            return self[stripped]
        value = _value(cell)
        return -1 if value is None else self.by_value.get(value, -1)


def _value(cell: str) -> Fraction | None:
    try:
        return number(cell)
    except (ValueError, ZeroDivisionError, OverflowError):
        return None
