"""Some profiles in floats, handled at once: the passes of an interior-point step over them."""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import numpy.typing as npt

Floats = npt.NDArray[np.float64]
Places = npt.NDArray[np.int64]


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


def scattered(
    like: Slab, shape: Sequence[int], numbers: Places, odds: Floats, x: Floats, z: Floats
) -> Scattered:
    """The profiles with these numbers and probabilities; `like` has the halves."""
    from scipy.sparse import csr_array

    starts = [int(v) for v in np.cumsum([0, *shape[:-1]])]
    types = np.unravel_index(numbers, tuple(shape))
    columns = np.stack(types, axis=1) + starts
    rows = np.arange(0, columns.size + 1, len(shape))
    whole = len(numbers), sum(shape)
    return Scattered(
        like.outer,
        like.inner,
        (odds, odds),
        x,
        z,
        kinds=csr_array((np.ones(columns.size), columns.ravel(), rows), whole),
        codes=[
            (
                slice(starts[i], starts[i] + shape[i]),
                slice(starts[j], starts[j] + shape[j]),
                types[i] * shape[j] + types[j],
            )
            for i, j in itertools.combinations(range(len(shape)), 2)
        ],
        numbers=numbers,
    )


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
