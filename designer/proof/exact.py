"""The program in integers, ready for exact checks.

Everything here is about the MIN problem in the unknowns X = col_den * x:

    minimise c.X   such that   L <= A X <= U,   l <= X <= u        (all integers)

with L = col_den * row_lo and so on, and c = cost, negated when the program maximises. Its
value is cost_den * col_den times the program's, up to cost_const and sign.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property
from math import gcd, inf, isfinite

import numpy as np
import numpy.typing as npt

from designer.engines.floats import ldexp, parts
from designer.engines.report import FloatArray
from designer.program.linear import LinearProgram
from designer.proof.sparse import Matrix, dot, narrow, plus, scaled
from designer.proof.vector import Vector
from designer.setting.setting import IntArray

Mask = npt.NDArray[np.bool_]


@dataclass(frozen=True, eq=False)
class Point:
    """Integers over one denominator: num / den, den > 0."""

    num: IntArray
    den: int


@dataclass(frozen=True, eq=False)
class Side:
    """Integer bounds of one axis and where they are finite."""

    num: IntArray
    finite: Mask


@dataclass(frozen=True, eq=False)
class Exact:
    """A program to minimise, in integers; see the module docstring."""

    lp: LinearProgram

    @cached_property
    def matrix(self) -> Matrix:
        """The matrix A."""
        return Matrix(self.lp.indptr, self.lp.indices, narrow(self.lp.data), self.lp.columns)

    @cached_property
    def cost(self) -> IntArray:
        """Cost c of the min problem."""
        return narrow(-self.lp.cost if self.lp.sense == "max" else self.lp.cost)

    @cached_property
    def row_lo(self) -> Side:
        """Lower row bounds L."""
        return Side(scaled(narrow(self.lp.row_lo.num), self.lp.col_den), self.lp.row_lo.finite)

    @cached_property
    def row_hi(self) -> Side:
        """Upper row bounds U."""
        return Side(scaled(narrow(self.lp.row_hi.num), self.lp.col_den), self.lp.row_hi.finite)

    @cached_property
    def col_lo(self) -> Side:
        """Lower bounds l."""
        return Side(narrow(self.lp.col_lo.num), self.lp.col_lo.finite)

    @cached_property
    def col_hi(self) -> Side:
        """Upper bounds u."""
        return Side(narrow(self.lp.col_hi.num), self.lp.col_hi.finite)

    # -- checks ---------------------------------------------------------------------

    def crossing(self) -> str:
        """In words, the first row or column whose lower bound exceeds its upper; or ''."""
        for name, lo, hi in (
            ("row", self.row_lo, self.row_hi),
            ("column", self.col_lo, self.col_hi),
        ):
            crossed = lo.finite & hi.finite & _mask(lo.num > hi.num)
            if crossed.any():
                return f"{name} {int(np.argmax(crossed))} has its lower bound above its upper"
        return ""

    def outside(self, x: Point, activity: IntArray | None = None) -> tuple[Mask, Mask]:
        """Columns and rows of X = num / den that miss one of their bounds."""
        if activity is None:
            activity = self.matrix.times(x.num)
        return (
            outside(x.num, x.den, self.col_lo, self.col_hi),
            outside(activity, x.den, self.row_lo, self.row_hi),
        )

    def reduced(self, y: Point, cost: IntArray | None = None) -> IntArray:
        """D = den * c - A' num, the reduced costs over the same denominator as y."""
        pulled = self.matrix.transposed.times(y.num)
        return plus(scaled(self.cost if cost is None else cost, y.den), -pulled)

    def dual_value(self, y: Point, d: IntArray) -> int | None:
        """Sum of y and d times the bounds they use, over y.den; None if one is infinite.

        Any x between its bounds has c.X at least this over y.den (weak duality).
        """
        total = 0
        for values, lo, hi in (
            (y.num, self.row_lo, self.row_hi),
            (d, self.col_lo, self.col_hi),
        ):
            up, down = _mask(values > 0), _mask(values < 0)
            if (up & ~lo.finite).any() or (down & ~hi.finite).any():
                return None
            total += dot(values[up], lo.num[up]) + dot(values[down], hi.num[down])
        return total

    # -- translations to the program's own units ---------------------------------------

    def minimum(self, x: Point) -> Fraction:
        """c.X of the min problem."""
        return Fraction(dot(self.cost, x.num), x.den)

    def value(self, x: Point) -> Fraction:
        """The program's objective at X."""
        return self.own_value(self.minimum(x))

    def own_value(self, minimum: Fraction) -> Fraction:
        """The program's value of a value c.X of the min problem."""
        sign = -1 if self.lp.sense == "max" else 1
        return sign * minimum / (self.lp.cost_den * self.lp.col_den) + self.lp.cost_const

    def primal_vector(self, x: Point) -> Vector:
        """The point x = X / col_den."""
        return Vector.over(x.den * self.lp.col_den, x.num.tolist())

    def dual_vector(self, y: Point) -> Vector:
        """Give y per unit of cost / cost_den."""
        return Vector.over(y.den * self.lp.cost_den, y.num.tolist())

    def farkas_vector(self, y: Point) -> Vector:
        """Give y as it is: a Farkas vector has no unit, any positive multiple is one."""
        common = gcd(*y.num.tolist()) or 1
        return Vector.over(1, [number // common for number in y.num.tolist()])

    def approximate(self, x: Point) -> float:
        """The program's objective at X as a float, infinite beyond their range."""
        value = self.value(x)
        try:
            return float(value)
        except OverflowError:
            return inf if value > 0 else -inf

    def rough_bound(self, cost: float) -> float:
        """Turn an engine's bound on the integer cost into the program's own value."""
        if not isfinite(cost):
            return -cost if self.lp.sense == "max" else cost
        try:
            return float(self.own_value(Fraction(cost) * self.lp.col_den))
        except OverflowError:
            return inf if cost > 0 else -inf

    def rough_minimum(self, x: FloatArray) -> float:
        """Estimate cost.x of the min problem at an engine's point, in floats."""
        used = np.flatnonzero(np.asarray(self.cost != 0, dtype=bool))
        mantissa, exponent = parts(self.cost[used])
        with np.errstate(over="ignore", invalid="ignore"):
            return float(np.sum(ldexp(mantissa * x[used], exponent)))

    def rough_value(self, x: FloatArray) -> float:
        """The program's objective at an engine's point, in floats."""
        return self.rough_bound(self.rough_minimum(x))

    # -- certificates --------------------------------------------------------------------

    def proves_infeasible(self, y: Point) -> bool:
        """Whether y is a Farkas vector: with cost 0 its dual value is positive."""
        d = -self.matrix.transposed.times(y.num)
        value = self.dual_value(y, d)
        return value is not None and value > 0

    def proves_ray(self, r: Point) -> bool:
        """Whether r keeps every row and bound for ever and improves the objective."""
        activity = self.matrix.times(r.num)
        for values, lo, hi in (
            (r.num, self.col_lo, self.col_hi),
            (activity, self.row_lo, self.row_hi),
        ):
            if (lo.finite & _mask(values < 0)).any() or (hi.finite & _mask(values > 0)).any():
                return False
        return dot(self.cost, r.num) < 0

    def proves_bound(self, y: Point, value: Fraction) -> bool:
        """Whether no feasible X has c.X below `value`, by y."""
        found = self.dual_value(y, self.reduced(y))
        return found is not None and Fraction(found, y.den) >= value


def outside(values: IntArray, den: int, lo: Side, hi: Side) -> Mask:
    """Where values / den misses a finite bound."""
    low = lo.finite & _mask(values < scaled(lo.num, den))
    return low | (hi.finite & _mask(values > scaled(hi.num, den)))


def _mask(compared: object) -> Mask:
    # comparing Python-int arrays gives an array of objects
    return np.asarray(compared, dtype=bool)
