"""A frontier drawn with letters: plain ASCII, so that every terminal and printer shows it."""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from fractions import Fraction

from designer.views.amounts import approximate

WIDE, HIGH = 56, 12
"""Columns and rows of the plotting area."""
CORNER, LINE = "o", "."


def chart(
    corners: Sequence[tuple[Fraction, ...]],
    x: str,
    y: str,
    wide: int = WIDE,
    high: int = HIGH,
) -> list[str]:
    r"""The lines of a chart: y up, x to the right, both from 0; none if there is no extent.

    What lies on the line or above and to the right of it can be had.

    >>> print("\n".join(chart([(0, 2), (4, 0)], "money", "floor", 9, 3)))   # doctest: +SKIP
    """
    most_x = max((corner[0] for corner in corners), default=Fraction(0))
    most_y = max((corner[1] for corner in corners), default=Fraction(0))
    if most_x <= 0 or most_y <= 0 or min(min(corner) for corner in corners) < 0:
        return []
    cells = [[" "] * wide for _ in range(high)]
    places = [
        (int(cx * (wide - 1) / most_x + Fraction(1, 2)), _row(cy, most_y, high))
        for cx, cy in corners
    ]
    for (left, top), (right, bottom) in itertools.pairwise(places):
        _draw(cells, left, top, right, bottom)
    for column, row in places:
        cells[row][column] = CORNER
    _write(cells, "can be had")
    labels = [approximate(most_y, 4), "0"]
    margin = max(map(len, labels))
    lines = [f"{'':{margin}} {y}"]
    for row, line in enumerate(cells):
        label = labels[0] if row == 0 else ""
        lines.append(f"{label:>{margin}} |{''.join(line)}".rstrip())
    lines.append(f"{'0':>{margin}} +{'-' * wide}")
    end = approximate(most_x, 4)
    lines.append(f"{'':{margin}}  0{end:>{wide - 1}}")
    lines.append(f"{'':{margin}}  {x:>{wide}}")
    return lines


def _row(value: Fraction, most: Fraction, high: int) -> int:
    return high - 1 - int(value * (high - 1) / most + Fraction(1, 2))


def _draw(cells: list[list[str]], left: int, top: int, right: int, bottom: int) -> None:
    """A straight line of dots, without gaps in either direction."""
    steps = max(right - left, bottom - top, 1)
    for step in range(steps + 1):
        column = left + (2 * step * (right - left) + steps) // (2 * steps)
        row = top + (2 * step * (bottom - top) + steps) // (2 * steps)
        cells[row][column] = LINE


def _write(cells: list[list[str]], text: str) -> None:
    """A word in the upper right, where there is room for it."""
    start = len(cells[0]) - len(text) - 1
    for line in cells[1:4]:
        if start > 0 and all(cell == " " for cell in line[start - 1 :]):
            line[start : start + len(text)] = text
            return
