"""Shortest paths in many small graphs at once, their trees, and cycles of negative length.

Source: R. Bellman (1958), Quarterly of Applied Mathematics 16:87-90; J.-C. Rochet (1987),
J. Mathematical Economics 16:191-200, for lies as edges (both from memory).
"""

from __future__ import annotations

import numpy as np

from designer.roads.typegraph.decided import Indices, Mask
from designer.setting.setting import IntArray


def shorten(cost: IntArray, start: IntArray) -> tuple[IntArray, Indices, Mask]:
    """Distances d[a] = min(start[a], min_b d[b] + cost[a, b]), the trees, and what has none.

    cost (B, T, T) with zeros on the diagonal, start (B, T). A tree gives each type the type
    it is reached from, itself at a root. The mask marks graphs with a negative cycle, whose
    distances and trees mean nothing.
    """
    count, types = start.shape
    dist = start.copy()
    tree = np.tile(np.arange(types, dtype=np.int64), (count, 1))
    bad = np.zeros(count, dtype=bool)
    live: Indices | None = None
    for step in range(types):
        held = cost if live is None else cost[live]
        now = dist if live is None else dist[live]
        through = held + now[:, None, :]
        best = through.min(axis=2)
        better = (best < now).astype(bool)
        rows = np.flatnonzero(better.any(axis=1))
        if not len(rows):
            break
        row, column = np.nonzero(better[rows])
        row = rows[row]
        places = row if live is None else live[row]
        tree[places, column] = through[row, column].argmin(axis=1)
        dist[places, column] = best[row, column]
        live = rows if live is None else live[rows]
        if step == types - 1:
            bad[live] = True
    return dist, tree, bad


def along(cost: IntArray, tree: IntArray, start: IntArray) -> tuple[IntArray, Mask]:
    """Lengths of the trees' paths on top of `start` at the root, and which graphs' trees loop."""
    count, types = tree.shape
    rows = np.arange(count)[:, None]
    length = cost[rows, np.arange(types)[None, :], tree]
    jump = tree
    for _ in range(max(1, types.bit_length())):
        length = length + length[rows, jump]
        jump = jump[rows, jump]
    loops = (tree[rows, jump] != jump).any(axis=1)
    return length + start[rows, jump], loops


def carried(tree: IntArray, sinks: IntArray) -> IntArray:
    """What flows into each type along the trees: its own sink and those of its descendants."""
    count, types = tree.shape
    rows = np.arange(count)
    roots = tree == np.arange(types)[None, :]
    flow = sinks
    for _ in range(types):
        passed = np.where(roots, 0, flow)
        fresh = sinks.copy()
        for a in range(types):
            fresh[rows, tree[:, a]] += passed[:, a]
        if (fresh == flow).all():
            break
        flow = fresh
    return flow


def loop(cost: IntArray) -> list[int] | None:
    """A cycle of negative length in one graph (T, T), each type followed by the one it imitates.

    The cycle a_0, a_1, ... means: a_0 is told apart from a_1, a_1 from a_2, and so on round.
    None if there is none.
    """
    types = len(cost)
    lengths = [[int(v) for v in row] for row in cost]
    dist, tree = [0] * types, list(range(types))
    last = -1
    for _ in range(types):
        last = -1
        for a in range(types):
            for b in range(types):
                if a != b and dist[b] + lengths[a][b] < dist[a]:
                    dist[a], tree[a], last = dist[b] + lengths[a][b], b, a
        if last < 0:
            return None
    for _ in range(types):
        last = tree[last]
    cycle = [last]
    while tree[cycle[-1]] != last:
        cycle.append(tree[cycle[-1]])
    return cycle


def trail(tree: IntArray, a: int) -> list[int]:
    """The types from a to the root of its path."""
    found = [a]
    while int(tree[found[-1]]) != found[-1]:
        found.append(int(tree[found[-1]]))
    return found
