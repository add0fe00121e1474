"""What a screen is made of: headings, paragraphs with a hanging indent, lists."""

from __future__ import annotations

import io
from collections.abc import Iterable
from typing import TYPE_CHECKING

from rich.console import Group, RenderableType
from rich.padding import Padding
from rich.table import Table
from rich.text import Text

from designer.views.caution import CAUTION

if TYPE_CHECKING:
    from rich.console import Console

INDENT = 2

Page = list[RenderableType]
"""A screen: renderables from top to bottom."""


def heading(text: str) -> RenderableType:
    """A heading after a blank line; bold where the terminal can."""
    return Group(Text(""), Text(text, style="bold"))


def paragraph(text: str, indent: int = INDENT) -> RenderableType:
    """Wrapped text."""
    return Padding(Text(text), (0, 0, 0, indent))


def listed(rows: Iterable[tuple[str, str]], indent: int = INDENT) -> RenderableType:
    """Short words on the left, wrapped text beside them.

    A word that is long itself wraps within a third of the line.
    """
    table = Table.grid(padding=(0, 2, 0, 0))
    table.add_column(max_width=24, overflow="fold")
    table.add_column(ratio=1, overflow="fold")
    for word, text in rows:
        table.add_row(Text(word), Text(text))
    return Padding(table, (0, 0, 0, indent))


def caution() -> RenderableType:
    """The caution, set off by a blank line."""
    return Group(Text(""), Text(CAUTION))


def printed(page: Page, console: Console) -> str:
    """The page as this console would print it, styles included where it shows any.

    The text is made first and written later, so that a reader who leaves early (a closed
    pipe) never stops a page halfway through.
    """
    with console.capture() as capture:
        for part in page:
            console.print(part)
    lines = [line.rstrip() for line in capture.get().split("\n")]
    while lines and not lines[0]:  # the blank line of a heading that comes first
        del lines[0]
    return "\n".join(lines)


def plain(page: Page, width: int = 80) -> str:
    r"""The page as plain text of a given width, for files and tests.

    >>> plain([heading("Pot"), paragraph("0 in every case")])
    'Pot\n  0 in every case\n'
    """
    from rich.console import Console

    stream = io.StringIO()
    console = Console(
        file=stream,
        width=width,
        no_color=True,
        color_system=None,
        force_terminal=False,
        highlight=False,
        markup=False,
        emoji=False,
        legacy_windows=False,
    )
    return printed(page, console)
