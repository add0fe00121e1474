"""From a basis to its exact point and multipliers.

With N_r the rows that are not basic and B_c the columns that are, K = A[N_r, B_c] is square
and K X_B = bounds - A[N_r, others] X_others, K' y = c[B_c], y = 0 on basic rows.
"""

from __future__ import annotations

from functools import cached_property

import numpy as np

from designer.engines.report import BASIC, UPPER, ZERO, Basis
from designer.engines.watch import Watch
from designer.proof.exact import Exact, Mask, Point, Side
from designer.proof.kernel import Kernel
from designer.proof.sparse import Indices, dot, plus, scaled
from designer.setting.setting import IntArray


class Corner:
    """A basis of a program and what follows from it exactly; computed when asked for."""

    def __init__(self, exact: Exact, basis: Basis, watch: Watch) -> None:
        """Keep the basis; nothing is solved yet."""
        self.exact, self.basis, self.watch = exact, basis, watch

    @cached_property
    def tight(self) -> Indices:
        """N_r, the rows that are not basic."""
        return np.flatnonzero(self.basis.rows != BASIC)

    @cached_property
    def basic(self) -> Indices:
        """B_c, the columns that are basic."""
        return np.flatnonzero(self.basis.columns == BASIC)

    @cached_property
    def kernel(self) -> Kernel:
        """K; Singular if it is not square."""
        return Kernel(self.exact.matrix.part(self.tight, self.basic), self.watch)

    @cached_property
    def x(self) -> Point:
        """The exact point. Raises Singular."""
        exact = self.exact
        # looked up first, so that an unsquare basis is found before anything is computed
        kernel = self.kernel
        resting = standing(self.basis.columns, exact.col_lo, exact.col_hi)
        right = standing(self.basis.rows, exact.row_lo, exact.row_hi)[self.tight]
        if np.any(resting != 0):
            right = plus(right, -exact.matrix.times(resting)[self.tight])
        numerators, den = kernel.solve(right)
        spread = scaled(resting, den)
        # `scaled` may hand back its argument: never write into that.
        spread = spread.astype(numerators.dtype if spread.dtype == numerators.dtype else object)
        spread[self.basic] = numerators
        return Point(spread, den)

    @cached_property
    def activity(self) -> IntArray:
        """A X over the denominator of x."""
        return self.exact.matrix.times(self.x.num)

    @cached_property
    def y(self) -> Point:
        """The exact multipliers. Raises Singular."""
        return self.multipliers(self.exact.cost)

    def multipliers(self, cost: IntArray) -> Point:
        """The multipliers of this basis for another cost."""
        numerators, den = self.kernel.solve_transposed(cost[self.basic])
        spread: IntArray = np.zeros(self.exact.matrix.rows, dtype=np.int64)
        if numerators.dtype == object:
            spread = spread.astype(object)
        spread[self.tight] = numerators
        return Point(spread, den)

    @cached_property
    def d(self) -> IntArray:
        """Reduced costs over the denominator of y."""
        return self.exact.reduced(self.y)

    @cached_property
    def missed(self) -> tuple[Mask, Mask]:
        """Columns and rows whose bounds the point misses."""
        return self.exact.outside(self.x, self.activity)

    @cached_property
    def wrong(self) -> tuple[Mask, Mask]:
        """Nonbasic columns and rows whose multiplier has the wrong sign."""
        return (
            wrong_sign(self.d, self.basis.columns, self.exact.col_lo, self.exact.col_hi),
            wrong_sign(self.y.num, self.basis.rows, self.exact.row_lo, self.exact.row_hi),
        )

    @property
    def feasible(self) -> bool:
        """Whether the point keeps every row and bound."""
        return not (self.missed[0].any() or self.missed[1].any())

    @property
    def dual_feasible(self) -> bool:
        """Whether every multiplier has its sign, so that the point is optimal if feasible."""
        return not (self.wrong[0].any() or self.wrong[1].any())

    @property
    def optimal(self) -> bool:
        """Whether point and multipliers prove each other: both feasible, values equal."""
        if not (self.feasible and self.dual_feasible):
            return False
        dual = self.exact.dual_value(self.y, self.d)
        if dual is None:
            return False
        return dual * self.x.den == dot(self.exact.cost, self.x.num) * self.y.den


def standing(status: object, lo: Side, hi: Side) -> IntArray:
    """Where nonbasic entries stand: at the bound their status names, 0 for free and basic."""
    status = np.asarray(status)
    at_hi = (status == UPPER) & hi.finite
    values = np.where(at_hi, hi.num, np.where(lo.finite, lo.num, 0))
    return np.where((status == BASIC) | (status == ZERO), 0, values)


def wrong_sign(values: IntArray, status: object, lo: Side, hi: Side) -> Mask:
    """Nonbasic entries whose reduced cost says that leaving the bound would pay."""
    status = np.asarray(status)
    up, down = np.asarray(values > 0, dtype=bool), np.asarray(values < 0, dtype=bool)
    fixed = lo.finite & hi.finite & np.asarray(lo.num == hi.num, dtype=bool)
    at_hi = status == UPPER
    free = status == ZERO
    wrong = np.where(at_hi, up, down) | (free & (up | down))
    result: Mask = wrong & (status != BASIC) & ~fixed
    return result
