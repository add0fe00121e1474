"""Small programs to prove things about, and a slow judge of what was proved.

The judge works in `Fraction`s, row by row, and shares nothing with the code under test.
"""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from itertools import combinations, product
from typing import Literal

import numpy as np

from designer.program.linear import Bound, LinearProgram
from designer.proof.outcome import Branch, Outcome, Tree
from designer.proof.vector import Vector
from designer.setting.setting import integers

Number = int | None
Rational = Fraction | int | None


def bound(values: Sequence[Number]) -> Bound:
    return Bound(
        integers([0 if value is None else value for value in values]),
        np.array([value is not None for value in values], dtype=bool),
    )


def program(
    rows: Sequence[Sequence[int]],
    row_lo: Sequence[Number],
    row_hi: Sequence[Number],
    col_lo: Sequence[Number],
    col_hi: Sequence[Number],
    cost: Sequence[int],
    sense: Literal["min", "max"] = "min",
    *,
    col_den: int = 1,
    cost_den: int = 1,
    cost_const: Fraction = Fraction(0),
    integer: Sequence[bool] | None = None,
) -> LinearProgram:
    """A program from dense rows."""
    indptr, indices, data = [0], [], []
    for row in rows:
        for column, value in enumerate(row):
            if value:
                indices.append(column)
                data.append(value)
        indptr.append(len(indices))
    return LinearProgram(
        np.array(indptr, dtype=np.int64),
        np.array(indices, dtype=np.int64),
        integers(data),
        bound(row_lo),
        bound(row_hi),
        bound(col_lo),
        bound(col_hi),
        col_den,
        integers(cost),
        np.zeros(len(cost), dtype=bool) if integer is None else np.array(integer, dtype=bool),
        cost_den,
        cost_const,
        sense,
    )


class Plain:
    """A program as lists of Fractions, to be minimised."""

    def __init__(self, lp: LinearProgram) -> None:  # noqa: D107 - see the class
        self.n, self.m = lp.columns, lp.rows
        self.rows = [[Fraction(0)] * self.n for _ in range(self.m)]
        for i in range(self.m):
            for k in range(int(lp.indptr[i]), int(lp.indptr[i + 1])):
                self.rows[i][int(lp.indices[k])] = Fraction(int(lp.data[k]))
        self.row_lo, self.row_hi = _side(lp.row_lo, 1), _side(lp.row_hi, 1)
        self.col_lo, self.col_hi = _side(lp.col_lo, lp.col_den), _side(lp.col_hi, lp.col_den)
        self.sign = -1 if lp.sense == "max" else 1
        self.const = lp.cost_const
        self.cost = [self.sign * Fraction(int(c), lp.cost_den) for c in lp.cost]
        self.whole = [bool(flag) for flag in lp.integer]

    def feasible(self, x: Sequence[Fraction]) -> bool:
        activities = [_dot(row, x) for row in self.rows]
        return (
            all(map(_between, x, self.col_lo, self.col_hi))
            and all(map(_between, activities, self.row_lo, self.row_hi))
            and all(not whole or v.denominator == 1 for v, whole in zip(x, self.whole, strict=True))
        )

    def own(self, minimum: Fraction) -> Fraction:
        return self.sign * minimum + self.const

    def dual_value(
        self,
        y: Sequence[Fraction],
        cost: Sequence[Fraction],
        col_lo: Sequence[Fraction | None],
        col_hi: Sequence[Fraction | None],
    ) -> Fraction | None:
        d = [
            cost[j] - sum((y[i] * self.rows[i][j] for i in range(self.m)), Fraction(0))
            for j in range(self.n)
        ]
        total = Fraction(0)
        for value, lo, hi in [
            *zip(y, self.row_lo, self.row_hi, strict=True),
            *zip(d, col_lo, col_hi, strict=True),
        ]:
            side = lo if value > 0 else hi
            if value != 0:
                if side is None:
                    return None
                total += value * side
        return total

    def vertices(self) -> list[list[Fraction]]:
        """All basic feasible points (only sensible for a handful of columns)."""
        planes: list[tuple[list[Fraction], Fraction]] = []
        for i in range(self.m):
            for side in {self.row_lo[i], self.row_hi[i]} - {None}:
                planes.append((self.rows[i], Fraction(side or 0)))
        for j in range(self.n):
            for side in {self.col_lo[j], self.col_hi[j]} - {None}:
                unit = [Fraction(int(k == j)) for k in range(self.n)]
                planes.append((unit, Fraction(side or 0)))
        found = []
        for chosen in combinations(planes, self.n):
            x = _solve([list(row) for row, _ in chosen], [right for _, right in chosen])
            if x is not None and self.feasible(x):
                found.append(x)
        return found

    def whole_points(self) -> list[list[Fraction]]:
        """All feasible points, when every column is whole and boxed."""
        ranges = [
            range(int(lo or 0), int(hi or 0) + 1)
            for lo, hi in zip(self.col_lo, self.col_hi, strict=True)
        ]
        points = ([Fraction(v) for v in point] for point in product(*ranges))
        return [point for point in points if self.feasible(point)]

    def value(self, x: Sequence[Fraction]) -> Fraction:
        return _dot(self.cost, x)


def judge(lp: LinearProgram, outcome: Outcome) -> None:
    """Fail unless every certificate in the outcome holds."""
    plain = Plain(lp)
    assert outcome.proved, outcome
    if outcome.status in ("optimal", "unbounded"):
        assert outcome.primal is not None
        assert outcome.table_proved
        x = outcome.primal.dense()
        assert len(x) == plain.n
        assert plain.feasible(x)
        assert outcome.value == plain.own(plain.value(x))
    if outcome.status == "unbounded":
        assert outcome.ray is not None
        r = outcome.ray.dense()
        zero_rows = [
            [None if side is None else Fraction(0) for side in sides]
            for sides in (plain.row_lo, plain.row_hi, plain.col_lo, plain.col_hi)
        ]
        assert all(map(_between, [_dot(row, r) for row in plain.rows], zero_rows[0], zero_rows[1]))
        assert all(map(_between, r, zero_rows[2], zero_rows[3]))
        assert plain.value(r) < 0
        return
    nothing = [Fraction(0)] * plain.n
    if outcome.tree is not None:
        best = None if outcome.primal is None else plain.value(outcome.primal.dense())
        _judge_tree(plain, outcome.tree, best, list(plain.col_lo), list(plain.col_hi))
    elif outcome.status == "optimal":
        assert outcome.dual is not None
        assert outcome.primal is not None
        y = outcome.dual.dense()
        assert len(y) == plain.m
        dual = plain.dual_value(y, plain.cost, plain.col_lo, plain.col_hi)
        assert dual == plain.value(outcome.primal.dense())
    else:
        assert outcome.status == "infeasible"
        assert outcome.farkas is not None
        positive = plain.dual_value(outcome.farkas.dense(), nothing, plain.col_lo, plain.col_hi)
        assert positive is not None
        assert positive > 0


def _judge_tree(
    plain: Plain,
    tree: Tree,
    best: Fraction | None,
    lo: list[Fraction | None],
    hi: list[Fraction | None],
) -> None:
    if isinstance(tree, Branch):
        assert plain.whole[tree.column]
        left, right = list(hi), list(lo)
        left[tree.column] = Fraction(tree.value)
        right[tree.column] = Fraction(tree.value + 1)
        _judge_tree(plain, tree.left, best, lo, left)
        _judge_tree(plain, tree.right, best, right, hi)
        return
    y = tree.dual.dense()
    if tree.kind == "bound":
        reached = plain.dual_value(y, plain.cost, lo, hi)
        assert best is not None
        assert reached is not None
        assert reached >= best
    else:
        reached = plain.dual_value(y, [Fraction(0)] * plain.n, lo, hi)
        assert reached is not None
        assert reached > 0


def dense(vector: Vector | None) -> list[Fraction]:
    assert vector is not None
    return vector.dense()


def _side(side: Bound, den: int) -> list[Fraction | None]:
    return [
        Fraction(int(number), den) if finite else None
        for number, finite in zip(side.num, side.finite, strict=True)
    ]


def _between(value: Fraction, lo: Fraction | None, hi: Fraction | None) -> bool:
    return (lo is None or lo <= value) and (hi is None or value <= hi)


def _dot(left: Sequence[Fraction], right: Sequence[Fraction]) -> Fraction:
    return sum((a * b for a, b in zip(left, right, strict=True)), Fraction(0))


def _solve(rows: list[list[Fraction]], right: list[Fraction]) -> list[Fraction] | None:
    size = len(rows)
    for k in range(size):
        at = next((i for i in range(k, size) if rows[i][k] != 0), None)
        if at is None:
            return None
        rows[k], rows[at] = rows[at], rows[k]
        right[k], right[at] = right[at], right[k]
        for i in range(size):
            if i != k and rows[i][k] != 0:
                factor = rows[i][k] / rows[k][k]
                rows[i] = [a - factor * b for a, b in zip(rows[i], rows[k], strict=True)]
                right[i] -= factor * right[k]
    return [right[k] / rows[k][k] for k in range(size)]
