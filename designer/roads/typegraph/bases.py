"""For each party a table of payments, up to one number, and what bounds its average.

Under a settled rule with dominant honesty, adding one number to all payments of a party keeps
every lie row. So what a party can be made to pay on average is everything up to some most,
or everything. The most, and a table that reaches it:

    ir none, or the party is compelled      no most;  any distances
    ir ex-ante                              E[room];  any distances
    ir ex-post                              E[d], d the distances from room, type by type
    ir interim (independent types)          one worst-off type w:  d = distances from w, plus
                                            E[room(w)], if no type then pays more than its
                                            E[room] on average; else an exact linear program
                                            over the classes (`worst.py`)
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from designer.engines.watch import Watch
from designer.roads.typegraph.decided import Indices, Mask
from designer.roads.typegraph.fibers import Fibers, Lengths
from designer.roads.typegraph.paths import along, loop, shorten
from designer.setting.setting import IntArray

OWN, ZERO = "own", "zero"
"""Roots of trees: any type with its own room, or any type with 0; else one type's number."""

Root = str | int


@dataclass(frozen=True, eq=False)
class Flow:
    """Multipliers of one party's rows where trees are not enough.

    roots  per type, of the row E[pays | a] <= E[room(a)], over den; they sum to 1
    lies   (class, true, told, multiplier over den and the total mass)
    """

    den: int
    roots: tuple[int, ...]
    lies: tuple[tuple[int, int, int, int], ...]


@dataclass(frozen=True, eq=False)
class Base:
    """A table of one party's payments by class and type, and the most it can pay on average.

    pays     int, shape (G, T), in units of 1 / den
    average  E of these payments       most  None: no bound
    root, tree  the paths behind `pays`; tree None: `flow` is what bounds the average
    worth    E[worth]        room  E[room], before payments; both in money
    """

    pays: IntArray
    average: Fraction
    most: Fraction | None
    root: Root
    tree: Indices | None
    flow: Flow | None
    worth: Fraction
    room: Fraction


@dataclass(frozen=True)
class Cycle:
    """Lies that no payments can all deter: each type in turn prefers to be the next."""

    party: int
    other: int
    types: tuple[int, ...]


class TooBig(Exception):  # noqa: N818 - not an error: another road may go there
    """The graphs are too many for the part that is asked; the message says which."""


def kind(work: Fibers) -> str:
    """How participation holds a party: "free", "mean", "types" or "cases"."""
    terms, name = work.terms, work.setting.parties[work.party].name
    if terms.ir == "none" or name in terms.compelled:
        return "free"
    if terms.ir == "interim":
        return "mean" if work.types == 1 else "types"
    return "cases" if terms.ir == "ex-post" else "mean"


def base(work: Fibers, watch: Watch) -> Base | Cycle:
    """The party's table and bound, or a cycle of lies that proves there is no table."""
    held = kind(work)
    trusted = work.setting.parties[work.party].name in work.terms.trusted
    if held == "types" and not trusted:
        from designer.roads.typegraph.worst import by_types

        return by_types(work, watch)
    return distances(work, OWN if held == "cases" or (trusted and held == "types") else ZERO, watch)


def distances(work: Fibers, root: Root, watch: Watch) -> Base | Cycle:
    """The table of distances from a kind of root, ZERO or OWN."""
    pays = np.zeros((work.classes, work.types), dtype=work.dtype)
    tree = np.zeros((work.classes, work.types), dtype=np.int64)
    total = worth = room = 0
    for start, lengths in work.blocks():
        watch.tell(f"paths of {work.setting.parties[work.party].name}", start)
        stop = start + len(lengths.room)
        dist, paths, bad = trees(work, start, lengths, root)
        if bad.any():
            return cycle(work, start + int(np.flatnonzero(bad)[0]))
        if lengths.scope is not None:
            outside_scope(dist, lengths.cost, lengths.scope, work.far)
        pays[start:stop], tree[start:stop] = dist, paths
        total += work.sum(lengths.sinks, dist)
        worth += work.sum(lengths.sinks, lengths.worth)
        room += work.sum(lengths.sinks, lengths.room)
    den = work.den * work.total
    average, mean = Fraction(total, den), Fraction(room, den)
    most = {"free": None, "mean": mean}.get(kind(work), average)
    return Base(pays, average, most, root, tree, None, Fraction(worth, den), mean)


def trees(work: Fibers, start: int, lengths: Lengths, root: Root) -> tuple[IntArray, Indices, Mask]:
    """Distances and trees of a block; at ties the trees that leaning choices leave shortest."""
    lean = work.leaning
    begin = _begin(work, lengths, root)
    if lean is not None:
        leant = lean.lengths(start, start + len(lengths.room))
        _, paths, bad = shorten(leant.cost, _begin(lean, leant, root))
        if not bad.any():
            dist, _ = along(lengths.cost, paths, begin)
            return dist, paths, bad
    return shorten(lengths.cost, begin)


def _begin(work: Fibers, lengths: Lengths, root: Root) -> IntArray:
    """What the paths' roots start from."""
    if root == OWN:
        begin = lengths.room.copy()
    elif root == ZERO:
        begin = np.zeros_like(lengths.room)
    else:
        begin = np.full(lengths.room.shape, work.far, dtype=work.dtype)
        begin[:, int(root)] = 0
    if lengths.scope is not None:
        begin[~lengths.scope] = work.far
    return begin


def outside_scope(dist: IntArray, cost: IntArray, scope: IntArray, far: int) -> None:
    """Payments where nothing is asked, high enough that nobody in scope lies its way there.

    t(a) >= t(b) - cost[b, a] for every b in scope; 0 where nobody in scope could lie.
    """
    need = np.where(scope[:, :, None], dist[:, :, None] - cost, -far).max(axis=1)
    # A lie that is not asked about costs more than `far`: it needs no deterrent.
    dist[~scope] = np.where((need > -far).astype(bool), need, 0)[~scope]


def cycle(work: Fibers, place: int) -> Cycle:
    """The cycle of a class that has one, at one of the others' profiles."""
    lengths = work.lengths(place, place + 1)
    found = loop(lengths.cost[0])
    if found is None:
        raise AssertionError("the graph was said to have a negative cycle")
    other = int(np.flatnonzero(work.of == place)[0])
    return Cycle(work.party, other, tuple(found))
