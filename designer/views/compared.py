"""The screen and the document of `designer compare`."""

from __future__ import annotations

from fractions import Fraction
from typing import Any

from designer.ruling.comparing import Change, Comparison
from designer.setting.exact import text
from designer.views.amounts import amount, cell
from designer.views.audited import name_of
from designer.views.beside import LEGEND, amounts_of, grid, manners, whose, worst
from designer.views.caution import CAUTION
from designer.views.grid import Column, Grid
from designer.views.page import INDENT, Page, caution, heading, paragraph
from designer.views.posed import posed

FORMAT = "designer.compare/1"


def compared(found: Comparison) -> Page:
    """The whole screen: the shared columns, then who gains and who loses, type by type."""
    money = found.setting.money
    rows = list(zip(found.names, found.tables, strict=True))
    page = posed(found.setting, found.terms)
    page += [heading("The tables, audited"), grid("table", rows, money), paragraph(LEGEND)]
    page += [heading("Type by type"), _fortunes(found)]
    first = found.names[0]
    page.append(
        paragraph(
            f"Expected utility, and expected pot, under {first}, and what the others add or take."
        )
    )
    page += [heading("Who gains, who loses")]
    for at, name in enumerate(found.names[1:], start=1):
        page += [paragraph(f"{name}, against {first}"), paragraph(_sides(found, at), 2 * INDENT)]
    page.append(heading("Table by table"))
    for name, table in rows:
        breaks = "; ".join(name_of(demand) for demand in table.failing)
        asked = f"Asked and broken: {breaks}." if breaks else "Does all that is asked."
        words = f"{manners(table, money)} {asked} {worst(table, money)}"
        page += [paragraph(name), paragraph(words.rstrip(), 2 * INDENT)]
    page.append(caution())
    return page


def _fortunes(found: Comparison) -> Grid:
    def row(change: Change) -> list[str]:
        gains = [_signed(cell(gain), gain) for gain in change.against_first[1:]]
        return [change.party, change.type, cell(change.utility[0]), *gains]

    def sentence(change: Change) -> str:
        parts = [f"{found.names[0]} {amount(change.utility[0], found.setting.money)}"]
        parts += [
            f"{name} {_signed(amount(gain), gain)}"
            for name, gain in zip(found.names[1:], change.against_first[1:], strict=True)
        ]
        return "; ".join(parts)

    pots = [table.expected_pot for table in found.tables]
    more = [pot - pots[0] for pot in pots[1:]]
    pot_row = ["the pot", "", cell(pots[0]), *(_signed(cell(gain), gain) for gain in more)]
    pot_words = f"{found.names[0]} {amount(pots[0], found.setting.money)}" + "".join(
        f"; {name} {_signed(amount(gain), gain)}"
        for name, gain in zip(found.names[1:], more, strict=True)
    )
    return Grid(
        columns=[
            Column("party"),
            Column("type"),
            *(Column(name, right=True) for name in found.names),
        ],
        rows=[*(row(change) for change in found.changes), pot_row],
        stacked=[
            *((f"{change.party}, {change.type}", sentence(change)) for change in found.changes),
            ("the pot", pot_words),
        ],
    )


def _signed(written: str, value: Fraction) -> str:
    return f"+{written}" if value > 0 else written


def _sides(found: Comparison, at: int) -> str:
    gain, lose = [], []
    for change in found.changes:
        moved = change.against_first[at]
        named = f"{change.party} {change.type}"
        if moved > 0:
            gain.append(named)
        elif moved < 0:
            lose.append(named)
    words = []
    if gain:
        words.append(f"Better off: {', '.join(gain)}.")
    if lose:
        words.append(f"Worse off: {', '.join(lose)}.")
    if len(gain) + len(lose) < len(found.changes):
        words.append("The rest fare the same." if words else "Everyone fares the same.")
    return " ".join(words)


def compare_document(found: Comparison) -> dict[str, Any]:
    """The comparison as JSON-ready values, format designer.compare/1; numbers exact as text."""
    from designer.demands.plain import as_plain

    return {
        "format": FORMAT,
        "scenario": {"title": found.setting.title, "digest": found.setting.digest},
        "money": found.setting.money,
        "demands": as_plain(found.terms),
        "tables": [
            {"name": name, **amounts_of(table), **whose(table)}
            for name, table in zip(found.names, found.tables, strict=True)
        ],
        "types": [
            {
                "party": change.party,
                "type": change.type,
                "probability": text(change.probability),
                "outside": text(change.outside),
                "utility": [text(value) for value in change.utility],
                "against_first": [text(value) for value in change.against_first],
                "best": [found.names[at] for at in change.best],
            }
            for change in found.changes
        ],
        "caution": CAUTION,
    }
