"""Exact frontiers: every corner of what can be traded against what.

The frontier of a linear program with two criteria is convex and piecewise linear. Its ends
are the two lexicographic optima; between two neighbours a and b the weighted sum whose level
line runs through both is minimised: either nothing lies below, and the segment is an edge, or a
point further out is found, and the search goes on at both sides (Aneja & Nair 1979,
Management Science 25:73-78; Cohon 1978, Multiobjective Programming and Planning). With three
criteria the same idea runs over the faces of the lower hull of the points found so far
(Benson 1998, Journal of Global Optimization 13:1-24, in the space of the criteria): a face that
no weighted sum undercuts is a face of the whole.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction

from designer.demands.terms import Terms
from designer.weighing.hull import LowerHull
from designer.weighing.relaxed import Answer
from designer.weighing.surface import Surface

Corner = tuple[Fraction, ...]

PAIRS = (
    ("money", "shortfall"),
    ("money", "welfare"),
    ("shortfall", "welfare"),
    ("lies", "money"),
)
TRIPLE = ("money", "shortfall", "welfare")


@dataclass(frozen=True)
class Frontier:
    """All corners of the least pairs of two criteria, from the smallest x to the smallest y.

    Every table has its criteria on or above the line through the corners, left of the first
    straight up and right of the last straight across (where more of x is allowed than helps,
    it need not be used). `corners` is empty when the two
    together do not help (`reason` says so); `complete` is False while corners may be missing:
    those listed then can be had, and the frontier lies on or below the line through them.
    """

    x: str
    y: str
    corners: tuple[Corner, ...] = ()
    proved: bool = False
    complete: bool = True
    reason: str = ""


@dataclass(frozen=True)
class CornerList:
    """The extreme points of the least triples of three criteria, in rising order of the first."""

    criteria: tuple[str, ...]
    corners: tuple[Corner, ...] = ()
    proved: bool = False
    complete: bool = True
    reason: str = ""


def payable(terms: Terms, criterion: str) -> bool:
    """Whether these terms can be paid for with a criterion."""
    if terms.decision == "deterministic":
        return False  # whole numbers: what is possible has holes, and no convex frontier
    asked = {"money": terms.balance, "shortfall": terms.ir, "lies": terms.ic}
    return asked.get(criterion) != "none"


def trace(surface: Surface, x: str, y: str) -> Iterator[Frontier]:
    """The frontier of two criteria, each time it is known better; the last is complete."""
    pair = (x, y)
    surface.watch(pair)
    ends: list[Corner] = []
    proved = True
    for first in (True, False):
        end = (Fraction(first), Fraction(not first))
        answer = surface.least(pair, end, then=True)
        if answer.status != "optimal" or answer.at is None:
            yield Frontier(x, y, (), answer.proved, reason=_refused(answer))
            return
        proved = proved and answer.proved
        ends.append((answer.at[x], answer.at[y]))
        yield Frontier(x, y, tuple(ends), proved, complete=False)
    points = set(ends)
    waiting = deque([(ends[0], ends[1])] if ends[0] != ends[1] else [])
    while waiting:
        left, right = waiting.popleft()
        weights = (left[1] - right[1], right[0] - left[0])
        level = weights[0] * left[0] + weights[1] * left[1]
        known = surface.bound(pair, weights)
        if known is not None and known[0] >= level:
            proved = proved and known[1]
            continue
        answer = surface.least(pair, weights)
        if answer.status != "optimal" or answer.at is None or answer.value is None:
            yield _drawn(x, y, points, False, complete=False, reason=_refused(answer))
            return
        proved = proved and answer.proved
        if answer.value < level:
            middle = (answer.at[x], answer.at[y])
            points.add(middle)
            waiting += [(left, middle), (middle, right)]
            yield _drawn(x, y, points, proved, complete=False)
    yield _drawn(x, y, points, proved, complete=True)


def _drawn(
    x: str, y: str, points: Iterable[Corner], proved: bool, complete: bool, reason: str = ""
) -> Frontier:
    return Frontier(x, y, tuple(bends(sorted(points))), proved, complete, reason)


def bends(corners: Sequence[Corner]) -> list[Corner]:
    """The corners at which the line really bends, its ends included."""
    kept: list[Corner] = []
    for corner in corners:
        while len(kept) > 1 and _straight(kept[-2], kept[-1], corner):
            kept.pop()
        kept.append(corner)
    return kept


def _straight(a: Corner, b: Corner, c: Corner) -> bool:
    return (b[0] - a[0]) * (c[1] - a[1]) == (c[0] - a[0]) * (b[1] - a[1])


def _refused(answer: Answer) -> str:
    if answer.status == "infeasible":
        return "the two together do not make the demands possible"
    return answer.reason or answer.status


def corner_list(
    surface: Surface, known: Iterable[Corner] = (), criteria: tuple[str, ...] = TRIPLE
) -> Iterator[CornerList]:
    """Every extreme point of the least triples, each time more is known; the last is complete.

    `known` are triples that can be had, to start from.
    """
    surface.watch(criteria)
    found = CornerList(criteria, complete=False)
    hull: LowerHull | None = None
    proved = True
    for place in range(3):
        weights = tuple(Fraction(int(k == place)) for k in range(3))
        answer = surface.least(criteria, weights, then=True)
        if answer.status != "optimal" or answer.at is None:
            yield replace(found, proved=answer.proved, complete=True, reason=_refused(answer))
            return
        proved = proved and answer.proved
        point = tuple(answer.at[name] for name in criteria)
        if hull is None:
            hull = LowerHull(point)
        else:
            hull.add(point)
    if hull is None:
        raise AssertionError("three criteria have three ends")
    for point in known:
        hull.add(point)
    settled: set[tuple[int, ...]] = set()
    while open_faces := [face for face in hull.faces if face.row not in settled]:
        face = open_faces[0]
        bound = surface.bound(criteria, face.weights)
        if bound is None or bound[0] < face.level:
            answer = surface.least(criteria, face.weights, then=not all(face.weights))
            if answer.status != "optimal" or answer.at is None or answer.value is None:
                yield replace(found, reason=_refused(answer))
                return
            bound = answer.value, answer.proved
            if answer.value < face.level:
                hull.add(tuple(answer.at[name] for name in criteria))
                found = replace(found, corners=tuple(sorted(hull.points)), proved=proved)
                yield found
                continue
        proved = proved and bound[1]
        settled.add(face.row)
    yield CornerList(criteria, tuple(hull.corners()), proved)
