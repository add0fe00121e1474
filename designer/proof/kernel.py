"""Square integer systems K x = b and K' y = c, solved exactly.

The kernel of a basis is nearly triangular: rows and columns with a single entry are peeled
off first. What remains, the core, is solved by sparse elimination in Python ints while
small (no library to import), by numeric-symbolic lifting (`lifting.py`) beyond; dense FLINT
helps where the one fills in and the other does not converge.
"""

from __future__ import annotations

import sys
from collections.abc import Sequence
from functools import cached_property
from heapq import heapify, heappop, heappush
from math import gcd, lcm

import numpy as np

from designer.engines.watch import Watch
from designer.proof.lifting import Lifting, NotLifted
from designer.proof.sparse import Matrix, largest, narrow
from designer.proof.waves import Waves, waves
from designer.setting.setting import IntArray

WAVES = 400
"""Kernels from this size are tried in waves first: shallow ones are done by then."""
PEEL = 4_000
"""Kernels up to this size are peeled in Python before anything else."""
SPARSE = 4_000
"""Cores up to this size are first tried by elimination in Python ints."""
WORK = 150_000
"""Entry updates after which elimination gives up: the core fills in."""
IMPORTED = 60
"""The same as `SPARSE` once the float LU has been imported anyway."""
DENSE = 150
"""Cores that fill in go to FLINT up to this size; importing the float LU costs more."""
DENSE_LAST = 1_500
"""Cores up to this size go to FLINT when lifting does not converge."""

Ratio = tuple[int, int]
"""A rational number in lowest terms, denominator positive."""


class Singular(Exception):  # noqa: N818 - a finding about a basis, not a mistake
    """The kernel has no inverse (or none could be found): the basis is no basis."""


class Crowded(Exception):  # noqa: N818 - a finding: another method is quicker
    """Elimination fills the core in."""


class Kernel:
    """An integer square matrix that can be solved with exactly, either way round."""

    def __init__(self, matrix: Matrix, watch: Watch | None = None) -> None:
        """Keep the matrix; Singular is raised when rows and columns differ in number."""
        if matrix.rows != matrix.columns:
            raise Singular(f"{matrix.rows} rows against {matrix.columns} columns")
        self.matrix = matrix
        self.watch = watch or Watch()
        self._crowded = False

    @property
    def size(self) -> int:
        """The number of rows."""
        return self.matrix.rows

    def solve(self, b: IntArray) -> tuple[IntArray, int]:
        """(N, q) with K N = q b, q > 0. Raises Singular."""
        return self._solve(b, False)

    def solve_transposed(self, c: IntArray) -> tuple[IntArray, int]:
        """(M, p) with K' M = p c, p > 0. Raises Singular."""
        return self._solve(c, True)

    def _solve(self, b: IntArray, transposed: bool) -> tuple[IntArray, int]:
        if self.size == 0 or largest(b) == 0:
            # still to be checked regular by whoever needs that; 0 solves every system
            return np.zeros(self.size, dtype=np.int64), 1
        if self.size >= WAVES and self._waves is not None:
            found = self._waves.solve(
                b, transposed, lambda rest: self._core._solve(rest, transposed)
            )
            if found is not None:
                return found
        core = len(self._peeled.core_rows) if self.size <= PEEL else self.size
        sparse = IMPORTED if "scipy.sparse.linalg" in sys.modules else SPARSE
        if core <= sparse and not self._crowded:
            try:
                return self._peeled.solve(b.tolist(), transposed)
            except Crowded:
                self._crowded = True
        if core <= DENSE:
            return self._peeled.solve(b.tolist(), transposed, dense=True)
        try:
            return self._lifting.solve(b, transposed)
        except NotLifted as failure:
            if self.size <= PEEL and core <= DENSE_LAST:
                return self._peeled.solve(b.tolist(), transposed, dense=True)
            raise Singular(str(failure)) from failure

    @cached_property
    def _waves(self) -> Waves | None:
        return waves(self.matrix)

    @cached_property
    def _core(self) -> Kernel:
        if self._waves is None:
            raise ValueError("a kernel without waves has no core")
        return Kernel(self._waves.core_matrix, self.watch)

    @cached_property
    def _peeled(self) -> Peeled:
        return Peeled(self.matrix, self.watch)

    @cached_property
    def _lifting(self) -> Lifting:
        return Lifting(self.matrix, self.watch)


class Peeled:
    """A kernel with its singleton rows and columns taken off, in order.

    first   (row, column): at its turn the row had this one column left
    last    (row, column): at its turn the column had this one row left
    """

    def __init__(self, matrix: Matrix, watch: Watch) -> None:
        """Peel until every remaining row and column has two entries or more."""
        self.watch = watch
        self.rows = matrix.entries()
        self.columns = matrix.transposed.entries()
        self.first: list[tuple[int, int]] = []
        self.last: list[tuple[int, int]] = []
        row_left = [len(row) for row in self.rows]
        column_left = [len(column) for column in self.columns]
        row_gone = [False] * len(row_left)
        column_gone = [False] * len(row_left)
        waiting = [(True, i) for i, count in enumerate(row_left) if count <= 1]
        waiting += [(False, j) for j, count in enumerate(column_left) if count <= 1]
        while waiting:
            by_row, k = waiting.pop()
            if row_gone[k] if by_row else column_gone[k]:
                continue
            line, gone = (self.rows[k], column_gone) if by_row else (self.columns[k], row_gone)
            alive = [other for other, _ in line if not gone[other]]
            if len(alive) != 1:
                raise Singular("an empty row or column")
            i, j = (k, alive[0]) if by_row else (alive[0], k)
            (self.first if by_row else self.last).append((i, j))
            row_gone[i] = column_gone[j] = True
            for other, _ in self.rows[i]:
                column_left[other] -= 1
                if not column_gone[other] and column_left[other] <= 1:
                    waiting.append((False, other))
            for other, _ in self.columns[j]:
                row_left[other] -= 1
                if not row_gone[other] and row_left[other] <= 1:
                    waiting.append((True, other))
        self.core_rows = [i for i, gone in enumerate(row_gone) if not gone]
        self.core_columns = [j for j, gone in enumerate(column_gone) if not gone]

    def solve(
        self, b: Sequence[int], transposed: bool, *, dense: bool = False
    ) -> tuple[IntArray, int]:
        """(N, q) with K N = q b, or K' N = q b. Raises Singular, and Crowded unless `dense`."""
        # For K x = b the singleton rows come first, then the core, then the singleton
        # columns backwards; for the transpose the two swap roles.
        lines = self.columns if transposed else self.rows
        first = [(j, i) for i, j in self.last] if transposed else self.first
        last = [(j, i) for i, j in self.first] if transposed else self.last
        core_lines = self.core_columns if transposed else self.core_rows
        core_unknowns = self.core_rows if transposed else self.core_columns
        known: list[Ratio | None] = [None] * len(lines)
        for line, unknown in first:
            known[unknown] = _resolve(lines[line], b[line], unknown, known)
        if core_lines:
            place = {unknown: k for k, unknown in enumerate(core_unknowns)}
            system, right = [], []
            for line in core_lines:
                row = {place[k]: a for k, a in lines[line] if k in place}
                n, d = _left(lines[line], b[line], known)
                system.append({k: a * d for k, a in row.items()} if d != 1 else row)
                right.append(n)
            for unknown, value in zip(core_unknowns, self._core(system, right, dense), strict=True):
                known[unknown] = value
        for line, unknown in reversed(last):
            known[unknown] = _resolve(lines[line], b[line], unknown, known)
        values = [value for value in known if value is not None]
        common = lcm(*{d for _, d in values})
        return narrow(np.array([n * (common // d) for n, d in values], dtype=object)), common

    def _core(self, system: list[dict[int, int]], right: list[int], dense: bool) -> list[Ratio]:
        if not any(right):
            return [(0, 1)] * len(right)
        return _flint(system, right) if dense else eliminate(system, right, self.watch)


def _left(line: list[tuple[int, int]], b: int, known: list[Ratio | None]) -> Ratio:
    """B minus what the known unknowns of the line contribute, not reduced."""
    n, d = b, 1
    for k, a in line:
        value = known[k]
        if value is None or value[0] == 0:
            continue
        vn, vd = value
        if vd == d:
            n -= a * vn
        elif d % vd == 0:
            n -= a * vn * (d // vd)
        else:
            common = d // gcd(d, vd) * vd
            n = n * (common // d) - a * vn * (common // vd)
            d = common
    return n, d


def _resolve(line: list[tuple[int, int]], b: int, unknown: int, known: list[Ratio | None]) -> Ratio:
    n, d = _left(line, b, known)
    pivot = next(a for k, a in line if k == unknown)
    return _ratio(n, d * pivot)


def _ratio(n: int, d: int) -> Ratio:
    common = gcd(n, d)
    return (n // common, d // common) if d > 0 else (-n // common, -d // common)


def eliminate(
    system: list[dict[int, int]], right: list[int], watch: Watch, work: int = WORK
) -> list[Ratio]:
    """Solve a sparse integer system by elimination, the shortest row first.

    `system[i]` maps columns to nonzero integers. Within the shortest row the pivot is the
    column with the fewest entries, a cheap form of Markowitz's (1957) rule; rows are kept
    free of common factors. Raises Singular, and Crowded after `work` entry updates.
    """
    rows, right = [dict(row) for row in system], list(right)
    where: list[set[int]] = [set() for _ in rows]
    for i, row in enumerate(rows):
        for j in row:
            where[j].add(i)
    alive = set(range(len(rows)))
    # rows by length; entries whose row has since changed are skipped when they come up
    queue = [(len(row), i) for i, row in enumerate(rows)]
    heapify(queue)
    order: list[tuple[int, int]] = []
    while alive:
        watch.check()
        length, i = heappop(queue)
        pivot_row = rows[i]
        if i not in alive or length != len(pivot_row):
            continue
        if not pivot_row:
            raise Singular("dependent rows")
        j = min(pivot_row, key=lambda k: len(where[k]))
        pivot = pivot_row[j]
        alive.remove(i)
        order.append((i, j))
        for k in pivot_row:
            where[k].discard(i)
        others = [(k, a) for k, a in pivot_row.items() if k != j]
        for other in where[j]:
            row = rows[other]
            factor = row.pop(j)
            common = gcd(pivot, factor)
            up, down = pivot // common, factor // common
            work -= len(others) + (len(row) if up != 1 else 0)
            if up != 1:
                for k in row:
                    row[k] *= up
            for k, a in others:
                before = row.get(k, 0)
                value = before - down * a
                if value:
                    row[k] = value
                    if not before:
                        where[k].add(other)
                else:
                    del row[k]
                    where[k].discard(other)
            right[other] = up * right[other] - down * right[i]
            content = gcd(right[other], *row.values())
            if content > 1:
                for k in row:
                    row[k] //= content
                right[other] //= content
            heappush(queue, (len(row), other))
        if work < 0:
            raise Crowded
    known: list[Ratio | None] = [None] * len(rows)
    for i, j in reversed(order):
        known[j] = _resolve(list(rows[i].items()), right[i], j, known)
    return [value for value in known if value is not None]


def _flint(system: list[dict[int, int]], right: list[int]) -> list[Ratio]:
    import flint

    size = len(system)
    dense = [[row.get(k, 0) for k in range(size)] for row in system]
    try:
        answer = flint.fmpz_mat(dense).solve(flint.fmpz_mat([[b] for b in right]))
    except ZeroDivisionError as error:
        raise Singular("dependent rows") from error
    return [(int(answer[k, 0].p), int(answer[k, 0].q)) for k in range(size)]
