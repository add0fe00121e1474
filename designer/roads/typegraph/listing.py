"""What is listed in the program over lotteries so far, party by party, and what is missing.

A point of the program is held against shortest paths or lies under its own lotteries; what it
breaks is listed as well. Floats lead, the last word is exact.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from fractions import Fraction
from typing import Any

import numpy as np

from designer.engines.report import FloatArray
from designer.program.program import Program
from designer.proof.vector import Vector
from designer.roads.typegraph.bases import ZERO, Base, Root
from designer.roads.typegraph.decided import Decided, Indices
from designer.roads.typegraph.fibers import Fibers
from designer.roads.typegraph.lotteries import Bound, Lies, Opened
from designer.roads.typegraph.paths import shorten
from designer.roads.typegraph.torn import Torn, shortest
from designer.setting.setting import IntArray

NEAR = 1e-9
"""What floats may leave of a difference, relative to the largest amount in sight."""


@dataclass
class Lines:
    """Rows of small numbers without repetition, in the order of arrival; the first is a graph."""

    rows: IntArray
    known: set[bytes] = field(default_factory=set)

    def add(self, lines: IntArray) -> int:
        """Add those that are not there yet; how many."""
        whole = np.ascontiguousarray(lines.astype(np.int64))
        fresh = []
        for j, line in enumerate(whole):
            key = line.tobytes()
            if key not in self.known:
                self.known.add(key)
                fresh.append(j)
        self.rows = np.concatenate([self.rows, whole[fresh]])
        return len(fresh)

    @property
    def order(self) -> Indices:
        """Ascending, the graph first."""
        return np.lexsort(self.rows.T[::-1]).astype(np.int64)

    def listed(self, ordered: bool) -> IntArray:
        """The rows; `ordered`: ascending."""
        return self.rows[self.order] if ordered else self.rows


class Listed:
    """A bound on a party's payments in the making."""

    def __init__(self, found: Torn, root: Root) -> None:
        """Begin with the paths under the options first listed."""
        self.found, self.root = found, root
        _, tree = shortest(found.work, root)
        self.even = tree[found.even]
        self.lines = Lines(np.zeros((0, found.work.types + 1), dtype=np.int64))
        every = np.arange(len(found.others), dtype=np.int64)
        self._add(every, tree[found.work.of[found.others]])

    def _add(self, graph: Indices, trees: IntArray) -> int:
        return self.lines.add(np.column_stack([graph, trees]))

    def bound(self, ordered: bool) -> Bound:
        """As the program takes it."""
        rows = self.lines.listed(ordered)
        return Bound(self.root, self.even, rows[:, 0], rows[:, 1:])

    def paths_under(self, alone: Fibers) -> int:
        """List every shortest path under a rule; how many are new."""
        _, tree = shortest(alone, self.root)
        return self._add(np.arange(len(tree), dtype=np.int64), tree)

    def near(self, alone: Fibers, paid: FloatArray) -> int:
        """List the paths that allow less than is paid, in floats."""
        dist, tree = shortest(alone, self.root)
        sinks = self.found.sinks()
        counted = np.where(sinks != 0, dist, 0).astype(np.float64) / alone.den
        weights = sinks.astype(np.float64)
        reached = (weights * counted).sum(axis=1) / weights.sum(axis=1)
        far = NEAR * max(1.0, float(abs(reached).max(initial=0)))
        chosen = np.flatnonzero(paid > reached + far)
        return self._add(chosen, tree[chosen])

    def exactly(self, alone: Fibers, paid: IntArray, den: int) -> int:
        """List the paths that allow less than is paid; `paid` over den."""
        dist, tree = shortest(alone, self.root)
        sinks = self.found.sinks().astype(object)
        total = (sinks * np.where(sinks != 0, dist, 0)).sum(axis=1)
        short: Any = paid * (sinks.sum(axis=1) * alone.den) > total * den
        chosen = np.flatnonzero(short.astype(bool))
        return self._add(chosen, tree[chosen])


class Spelling:
    """The lies of a party that is spelled, in the making."""

    def __init__(self, found: Torn) -> None:
        """`found`: every graph once."""
        self.found = found
        self.lines = Lines(np.zeros((0, 3), dtype=np.int64))

    def paths_under(self, alone: Fibers) -> int:
        """List the lies on shortest paths under a rule, from every type: no type is left free.

        Among shortest paths those of many small steps are taken: they imply the others.
        """
        steps = _steps(alone)
        part = int(steps.sum()) + 1
        small = alone.reach * part < 2**57
        far = 2**60 if small else 8 * alone.reach * part
        added = 0
        for start, lengths in alone.blocks():
            cost = lengths.cost.astype(np.int64 if small else object) * part + steps
            for root in range(alone.types):
                begin = np.full(lengths.room.shape, far, dtype=cost.dtype)
                begin[:, root] = 0
                _, tree, _ = shorten(cost, begin)
                graph, a = np.nonzero(tree != np.arange(alone.types))
                lies = np.column_stack([graph + start, a, tree[graph, a]])
                added += self.lines.add(lies)
        return added

    def lies(self, ordered: bool) -> Lies:
        """As the program takes them."""
        return Lies(self.lines.listed(ordered))

    def near(self, alone: Fibers, paid: FloatArray) -> int:
        """List the lies that tempt at payments in floats, (G * T,)."""
        added = 0
        pays = paid.reshape(alone.classes, alone.types)
        for start, lengths in alone.blocks():
            here = pays[start : start + len(lengths.room)]
            cost = lengths.cost.astype(np.float64) / alone.den
            gap = here[:, :, None] - here[:, None, :] - cost
            far = NEAR * max(1.0, float(abs(here).max(initial=0)))
            added += self._tempting(start, gap, far)
        return added

    def exactly(self, alone: Fibers, paid: IntArray, den: int) -> int:
        """List the lies that tempt; `paid` (G * T,) over den."""
        added = 0
        pays = paid.reshape(alone.classes, alone.types) * alone.den
        for start, lengths in alone.blocks():
            here = pays[start : start + len(lengths.room)]
            gap = here[:, :, None] - here[:, None, :] - lengths.cost.astype(object) * den
            added += self._tempting(start, gap, 0)
        return added

    def _tempting(self, start: int, gap: Any, far: float) -> int:
        graph, true, told = np.nonzero((gap > far).astype(bool))
        return self.lines.add(np.column_stack([graph + start, true, told]))


def _steps(alone: Fibers) -> IntArray:
    """Squares of how far types are apart, (T, T), in the direction in which worths vary most."""
    value = alone.setting.parties[alone.party].value.astype(np.float64)
    spread = value - value[:, :1]
    spread -= spread.mean(axis=0)
    direction = np.linalg.svd(spread, full_matrices=False)[2][0]
    rank = np.argsort(np.argsort(spread @ direction, kind="stable"))
    found: IntArray = (rank[:, None] - rank[None, :]).astype(np.int64) ** 2
    return found


def starts(program: Program) -> list[int]:
    """The first column of every party's or bound's payments by graph, in order."""
    found, place = [], 0
    for block in program.column_axis.blocks:
        if block.family in ("pays against", "pays"):
            found.append(place)
        place += block.count
    return found


def mixed(decided: Decided, shares: IntArray, den: int) -> Decided:
    """The rule with these lotteries at tied profiles, int (M, K) over den; equal ones once."""
    found: dict[tuple[int, ...], int] = {}
    of = [found.setdefault(tuple(row), len(found)) for row in shares.tolist()]
    lotteries = np.array(list(found), dtype=object)
    return decided.mixing(lotteries, den, np.array(of, dtype=np.int64))


def rule_of(program: Program, opened: Opened, primal: Vector) -> Decided:
    """The rule with the lotteries of a point of the program.

    Raises ValueError where they are no lotteries over efficient options.
    """
    start = program.column_axis.start("decides")
    stop = start + len(opened.cells)
    chances = {
        j - start: Fraction(n, primal.den)
        for j, n in zip(primal.idx, primal.num, strict=True)
        if start <= j < stop
    }
    den = int(np.lcm.reduce([1, *(v.denominator for v in chances.values())], dtype=object))
    shares = np.zeros(opened.decided.torn.shape, dtype=object)
    for j, chance in chances.items():
        row, option = opened.cells[j]
        shares[row, option] = int(chance * den)
    return mixed(opened.decided, shares, den)


def spelled_base(opened: Opened, party: int, work: Fibers, paid: IntArray, den: int) -> Base:
    """The payments of a party that is spelled, averaged over graphs that a rule makes one.

    `work` are its classes under that rule; `paid` (G * T,) over den, in money. Averages over
    graphs with the same lies keep them, and participation type by type.
    """
    found = opened.spelled(party)
    of = work.of[found.others]
    sums = np.zeros((work.classes, work.types), dtype=object)
    np.add.at(sums, of, found.masses.astype(object)[:, None] * paid.reshape(-1, work.types))
    mass = np.zeros(work.classes, dtype=object)
    np.add.at(mass, of, found.masses.astype(object))
    scale = Fraction(work.den, den)
    pays = np.array(
        [[scale * v / int(m) for v in row] for row, m in zip(sums, mass, strict=True)], dtype=object
    ).reshape(sums.shape)
    total = Fraction(int((sums * work.own.astype(object)).sum()), den * work.total)
    worth = room = 0
    for _, lengths in work.blocks():
        worth += work.sum(lengths.sinks, lengths.worth)
        room += work.sum(lengths.sinks, lengths.room)
    whole = work.den * work.total
    return Base(pays, total, total, ZERO, None, None, Fraction(worth, whole), Fraction(room, whole))
