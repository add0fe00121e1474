"""The screen of `designer weigh`: what collides, what each way out costs, what trades."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction

from designer.views.amounts import amount, cell, counted
from designer.views.chart import Chart
from designer.views.grid import Column, Grid
from designer.views.page import INDENT, Page, caution, heading, listed, paragraph
from designer.views.posed import posed
from designer.views.weighing_words import (
    CRITERIA,
    DEMANDS,
    form,
    groups,
    joined,
    price,
    room,
    steps,
    way,
)
from designer.weighing.frontier import CornerList, Frontier
from designer.weighing.ledger import Entry, Ledger
from designer.weighing.prices import Price
from designer.weighing.tradeoff import Tradeoff

SETS = 12
"""Collisions, and possible sets, that are listed."""
CORNERS = 8
"""Corners of one frontier that are listed."""
RENTS = 12
"""Lines of the ledger on single types that are listed one by one."""
STOPPED = {
    "interrupted": "it was interrupted",
    "the time limit was reached": "the time limit was reached",
}


def weighed(found: Tradeoff, rows: int | None = None, plots: bool = True) -> Page:
    """The whole screen; `rows` limits every list, `plots` leaves the charts out."""
    page = posed(found.setting, found.terms)
    word = found.status.upper()
    proved = "" if found.status == "undecided" else f", {'proved' if found.proved else 'unproved'}"
    page.append(heading(f"{word}{proved}."))
    if not found.complete:
        page.append(paragraph(f"INCOMPLETE: {_missing(found)}. What was found so far stands."))
    if found.status == "impossible":
        page.append(paragraph("No table does all that is asked. Here is what can give."))
        page += _collisions(found, SETS if rows is None else rows)
        page += _prices(found)
        page += _ladders(found)
        page += _ledger(found, RENTS if rows is None else rows)
        page += _frontiers(found, CORNERS if rows is None else rows, plots)
    elif found.status == "possible":
        page.append(paragraph("Some table does all that is asked. Here is the room that is left."))
        page += _room(found)
    page.append(caution())
    return page


def _missing(found: Tradeoff) -> str:
    whole = found.reasons.get("page")
    parts = [f"{part}: {why}" for part, why in found.reasons.items() if part != "page"]
    return "; ".join([*([STOPPED.get(whole, whole)] if whole else []), *parts]) or "it was stopped"


# -- what collides -------------------------------------------------------------------------


def _collisions(found: Tradeoff, most: int) -> Page:
    if not found.sets:
        return []
    names = found.groups
    page: Page = [heading("What collides")]
    collisions, possible = found.collisions, found.possible_sets
    for one in collisions[:most]:
        lead = "All of these together" if len(collisions) == 1 else "Together impossible"
        page.append(paragraph(f"{lead}: {groups(one.groups, found)}.{_doubt(one.proved)}"))
    page += _more(len(collisions) - most, "collision")
    gives = [
        [name for name in names if name not in one.groups] for one in possible if one.proved
    ] + [[name for name in names if name not in one.groups] for one in possible if not one.proved]
    gives.sort(key=len)
    single = [give[0] for give in gives if len(give) == 1]
    if single:
        page.append(
            paragraph(f"Enough to drop one of: {groups_apart(single, found)}; all else can stay.")
        )
    several = [give for give in gives if len(give) > 1]
    for give in several[:most]:
        page.append(paragraph(f"Or drop together: {groups(give, found)}."))
    page += _more(len(several) - most, "way to give way")
    return page


def groups_apart(names: Sequence[str], found: Tradeoff) -> str:
    """Groups as alternatives, one by one."""
    return joined([groups([name], found) for name in names], "or")


def _more(left: int, noun: str) -> Page:
    if left <= 0:
        return []
    plural = {"way to give way": "ways to give way"}.get(noun)
    more = f"… and {counted(left, noun, plural)} more: --rows N, --json and --save show all."
    return [paragraph(more)]


def _doubt(proved: bool) -> str:
    return "" if proved else " Unproved."


# -- ways out --------------------------------------------------------------------------------


def _prices(found: Tradeoff) -> Page:
    if not found.prices:
        return []
    rows, compel = [], [p for p in found.prices if p.relax == "compel"]
    for one in found.prices:
        if one.relax != "compel" or one.amount is None:
            rows.append((way(one.relax), _price(one, found)))
        elif one is compel[0]:
            sets = [joined(p.parties, "and") for p in compel]
            text = f"Compel {joined(sets, 'or')}" if len(sets) > 1 else f"Compel {sets[0]}"
            count = counted(int(one.amount), "party", "parties")
            rows.append((way(one.relax), f"{text}: {count} at least.{_doubt(one.proved)}"))
    return [heading("Ways out, each alone, all else kept whole"), listed(rows)]


def _price(one: Price, found: Tradeoff) -> str:
    """A price in sentences, without repeating what the first of two like ones says."""
    whole = found.price("outside-money")
    same = whole is not None and (one.amount, one.buys) == (whole.amount, whole.buys)
    if one.relax == "outside-money-on-average" and same and one.amount is not None:
        return f"No less: {amount(one.amount, found.setting.money)} in expectation, case by case."
    return price(one, found.setting)


def _ladders(found: Tradeoff) -> Page:
    if not found.ladders:
        return []
    rows = []
    for one in found.ladders:
        if one.settled is None:
            text = "No weaker form of this alone is enough."
        else:
            text = f"Enough: {form(one.demand, one.settled)}."
            failed = [form(one.demand, word) for word, held in one.tried if not held]
            if failed:
                text += f" Not enough: {joined(failed, 'or')}."
        rows.append((DEMANDS[one.demand], text + _doubt(one.proved)))
    page: Page = [heading("Weaker forms, each alone"), listed(rows)]
    combined = [one for one in found.steps if len(one.forms) > 1]
    if combined:
        page.append(paragraph("Combined, the least that has to be weakened otherwise:"))
        page += [paragraph(f"{steps(one.forms)}.", 2 * INDENT) for one in combined]
    elif found.steps:
        page.append(paragraph("No combination of smaller steps does: one whole step is needed."))
    return page


# -- why -------------------------------------------------------------------------------------


def _ledger(found: Tradeoff, most: int) -> Page:
    ledger = found.ledger
    if ledger is None:
        return []
    page: Page = [heading("Why: the money in expected terms")]
    if not ledger.entries:
        return [*page, paragraph(f"{ledger.reason[0].upper()}{ledger.reason[1:]}.")]
    columns = [Column("line"), Column(f"{found.setting.money}", right=True), Column("")]
    lines = [[_line(one), cell(one.amount), _each(one)] for one in _shortened(ledger, most)]
    lines.append(["outside money allowed", cell(ledger.allowed), ""])
    word = "missing" if ledger.gap > 0 else "left over"
    lines.append([f"= {word}", cell(abs(ledger.gap)), ""])
    stacked = [(f"{line[0]}:", f"{line[1]} {line[2]}".strip()) for line in lines]
    page.append(Grid(columns, lines, stacked))
    if ledger.gap > 0:
        total = amount(-ledger.gap, found.setting.money)
        page.append(
            paragraph(
                f"The lines add up to {total}: no payments that keep everyone honest and "
                "willing leave more in the pot than this table does."
            )
        )
    if ledger.reason:
        page.append(paragraph(f"{ledger.reason[0].upper()}{ledger.reason[1:]}."))
    if any(int(worth) for worth in found.setting.worth):
        page.append(paragraph("The designer's own worth counts in the decision; it is no money."))
    if not ledger.proved:
        page.append(paragraph("Unproved."))
    return page


def _shortened(ledger: Ledger, most: int) -> list[Entry]:
    """The entries, those on types added up by party where they are too many."""
    listed_ = list(ledger.entries)
    for kind in ("outside", "rent"):
        rows = [one for one in listed_ if one.kind == kind]
        if len(rows) > most:
            place = listed_.index(rows[0])
            parties = dict.fromkeys(one.party for one in rows)
            sums = [
                Entry(
                    kind,
                    party,
                    "",
                    Fraction(1),
                    sum((one.amount for one in rows if one.party == party), Fraction(0)),
                )
                for party in parties
            ]
            listed_ = [one for one in listed_ if one.kind != kind]
            listed_[place:place] = sums
    return listed_


def _line(one: Entry) -> str:
    who = f"{one.party}, {one.type}" if one.type else one.party
    return {
        "worth": f"the decision is worth to {who}",
        "outlay": "the outlay",
        "outside": f"staying out is worth to {who}",
        "rent": f"information rent of {who}",
        "in-every-case": "balance in every case asks more",
    }[one.kind]


def _each(one: Entry) -> str:
    return f"= {cell(one.chance)} × {cell(one.each)}" if one.type else ""


# -- what trades against what ----------------------------------------------------------------


def _frontiers(found: Tradeoff, most: int, plots: bool) -> Page:
    page: Page = []
    money = found.setting.money
    for one in found.frontiers:
        page.append(heading(f"{_axis(one.x)} against {CRITERIA[one.y]}, in {money}"))
        page += _frontier(one, most)
        if plots and len(one.corners) > 1:
            page.append(Chart(one.corners, CRITERIA[one.x], CRITERIA[one.y]))
    if found.corners is not None:
        page += _triples(found.corners, most, money)
    return page


def _axis(name: str) -> str:
    word = CRITERIA[name]
    return f"{word[0].upper()}{word[1:]}"


def _frontier(one: Frontier, most: int) -> Page:
    if not one.corners:
        return [paragraph(f"{one.reason[0].upper()}{one.reason[1:]}.")]
    names = CRITERIA[one.x], CRITERIA[one.y]
    if len(one.corners) == 1:
        at = " and ".join(
            f"{amount(part)} of {name}" for part, name in zip(one.corners[0], names, strict=True)
        )
        return [paragraph(f"One point is best in both: {at}.{_doubt(one.proved)}")]
    columns = [
        Column(names[0], right=True),
        Column(names[1], right=True),
        Column("one more unit saves", right=True),
    ]
    lines = [[cell(x), cell(y), _saves(one, place)] for place, (x, y) in enumerate(one.corners)]
    shown = [lines[place] for place in _spread(len(lines), most)]
    stacked = [(f"{line[0]}, {line[1]}:", f"one more unit saves {line[2]}") for line in shown]
    page: Page = [Grid(columns, shown, stacked)] if shown else []
    notes = [f"{counted(len(one.corners), 'corner')}"]
    if len(shown) < len(lines):
        notes[0] += f", {len(lines) - len(shown):,} between not shown (--rows, --save)"
    if any("~" in text for line in shown for text in line):
        notes.append("~ marks a rounded number")
    notes.append("exact, complete, proved" if one.complete and one.proved else _weak(one))
    return [*page, paragraph("; ".join(notes) + ".")]


def _spread(count: int, most: int) -> list[int]:
    """Places of at most so many of `count`, evenly spread, both ends among them; 0: none."""
    if count <= most + 2 and most:
        return list(range(count))
    if most < 2:
        return []
    return [place * (count - 1) // (most - 1) for place in range(most)]


def _weak(one: Frontier | CornerList) -> str:
    if one.complete:
        return "exact and complete, but unproved"
    return "INCOMPLETE: corners are missing"


def _saves(one: Frontier, place: int) -> str:
    """What one more unit of x saves of y to the right of a corner."""
    if place + 1 == len(one.corners):
        return "nothing" if one.complete else "?"
    (x, y), (after_x, after_y) = one.corners[place], one.corners[place + 1]
    return cell((y - after_y) / (after_x - x))


def _triples(found: CornerList, most: int, money: str) -> Page:
    names = [CRITERIA[name] for name in found.criteria]
    page: Page = [heading(f"{_axis(found.criteria[0])}, {names[1]} and {names[2]}, in {money}")]
    if not found.corners:
        return [*page, paragraph(f"{found.reason or 'nothing was found'}.")]
    shown = [found.corners[place] for place in _spread(len(found.corners), most)]
    columns = [Column(name, right=True) for name in names]
    lines = [[cell(part) for part in corner] for corner in shown]
    stacked = [(", ".join(line), "") for line in lines]
    notes = [counted(len(found.corners), "corner")]
    if len(shown) < len(found.corners):
        notes[0] += f", {len(found.corners) - len(shown):,} between not shown (--rows, --save)"
    notes.append("exact, complete, proved" if found.complete and found.proved else _weak(found))
    if shown:
        page.append(Grid(columns, lines, stacked))
    return [*page, paragraph("; ".join(notes) + ".")]


# -- the reverse -----------------------------------------------------------------------------


def _room(found: Tradeoff) -> Page:
    page: Page = []
    if found.room:
        rows = [room(one, found.setting) for one in found.room]
        page += [heading("Room, in each direction alone"), listed(rows)]
    if found.ladders:
        rows = []
        for one in found.ladders:
            failed = [form(one.demand, word) for word, held in one.tried if not held]
            text = "Nothing stronger holds."
            if one.settled is not None:
                text = f"Holds as well: {form(one.demand, one.settled)}."
            if failed:
                text += f" Impossible: {joined(failed, 'or')}."
            rows.append((DEMANDS[one.demand], text + _doubt(one.proved)))
        page += [heading("Stronger forms, each alone"), listed(rows)]
    combined = [one for one in found.steps if one.forms]
    if combined:
        page.append(heading("The strongest that holds together"))
        page += [paragraph(f"{steps(one.forms)}.") for one in combined]
    return page
