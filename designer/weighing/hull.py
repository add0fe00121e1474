"""The lower hull of points in space: what lies on or above some mixture of them.

P = conv(points) + the directions in which every criterion grows. It is held as a cone in
homogeneous coordinates, its faces found by the double description method (Motzkin, Raiffa,
Thompson & Thrall 1953; Fukuda & Prodon 1996, LNCS 1120:91-111): a point outside cuts off the
faces that do not see it, and a new face joins it to every edge between a face kept and a face
cut off. Two faces share an edge when two of the generators lie on both.
"""

from __future__ import annotations

import itertools
import math
from dataclasses import dataclass
from fractions import Fraction

Point = tuple[Fraction, ...]
Row = tuple[int, int, int, int]

FAR: tuple[Row, ...] = ((1, 0, 0, 0), (0, 1, 0, 0), (0, 0, 1, 0))
"""The directions of growth, as points at infinity."""


@dataclass(frozen=True)
class Face:
    """weights . point >= level, with equality on the face; homogeneous, in integers."""

    row: Row
    on: frozenset[int]

    @property
    def weights(self) -> Point:
        """The weights, which are not negative; all 0 for the face at infinity."""
        return tuple(Fraction(part) for part in self.row[:3])

    @property
    def level(self) -> Fraction:
        """The level."""
        return Fraction(-self.row[3])


class LowerHull:
    """Points in space and the faces of their lower hull; exact."""

    def __init__(self, first: Point) -> None:
        """One point: what is at least as large in every coordinate."""
        self.points: list[Point] = [first]
        self._generators: list[Row] = [*FAR, _homogeneous(first)]
        self._faces: list[Face] = [_through(self._generators, i) for i in range(4)]

    @property
    def faces(self) -> list[Face]:
        """The faces, without that at infinity."""
        return [face for face in self._faces if any(face.row[:3])]

    def add(self, point: Point) -> bool:
        """Take in a point; False if it was inside already."""
        new, place = _homogeneous(point), len(self._generators)
        sides = [sum(h * g for h, g in zip(face.row, new, strict=True)) for face in self._faces]
        if min(sides) >= 0:
            return False
        self.points.append(point)
        self._generators.append(new)
        kept, above, below = [], [], []
        for face, side in zip(self._faces, sides, strict=True):
            if side > 0:
                kept.append(face)
                above.append((face, side))
            elif side < 0:
                below.append((face, side))
            else:
                kept.append(Face(face.row, face.on | {place}))
        for (one, up), (two, down) in itertools.product(above, below):
            edge = one.on & two.on
            if len(edge) >= 2:
                row = [up * b - down * a for a, b in zip(one.row, two.row, strict=True)]
                kept.append(Face(_lowest(row), edge | {place}))
        self._faces = kept
        return True

    def corners(self) -> list[Point]:
        """The points at which at least three faces meet, in rising order."""
        found = []
        for place, point in enumerate(self.points, start=len(FAR)):
            rows = [face.row for face in self._faces if place in face.on]
            if any(_independent(*three) for three in itertools.combinations(rows, 3)):
                found.append(point)
        return sorted(found)


def _homogeneous(point: Point) -> Row:
    den = math.lcm(*(part.denominator for part in point))
    row = [int(part * den) for part in point]
    return (row[0], row[1], row[2], den)


def _through(generators: list[Row], left_out: int) -> Face:
    """The face of the first cone on which all generators but one lie."""
    on = frozenset(range(4)) - {left_out}
    if left_out == 3:
        return Face((0, 0, 0, 1), on)
    *numbers, den = generators[3]
    row = [den if j == left_out else 0 for j in range(3)]
    return Face(_lowest([*row, -numbers[left_out]]), on)


def _lowest(row: list[int]) -> Row:
    shared = math.gcd(*row) or 1
    return (row[0] // shared, row[1] // shared, row[2] // shared, row[3] // shared)


def _independent(one: Row, two: Row, three: Row) -> bool:
    """Whether three rows span three dimensions: some 3 x 3 minor is not 0."""
    return any(
        one[a] * (two[b] * three[c] - two[c] * three[b])
        - one[b] * (two[a] * three[c] - two[c] * three[a])
        + one[c] * (two[a] * three[b] - two[b] * three[a])
        for a, b, c in itertools.combinations(range(4), 3)
    )
