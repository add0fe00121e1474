"""Exact frontiers: every corner of what can be traded against what.

The frontier of a linear program with two criteria is convex and piecewise linear. Its ends
are the two lexicographic optima; between two neighbours a and b the weighted sum whose level
line runs through both is minimised: either nothing lies below, and the segment is an edge, or a
point further out is found, and the recursion goes on at both sides (Aneja & Nair 1979,
Management Science 25:73-78; Cohon 1978). With three criteria the same idea runs over the
faces of the lower hull of the corners found so far (Benson 1998, J. Global Optimization 13:1-24,
in criterion space).
"""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from dataclasses import dataclass, replace
from fractions import Fraction

from designer.demands.terms import Terms
from designer.weighing.oracle import Oracle
from designer.weighing.prices import NONNEGATIVE
from designer.weighing.relaxed import ALLOWANCE, Bounds, Relaxed

Corner = tuple[Fraction, ...]

PAIRS = (
    ("money", "shortfall"),
    ("money", "welfare"),
    ("shortfall", "welfare"),
    ("lies", "money"),
)


@dataclass(frozen=True)
class Frontier:
    """All corners of the least pairs of two criteria, from the smallest x to the smallest y.

    Every table has criteria on or above the line through the corners, left of the first
    straight up and right of the last straight across. `corners` is empty when the two
    together do not help (`reason` says so); `complete` is False when time ran out.
    """

    x: str
    y: str
    corners: tuple[Corner, ...]
    proved: bool
    complete: bool = True
    reason: str = ""


@dataclass(frozen=True)
class CornerList:
    """The extreme points of the least triples of three criteria, in rising order of the first."""

    criteria: tuple[str, str, str]
    corners: tuple[Corner, ...]
    proved: bool
    complete: bool = True
    reason: str = ""


def opened(oracle: Oracle, terms: Terms, criteria: Sequence[str]) -> Relaxed:
    """The demands with the allowances of these criteria freed."""
    free: dict[str, Bounds] = {
        ALLOWANCE[name]: NONNEGATIVE for name in criteria if name in ALLOWANCE
    }
    if "welfare" in criteria and terms.decision in ("efficient", "table"):
        terms = replace(terms, decision="randomized")
    return Relaxed(oracle.setting, terms, free, oracle.engine, oracle.watch)


def applies(terms: Terms, criteria: Sequence[str]) -> bool:
    """Whether every criterion is one that these terms can pay with."""
    return not (
        ("money" in criteria and terms.balance == "none")
        or ("shortfall" in criteria and terms.ir == "none")
        or ("lies" in criteria and terms.ic == "none")
        or terms.decision == "deterministic"  # whole numbers: no convex frontier
    )


def frontier(oracle: Oracle, terms: Terms, x: str, y: str) -> Frontier:
    """Every corner between the least x and the least y."""
    relaxed = opened(oracle, terms, (x, y))
    ends = []
    proved = True
    for first, second in ((x, y), (y, x)):
        answer = relaxed.minimise({first: Fraction(1)}, then={second: Fraction(1)})
        if answer.status != "optimal" or answer.at is None:
            return Frontier(
                x, y, (), answer.proved, reason=f"{answer.status} {answer.reason}".strip()
            )
        proved = proved and answer.proved
        ends.append((answer.at[x], answer.at[y]))
    corners = [ends[0]]
    if ends[0] != ends[1]:
        waiting = [(ends[0], ends[1])]
        while waiting:
            left, right = waiting.pop()
            weight = {x: left[1] - right[1], y: right[0] - left[0]}
            answer = relaxed.minimise(weight)
            if answer.status != "optimal" or answer.at is None or answer.value is None:
                return Frontier(x, y, tuple(corners), False, complete=False, reason=answer.reason)
            proved = proved and answer.proved
            if answer.value == weight[x] * left[0] + weight[y] * left[1]:
                corners.append(right)
            else:
                middle = (answer.at[x], answer.at[y])
                waiting += [(middle, right), (left, middle)]
    return Frontier(x, y, tuple(_bends(corners)), proved)


def _bends(corners: Sequence[tuple[Fraction, Fraction]]) -> list[tuple[Fraction, Fraction]]:
    """The corners at which the line really bends."""
    kept: list[tuple[Fraction, Fraction]] = []
    for corner in corners:
        while len(kept) > 1 and _straight(kept[-2], kept[-1], corner):
            kept.pop()
        kept.append(corner)
    return kept


def _straight(a: Corner, b: Corner, c: Corner) -> bool:
    return (b[0] - a[0]) * (c[1] - a[1]) == (c[0] - a[0]) * (b[1] - a[1])


def corner_list(
    oracle: Oracle, terms: Terms, criteria: tuple[str, str, str] = ("money", "shortfall", "welfare")
) -> CornerList:
    """Every extreme point of the least triples, each proved by the weights that single it out."""
    relaxed = opened(oracle, terms, criteria)
    points: set[Corner] = set()
    proved = True
    seen: set[Corner] = set()
    unit = [tuple(Fraction(int(i == j)) for j in range(3)) for i in range(3)]
    waiting: list[Corner] = [*unit, (Fraction(1), Fraction(1), Fraction(1))]
    while waiting:
        for weights in waiting:
            seen.add(weights)
            least = min((_dot(weights, p) for p in points), default=None)
            then = {name: Fraction(1) for name in criteria}
            answer = relaxed.minimise(dict(zip(criteria, weights, strict=True)), then=then)
            if answer.status != "optimal" or answer.at is None or answer.value is None:
                return CornerList(
                    criteria, tuple(sorted(points)), answer.proved, False, answer.reason
                )
            proved = proved and answer.proved
            if least is None or answer.value < least or weights in unit:
                points.add(tuple(answer.at[name] for name in criteria))
        waiting = [w for w in _facets(points, unit) if w not in seen]
    return CornerList(criteria, tuple(sorted(_extreme(points, unit))), proved)


def _dot(weights: Corner, point: Corner) -> Fraction:
    return sum((w * p for w, p in zip(weights, point, strict=True)), Fraction(0))


def _facets(points: set[Corner], rays: list[Corner]) -> list[Corner]:
    """The weights, none negative, of the faces of the lower hull of points plus rays."""
    found: dict[Corner, None] = {}
    for base, *others in _triples(points, rays):
        edges = [
            tuple(a - b for a, b in zip(other, base, strict=True)) if is_point else other
            for other, is_point in others
        ]
        normal = _cross(edges[0], edges[1])
        if all(part <= 0 for part in normal):
            normal = tuple(-part for part in normal)
        if any(part < 0 for part in normal) or not any(normal):
            continue
        level = _dot(normal, base)
        if all(_dot(normal, point) >= level for point in points):
            total = sum(normal)
            found[tuple(part / total for part in normal)] = None
    return list(found)


def _triples(points: set[Corner], rays: list[Corner]):  # type: ignore[no-untyped-def]
    ordered = sorted(points)
    tagged = [(point, True) for point in ordered] + [(ray, False) for ray in rays]
    for i, base in enumerate(ordered):
        for two in itertools.combinations(tagged[i + 1 :], 2):
            yield (base, *two)


def _cross(a: Corner, b: Corner) -> Corner:
    return (
        a[1] * b[2] - a[2] * b[1],
        a[2] * b[0] - a[0] * b[2],
        a[0] * b[1] - a[1] * b[0],
    )


def _extreme(points: set[Corner], rays: list[Corner]) -> list[Corner]:
    """The points that are corners: on at least three faces with independent weights."""
    if len(points) <= 1:
        return list(points)
    facets = [*_facets(points, rays), *rays]
    kept = []
    for point in points:
        tight = [w for w in facets if _dot(w, point) == min(_dot(w, other) for other in points)]
        if any(_dot(a, _cross(b, c)) != 0 for a, b, c in itertools.combinations(tight, 3)):
            kept.append(point)
    return kept
