"""Exact counts where parties are alike: several of them count as one, whose types are multisets.

Where m parties have the same index at the same weights, only how many of them have each type
matters: comb(m + T - 1, T - 1) multisets instead of T**m profiles, each with its multinomial
weight. So alike parties are put together in one chunk, or in two that make halves of equal
size, and the chunks are counted like parties. A party in a chunk of m takes its even share:

    C_i(k, a) = sum over multisets s of C(k, s) * n_a(s) / m,

which is whole, and the same for all parties that are alike. Types that differ in nothing
the index says are counted as one, too, and share by their weights.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
import numpy.typing as npt

from designer.engines.watch import Watch
from designer.roads.interim import halves
from designer.roads.interim.additive import ROOM as SHORT
from designer.roads.interim.additive import Additive, additive
from designer.roads.interim.rule import Counts, Index, Rule
from designer.roads.multisets import multisets
from designer.setting.setting import IntArray, Party, Setting, Type

ROOM = 2**62
LARGEST = 1 << 20
"""Multisets of one chunk held at once."""

SWEPT = 1 << 22
"""Profiles of multisets up to which each is looked at."""

Ints = npt.NDArray[Any]


@dataclass(frozen=True)
class _Like:
    """Parties alike.

    members  their positions
    rows     the different rows of their index
    masses   the weight of each row: of all types that have it
    kinds    per member, the row that each of its types has
    """

    members: tuple[int, ...]
    rows: tuple[tuple[int, ...], ...]
    masses: tuple[int, ...]
    kinds: tuple[tuple[int, ...], ...]

    def multisets(self, size: int) -> int:
        """How many multisets `size` of the parties may have."""
        return math.comb(size + len(self.rows) - 1, len(self.rows) - 1)


@dataclass(frozen=True)
class _Plan:
    """Which parties go together.

    likes   every party is in one
    left    per group, how many go to the chunk on the left; the rest to that on the right
    swept   whether every profile of whole groups is looked at instead
    """

    likes: tuple[_Like, ...]
    left: tuple[int, ...]
    swept: bool
    seconds: float


def work(setting: Setting, rule: Rule, lead: int | None) -> float:
    """Seconds that a count takes, roughly; infinite where no parties are alike."""
    return _plan(setting, additive(rule), lead).seconds


def count(setting: Setting, rule: Rule, lead: int | None, watch: Watch) -> Counts:
    """The exact counts of a rule, slice by slice of the lead party's types (None: one slice)."""
    index = additive(rule)
    plan = _plan(setting, index, lead)
    if plan.swept:
        chunks = [_Chunk.of(like, len(like.members)) for like in plan.likes]
        place = [g for g, like in enumerate(plan.likes) if lead in like.members]
        found = _sweep(chunks, index, place[0] if place else None, watch)
    else:
        sizes = [
            (like, size)
            for like, left in zip(plan.likes, plan.left, strict=True)
            for size in (left, len(like.members) - left)
            if size
        ]
        chunks = [_Chunk.of(like, size) for like, size in sizes]
        place = [c for c, (like, _) in enumerate(sizes) if lead in like.members]
        whole, own = _as_parties(setting, chunks, index)
        found = halves.count(whole, own, place[0] if place else None, watch).taken
    return Counts(tuple(_shared_out(setting, chunks, tables) for tables in found))


def _likes(setting: Setting, index: Additive, lead: int | None) -> list[_Like]:
    """The parties, those alike together; a lead party by itself, all its types apart."""
    groups: dict[tuple[tuple[tuple[int, ...], int], ...], list[tuple[int, tuple[int, ...]]]] = {}
    likes = []
    for party, table in enumerate(index.parties):
        rows = [tuple(int(v) for v in row) for row in table.tolist()]
        weights = setting.parties[party].weights
        if party == lead:
            own = tuple(range(len(rows)))
            likes.append(_Like((party,), tuple(rows), tuple(weights), (own,)))
            continue
        masses: dict[tuple[int, ...], int] = {}
        for row, weight in zip(rows, weights, strict=True):
            masses[row] = masses.get(row, 0) + weight
        different = sorted(masses.items())
        place = {row: c for c, (row, _) in enumerate(different)}
        kinds = tuple(place[row] for row in rows)
        groups.setdefault(tuple(different), []).append((party, kinds))
    for pairs, found in groups.items():
        likes.append(
            _Like(
                tuple(party for party, _ in found),
                tuple(row for row, _ in pairs),
                tuple(mass for _, mass in pairs),
                tuple(kinds for _, kinds in found),
            )
        )
    return likes


def _plan(setting: Setting, index: Additive, lead: int | None) -> _Plan:
    """The cheapest way to put parties together."""
    likes = tuple(_likes(setting, index, lead))
    options = len(index.options)
    hopeless = _Plan(likes, (0,) * len(likes), False, math.inf)
    if len(likes) == len(index.parties):
        return hopeless
    slices = 1 if lead is None else setting.shape[lead]
    wide = max(len(like.rows) for like in likes)
    whole = math.prod(like.multisets(len(like.members)) for like in likes)
    best = hopeless
    if whole <= SWEPT:
        slow = 1 if 2 * index.reach + 2 < SHORT and setting.total_weight < ROOM else 15
        best = _Plan(likes, best.left, True, 1e-3 + 1e-8 * slow * whole * (options + 3 * wide))
    if options in halves.OPTIONS:
        left = _split(likes, lead)
        if left is not None:
            points = [1, 1]
            for like, own in zip(likes, left, strict=True):
                points[0] *= like.multisets(own)
                points[1] *= like.multisets(len(like.members) - own)
            asked = points[0] + slices * points[1]
            each = (2e-7, 8e-7, 5e-6)[options - 2] * math.log2(asked + 2) / 17
            slow = 1 + setting.total_weight.bit_length() // 62
            seconds = 1e-3 + (options - 1) * asked * each * slow + 2e-7 * sum(points) * wide * slow
            if seconds < best.seconds:
                best = _Plan(likes, left, False, seconds)
    return best


def _split(likes: tuple[_Like, ...], lead: int | None) -> tuple[int, ...] | None:
    """Per group how many parties go left, for the fewest multisets in the two halves together.

    Choices that have more on both sides than another are dropped as groups are gone through.
    """
    ways: dict[tuple[int, int], tuple[int, ...]] = {(1, 1): ()}
    for like in likes:
        size = len(like.members)
        steps = [
            (own, like.multisets(own), like.multisets(size - own))
            for own in ([1] if lead in like.members else range(size + 1))
        ]
        steps = [step for step in steps if max(step[1:]) <= LARGEST]
        more: dict[tuple[int, int], tuple[int, ...]] = {}
        for (one, two), left in ways.items():
            for own, here, there in steps:
                if max(one * here, two * there) <= 4 * LARGEST:
                    more.setdefault((one * here, two * there), (*left, own))
        ways = {}
        least = math.inf
        for one, two in sorted(more):
            if two < least:
                least = two
                ways[one, two] = more[one, two]
    if not ways:
        return None
    return min(ways.items(), key=lambda way: (sum(way[0]), way))[1]


@dataclass(frozen=True, eq=False)
class _Chunk:
    """Some parties alike as one: its types are the multisets.

    numbers  int64, shape (M, rows): how many of the parties have each row
    weights  int, shape (M,)
    """

    like: _Like
    size: int
    numbers: Ints
    weights: Ints

    @staticmethod
    def of(like: _Like, size: int) -> _Chunk:
        """The chunk of `size` of the parties; a party alone keeps its rows in order."""
        if size == 1:
            numbers: Ints = np.eye(len(like.rows), dtype=np.int64)
            return _Chunk(like, 1, numbers, np.array(like.masses, dtype=object))
        return _Chunk(like, size, *multisets(size, like.masses))

    def table(self, reach: int) -> IntArray:
        """The multisets' index sums, shape (M, K)."""
        kind: Any = np.int64 if reach < SHORT else object
        rows = np.array(self.like.rows, dtype=object).astype(kind)
        total: IntArray = np.zeros((len(self.numbers), rows.shape[1]), dtype=kind)
        for number, row in zip(self.numbers.T, rows, strict=True):
            total += np.multiply.outer(number.astype(kind), row)
        return total


def _as_parties(setting: Setting, chunks: list[_Chunk], index: Additive) -> tuple[Setting, Rule]:
    """A setting whose parties are the chunks, and the rule on it."""
    kind, none = Type("multiset"), np.zeros((0, 0), dtype=np.int64)
    parties = tuple(
        Party(
            name=f"chunk {c}",
            types=(kind,) * len(chunk.weights),
            weights=tuple(chunk.weights.tolist()),
            value=none,
            outside=none,
        )
        for c, chunk in enumerate(chunks)
    )
    tables = tuple(chunk.table(index.reach) for chunk in chunks)
    whole = replace(setting, parties=parties, joint=None, rule=None)
    return whole, Rule((Index(tables, index.options),))


def _sweep(
    chunks: list[_Chunk], index: Additive, lead: int | None, watch: Watch
) -> tuple[tuple[IntArray, ...], ...]:
    """The counts of the chunks, looking at every profile of multisets; lead: a chunk or None."""
    shape = tuple(len(chunk.weights) for chunk in chunks)
    options = len(index.options)
    reach = 2 * index.reach + 2
    kind: Any = np.int64 if reach < SHORT else object
    tables = [chunk.table(reach) for chunk in chunks]
    best: Ints = np.zeros(shape, dtype=np.int64)
    top: Ints | None = None
    for k in range(options):
        watch.check()
        score = np.full((), int(index.options[k]), dtype=kind)
        for table in tables:
            score = np.add.outer(score, table[:, k])
        if top is None:
            top = score
            continue
        above = np.asarray(score > top, dtype=bool)  # ties stay with the option listed first
        best[above] = k
        top = np.where(above, score, top)
    total = math.prod(int(chunk.weights.sum()) for chunk in chunks)
    weights: Ints = np.ones((), dtype=np.int64 if total < ROOM else object)
    for chunk in chunks:
        weights = np.multiply.outer(weights, chunk.weights.astype(weights.dtype))
    slices = 1 if lead is None else shape[lead]
    found = [
        tuple(np.zeros((size, options), dtype=object) for size in shape) for _ in range(slices)
    ]
    axes = range(len(shape))
    for k in range(options):
        watch.check()
        taken = np.where(best == k, weights, 0)
        for c in axes:
            if lead is None or c == lead:
                sums = taken.sum(axis=tuple(a for a in axes if a != c)).astype(object)
                if lead is None:
                    found[0][c][:, k] = sums
                else:
                    for g in range(slices):
                        found[g][c][g, k] = sums[g]
                continue
            pairs = taken.sum(axis=tuple(a for a in axes if a not in (c, lead))).astype(object)
            for g, row in enumerate(pairs if lead < c else pairs.T):
                found[g][c][:, k] = row
    return tuple(found)


def _shared_out(
    setting: Setting, chunks: list[_Chunk], tables: tuple[IntArray, ...]
) -> tuple[IntArray, ...]:
    """The tables of the parties from those of the chunks."""
    done: dict[int, IntArray] = {}
    for chunk, table in sorted(
        zip(chunks, tables, strict=True), key=lambda pair: len(pair[0].weights)
    ):
        like = chunk.like
        if like.members[0] in done:
            continue  # the other chunk of the same parties says the same
        short = setting.total_weight * chunk.size < ROOM
        kind: Any = np.int64 if short else object
        shares = chunk.numbers.T.astype(kind) @ table.astype(kind) // chunk.size
        for party, kinds in zip(like.members, like.kinds, strict=True):
            weights = setting.parties[party].weights
            done[party] = np.array(
                [
                    [int(v) * weight // like.masses[c] for v in shares[c]]
                    for c, weight in zip(kinds, weights, strict=True)
                ],
                dtype=object,
            )
    return tuple(done[party] for party in range(len(setting.parties)))
