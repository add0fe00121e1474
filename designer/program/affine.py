"""Vectors of exact affine forms over the columns of a program.

A vector of R forms stands for   f_r = (sum_j num_rj * x_j + const_r) / den_r,   den_r > 0,
in natural units (money, or probability), conditional on one's own type where that applies.
Demands are written in these units; only `Draft.require` turns them into integer rows.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np

from designer.program.linear import IndexArray
from designer.setting.setting import IntArray


@dataclass(frozen=True, eq=False)
class Affine:
    """R affine forms: coordinate triples (row, col, num), and int const, den of shape (R,)."""

    row: IndexArray
    col: IndexArray
    num: IntArray
    const: IntArray
    den: IntArray

    def __len__(self) -> int:
        return len(self.const)

    def __add__(self, other: Affine) -> Affine:
        left, right = _shared(self, other)
        return Affine(
            np.concatenate([left.row, right.row]),
            np.concatenate([left.col, right.col]),
            np.concatenate([left.num, right.num]),
            left.const + right.const,
            left.den,
        )

    def __neg__(self) -> Affine:
        return Affine(self.row, self.col, -self.num, -self.const, self.den)

    def __sub__(self, other: Affine) -> Affine:
        return self + (-other)

    def plus(self, amount: Fraction) -> Affine:
        """Every form plus one exact amount."""
        dtype = self.const.dtype
        size = len(self)
        return self + Affine(
            np.empty(0, dtype=np.int64),
            np.empty(0, dtype=np.int64),
            np.empty(0, dtype=dtype),
            np.full(size, amount.numerator, dtype=dtype),
            np.full(size, amount.denominator, dtype=dtype),
        )

    def times(self, factor: Fraction) -> Affine:
        """Every form times one exact factor."""
        up, down = factor.numerator, factor.denominator
        return Affine(self.row, self.col, self.num * up, self.const * up, self.den * down)

    def repeat(self, size: int) -> Affine:
        """One form (R = 1) repeated `size` times."""
        count = len(self.col)
        return Affine(
            np.repeat(np.arange(size, dtype=np.int64), count),
            np.tile(self.col, size),
            np.tile(self.num, size),
            np.repeat(self.const, size),
            np.repeat(self.den, size),
        )

    def take(self, keep: IndexArray) -> Affine:
        """The forms at distinct positions `keep`, in that order."""
        place = np.full(len(self), -1, dtype=np.int64)
        place[keep] = np.arange(len(keep))
        inside = place[self.row] >= 0
        return Affine(
            place[self.row[inside]],
            self.col[inside],
            self.num[inside],
            self.const[keep],
            self.den[keep],
        )

    def mean(self, weights: IntArray) -> Affine:
        """One form: the average of all R under positive integer weights.

        f = sum_r weights_r * f_r / sum_r weights_r
        """
        common = math.lcm(*{int(den) for den in self.den})
        factor = weights * (common // self.den)
        return Affine(
            np.zeros(len(self.row), dtype=np.int64),
            self.col,
            self.num * factor[self.row],
            np.array([_total(self.const * factor)], dtype=self.const.dtype),
            np.array([common * _total(weights)], dtype=self.const.dtype),
        )


def _total(values: IntArray) -> int:
    return int(values.sum()) if len(values) else 0


def _shared(left: Affine, right: Affine) -> tuple[Affine, Affine]:
    """The same two vectors over the same denominators, row by row."""
    if np.array_equal(left.den, right.den):
        return left, right
    common = np.lcm(left.den, right.den)
    return _over(left, common), _over(right, common)


def _over(form: Affine, common: IntArray) -> Affine:
    factor = common // form.den
    return Affine(form.row, form.col, form.num * factor[form.row], form.const * factor, common)


def constants(values: IntArray, den: int, dtype: np.dtype[Any]) -> Affine:
    """Forms without columns: values / den."""
    return Affine(
        np.empty(0, dtype=np.int64),
        np.empty(0, dtype=np.int64),
        np.empty(0, dtype=dtype),
        np.asarray(values, dtype=dtype),
        np.full(len(values), den, dtype=dtype),
    )


def of_columns(columns: IndexArray, dtype: np.dtype[Any]) -> Affine:
    """One form per listed column: the column itself."""
    size = len(columns)
    return Affine(
        np.arange(size, dtype=np.int64),
        np.asarray(columns, dtype=np.int64),
        np.ones(size, dtype=dtype),
        np.zeros(size, dtype=dtype),
        np.ones(size, dtype=dtype),
    )


def averages(forms: Affine, weights: IntArray, totals: IntArray) -> Affine:
    """Averages of consecutive runs of forms with one denominator, weights (R, runs)."""
    runs = weights.shape[1]
    flat = weights.ravel()
    factor = flat[forms.row]
    keep = factor != 0
    return Affine(
        forms.row[keep] // runs,
        forms.col[keep],
        forms.num[keep] * factor[keep],
        (forms.const * flat).reshape(weights.shape).sum(axis=1).astype(forms.const.dtype),
        totals * forms.den[0],
    )


@dataclass(frozen=True, eq=False)
class Rows:
    """Integer rows in compressed form, each divided by the gcd of its numbers.

    natural row * scale_num / scale_den = stored row; const is the stored constant term.
    """

    indptr: IndexArray
    indices: IndexArray
    data: IntArray
    const: IntArray
    scale_num: IntArray
    scale_den: IntArray


def compress(form: Affine) -> Rows:
    """The forms times their denominators as integer rows without duplicates or zeros."""
    size = len(form)
    row, col, num = form.row, form.col, form.num
    if len(row):
        width = int(col.max()) + 1
        key = row * width + col
        if np.any(key[1:] <= key[:-1]):
            order = np.argsort(key, kind="stable")
            key, num = key[order], num[order]
            first = np.flatnonzero(np.concatenate([[True], key[1:] != key[:-1]]))
            if len(first) < len(key):
                num = np.add.reduceat(num, first)
                key = key[first]
        nonzero = num != 0
        if not nonzero.all():
            key, num = key[nonzero], num[nonzero]
        row, col = np.divmod(key, width)
    counts = np.bincount(row, minlength=size) if len(row) else np.zeros(size, dtype=np.int64)
    indptr = np.concatenate([[0], np.cumsum(counts)]).astype(np.int64)
    divisor = np.abs(form.const)
    if len(row):
        filled = np.flatnonzero(counts)
        inner = np.gcd.reduceat(np.abs(num), indptr[filled])
        divisor[filled] = np.gcd(divisor[filled], inner)
    divisor = np.where(divisor == 0, 1, divisor).astype(form.const.dtype)
    return Rows(
        indptr,
        col.astype(np.int64),
        num // divisor[row] if len(row) else num,
        form.const // divisor,
        form.den,
        divisor,
    )
