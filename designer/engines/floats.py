"""The exact program as floats, made once: every row and, where needed, column scaled.

Scalings are powers of two, so they add no rounding of their own and integers beyond the
range of floats come out right too. With row exponents r, column exponents k and objective
exponent o the float program in x' = x / 2**k is

    min 2**o (c 2**k) . x'   such that   2**r lo <= (2**r A 2**k) x' <= 2**r hi.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import cast

import numpy as np
import numpy.typing as npt

from designer.engines.report import FloatArray
from designer.program.linear import Bound, LinearProgram
from designer.setting.setting import IntArray

Exponents = npt.NDArray[np.int64]

NEAR = 20
"""Coefficients within 2**-20 .. 2**20 after row scaling need no column scaling."""

MOST = 40
"""Coefficients are kept below 2**40; engines refuse much larger ones."""

FAR = 27
"""Bounds beyond 2**27 make absolute tolerances of 1e-7 meaningless: rescale."""


@dataclass(frozen=True, eq=False)
class FloatProgram:
    """A scaled float copy of a program, always to be minimised, and its exponents."""

    indptr: Exponents
    indices: Exponents
    data: FloatArray
    cost: FloatArray
    row_lo: FloatArray
    row_hi: FloatArray
    col_lo: FloatArray
    col_hi: FloatArray
    integer: npt.NDArray[np.bool_]
    row_exp: Exponents
    col_exp: Exponents
    cost_exp: int

    def point(self, scaled: FloatArray) -> FloatArray:
        """Return x in the program's own units."""
        return ldexp(scaled, self.col_exp)

    def multipliers(self, scaled: FloatArray) -> FloatArray:
        """Return y in units of the integer cost of the min problem."""
        return ldexp(scaled, self.row_exp - self.cost_exp)

    def scaled(self, x: FloatArray) -> FloatArray:
        """Return the engine's x' of a point x."""
        return ldexp(x, -self.col_exp)

    def scaled_multipliers(self, y: FloatArray) -> FloatArray:
        """Return the engine's y' of multipliers y."""
        return ldexp(y, self.cost_exp - self.row_exp)


def ldexp(mantissa: FloatArray, exponent: Exponents) -> FloatArray:
    """Return mantissa * 2**exponent; infinite or 0 beyond floats, without a warning."""
    with np.errstate(over="ignore", under="ignore"):
        short = np.clip(exponent, -4000, 4000).astype(np.intc)
        return cast(FloatArray, np.ldexp(mantissa, short))


def parts(values: IntArray) -> tuple[FloatArray, Exponents]:
    """Mantissas in (-1, 1) and exponents with values = mantissa * 2**exponent (rounded)."""
    if values.dtype != object:
        mantissa, exponent = np.frexp(values.astype(np.float64))
        return mantissa, exponent.astype(np.int64)
    shifts = np.array([max(0, int(v).bit_length() - 64) for v in values], dtype=np.int64)
    tops = [int(v) >> int(s) for v, s in zip(values, shifts, strict=True)]
    mantissa, exponent = np.frexp(np.array(tops, dtype=np.float64))
    return mantissa, exponent.astype(np.int64) + shifts


def floats(lp: LinearProgram) -> FloatProgram:
    """Return the program as floats; see the module docstring for the scaling."""
    data, data_exp = parts(lp.data)
    cost, cost_exp = parts(lp.cost)
    row_of = np.repeat(np.arange(lp.rows), np.diff(lp.indptr))
    row_lo, row_lo_exp = parts(lp.row_lo.num)
    row_hi, row_hi_exp = parts(lp.row_hi.num)
    den, den_exp = parts(np.array([lp.col_den], dtype=object))
    col_lo, col_lo_exp = parts(lp.col_lo.num)
    col_hi, col_hi_exp = parts(lp.col_hi.num)
    col_lo, col_hi = col_lo / den[0], col_hi / den[0]
    col_lo_exp, col_hi_exp = col_lo_exp - den_exp[0], col_hi_exp - den_exp[0]

    row_exp = _middle(data_exp, row_of, lp.rows)
    col_exp = np.zeros(lp.columns, dtype=np.int64)
    finite_rows = [
        (row_lo, row_lo_exp, lp.row_lo.finite),
        (row_hi, row_hi_exp, lp.row_hi.finite),
    ]
    finite_cols = [
        (col_lo, col_lo_exp, lp.col_lo.finite),
        (col_hi, col_hi_exp, lp.col_hi.finite),
    ]

    def farthest() -> int:
        rows = [_top(m, e + row_exp, f) for m, e, f in finite_rows]
        cols = [_top(m, e - col_exp, f) for m, e, f in finite_cols]
        return max(rows + cols)

    spread = int(np.abs(data_exp + row_exp[row_of]).max(initial=0))
    if spread > NEAR or farthest() > FAR:
        for _ in range(3):
            col_exp = _middle(data_exp + row_exp[row_of], lp.indices, lp.columns)
            col_exp[lp.integer] = 0
            row_exp = _middle(data_exp + col_exp[lp.indices], row_of, lp.rows)
        if not lp.integer.any() and farthest() > FAR:
            # x' = x / 2**shift: all bounds shrink together, coefficients stay as they are
            shift = farthest() - NEAR
            col_exp, row_exp = col_exp + shift, row_exp - shift
            # the row exponents undo the column shift inside A, and shrink the row bounds

    seen = cost != 0
    size = int((cost_exp + col_exp)[seen].max()) if seen.any() else 7
    objective = 0 if 0 < size <= 10 else 7 - size
    sign = -1.0 if lp.sense == "max" else 1.0
    return FloatProgram(
        lp.indptr,
        lp.indices,
        ldexp(data, data_exp + row_exp[row_of] + col_exp[lp.indices]),
        sign * ldexp(cost, cost_exp + col_exp + objective),
        _side(row_lo, row_lo_exp + row_exp, lp.row_lo, -np.inf),
        _side(row_hi, row_hi_exp + row_exp, lp.row_hi, np.inf),
        _side(col_lo, col_lo_exp - col_exp, lp.col_lo, -np.inf),
        _side(col_hi, col_hi_exp - col_exp, lp.col_hi, np.inf),
        lp.integer,
        row_exp,
        col_exp,
        objective,
    )


def _middle(exponents: Exponents, group: npt.NDArray[np.int64], size: int) -> Exponents:
    """Minus the middle of the smallest and the largest exponent of each group, capped."""
    low = np.full(size, 2**40, dtype=np.int64)
    high = np.full(size, -(2**40), dtype=np.int64)
    np.minimum.at(low, group, exponents)
    np.maximum.at(high, group, exponents)
    middle: Exponents = np.minimum(-((low + high) // 2), MOST - high)
    middle[low > high] = 0
    return middle


def _top(mantissa: FloatArray, exponent: Exponents, finite: npt.NDArray[np.bool_]) -> int:
    """Return the largest exponent among the finite, nonzero entries."""
    seen = finite & (mantissa != 0)
    return int(exponent[seen].max()) if seen.any() else -(2**30)


def _side(mantissa: FloatArray, exponent: Exponents, bound: Bound, absent: float) -> FloatArray:
    return np.where(bound.finite, ldexp(mantissa, exponent), absent)
