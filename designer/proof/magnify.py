"""The magnified program: what floats got wrong, made large enough for floats to see.

Around an exact point X* and multipliers y* of a wrong basis, with z = x - x*,

    min  Dd (d*.z + y*.s)   such that   A z - s = 0,
         Dp (l - x*) <= z <= Dp (u - x*),   Dp (L - A x*) <= s <= Dp (U - A x*),

where d* = c - A'y* and the row activities s are columns of their own. Its bases are those
of the program. The offsets are computed exactly and rounded once, so a bound missed by
1e-10 stands at 1 when Dp = 1e10. Source: A. Gleixner, D. Steffy, K. Wolter, "Iterative
refinement for linear programming", INFORMS J. Computing 28 (2016) 449-464.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from designer.engines.floats import Exponents, FloatProgram, floats, ldexp, parts
from designer.engines.highs import HIGHS
from designer.engines.report import BASIC, LOWER, Basis, FloatArray, Report
from designer.engines.watch import Watch
from designer.proof.corner import Corner
from designer.proof.exact import Point, Side
from designer.proof.sparse import plus, scaled
from designer.setting.setting import IntArray

MOST = 60
"""The magnification is at most 2**60."""
USUAL = 30
"""Used for the side (point or multipliers) of which nothing is wrong."""


def magnified(corner: Corner, watch: Watch) -> Report:
    """Return HiGHS's report on the program magnified at `corner`.

    Its basis is one of the program itself; x and y are left out.
    """
    exact = corner.exact
    base = floats(exact.lp)
    x, y = corner.x, corner.y
    columns, rows = exact.matrix.columns, exact.matrix.rows

    over = x.den * exact.lp.col_den
    col_lo = _offset(exact.col_lo, x, x.num, over, -base.col_exp, -np.inf)
    col_hi = _offset(exact.col_hi, x, x.num, over, -base.col_exp, np.inf)
    row_lo = _offset(exact.row_lo, x, corner.activity, over, base.row_exp, -np.inf)
    row_hi = _offset(exact.row_hi, x, corner.activity, over, base.row_exp, np.inf)
    miss = max(float(values.max(initial=0.0)) for values in (col_lo, -col_hi, row_lo, -row_hi))
    up = _magnification(miss)
    price_c = _rounded(corner.d, y.den, base.col_exp + base.cost_exp)
    price_r = _rounded(y.num, y.den, base.cost_exp - base.row_exp)
    wrong = np.concatenate([np.abs(price_c)[corner.wrong[0]], np.abs(price_r)[corner.wrong[1]]])
    up_dual = _magnification(float(wrong.max(initial=0.0)))

    ends = exact.lp.indptr[1:]
    program = FloatProgram(
        indptr=np.concatenate([[0], ends + np.arange(1, rows + 1)]).astype(np.int64),
        indices=np.insert(exact.lp.indices, ends, columns + np.arange(rows)),
        data=np.insert(base.data, ends, -1.0),
        cost=ldexp(np.concatenate([price_c, price_r]), _all(up_dual, columns + rows)),
        row_lo=np.zeros(rows),
        row_hi=np.zeros(rows),
        col_lo=ldexp(np.concatenate([col_lo, row_lo]), _all(up, columns + rows)),
        col_hi=ldexp(np.concatenate([col_hi, row_hi]), _all(up, columns + rows)),
        integer=np.zeros(columns + rows, dtype=bool),
        row_exp=np.zeros(rows, dtype=np.int64),
        col_exp=np.zeros(columns + rows, dtype=np.int64),
        cost_exp=0,
    )
    start = Basis(
        np.concatenate([corner.basis.columns, corner.basis.rows]),
        np.full(rows, LOWER, dtype=np.int8),
    )
    report = HIGHS.run(program, watch, basis=start, tolerance=1e-9)
    if report.basis is None:
        return replace(report, x=None, y=None)
    found = report.basis.columns[columns:].copy()
    # a basic slack of A z - s = 0 spans what the row's own activity would
    found[report.basis.rows == BASIC] = BASIC
    basis = Basis(report.basis.columns[:columns], found)
    return replace(report, x=None, y=None, basis=basis)


def _offset(
    side: Side, x: Point, values: IntArray, over: int, exponent: Exponents, absent: float
) -> FloatArray:
    """(bound - value) * 2**exponent in floats; `absent` where there is no bound."""
    away = plus(scaled(side.num, x.den), -values)
    return np.where(side.finite, _rounded(away, over, exponent), absent)


def _rounded(values: IntArray, den: int, exponent: Exponents) -> FloatArray:
    """Values / den * 2**exponent, each rounded once or twice."""
    top, top_exp = parts(values)
    bottom, bottom_exp = parts(np.array([den], dtype=object))
    return ldexp(top / bottom[0], top_exp - bottom_exp[0] + exponent)


def _magnification(size: float) -> int:
    """The exponent that brings `size` to about 1."""
    if size <= 0.0:
        return USUAL
    return int(np.clip(-np.floor(np.log2(size)), 0, MOST))


def _all(exponent: int, size: int) -> Exponents:
    return np.full(size, exponent, dtype=np.int64)
