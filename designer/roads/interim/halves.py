"""Exact counts without a pass: profiles are pairs of half-profiles.

With two to four options, option k is taken where its index is at least (or, against options
listed before it, more than) every other's. For a half-profile on the left that asks K - 1
differences of the right half to reach thresholds: a dominance query (`dominance.py`). So N
profiles cost about sqrt(N) * log(N)**(K - 2), not N.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
import numpy.typing as npt

from designer.engines.watch import Watch
from designer.roads.interim.additive import Additive, Words, additive, ranked, words
from designer.roads.interim.cores import on_cores
from designer.roads.interim.dominance import dominance
from designer.roads.interim.rule import Counts, Rule
from designer.setting.setting import IntArray, Setting

OPTIONS = (2, 3, 4)
ROOM = 2**62
DIGIT = 30
"""Bits of a weight that are summed at a time where weights exceed 62 bits."""

Ints = npt.NDArray[np.int64]


def halves(setting: Setting, lead: int | None) -> tuple[tuple[int, ...], tuple[int, ...]]:
    """The parties on the left (the lead among them) and on the right, for the least work."""
    return _split(setting.shape, lead)


@lru_cache(maxsize=16)
def _split(shape: tuple[int, ...], lead: int | None) -> tuple[tuple[int, ...], tuple[int, ...]]:
    ways: dict[int, tuple[int, ...]] = {1: ()} if lead is None else {shape[lead]: (lead,)}
    for index, size in enumerate(shape):
        if index != lead:
            ways = {
                **{product * size: (*own, index) for product, own in ways.items()},
                **ways,
            }
    slices = 1 if lead is None else shape[lead]
    whole = math.prod(shape)
    left = min(ways.items(), key=lambda way: (way[0] + slices * (whole // way[0]), way))
    own = tuple(sorted(left[1]))
    return own, tuple(i for i in range(len(shape)) if i not in own)


def work(setting: Setting, lead: int | None) -> float:
    """Seconds that a count takes, roughly; infinite with another number of options."""
    options = len(setting.options)
    if options not in OPTIONS:
        return math.inf
    left, _ = halves(setting, lead)
    one = math.prod(setting.shape[i] for i in left)
    other = setting.profiles // one * (1 if lead is None else setting.shape[lead])
    points = one + other
    each = (2e-7, 8e-7, 5e-6)[options - 2] * math.log2(points + 2) / 17
    return 1e-4 + (options - 1) * points * each


def count(setting: Setting, rule: Rule, lead: int | None, watch: Watch) -> Counts:
    """The exact counts of a rule, slice by slice of the lead party's types (None: one slice)."""
    return _Halves.of(setting, rule, lead).counts(watch)


def totals(setting: Setting, rule: Rule, watch: Watch) -> tuple[int, ...]:
    """The weight of the profiles at which each option is taken."""
    return _Halves.of(setting, rule, None).totals(watch)


@dataclass(frozen=True, eq=False)
class _Side:
    """One half: its parties, the index sums per option, and the weights of its profiles."""

    parties: tuple[int, ...]
    shape: tuple[int, ...]
    sums: list[Words]
    weights: IntArray | None  # None where all are the same
    even: int

    @property
    def size(self) -> int:
        return math.prod(self.shape)

    @staticmethod
    def of(setting: Setting, index: Additive, reach: int, parties: tuple[int, ...]) -> _Side:
        shape = tuple(setting.shape[i] for i in parties)
        sums = []
        for k in range(len(setting.options)):
            parts = [words(index.parties[i][:, k], reach) for i in parties]
            limbs = len(words(np.zeros(1, dtype=object), reach))
            sums.append([_outer_sum([part[limb] for part in parts]) for limb in range(limbs)])
        even = 1
        if all(len(set(setting.parties[i].weights)) == 1 for i in parties):
            even = math.prod(setting.parties[i].weights[0] for i in parties)
            return _Side(parties, shape, sums, None, even)
        total = math.prod(sum(setting.parties[i].weights) for i in parties)
        weights = np.ones(1, dtype=np.int64 if total < ROOM else object)
        for i in parties:
            own = np.array(setting.parties[i].weights, dtype=weights.dtype)
            weights = np.multiply.outer(weights, own).ravel()
        return _Side(parties, shape, sums, weights, even)

    def only(self, place: int, position: int) -> _Side:
        """The half where one of its parties has one type."""
        grid = np.arange(self.size).reshape(self.shape)
        keep = np.take(grid, position, axis=place).ravel()
        weights = None if self.weights is None else self.weights[keep]
        sums = [[limb[keep] for limb in part] for part in self.sums]
        shape = (*self.shape[:place], *self.shape[place + 1 :])
        return _Side((), shape, sums, weights, self.even)


@dataclass(frozen=True, eq=False)
class _Halves:
    setting: Setting
    lead: int | None
    left: _Side
    right: _Side
    constants: list[int]
    reach: int

    @staticmethod
    def of(setting: Setting, rule: Rule, lead: int | None) -> _Halves:
        index = additive(rule)
        reach = 4 * index.reach + 4
        left, right = halves(setting, lead)
        return _Halves(
            setting,
            lead,
            _Side.of(setting, index, reach, left),
            _Side.of(setting, index, reach, right),
            [int(v) for v in index.options],
            reach,
        )

    def counts(self, watch: Watch) -> Counts:
        """Both directions, each option but the last, on both cores."""
        setting, options = self.setting, len(self.constants)
        slices = 1 if self.lead is None else setting.shape[self.lead]
        tables = [
            tuple(np.zeros((n, options), dtype=object) for n in setting.shape)
            for _ in range(slices)
        ]
        place = None if self.lead is None else self.left.parties.index(self.lead)
        tasks: list[tuple[int, int]] = [(k, -1) for k in range(options - 1)]
        tasks += [(k, g) for k in range(options - 1) for g in range(slices)]

        def one(number: int, guard: Watch) -> None:
            guard.check()
            k, g = tasks[number]
            if g < 0:
                self._spread(self._reached(self.left, self.right, k), self.left, k, tables, None)
            else:
                part = self.left if place is None else self.left.only(place, g)
                self._spread(self._reached(self.right, part, k), self.right, k, tables, g)

        if self.left.size + self.right.size < 1 << 14:
            for number in range(len(tasks)):
                one(number, watch)
        else:
            doing, each = "counting by halves", setting.profiles // len(tasks)
            on_cores(one, len(tasks), watch, doing, each)
        self._last(tables)
        return Counts(tuple(tables))

    def totals(self, watch: Watch) -> tuple[int, ...]:
        """As `totals` says."""
        found = []
        for k in range(len(self.constants) - 1):
            watch.check()
            reached = self._reached(self.left, self.right, k)
            own = self.left.weights
            if own is not None:
                total = self.setting.total_weight
                reached = reached * (own if total < ROOM else own.astype(object))
            found.append(_sum(reached) * self.left.even * self.right.even)
        return (*found, self.setting.total_weight - sum(found))

    def _reached(self, asking: _Side, asked: _Side, k: int) -> IntArray:
        """Per profile of one half, the weight (or number) of the other's at which k is taken."""
        points, queries = [], []
        for j in range(len(self.constants)):
            if j == k:
                continue
            # S_k - S_j must be at least 0 against later options, 1 against earlier ones.
            floor = self.constants[j] - self.constants[k] + (1 if j < k else 0)
            limbs = words(np.array([floor], dtype=object), self.reach)
            point = [a - b for a, b in zip(asked.sums[k], asked.sums[j], strict=True)]
            query = [
                c - (a - b) for a, b, c in zip(asking.sums[k], asking.sums[j], limbs, strict=True)
            ]
            at, least = ranked([point, query])
            points.append(at)
            queries.append(least)
        own = asked.weights
        if own is None or own.dtype != object:
            return dominance(points, own, queries)
        total: IntArray = np.zeros(len(queries[0]), dtype=object)
        for place in range(0, max(int(w).bit_length() for w in own), DIGIT):
            digit = ((own >> place) & ((1 << DIGIT) - 1)).astype(np.int64)
            total += dominance(points, digit, queries).astype(object) << place
        return total

    def _spread(
        self,
        reached: IntArray,
        side: _Side,
        k: int,
        tables: list[tuple[IntArray, ...]],
        g: int | None,
    ) -> None:
        """Add what one half's profiles reached to its parties' tables, slice by slice."""
        setting = self.setting
        even = self.left.even * self.right.even
        top = setting.total_weight // even
        grid: IntArray = reached if top < ROOM else reached.astype(object)
        if side.weights is not None:
            grid = grid * side.weights
        grid = grid.reshape(side.shape)
        axes = range(len(side.shape))
        for place, party in enumerate(side.parties):
            if g is None and self.lead is not None and party != self.lead:
                other = side.parties.index(self.lead)
                kept = grid.sum(axis=tuple(a for a in axes if a not in (place, other)))
                rows = kept if other < place else kept.T
                for slice_, row in enumerate(rows):
                    tables[slice_][party][:, k] += row.astype(object) * even
                continue
            total = grid.sum(axis=tuple(a for a in axes if a != place)).astype(object) * even
            if party == self.lead:
                for slice_, number in enumerate(total):
                    tables[slice_][party][slice_, k] += number
            else:
                tables[g or 0][party][:, k] += total

    def _last(self, tables: list[tuple[IntArray, ...]]) -> None:
        """The last option is taken where no other is."""
        setting = self.setting
        for g, row in enumerate(tables):
            share = setting.total_weight
            if self.lead is not None:
                own = setting.parties[self.lead].weights
                share = share // sum(own) * own[g]
            for index, (party, table) in enumerate(zip(setting.parties, row, strict=True)):
                if index == self.lead:
                    table[g, -1] = share - sum(table[g, :-1])
                    continue
                each = share // sum(party.weights)
                mass = np.array(party.weights, dtype=object) * each
                table[:, -1] = mass - table[:, :-1].sum(axis=1)


def _sum(values: IntArray) -> int:
    """The sum of nonnegative integers, whatever its size."""
    if values.dtype == object:
        return int(values.sum())
    low = values & ((1 << 31) - 1)
    return int((values >> 31).sum()) * (1 << 31) + int(low.sum())


def _outer_sum(parts: list[Ints]) -> Ints:
    """Sums of one entry per list, last list fastest."""
    total = np.zeros(1, dtype=np.int64)
    for part in parts:
        total = np.add.outer(total, part).ravel()
    return total
