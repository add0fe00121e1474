"""Weights of the points that are at least as large as a query in every coordinate.

    answer(q) = sum of weight(p) over points p with p_j >= q_j for all j

One coordinate: sorted suffix sums. Two: points sorted by the first, a wavelet matrix over the
second (Claude, Navarro & Ordonez 2015 describe the structure). More: the last coordinate is
split bit by bit (as divide and conquer does), each bit leaving one coordinate less. With N
points the work is N log N for two coordinates, and another log N for each one more.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

Ints = npt.NDArray[np.int64]


def dominance(points: list[Ints], weights: Ints | None, queries: list[Ints]) -> Ints:
    """The answers for all queries; `weights` None counts points.

    points   per coordinate, int, shape (N,)      queries  per coordinate, int, shape (Q,)
    weights  nonnegative, their sum within int64
    """
    size = len(points[0]) if points else 0
    if not points:
        raise ValueError("dominance needs at least one coordinate")
    if not size or not len(queries[0]):
        return np.zeros(len(queries[0]), dtype=np.int64)
    if len(points) == 1:
        return _suffix(points[0], weights, queries[0])
    spot: list[Ints] = []
    asked: list[Ints] = []
    for at, least in zip(points, queries, strict=True):
        values, rank = np.unique(at, return_inverse=True)
        spot.append(rank.astype(np.int64))
        asked.append(np.searchsorted(values, least).astype(np.int64))
    # Queries beyond every point in some coordinate have no answer but 0.
    open_to = np.ones(len(asked[0]), dtype=bool)
    for rank, least in zip(spot, asked, strict=True):
        open_to &= least <= int(rank.max())
    answer = np.zeros(len(asked[0]), dtype=np.int64)
    live = np.flatnonzero(open_to)
    if not len(live):
        return answer
    zero = np.zeros(size, dtype=np.int64)
    answer[live] = _within(
        zero, spot, weights, np.zeros(len(live), dtype=np.int64), [least[live] for least in asked]
    )
    return answer


def _suffix(points: Ints, weights: Ints | None, queries: Ints) -> Ints:
    """One coordinate: sort, and sum from the end. Sorted queries are found fastest."""
    turn = np.argsort(queries)
    answer = np.empty(len(queries), dtype=np.int64)
    if weights is None:
        answer[turn] = len(points) - np.searchsorted(np.sort(points), queries[turn])
        return answer
    order = np.argsort(points)
    total = np.zeros(len(points) + 1, dtype=np.int64)
    np.cumsum(weights[order], out=total[1:])
    answer[turn] = total[-1] - total[np.searchsorted(points[order], queries[turn])]
    return answer


def _within(
    block: Ints, points: list[Ints], weights: Ints | None, home: Ints, queries: list[Ints]
) -> Ints:
    """The same where only points whose block is the query's home count; ranks from 0."""
    if len(points) > 3:
        return _by_bits(block, points, weights, home, queries)
    if len(points) == 3:
        if not block.any() and not home.any():
            return _three(points, weights, queries)
        return _by_bits(block, points, weights, home, queries)
    width = int(points[0].max()) + 1
    key, least = block * width + points[0], home * width + np.minimum(queries[0], width)
    order = np.argsort(key, kind="stable")
    key = key[order]
    own = None if weights is None else weights[order]
    first = np.searchsorted(key, least)
    last = np.searchsorted(key, (home + 1) * width)
    if len(points) == 1:
        if own is None:
            return last - first
        total = np.concatenate([[0], np.cumsum(own)])
        counted: Ints = total[last] - total[first]
        return counted
    return _wavelet(points[1][order], own, first, last, queries[1])


def _three(points: list[Ints], weights: Ints | None, queries: list[Ints]) -> Ints:
    """As `_by_bits` for three coordinates and one block, with one sort for all bits.

    The points stay sorted by (last >> bit, first): each bit parts every block in two, stably.
    """
    order = np.argsort(points[0], kind="stable")
    first, second, last = (at[order] for at in points)
    own = None if weights is None else weights[order]
    least = queries[2]
    width = max(int(first.max()), int(queries[0].max())) + 1
    answer = np.zeros(len(least), dtype=np.int64)
    for bit in reversed(range(-1, max(int(last.max()), int(least.max())).bit_length())):
        block = last >> (bit + 1)
        one = (last >> bit) & 1 == 1 if bit >= 0 else np.ones(len(last), dtype=bool)
        asked = np.flatnonzero((least >> bit) & 1 == 0) if bit >= 0 else np.arange(len(least))
        mine = np.flatnonzero(one)
        if len(mine) and len(asked):
            home = least[asked] >> (bit + 1)
            key = block[mine] * width + first[mine]
            answer[asked] += _wavelet(
                second[mine],
                None if own is None else own[mine],
                np.searchsorted(key, home * width + queries[0][asked]),
                np.searchsorted(key, (home + 1) * width),
                queries[1][asked],
            )
        if bit < 0:
            break
        new = np.concatenate([[True], block[1:] != block[:-1]])
        starts = np.flatnonzero(new)
        which = np.cumsum(new) - 1
        zeros = np.concatenate([[0], np.cumsum(~one)])
        start = starts[which]
        before = zeros[:-1] - zeros[start]
        within = np.arange(len(last)) - start - before
        parted = zeros[np.concatenate([starts[1:], [len(last)]])] - zeros[starts]
        place = start + np.where(one, parted[which] + within, before)
        back = np.empty(len(last), dtype=np.int64)
        back[place] = np.arange(len(last))
        first, second, last = first[back], second[back], last[back]
        own = None if own is None else own[back]
    return answer


def _by_bits(
    block: Ints, points: list[Ints], weights: Ints | None, home: Ints, queries: list[Ints]
) -> Ints:
    """Split the last coordinate: p >= q where equal, or where p first exceeds q at some bit."""
    *rest, last = points
    *asked, least = queries
    answer = np.zeros(len(home), dtype=np.int64)
    for bit in range(-1, max(int(last.max()), int(least.max())).bit_length()):
        # At `bit` the point has 1 and the query 0, above it they agree; -1: they are equal.
        if bit < 0:
            mine, theirs = np.arange(len(last)), np.arange(len(least))
            place, wanted = last, least
        else:
            mine = np.flatnonzero((last >> bit) & 1)
            theirs = np.flatnonzero(~(least >> bit) & 1)
            place, wanted = last >> bit, (least >> bit) | 1
        if not len(mine) or not len(theirs):
            continue
        span = max(int(place.max()), int(wanted.max())) + 1
        pairs = np.concatenate([(block * span + place)[mine], (home * span + wanted)[theirs]])
        _, joined = np.unique(pairs, return_inverse=True)
        answer[theirs] += _within(
            joined[: len(mine)],
            [part[mine] for part in rest],
            None if weights is None else weights[mine],
            joined[len(mine) :],
            [part[theirs] for part in asked],
        )
    return answer


def _wavelet(values: Ints, weights: Ints | None, first: Ints, last: Ints, least: Ints) -> Ints:
    """Weights of entries in [first, last) of a sequence that are at least `least`."""
    answer = np.zeros(len(least), dtype=np.int64)
    low, high = first.astype(np.int32), last.astype(np.int32)
    values = values.astype(np.int32)
    asked = least.astype(np.int32)
    bits = max(int(values.max()).bit_length(), int(asked.max()).bit_length())
    for bit in reversed(range(bits)):
        ones = (values >> bit) & 1
        zeros = np.zeros(len(values) + 1, dtype=np.int32)
        np.cumsum(1 - ones, out=zeros[1:], dtype=np.int32)
        split = int(zeros[-1])
        order = np.concatenate([np.flatnonzero(ones == 0), np.flatnonzero(ones)])
        values = values[order]
        low0, high0 = zeros[low], zeros[high]
        low1, high1 = low - low0 + split, high - high0 + split
        up = ((asked >> bit) & 1).astype(bool)
        if weights is None:
            larger: Ints = (high1 - low1).astype(np.int64)
        else:
            weights = weights[order]
            total = np.zeros(len(weights) + 1, dtype=np.int64)
            np.cumsum(weights, out=total[1:])
            larger = total[high1] - total[low1]
        answer += np.where(up, 0, larger)
        low, high = np.where(up, low1, low0), np.where(up, high1, high0)
    if weights is None:
        return answer + (high - low)
    total = np.zeros(len(weights) + 1, dtype=np.int64)
    np.cumsum(weights, out=total[1:])
    rest: Ints = total[high] - total[low]
    return answer + rest
