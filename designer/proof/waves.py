"""Nearly triangular integer systems in whole waves of rows at a time, in words of 64 bits.

The kernels of programs whose lies and balances settle one payment after the other are
shallow: thousands of rows in a few dozen waves, each of which needs only the ones before, and
a small core. What is too deep or too large for 64 bits is left to others.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from designer.proof.sparse import Indices, Matrix, largest
from designer.setting.setting import IntArray

SHALLOW = 20
"""Rows per wave, on average, from which waves are quicker than one row at a time."""
CORE = 10
"""Times as many rows as the core has from which waves are worth their while."""
GONE = -(2**40)
"""What marks a line that has been taken off, in place of a count of entries."""
ROOM = 2**62

Wave = tuple[Indices, Indices]
Solver = Callable[[IntArray], tuple[IntArray, int]]


@dataclass(frozen=True, eq=False)
class Waves:
    """A square matrix whose rows and columns with one entry left are taken off in waves.

    first  (rows, columns): at their turn each row had this one column left
    last   (rows, columns): at their turn each column had this one row left
    core   (rows, columns) that are left between them
    """

    matrix: Matrix
    first: tuple[Wave, ...]
    last: tuple[Wave, ...]
    core: Wave

    def solve(self, b: IntArray, transposed: bool, inner: Solver) -> tuple[IntArray, int] | None:
        """(N, q) with K N = q b (K' N = q b), q > 0 and least; None beyond 64 bits.

        inner  solves the core (`core_matrix`, or its transpose)
        """
        matrix = self.matrix.transposed if transposed else self.matrix
        if b.dtype == object:
            return None
        found, q = np.zeros(len(b), dtype=np.int64), 1
        top, most = 0, largest(b)
        reach = self.matrix.largest * max(1, matrix.widest)
        for lines, unknowns in self._order(transposed):
            if top * reach + q * most >= ROOM:
                return None
            at, starts = _places(matrix, lines)
            index, data = matrix.indices[at], matrix.data[at]
            # The lines' own unknowns, and those after them, are still 0.
            rest = q * b[lines] - np.add.reduceat(data * found[index], starts[:-1])
            if lines is self.core[transposed]:
                values, factor = inner(rest)
                if values.dtype == object or factor * max(top, q) >= ROOM:
                    return None
                found, q = found * factor, q * factor
                found[unknowns] = values
                top = max(top * factor, largest(values))
                continue
            pivots = data[index == np.repeat(unknowns, np.diff(starts))]
            short = np.abs(pivots) // np.gcd(rest, pivots)
            factor = math.lcm(*np.unique(short).tolist())
            if factor != 1:
                if factor * max(top, largest(rest), q) >= ROOM:
                    return None
                found, rest, q = found * factor, rest * factor, q * factor
            found[unknowns] = rest // pivots
            top = max(top * factor, largest(found[unknowns]))
        return found, q

    @cached_property
    def core_matrix(self) -> Matrix:
        """The rows and columns of the core alone."""
        return self.matrix.part(*self.core)

    def _order(self, transposed: bool) -> Iterator[Wave]:
        """Lines and their unknowns, wave by wave."""
        before, after = self.first, self.last
        if transposed:
            before, after = (tuple((c, r) for r, c in part) for part in (after, before))
        yield from before
        if len(self.core[0]):
            yield (self.core[1], self.core[0]) if transposed else self.core
        yield from reversed(after)


def waves(matrix: Matrix) -> Waves | None:
    """The waves of a square matrix; None where it is too deep, or its core or numbers too large."""
    if matrix.data.dtype == object:
        return None
    most = 2 + matrix.rows // SHALLOW
    other = matrix.transposed
    rows, columns = _Left.of(matrix), _Left.of(other)
    found: list[list[Wave]] = []
    for one, two, across in ((rows, columns, other), (columns, rows, matrix)):
        taken: list[Wave] = []
        while len(taken) <= most:
            lines = np.flatnonzero(one.count == 1)
            if not len(lines):
                break
            crossing = one.total[lines]
            if len(np.unique(crossing)) < len(crossing):
                return None  # two lines with the same one entry left: singular
            taken.append((lines, crossing))
            # In the other direction the lines are left in nothing but what they cross.
            at, starts = _places(across, crossing)
            np.subtract.at(one.count, across.indices[at], 1)
            of = np.repeat(crossing, np.diff(starts))
            np.subtract.at(one.total, across.indices[at], of)
            one.count[lines] = two.count[crossing] = GONE
        found.append(taken)
    core = np.flatnonzero(rows.count > GONE // 2), np.flatnonzero(columns.count > GONE // 2)
    shallow = all(len(taken) <= most for taken in found)
    if not shallow or CORE * len(core[0]) > matrix.rows:
        return None
    first, last = found
    return Waves(matrix, tuple(first), tuple((rows, columns) for columns, rows in last), core)


@dataclass(frozen=True, eq=False)
class _Left:
    """Per line, how many entries are left and the sum of their positions."""

    count: Indices
    total: Indices

    @staticmethod
    def of(matrix: Matrix) -> _Left:
        ones = replace(matrix, data=np.ones(matrix.nonzeros, dtype=np.int64))
        total: Indices = ones.wrapping(np.arange(matrix.columns))
        return _Left(np.diff(matrix.indptr), total)


def _places(matrix: Matrix, lines: Indices) -> tuple[Indices, Indices]:
    """Where the entries of some rows are, one row after the other, and where each starts."""
    counts = matrix.indptr[lines + 1] - matrix.indptr[lines]
    starts = np.concatenate(([0], np.cumsum(counts)))
    at = np.arange(starts[-1]) + np.repeat(matrix.indptr[lines] - starts[:-1], counts)
    return at, starts
