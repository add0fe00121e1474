"""All profiles in floats, in slabs: chances and prices of options, and what parties see of them.

An interior-point step needs of the profiles only sums: what every type sees (one table) and
what every pair of types sees together (one matrix). Profiles are pairs of an outer and an
inner half, so the latter are a few products of a slab with indicator matrices.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, field
from typing import Any, TypeVar

import numpy as np
import numpy.typing as npt

from designer.engines.watch import Watch
from designer.roads.interim.cores import CORES
from designer.setting.setting import Setting

Floats = npt.NDArray[np.float64]
Places = npt.NDArray[np.int64]
Result = TypeVar("Result")

FEW = 4
"""Profiles without order take several times longer each: one in so many must be left."""
SLAB = 1 << 13
"""Profiles handled at once: their arrays stay in the cache."""


@dataclass(eq=False)
class Slab:
    """Some outer halves with all inner ones; arrays are (options, outer, inner).

    outer, inner    indicators of types, with the same times the half-profile's probability
    x  chances of the options; z  what each lacks to be the best one; step  the next moves of both
    """

    outer: Floats
    inner: Floats
    odds: tuple[Floats, Floats]
    x: Floats
    z: Floats
    step: tuple[Floats, Floats] | None = None
    bend: Floats | None = None
    inverse: Floats = field(default_factory=lambda: np.empty(0))
    first: int = 0

    @property
    def places(self) -> Places:
        """The numbers of its profiles, row-major."""
        return np.arange(self.first, self.first + self.x[0].size)

    @property
    def weights(self) -> Floats:
        """The probabilities of its profiles."""
        return np.multiply.outer(*self.odds).ravel()

    def sums(self, tables: Floats) -> Floats:
        """Sum over the parties of tables (stacked types, options)."""
        split = self.outer.shape[1]
        high, low = self.outer @ tables[:split], self.inner @ tables[split:]
        total: Floats = high.T[:, :, None] + low.T[:, None, :]
        return total

    def see(self, values: Floats) -> Floats:
        """What every type sees of values on average, times its probability."""
        high, low = self.odds
        outer = self.outer.T @ ((values @ low).T * high[:, None])
        inner = self.inner.T @ (np.matmul(high, values).T * low[:, None])
        return np.vstack([outer, inner])

    def mean(self, values: Floats) -> float:
        """The average of one value per profile."""
        high, low = self.odds
        return float(high @ (values @ low))

    def move(self, primal: float, dual: float) -> None:
        """Take the step."""
        if self.step is not None:
            dx, dz = self.step
            dx *= primal
            dz *= dual
            self.x += dx
            self.z += dz
            self.step = self.bend = None

    def curvature(self) -> tuple[Floats, Floats, Floats, float]:
        """Averages of x and of d / sum(d), of the pairs, d = x / z, and of x z."""
        d = self.x / self.z
        self.inverse = 1.0 / d.sum(axis=0)
        gap = self.mean(np.einsum("k...,k...->...", self.x, self.z))
        return self.see(self.x), self.see(d * self.inverse), self._pairs(d), gap

    def _pairs(self, d: Floats) -> Floats:
        """The average of d_k d_l / sum(d), seen by pairs of stacked types, for k < l."""
        options = len(d)
        outer, inner = self.outer.shape[1], self.inner.shape[1]
        high, low = self.odds
        size = outer + inner
        weighed_outer, weighed_inner = self.outer * high[:, None], self.inner * low[:, None]
        found = np.empty((options * (options - 1) // 2, size, size))
        both = np.empty_like(d[0])
        place = 0
        for k in range(options - 1):
            share = d[k] * self.inverse
            for other in range(k + 1, options):
                np.multiply(share, d[other], out=both)
                block = found[place]
                block[:outer, :outer] = weighed_outer.T @ ((both @ low)[:, None] * self.outer)
                block[outer:, outer:] = weighed_inner.T @ ((high @ both)[:, None] * self.inner)
                cross = weighed_outer.T @ (both @ weighed_inner)
                block[:outer, outer:], block[outer:, :outer] = cross, cross.T
                place += 1
        return found

    def predict(self, tables: Floats) -> tuple[Floats, Floats, float, float, float]:
        """Look at the step that aims at x z = 0 when prices move by tables.

        What the corrector adds (per unit of its target) and takes away (for dx dz), the average
        move of the best option's price, and the least of dx / x and dz / z.
        """
        ratio = self.sums(tables)
        d = self.x / self.z
        level = (np.einsum("k...,k...->...", d, ratio) - 1.0) * self.inverse
        np.subtract(level, ratio, out=ratio)
        ratio /= self.z
        least = (-1.0 - float(ratio.max()), float(ratio.min()))
        unit = 1.0 / self.z
        per_target = self.see(self._centred(unit, d))
        # dx dz / z = -x r (1 + r) with r = dz / z
        bend = np.add(ratio, 1.0, out=unit)
        bend *= ratio
        bend *= self.x
        self.bend = -bend
        return per_target, self.see(self._centred(self.bend, d)), self.mean(level), *least

    def _centred(self, e: Floats, d: Floats) -> Floats:
        """Write e - d * sum(e) / sum(d)."""
        centred: Floats = d * (e.sum(axis=0) * self.inverse)
        np.subtract(e, centred, out=centred)
        return centred

    def correct(self, tables: Floats, target: float, share: float) -> tuple[float, float]:
        """Fix the step that aims at x z = target, with a share of the predictor's dx dz.

        The least of dx / x and dz / z.
        """
        if self.bend is None:
            raise AssertionError("a corrector follows a predictor")
        dz = self.sums(tables)
        d = self.x / self.z
        e = target / self.z
        e -= self.x
        e -= self.bend if share == 1.0 else share * self.bend
        level = (e.sum(axis=0) + np.einsum("k...,k...->...", d, dz)) * self.inverse
        np.subtract(level, dz, out=dz)
        d *= dz
        e -= d
        self.step = e, dz
        least = float(np.divide(e, self.x, out=d).min())
        return least, float(np.divide(dz, self.z, out=d).min())


@dataclass(eq=False)
class Scattered(Slab):
    """Profiles without order: those at which it is not yet clear what is best; (options, R).

    kinds  the sparse matrix of profiles by stacked types
    codes  per two parties their stacked types, and which pair of those each profile has
    """

    kinds: Any = None
    codes: list[tuple[slice, slice, Places]] = field(default_factory=list)
    numbers: Places = field(default_factory=lambda: np.empty(0, dtype=np.int64))

    @property
    def places(self) -> Places:
        """The numbers of its profiles, row-major."""
        return self.numbers

    @property
    def weights(self) -> Floats:
        """The probabilities of its profiles."""
        return self.odds[0]

    def sums(self, tables: Floats) -> Floats:
        """As of slabs."""
        total: Floats = np.ascontiguousarray((self.kinds @ tables).T)
        return total

    def see(self, values: Floats) -> Floats:
        """As of slabs."""
        seen: Floats = self.kinds.T @ (values * self.odds[0]).T
        return seen

    def mean(self, values: Floats) -> float:
        """As of slabs."""
        return float(values @ self.odds[0])

    def _pairs(self, d: Floats) -> Floats:
        found = []
        for k in range(len(d) - 1):
            share = d[k] * self.inverse * self.odds[0]
            for other in range(k + 1, len(d)):
                both = share * d[other]
                block = np.diag(self.kinds.T @ both)
                for rows, columns, code in self.codes:
                    shape = rows.stop - rows.start, columns.stop - columns.start
                    part = np.bincount(code, both, shape[0] * shape[1]).reshape(shape)
                    block[rows, columns], block[columns, rows] = part, part.T
                found.append(block)
        return np.array(found)


def curved(blocks: Floats, options: int) -> Floats:
    """Sum over profiles of diag(d) - d d' / sum(d), seen by pairs of stacked types and options."""
    size = blocks.shape[1]
    found = np.zeros((size, options, size, options))
    for block, (k, other) in zip(blocks, itertools.combinations(range(options), 2), strict=True):
        found[:, k, :, other] -= block
        found[:, other, :, k] -= block
        found[:, k, :, k] += block
        found[:, other, :, other] += block
    return found.reshape(size * options, size * options)


class Cube:
    """All slabs."""

    def __init__(self, setting: Setting, watch: Watch) -> None:
        """Split the parties in two halves of about the same number of profiles."""
        self.setting, self.watch = setting, watch
        shape = setting.shape
        cuts = range(len(shape))
        self.cut = min(cuts, key=lambda cut: math.prod(shape[:cut]) + math.prod(shape[cut:]))
        self.marginals = [np.array([float(p) for p in one.marginal]) for one in setting.parties]
        self.outer, self.outer_weight = self._half(range(self.cut))
        self.inner, self.inner_weight = self._half(range(self.cut, len(shape)))
        self.slabs: list[Slab] = []
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

    def start(self, tables: Floats, margin: float) -> None:
        """Even chances, and prices whose best option still lacks `margin`."""
        options = tables.shape[1]
        rows = max(1, SLAB // len(self.inner))
        self.slabs = []
        for first in range(0, len(self.outer), rows):
            outer = self.outer[first : first + rows]
            odds = self.outer_weight[first : first + rows], self.inner_weight
            x = np.full((options, len(outer), len(self.inner)), 1.0 / options)
            slab = Slab(outer, self.inner, odds, x, x)
            price = slab.sums(tables)
            slab.z = price.max(axis=0) + margin - price
            slab.first = first * len(self.inner)
            self.slabs.append(slab)

    def settle(self, margin: float, least: int) -> None:
        """Fix the best option wherever every other lacks more than a margin.

        Only where that leaves few of the profiles open, but at least `least`.
        """
        from scipy.sparse import csr_array

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
        shape = self.setting.shape
        starts = [int(v) for v in np.cumsum([0, *shape[:-1]])]
        types = np.unravel_index(place, shape)
        columns = np.stack(types, axis=1) + starts
        rows, whole_shape = np.arange(0, columns.size + 1, len(shape)), (len(place), sum(shape))
        self.slabs = [
            Scattered(
                self.outer,
                self.inner,
                (odds, odds),
                np.concatenate(chances, axis=1),
                np.concatenate(missing, axis=1),
                kinds=csr_array((np.ones(columns.size), columns.ravel(), rows), whole_shape),
                codes=[
                    (
                        slice(starts[i], starts[i] + shape[i]),
                        slice(starts[j], starts[j] + shape[j]),
                        types[i] * shape[j] + types[j],
                    )
                    for i, j in itertools.combinations(range(len(shape)), 2)
                ],
                numbers=place,
            )
        ]

    def each(self, work: Callable[[Slab], Result]) -> list[Result]:
        """The work on every slab, on both cores where there are many."""

        def watched(slab: Slab) -> Result:
            self.watch.check()
            return work(slab)

        if len(self.slabs) < 8 * CORES:
            return [watched(slab) for slab in self.slabs]
        with ThreadPoolExecutor(max_workers=CORES) as pool:
            return list(pool.map(watched, self.slabs))

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
