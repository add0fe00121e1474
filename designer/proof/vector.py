"""Sparse exact vectors over one common denominator."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from fractions import Fraction
from math import gcd, lcm


@dataclass(frozen=True)
class Vector:
    """v[idx[k]] = num[k] / den, every other of the `size` entries 0.

    den > 0; idx ascending, each in 0..size-1; num nonzero Python ints.
    """

    den: int
    idx: tuple[int, ...]
    num: tuple[int, ...]
    size: int

    @staticmethod
    def over(den: int, numerators: Iterable[int]) -> Vector:
        """Build the vector numerators / den, in lowest terms as a whole.

        >>> Vector.over(-4, [2, 0, 6])
        Vector(den=2, idx=(0, 2), num=(-1, -3), size=3)
        """
        dense = [int(number) for number in numerators]
        idx = tuple(k for k, number in enumerate(dense) if number)
        common = den
        for k in idx:
            common = gcd(common, dense[k])
            if common == 1:
                break
        common = abs(common) if idx else abs(den)
        if den < 0:
            common = -common
        return Vector(den // common, idx, tuple(dense[k] // common for k in idx), len(dense))

    @staticmethod
    def of(entries: Mapping[int, Fraction], size: int) -> Vector:
        """Build the vector with these entries, zeros dropped."""
        kept = sorted((k, value) for k, value in entries.items() if value)
        den = lcm(*(value.denominator for _, value in kept))
        return Vector(
            den,
            tuple(k for k, _ in kept),
            tuple(value.numerator * (den // value.denominator) for _, value in kept),
            size,
        )

    @staticmethod
    def zero(size: int) -> Vector:
        """All entries 0."""
        return Vector(1, (), (), size)

    def value(self, position: int) -> Fraction:
        """One entry; O(log) in the number of nonzeros."""
        from bisect import bisect_left

        k = bisect_left(self.idx, position)
        if k < len(self.idx) and self.idx[k] == position:
            return Fraction(self.num[k], self.den)
        return Fraction(0)

    def fractions(self) -> dict[int, Fraction]:
        """Return the nonzero entries."""
        return {k: Fraction(n, self.den) for k, n in zip(self.idx, self.num, strict=True)}

    def dense(self) -> list[Fraction]:
        """All entries."""
        entries = [Fraction(0)] * self.size
        for k, number in zip(self.idx, self.num, strict=True):
            entries[k] = Fraction(number, self.den)
        return entries

    def numerators(self) -> list[int]:
        """All entries times `den`."""
        entries = [0] * self.size
        for k, number in zip(self.idx, self.num, strict=True):
            entries[k] = number
        return entries
