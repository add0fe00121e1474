"""Programs made from a program by other bounds: allowances held, directions from a point."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import replace
from fractions import Fraction

import numpy as np

from designer.program.linear import BoolArray, Bound, LinearProgram
from designer.proof.sparse import Matrix, narrow
from designer.proof.vector import Vector
from designer.setting.setting import IntArray


def holding(lp: LinearProgram, held: Mapping[int, Fraction]) -> LinearProgram:
    """The program with columns held at given values."""
    den = math.lcm(lp.col_den, *(value.denominator for value in held.values()))
    low, high = _scaled(lp.col_lo, den // lp.col_den), _scaled(lp.col_hi, den // lp.col_den)
    for column, value in held.items():
        for side in (low, high):
            side.num[column], side.finite[column] = int(value * den), True
    return replace(lp, col_lo=low, col_hi=high, col_den=den)


def without_rows(lp: LinearProgram, dropped: BoolArray) -> LinearProgram:
    """The program with the rows of a mask let go."""
    low = Bound(lp.row_lo.num, lp.row_lo.finite & ~dropped)
    high = Bound(lp.row_hi.num, lp.row_hi.finite & ~dropped)
    return replace(lp, row_lo=low, row_hi=high)


def tangent(lp: LinearProgram, at: Vector, moved: Mapping[int, int]) -> LinearProgram:
    """The directions from a feasible point, with given columns moved by given whole numbers.

    Rows and bounds that are tight at the point keep their side at 0, all others are let go;
    the cost is that of `lp` without its constant.
    """
    numbers = np.array(at.numerators(), dtype=object)
    activity = Matrix(lp.indptr, lp.indices, narrow(lp.data), lp.columns).times(numbers)
    col_lo = _tight(numbers * lp.col_den, lp.col_lo, at.den)
    col_hi = _tight(numbers * lp.col_den, lp.col_hi, at.den)
    for column, step in moved.items():
        for side in (col_lo, col_hi):
            side.num[column], side.finite[column] = step, True
    return replace(
        lp,
        row_lo=_tight(activity, lp.row_lo, at.den),
        row_hi=_tight(activity, lp.row_hi, at.den),
        col_lo=col_lo,
        col_hi=col_hi,
        col_den=1,
        cost_const=Fraction(0),
    )


def _scaled(bound: Bound, factor: int) -> Bound:
    num: IntArray = bound.num.astype(object) * factor if factor > 1 else bound.num.copy()
    if num.dtype != object:
        num = num.astype(object)
    return Bound(narrow(num).copy(), bound.finite.copy())


def _tight(values: IntArray, bound: Bound, den: int) -> Bound:
    """0 where the value, over den, sits at the bound; no bound elsewhere."""
    reached = np.asarray(values == bound.num.astype(object) * den, dtype=bool)
    return Bound(np.zeros(len(bound.num), dtype=np.int64), bound.finite & reached)
