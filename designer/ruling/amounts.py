"""Exact money in arrays: whole numbers over one denominator, int64 wherever that is safe."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from designer.setting.setting import IntArray
from designer.table import held, largest, whole


@dataclass(frozen=True, eq=False)
class Amounts:
    """Amounts num / den, over profiles, over a party's types, or over any broadcastable shape.

    Every operation is exact: a sum is taken in int64 only where its bound, found from the
    operands, stays below 2**60, and in Python ints otherwise.
    """

    num: IntArray
    den: int = 1

    @classmethod
    def of(cls, values: Sequence[Fraction | int]) -> Amounts:
        """Lay fractions out over their least common denominator.

        >>> Amounts.of([Fraction(1, 2), 1]).num.tolist()
        [1, 2]
        """
        den = math.lcm(1, *{value.denominator for value in values})
        return cls(whole([value.numerator * (den // value.denominator) for value in values]), den)

    def __add__(self, other: Amounts) -> Amounts:
        """Add, with numpy's broadcasting."""
        den = math.lcm(self.den, other.den)
        mine, theirs = den // self.den, den // other.den
        bound = largest(self.num) * mine + largest(other.num) * theirs + mine + theirs
        return Amounts(held(self.num, bound) * mine + held(other.num, bound) * theirs, den)

    def __sub__(self, other: Amounts) -> Amounts:
        """Subtract, with numpy's broadcasting."""
        return self + other.times(-1)

    def times(self, factor: Fraction | int) -> Amounts:
        """Multiply every amount by one number, in lowest common terms."""
        factor = Fraction(factor)
        shared = math.gcd(factor.numerator, self.den)
        top = factor.numerator // shared
        return Amounts(
            held(self.num, (largest(self.num) + 1) * (abs(top) + 1)) * top,
            self.den // shared * factor.denominator,
        )

    def at(self, *index: int) -> Fraction:
        """Read one amount."""
        return Fraction(int(self.num[index]), self.den)

    def fractions(self) -> list[Fraction]:
        """Read a one-dimensional array out as fractions."""
        return [Fraction(top, self.den) for top in self.num.tolist()]

    def lowest(self) -> Amounts:
        """Divide out what all amounts and the denominator share."""
        shared = math.gcd(self.den, int(np.gcd.reduce(self.num, axis=None)))
        if shared <= 1:
            return self
        num = self.num // shared
        return Amounts(held(num, largest(num)), self.den // shared)


def total(parts: Sequence[Amounts]) -> Amounts:
    """Add up one or more arrays of amounts."""
    found = parts[0]
    for part in parts[1:]:
        found = found + part
    return found


def stacked(rows: Sequence[Amounts]) -> tuple[IntArray, int]:
    """Put rows over one denominator: int, shape (rows, …), and the denominator."""
    rows = [row.lowest() for row in rows]
    den = math.lcm(1, *{row.den for row in rows})
    bound = max(largest(row.num) * (den // row.den) for row in rows) + den
    return np.stack([held(row.num, bound) * (den // row.den) for row in rows]), den
