"""Sparse integer matrices: int64 where provably within range, Python ints otherwise."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise
from operator import mul
from typing import cast

import numpy as np
import numpy.typing as npt

from designer.setting.setting import IntArray

Indices = npt.NDArray[np.int64]

ROOM = 2**62
"""Sums bounded by this in absolute value are computed in int64."""


def largest(values: IntArray) -> int:
    """Max |v|, 0 for an empty array."""
    if len(values) == 0:
        return 0
    if values.dtype == object:
        return int(max(map(abs, values.tolist())))
    return max(int(values.max()), -int(values.min()))


def narrow(values: IntArray) -> IntArray:
    """The same integers, as int64 if all are below 2**62."""
    if values.dtype == object and largest(values) < ROOM:
        return values.astype(np.int64)
    return values


def scaled(values: IntArray, factor: int) -> IntArray:
    """Values * factor, exactly."""
    if factor == 1:
        return values
    if values.dtype != object and max(1, largest(values)) * abs(factor) < ROOM:
        fitting: IntArray = values * np.int64(factor)
        return fitting
    exact: IntArray = values.astype(object) * factor
    return exact


def dot(left: IntArray, right: IntArray) -> int:
    """Sum of left * right, exactly."""
    if (
        left.dtype != object
        and right.dtype != object
        and largest(left) * largest(right) * max(1, len(left)) < ROOM
    ):
        return int(np.dot(left, right))
    return int(sum(map(mul, left.tolist(), right.tolist())))


def plus(left: IntArray, right: IntArray) -> IntArray:
    """Left + right, exactly."""
    if left.dtype != object and right.dtype != object:
        if largest(left) + largest(right) < ROOM:
            return left + right
        return left.astype(object) + right
    return left + right


@dataclass(frozen=True, eq=False)
class Matrix:
    """An integer matrix in compressed rows; no duplicate entries within a row."""

    indptr: Indices
    indices: Indices
    data: IntArray
    columns: int

    @property
    def rows(self) -> int:
        """The number of rows."""
        return len(self.indptr) - 1

    @property
    def nonzeros(self) -> int:
        """The number of entries."""
        return len(self.data)

    @cached_property
    def largest(self) -> int:
        """The largest absolute entry."""
        return largest(self.data)

    @cached_property
    def widest(self) -> int:
        """The largest number of entries in a row."""
        return int(np.diff(self.indptr).max(initial=0))

    @cached_property
    def row_of(self) -> Indices:
        """The row of each entry."""
        return np.repeat(np.arange(self.rows, dtype=np.int64), np.diff(self.indptr))

    @cached_property
    def transposed(self) -> Matrix:
        """The transpose, in compressed rows."""
        order = np.argsort(self.indices, kind="stable")
        counts = np.bincount(self.indices, minlength=self.columns)
        return Matrix(
            np.concatenate(([0], np.cumsum(counts))).astype(np.int64),
            self.row_of[order],
            self.data[order],
            self.rows,
        )

    def times(self, vector: IntArray) -> IntArray:
        """A v, exactly."""
        fits = (
            self.data.dtype != object
            and vector.dtype != object
            and self.largest * largest(vector) * max(1, self.widest) < ROOM
        )
        return self.wrapping(vector) if fits else self.wrapping(vector.astype(object))

    def wrapping(self, vector: IntArray) -> IntArray:
        """A v in the arithmetic of the arrays: modulo 2**64 when both are int64."""
        products = self.data * vector[self.indices]
        sums = np.zeros(self.rows, dtype=products.dtype)
        starts = self.indptr[:-1]
        filled = starts < self.indptr[1:]
        if len(products):
            sums[filled] = np.add.reduceat(products, starts[filled])
        return cast(IntArray, sums)

    def part(self, rows: Indices, columns: Indices) -> Matrix:
        """The entries in some rows and columns, renumbered in the order given."""
        place = np.full(self.columns, -1, dtype=np.int64)
        place[columns] = np.arange(len(columns))
        counts = self.indptr[rows + 1] - self.indptr[rows]
        total = int(counts.sum())
        ends = np.cumsum(counts)
        at = (
            np.arange(total)
            - np.repeat(ends - counts, counts)
            + np.repeat(self.indptr[rows], counts)
        )
        new = place[self.indices[at]]
        kept = new >= 0
        row = np.repeat(np.arange(len(rows)), counts)[kept]
        indptr = np.concatenate(([0], np.cumsum(np.bincount(row, minlength=len(rows)))))
        return Matrix(indptr.astype(np.int64), new[kept], self.data[at[kept]], len(columns))

    def entries(self) -> list[list[tuple[int, int]]]:
        """The rows as lists of (column, value) in Python ints."""
        pairs = list(zip(self.indices.tolist(), self.data.tolist(), strict=True))
        cuts = self.indptr.tolist()
        return [pairs[a:b] for a, b in pairwise(cuts)]
