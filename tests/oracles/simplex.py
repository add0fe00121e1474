"""A tiny linear optimiser in rationals: the full tableau, Bland's rule, nothing clever.

It shares nothing with the package and is slow; it exists to be obviously right on programs
of a few dozen columns.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from fractions import Fraction

Row = tuple[Mapping[int, Fraction], str, Fraction]
"""(coefficients by column, ">=" or "=", right-hand side)."""


def maximise(
    cost: Mapping[int, Fraction], rows: Sequence[Row], columns: int
) -> tuple[str, Fraction | None]:
    """Maximise cost . x over FREE columns subject to the rows: the status and the exact optimum.

    Status "possible", "impossible" or "unbounded"; bounds on columns are rows too.
    """
    # x_j = y_j - y_last with all y >= 0, then a surplus per inequality, an artificial per row.
    surplus = sum(1 for _, relation, _ in rows if relation == ">=")
    width = columns + 1 + surplus
    table: list[list[Fraction]] = []
    place = columns + 1
    for coefficients, relation, bound in rows:
        line = [Fraction(0)] * (width + len(rows) + 1)
        for j, value in coefficients.items():
            line[j] += value
            line[columns] -= value
        if relation == ">=":
            line[place] = Fraction(-1)
            place += 1
        line[-1] = bound
        if bound < 0:
            line = [-value for value in line]
        line[width + len(table)] = Fraction(1)
        table.append(line)
    basis = [width + r for r in range(len(rows))]

    first = [Fraction(0)] * (width + len(rows) + 1)
    for line in table:
        for j in range(width):
            first[j] += line[j]
        first[-1] += line[-1]
    if not _climb(table, basis, first, width):
        raise AssertionError("the first phase is bounded by 0")
    if first[-1] != 0:
        return "impossible", None

    _drop_artificials(table, basis, width)
    second = [Fraction(0)] * (width + len(rows) + 1)
    for j, value in cost.items():
        second[j] += value
        second[columns] -= value
    for line, base in zip(table, basis, strict=True):
        factor = second[base]
        if factor and base < width:
            _subtract(second, line, factor)
    if not _climb(table, basis, second, width):
        return "unbounded", None
    return "possible", -second[-1]


def _climb(
    table: list[list[Fraction]], basis: list[int], gains: list[Fraction], width: int
) -> bool:
    """Pivot to optimality, smallest index first; False if the objective grows for ever.

    `gains` carries reduced gains per column and, last, minus the objective so far.
    """
    while True:
        enter = next((j for j in range(width) if gains[j] > 0), None)
        if enter is None:
            return True
        ratios = [
            (line[-1] / line[enter], basis[r], r) for r, line in enumerate(table) if line[enter] > 0
        ]
        if not ratios:
            return False
        _pivot(table, basis, min(ratios)[2], enter)
        _subtract(gains, table[min(ratios)[2]], gains[enter])


def _pivot(table: list[list[Fraction]], basis: list[int], leave: int, enter: int) -> None:
    head = table[leave][enter]
    table[leave] = [value / head for value in table[leave]]
    for r, line in enumerate(table):
        if r != leave and line[enter]:
            _subtract(line, table[leave], line[enter])
    basis[leave] = enter


def _subtract(line: list[Fraction], other: list[Fraction], factor: Fraction) -> None:
    for j, value in enumerate(other):
        if value:
            line[j] -= factor * value


def _drop_artificials(table: list[list[Fraction]], basis: list[int], width: int) -> None:
    """Pivot artificial columns out of the basis; rows that are all zero say nothing."""
    for r in reversed(range(len(table))):
        if basis[r] >= width:
            enter = next((j for j in range(width) if table[r][j]), None)
            if enter is None:
                del table[r], basis[r]
            else:
                _pivot(table, basis, r, enter)
