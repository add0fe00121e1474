"""The screen of an impossible verdict: the derivation, to be followed with a pencil."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from rich.cells import cell_len
from rich.padding import Padding
from rich.table import Table as RichTable
from rich.text import Text

from designer.proof.derivation import Derivation
from designer.setting import exact
from designer.views.amounts import counted
from designer.views.labels import addends, family, legend, sentence
from designer.views.page import Page, heading, listed, paragraph

if TYPE_CHECKING:
    from rich.console import Console, ConsoleOptions, RenderResult

    from designer.verdict import Verdict

LINES = 24
"""Lines of a derivation that are written out."""


def impossible(verdict: Verdict) -> Page:
    """The word, why, and where to go from here."""
    page: Page = [
        heading(f"IMPOSSIBLE, {'proved' if verdict.proved else 'unproved'}."),
        paragraph("No table does all that is asked, with any payments whatever."),
    ]
    found = verdict.derivation
    if found is None:
        page.append(paragraph(_without_lines(verdict)))
    else:
        page += derivation(found)
    page.append(heading("What now"))
    page.append(
        listed(
            [
                ("weigh", "`designer weigh SCENARIO` says what must give, and at what price."),
                ("or", "Ask for less: --ir, --ic, --balance, --budget, --subsidy, --compel NAME."),
            ]
        )
    )
    return page


@dataclass(frozen=True)
class Sum:
    """A sum and its bound; lines break before a sign, never inside a term."""

    parts: Sequence[str]
    bound: str

    def __rich_console__(self, console: Console, options: ConsoleOptions) -> RenderResult:
        """As many terms a line as the width has room for."""
        line = ""
        for part in (*self.parts, f"≥ {self.bound}"):
            longer = f"{line} {part}".strip()
            if line and cell_len(longer) > options.max_width:
                yield Text(line, overflow="fold")
                longer = part
            line = longer
        yield Text(line, overflow="fold")


def derivation(found: Derivation) -> Page:
    """Every line with its multiplier, and the sum that cannot be."""
    shown = found.lines[:LINES]
    kinds = Counter(family(line.label) for line in found.lines)
    collide = ", ".join(f"{name} ({counted(count, 'line')})" for name, count in kinds.items())
    page: Page = [
        paragraph(f"Colliding: {collide}."),
        heading("Why: multiply each line by the number before it, and add up"),
    ]
    terms = [label for line in shown for label, _ in line.terms]
    page += [paragraph(meaning) for meaning in legend(terms)]
    table = RichTable.grid(padding=(0, 1, 0, 0))
    table.add_column(justify="right")
    table.add_column(ratio=1, overflow="fold")
    for line in shown:
        demand = Text(f"{sentence(line.label, line.folds)}:")
        table.add_row(f"{exact.text(line.multiplier)} ×", demand)
        table.add_row("", Padding(Sum(addends(line.terms), exact.text(line.bound)), (0, 0, 0, 2)))
    page.append(Padding(table, (1, 0, 0, 2)))
    left = len(found.lines) - len(shown)
    if left:
        more = f"… and {left:,} more: --save DIR writes the whole to proof.json."
        page.append(paragraph(more))
    page.append(paragraph(_sum(found, whole=not left)))
    return page


def _sum(found: Derivation, whole: bool) -> str:
    """The closing line; with the bounds added up where every line is there to see."""
    result = exact.text(found.total)
    products = [(line.multiplier, line.bound) for line in found.lines if line.bound]
    if not whole or len(products) < 2:
        return f"Sum: on the left everything cancels, and 0 ≥ {result} is left, which is false."
    parts: list[str] = []
    for multiplier, bound in products:
        size = exact.text(abs(bound))
        size = f"({size})" if "/" in size else size
        product = size if multiplier == 1 else f"{exact.text(multiplier)}·{size}"
        sign = ("-" if bound < 0 else "") if not parts else (" - " if bound < 0 else " + ")
        parts.append(f"{sign}{product}")
    return (
        "Sum: on the left everything cancels; on the right "
        f"{''.join(parts)} = {result}. That leaves 0 ≥ {result}, which is false."
    )


def _without_lines(verdict: Verdict) -> str:
    """A refutation by cases, or by bounds that cross, has no lines to add up."""
    if verdict.claims:
        return f"Proved in exact arithmetic: {'; '.join(verdict.claims)}."
    return verdict.reason or "The engine says so; no proof was found."
