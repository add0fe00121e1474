"""All profiles in floats, in slabs: chances and prices of options, and what parties see of them.

An interior-point step needs of the profiles only sums: what every type sees (one table) and
what every pair of types sees together (one matrix). Profiles are pairs of an outer and an
inner half, so the latter are a few products of a slab with indicator matrices.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Callable, Sequence
from concurrent.futures import ThreadPoolExecutor
from typing import TypeVar

import numpy as np

from designer.engines.watch import Watch
from designer.roads.interim.cores import CORES
from designer.roads.interim.leading import Leading, Mask
from designer.roads.interim.rule import Index
from designer.roads.interim.slab import Floats, Places, Slab, scattered
from designer.setting.setting import Setting

Result = TypeVar("Result")

FEW = 4
"""Profiles without order take several times longer each: one in so many must be left."""
SLAB = 1 << 14
"""Profiles handled at once: their arrays stay in the cache."""
PIECE = 1 << 14
"""The same without order."""
CELLS = 12_000_000
"""Chances up to which they are held in memory, four times over: 384 MiB."""
SCATTERED = 4_000_000
"""The same without order: what is known of each profile is held, too."""
NEVER = 1e60
"""What an option lacks that is not open: far beyond money, but its square is still a number."""


class Cube:
    """All slabs."""

    def __init__(self, setting: Setting, watch: Watch, first: Sequence[Index] = ()) -> None:
        """Split the parties in two halves of about the same number of profiles.

        first  indices that decide before all prices
        """
        self.setting, self.watch = setting, watch
        shape = setting.shape
        cuts = range(len(shape))
        self.cut = min(cuts, key=lambda cut: math.prod(shape[:cut]) + math.prod(shape[cut:]))
        self.marginals = [np.array([float(p) for p in one.marginal]) for one in setting.parties]
        self.outer, self.outer_weight = self._half(range(self.cut))
        self.inner, self.inner_weight = self._half(range(self.cut, len(shape)))
        self.leading = Leading(setting, first, self.cut) if first else None
        self.slabs: list[Slab] = []
        self.all: list[Slab] = []  # the first ones, whatever has been settled since
        self.weight = 1.0
        self.fixed = np.zeros((sum(shape), len(setting.options)))

    def _half(self, parties: range) -> tuple[Floats, Floats]:
        """Indicators of the types of some parties, and the probability, per half-profile."""
        shape = [self.setting.shape[i] for i in parties]
        kinds = np.array(list(itertools.product(*map(range, shape))), dtype=np.int64)
        kinds = kinds.reshape(math.prod(shape), len(shape))
        found = np.zeros((len(kinds), sum(shape)))
        weight = np.ones(len(kinds))
        start = 0
        for place, party in enumerate(parties):
            found[np.arange(len(kinds)), start + kinds[:, place]] = 1.0
            weight *= self.marginals[party][kinds[:, place]]
            start += shape[place]
        return found, weight

    def start(self, tables: Floats, margin: float) -> bool:
        """Even chances, and prices whose best option still lacks `margin`.

        With leading indices, among the options that they leave open: where that is one, it is
        settled. Whether there is room for all that are not.
        """
        options = tables.shape[1]
        rows = max(1, SLAB // len(self.inner))
        dense = self.setting.profiles * options <= CELLS
        if self.leading is not None:
            tied = self._tied(rows, options)
            if tied is not None and not (dense and FEW * len(tied[0]) > self.setting.profiles):
                self._start_scattered(*tied, tables, margin)
                return True
            self.fixed[:] = 0.0
        if not dense:
            return False
        self.slabs = []
        for first in range(0, len(self.outer), rows):
            slab = self._slab(first, rows, np.empty(0))
            price = slab.sums(tables)
            if self.leading is None:
                slab.x = np.full(price.shape, 1.0 / options)
                slab.z = price.max(axis=0) + margin - price
            else:
                slab.x, slab.z = _among(self.leading.open(first, rows), price, margin)
            self.slabs.append(slab)
        self.all = self.slabs
        return True

    def _slab(self, first: int, rows: int, chances: Floats) -> Slab:
        odds = self.outer_weight[first : first + rows], self.inner_weight
        outer = self.outer[first : first + rows]
        place = first * len(self.inner)
        return Slab(outer, self.inner, odds, chances, chances, first=place)

    def _tied(self, rows: int, options: int) -> tuple[Places, Floats, Mask] | None:
        """The profiles at which several options are open: numbers, probabilities, and which.

        All others are fixed. None where they are too many.
        """
        if self.leading is None:
            raise AssertionError("nothing is tied without an index that leads")
        parts, count = [], 0
        for first in range(0, len(self.outer), rows):
            self.watch.check()
            best = self.leading.open(first, rows)
            several = (np.count_nonzero(best, axis=0) > 1).ravel()
            slab = self._slab(first, rows, np.empty(0))
            self.fixed += slab.see((best & ~several.reshape(best[0].shape)).astype(np.float64))
            own = np.flatnonzero(several)
            count += len(own)
            if count * options > SCATTERED:
                return None
            places = slab.first + own
            parts.append((places, slab.weights[own], best.reshape(options, -1)[:, own]))
        numbers, odds, open_to = zip(*parts, strict=True)
        return np.concatenate(numbers), np.concatenate(odds), np.concatenate(open_to, axis=1)

    def _start_scattered(
        self, numbers: Places, odds: Floats, open_to: Mask, tables: Floats, margin: float
    ) -> None:
        self.weight = float(odds.sum())
        like = self._slab(0, 0, np.empty(0))
        self.slabs = []
        for first in range(0, len(numbers), PIECE):
            own = slice(first, first + PIECE)
            nothing = np.empty(0)
            slab = scattered(like, self.setting.shape, numbers[own], odds[own], nothing, nothing)
            slab.x, slab.z = _among(open_to[:, own], slab.sums(tables), margin)
            self.slabs.append(slab)
        self.all = self.slabs

    def settle(self, margin: float, least: int) -> None:
        """Fix the best option wherever every other lacks more than a margin.

        Only where that leaves few of the profiles open, but at least `least`.
        """
        lacks = self.each(_second)
        whole = np.concatenate(lacks)
        if len(whole) <= FEW * least:
            return
        margin = max(margin, float(np.partition(whole, least)[least]))
        if FEW * int(np.count_nonzero(whole <= margin)) > len(whole):
            return
        parts = []
        for slab, lack in zip(self.slabs, lacks, strict=True):
            open_to = lack <= margin
            x, z = slab.x.reshape(len(slab.x), -1), slab.z.reshape(len(slab.z), -1)
            pure = np.arange(len(z))[:, None] == z.argmin(axis=0)
            self.fixed += slab.see((pure & ~open_to).astype(np.float64).reshape(slab.x.shape))
            parts.append(
                (slab.places[open_to], slab.weights[open_to], x[:, open_to], z[:, open_to])
            )
        numbers, weights, chances, missing = zip(*parts, strict=True)
        place = np.concatenate(numbers)
        odds = np.concatenate(weights)
        self.weight = float(odds.sum())
        x, z = np.concatenate(chances, axis=1), np.concatenate(missing, axis=1)
        like = self.slabs[0]
        self.slabs = [scattered(like, self.setting.shape, place, odds, x, z)]

    def each(self, work: Callable[[Slab], Result], slabs: list[Slab] | None = None) -> list[Result]:
        """The work on every slab, on both cores where there are many."""
        slabs = self.slabs if slabs is None else slabs

        def watched(slab: Slab) -> Result:
            self.watch.check()
            return work(slab)

        if len(slabs) < 8 * CORES:
            return [watched(slab) for slab in slabs]
        with ThreadPoolExecutor(max_workers=CORES) as pool:
            return list(pool.map(watched, slabs))

    def taken(self, rule: Floats) -> list[Places]:
        """Per slab of all profiles, the first open option of those that are best by a rule."""

        def look(slab: Slab) -> Places:
            score = slab.sums(rule)
            score[slab.z >= NEVER / 2] = -np.inf
            best: Places = score.argmax(axis=0)
            return best

        return self.each(look, self.all)

    def better(
        self, taken: list[Places], prices: Floats, least: float, known: Places, most: int
    ) -> tuple[Places, Places]:
        """Where the best open option beats what is taken by more than `least`.

        Types (R, n) and that option.

        The `most` profiles where it does so by most; without those that are known as
        number * K + option.
        """
        options = len(self.setting.options)

        def look(place: int) -> tuple[Floats, Places]:
            slab, own = self.all[place], taken[place]
            price = slab.sums(prices)
            price[slab.z >= NEVER / 2] = -np.inf
            best = price.argmax(axis=0)
            level = np.take_along_axis(price, np.stack([best, own]), axis=0)
            gain = (level[0] - level[1]).ravel()
            better = np.flatnonzero(gain > least)
            return gain[better], slab.places[better] * options + best.ravel()[better]

        parts = [look(place) for place in range(len(self.all))]
        gain, codes = (np.concatenate(part) for part in zip(*parts, strict=True))
        new = ~np.isin(codes, known)
        gain, codes = gain[new], codes[new]
        codes = codes[np.argsort(-gain, kind="stable")[:most]]
        at = np.unravel_index(codes // options, self.setting.shape)
        return np.stack(at, axis=1).astype(np.int64), codes % options

    def closest(self, most: int) -> tuple[Places, Floats, Floats]:
        """The profiles whose second-best option lacks least: types (R, n), x and z (R, K)."""
        lacks = self.each(_second)
        whole = np.concatenate(lacks)
        chosen = np.arange(len(whole))
        if len(whole) > most:
            chosen = np.sort(np.argpartition(whole, most)[:most])
        edges = np.cumsum([0, *(len(part) for part in lacks)])
        places, chances, missing = [], [], []
        for slab, first, last in zip(self.slabs, edges[:-1], edges[1:], strict=True):
            own = chosen[(chosen >= first) & (chosen < last)] - first
            places.append(slab.places[own])
            chances.append(slab.x.reshape(len(slab.x), -1)[:, own].T)
            missing.append(slab.z.reshape(len(slab.z), -1)[:, own].T)
        at = np.unravel_index(np.concatenate(places), self.setting.shape)
        types = np.stack(at, axis=1).astype(np.int64)
        return types, np.concatenate(chances), np.concatenate(missing)


def _second(slab: Slab) -> Floats:
    """What the second-best option lacks, per profile."""
    lacks: Floats = np.partition(slab.z, 1, axis=0)[1].ravel()
    return lacks


def _among(open_to: Mask, price: Floats, margin: float) -> tuple[Floats, Floats]:
    """Even chances of open options, and what each lacks: at most `margin` for the best."""
    count = np.count_nonzero(open_to, axis=0)
    best = np.where(open_to, price, -np.inf).max(axis=0)
    # A closed option keeps its place, at a chance that is next to nothing.
    x = np.where(open_to, 1.0 / count, margin / NEVER)
    return x, np.where(open_to, best + margin - price, NEVER)
