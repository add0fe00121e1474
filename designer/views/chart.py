"""A frontier drawn with letters: plain ASCII, so that every terminal and printer shows it."""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import TYPE_CHECKING

from rich.text import Text

from designer.views.amounts import approximate
from designer.views.page import INDENT

if TYPE_CHECKING:
    from rich.console import Console, ConsoleOptions, RenderResult

WIDE, HIGH = 56, 12
"""Columns and rows of the plotting area where there is room."""
STRAIGHT = 5
"""Rows of a chart that shows one straight line."""
NARROW = 16
"""Columns below which no chart is drawn."""
CORNER, LINE = "o", "."
MARKED = 12
"""Corners up to which each is marked."""
WORD = "can be had"

Corners = Sequence[tuple[Fraction, ...]]


@dataclass(frozen=True)
class Chart:
    """The chart of a frontier, as wide as the screen lets it be; for rich to print."""

    corners: Corners
    x: str
    y: str

    def __rich_console__(self, console: Console, options: ConsoleOptions) -> RenderResult:
        """A blank line and the chart, or nothing where it would say nothing."""
        high = HIGH if len(self.corners) > 2 else STRAIGHT
        labels = max((len(approximate(corner[1], 4)) for corner in self.corners), default=0)
        wide = min(WIDE, options.max_width - INDENT - labels - 2)
        lines = chart(self.corners, self.x, self.y, wide, high)
        if lines:
            yield Text("")
        for line in lines:
            yield Text(" " * INDENT + line, no_wrap=True)


def chart(corners: Corners, x: str, y: str, wide: int = WIDE, high: int = HIGH) -> list[str]:
    r"""The lines of a chart: y up, x to the right, both from 0; none if there is no extent.

    What lies on the line, or above and to the right of it, can be had.

    >>> half = Fraction(1, 2)
    >>> print("\n".join(chart([(0 * half, half), (3 * half, 0 * half)], "money", "floor", 16, 3)))
        floor
    0.5 |o...
        |    ........
        |            ...o
      0 +----------------
         0            1.5
                    money
    """
    most_x = max((corner[0] for corner in corners), default=Fraction(0))
    most_y = max((corner[1] for corner in corners), default=Fraction(0))
    if wide < NARROW or most_x <= 0 or most_y <= 0 or min(map(min, corners)) < 0:
        return []
    cells = [[" "] * wide for _ in range(high)]
    places = [(_place(cx, most_x, wide), high - 1 - _place(cy, most_y, high)) for cx, cy in corners]
    for (left, top), (right, bottom) in itertools.pairwise(places):
        _draw(cells, left, top, right, bottom)
    for column, row in places if len(places) <= MARKED else [places[0], places[-1]]:
        cells[row][column] = CORNER
    _write(cells)
    labels = [approximate(most_y, 4), *[""] * (high - 1)]
    margin = len(labels[0])
    lines = [f"{'':{margin}} {y}"]
    lines += [
        f"{label:>{margin}} |{''.join(line)}".rstrip()
        for label, line in zip(labels, cells, strict=True)
    ]
    lines.append(f"{'0':>{margin}} +{'-' * wide}")
    lines.append(f"{'':{margin}}  0{approximate(most_x, 4):>{wide - 1}}")
    lines.append(f"{'':{margin}}  {x:>{wide}}")
    return lines


def _place(value: Fraction, most: Fraction, size: int) -> int:
    """The nearest of `size` places from 0 to `most`."""
    return int(value * (size - 1) / most + Fraction(1, 2))


def _draw(cells: list[list[str]], left: int, top: int, right: int, bottom: int) -> None:
    """A straight line of dots, without gaps in either direction."""
    steps = max(right - left, bottom - top, 1)
    for step in range(steps + 1):
        column = left + (2 * step * (right - left) + steps) // (2 * steps)
        row = top + (2 * step * (bottom - top) + steps) // (2 * steps)
        cells[row][column] = LINE


def _write(cells: list[list[str]]) -> None:
    """A word in the upper right, where there is room for it."""
    start = len(cells[0]) - len(WORD) - 1
    for line in cells[1:4]:
        if start > 0 and all(cell == " " for cell in line[start - 1 :]):
            line[start : start + len(WORD)] = WORD
            return
