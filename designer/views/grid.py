"""Figures in columns where they fit the width, else one short paragraph a row."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from rich.cells import cell_len
from rich.padding import Padding
from rich.text import Text

from designer.views.page import INDENT

if TYPE_CHECKING:
    from rich.console import Console, ConsoleOptions, RenderResult

GAPS = (2, 1)
"""Blank cells before each column: the roomier first, the tighter if that is too wide."""


@dataclass(frozen=True)
class Column:
    """A column: its title, whether its entries are flush right, the group it stands under."""

    title: str
    right: bool = False
    group: str = ""


@dataclass(frozen=True)
class Grid:
    """Columns and rows of text, for rich to print.

    stacked  the same rows as (opening words, the rest), used where the columns are too wide
    """

    columns: Sequence[Column]
    rows: Sequence[Sequence[str]]
    stacked: Sequence[tuple[str, str]]

    def __rich_console__(self, console: Console, options: ConsoleOptions) -> RenderResult:
        """Columns if the whole grid fits, paragraphs if not."""
        for gap in GAPS:
            widths = self.widths(gap)
            if sum(widths) + gap * (len(widths) - 1) + INDENT <= options.max_width:
                yield from (Text(line, no_wrap=True) for line in self.lines(widths, gap))
                return
        for opening, rest in self.stacked:
            yield Padding(Text(opening), (0, 0, 0, INDENT))
            yield Padding(Text(rest), (0, 0, 0, 2 * INDENT))

    def widths(self, gap: int) -> list[int]:
        """The cells each column needs; the last of a group also makes room for its heading."""
        widths = [
            max(cell_len(text) for text in (column.title, *(row[c] for row in self.rows)))
            for c, column in enumerate(self.columns)
        ]
        for name, first, last in self.groups():
            room = sum(widths[first : last + 1]) + gap * (last - first)
            widths[last] += max(0, cell_len(name) - room)
        return widths

    def groups(self) -> Iterator[tuple[str, int, int]]:
        """Runs of neighbouring columns under one heading: name, first and last position."""
        first = 0
        for c in range(1, len(self.columns) + 1):
            name = self.columns[first].group
            if c == len(self.columns) or self.columns[c].group != name:
                if name:
                    yield name, first, c - 1
                first = c

    def lines(self, widths: Sequence[int], gap: int) -> Iterator[str]:
        """The printed lines: group headings if any, titles, a rule, the rows."""
        groups = list(self.groups())
        if groups:
            line, at = "", 0
            for name, first, _ in groups:
                start = INDENT + gap * first + sum(widths[:first])
                line += " " * (start - at) + name
                at = start + cell_len(name)
            yield line
        titles = [column.title for column in self.columns]
        yield self._line(titles, widths, gap)
        yield self._line(["-" * width for width in widths], widths, gap)
        for row in self.rows:
            yield self._line(row, widths, gap)

    def _line(self, cells: Sequence[str], widths: Sequence[int], gap: int) -> str:
        parts = []
        for column, text, width in zip(self.columns, cells, widths, strict=True):
            blank = " " * (width - cell_len(text))
            parts.append(blank + text if column.right else text + blank)
        return (" " * INDENT + (" " * gap).join(parts)).rstrip()
