"""Interim participation: the most a party pays on average, by its worst-off type or types.

Participation holds E[pays | a] <= E[room(a)], one row per type over all the others' profiles.
If the payments that leave one type w exactly at its room, and follow the shortest paths from w
everywhere, keep every other type within its room, they are best. Otherwise several types are
worst off together and an exact linear program over the classes settles their shares; lies
are added to it as they tempt.
"""

from __future__ import annotations

from fractions import Fraction

import numpy as np

from designer.engines.watch import Stopped, Watch
from designer.program.linear import Bound, LinearProgram
from designer.proof.outcome import Outcome
from designer.proof.prove import prove
from designer.roads.typegraph.bases import Base, Cycle, Flow, TooBig, cycle, trees
from designer.roads.typegraph.decided import Indices
from designer.roads.typegraph.fibers import Fibers
from designer.setting.setting import IntArray

CELLS = 60_000
"""Class payments up to which the linear program over the classes is tried."""

Lie = tuple[int, int, int]
"""(class, true type, told type)."""


def by_types(work: Fibers, watch: Watch) -> Base | Cycle:
    """The party's best table under interim participation."""
    types = work.types
    rooms, worth, room = [0] * types, 0, 0
    for start, lengths in work.blocks():
        stop = start + len(lengths.room)
        held = work.shared(start, stop, lengths.room)
        rooms = [r + h for r, h in zip(rooms, held, strict=True)]
        worth += work.sum(lengths.sinks, lengths.worth)
        room += work.sum(lengths.sinks, lengths.room)
    mass = work.total // int(work.own.sum())
    den = work.den * work.total
    means = Fraction(worth, den), Fraction(room, den)
    found_trees = []
    for w in range(types):
        found = _from(work, w, watch)
        if isinstance(found, Cycle):
            return found
        pays, tree, sums = found
        found_trees.append(tree)
        # In units of 1 / (den * mass): what each type pays on average, once w is at its room.
        if all(s + rooms[w] <= r for s, r in zip(sums, rooms, strict=True)):
            total = sum(int(o) * (s + rooms[w]) for o, s in zip(work.own, sums, strict=True))
            lift = Fraction(rooms[w], work.den * mass)
            most = Fraction(total, den)
            return Base(pays, most - lift, most, w, tree, None, *means)
    return _mixed(work, rooms, found_trees, means, watch)


def _from(work: Fibers, w: int, watch: Watch) -> tuple[IntArray, Indices, list[int]] | Cycle:
    """Distances from type w in every class, their trees, and their sums by type."""
    pays = np.zeros((work.classes, work.types), dtype=work.dtype)
    tree = np.zeros((work.classes, work.types), dtype=np.int64)
    sums = [0] * work.types
    for start, lengths in work.blocks():
        watch.tell(f"paths of {work.setting.parties[work.party].name}", start)
        stop = start + len(lengths.room)
        dist, paths, bad = trees(work, start, lengths, w)
        if bad.any():
            return cycle(work, start + int(np.flatnonzero(bad)[0]))
        pays[start:stop], tree[start:stop] = dist, paths
        part = work.shared(start, stop, dist)
        sums = [s + p for s, p in zip(sums, part, strict=True)]
    return pays, tree, sums


def _mixed(
    work: Fibers,
    rooms: list[int],
    known: list[Indices],
    means: tuple[Fraction, Fraction],
    watch: Watch,
) -> Base:
    """Several worst-off types: an exact linear program, lies added as they tempt."""
    if work.classes * work.types > CELLS:
        raise TooBig(
            f"several types of {work.setting.parties[work.party].name} are worst off together"
        )
    lies = sorted(
        {
            (g, a, int(tree[g, a]))
            for tree in known
            for g in range(work.classes)
            for a in range(work.types)
            if int(tree[g, a]) != a
        }
    )
    cost = np.concatenate([lengths.cost for _, lengths in work.blocks()])
    while True:
        outcome = prove(_program(work, rooms, cost, lies), watch=watch)
        if outcome.status != "optimal" or not outcome.proved or outcome.primal is None:
            if outcome.status == "undecided":
                raise Stopped(outcome.reason)
            raise TooBig(outcome.reason or "the program over the classes was not settled")
        values = outcome.primal.dense()
        pays = np.array(values, dtype=object).reshape(work.classes, work.types)
        gap = pays[:, :, None] - pays[:, None, :] - cost
        tempting = np.argwhere((gap > 0).astype(bool))
        if not len(tempting):
            return _settled(work, outcome, pays, lies, means)
        lies = sorted({*lies, *((int(g), int(a), int(b)) for g, a, b in tempting)})


def _program(work: Fibers, rooms: list[int], cost: IntArray, lies: list[Lie]) -> LinearProgram:
    """Max sum mass * own * pays;  pays[g, a] - pays[g, b] <= cost,  sum mass * pays <= rooms."""
    classes, types = work.classes, work.types
    rows = len(lies) + types
    g, a, b = (np.array(part, dtype=np.int64) for part in zip(*lies, strict=True))
    pairs = np.stack([g * types + np.minimum(a, b), g * types + np.maximum(a, b)], axis=1)
    signs = np.stack([np.where(a < b, 1, -1), np.where(a < b, -1, 1)], axis=1)
    members = np.arange(classes * types, dtype=np.int64).reshape(classes, types).T
    mass = np.array([int(m) for m in work.mass], dtype=object)
    upper = np.concatenate([cost[g, a, b].astype(object), np.array(rooms, dtype=object)])
    none = np.zeros(classes * types, dtype=np.int64)
    nowhere = np.zeros(classes * types, dtype=bool)
    return LinearProgram(
        indptr=np.concatenate(
            [np.arange(len(lies) + 1) * 2, len(lies) * 2 + np.arange(1, types + 1) * classes]
        ).astype(np.int64),
        indices=np.concatenate([pairs.ravel(), members.ravel()]),
        data=np.concatenate([signs.ravel().astype(object), np.tile(mass, types)]),
        row_lo=Bound(np.zeros(rows, dtype=np.int64), np.zeros(rows, dtype=bool)),
        row_hi=Bound(upper, np.ones(rows, dtype=bool)),
        col_lo=Bound(none, nowhere),
        col_hi=Bound(none, nowhere),
        col_den=1,
        cost=np.multiply.outer(mass, work.own).ravel(),
        integer=nowhere,
        sense="max",
    )


def _settled(
    work: Fibers,
    outcome: Outcome,
    pays: IntArray,
    lies: list[Lie],
    means: tuple[Fraction, Fraction],
) -> Base:
    if outcome.dual is None or outcome.value is None or outcome.primal is None:
        raise AssertionError("an optimum has multipliers")
    # Multipliers of the minimising form are negative on upper bounds; scaled so that the
    # roots sum to 1 (they sum to the weight of the party's own types).
    own = int(work.own.sum())
    duals = outcome.dual.fractions()
    den = outcome.dual.den * own
    flow = Flow(
        den,
        tuple(int(-duals.get(len(lies) + a, Fraction(0)) * den / own) for a in range(work.types)),
        tuple((*lie, int(-duals[j] * den / own)) for j, lie in enumerate(lies) if duals.get(j)),
    )
    value = outcome.value / (work.den * work.total)
    return Base(pays, value, value, 0, None, flow, *means)
