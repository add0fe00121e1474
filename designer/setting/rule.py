"""A decision rule the scenario gives: for every profile an option or a lottery."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from fractions import Fraction
from pathlib import Path
from typing import Any

import numpy as np

from designer.setting import exact, profiles
from designer.setting.parties import Roster
from designer.setting.priors import party_columns, row_profile, smallest
from designer.setting.reading import (
    Report,
    Section,
    describe,
    listing,
    read_number,
    unknown_keys,
)
from designer.setting.setting import IntArray, integers
from designer.setting.sheet import Sheet, read_sheet
from designer.setting.worths import frozen, too_many

Lottery = tuple[Fraction, ...]
Entry = tuple[str, tuple[int, ...] | None, Lottery | None, bool]
"""Place, profile (None: mistaken, or every other profile if the flag says so), lottery."""


def read_rule(
    root: Section, roster: Roster, options: Sequence[str], folder: Path | None
) -> tuple[IntArray, int] | None:
    """The rule: int (N, K), each row summing to the returned denominator.

    Every profile must be covered exactly once; one entry without `at` covers all profiles
    that no other entry names.
    """
    report = root.report
    before = len(report)
    count = math.prod(roster.shape)
    if count > profiles.MOST:
        too_many(count, "rule", report)
        return None
    steps = profiles.strides(roster.shape)
    numbers: dict[Lottery, int] = {}
    taken = np.full(count, -1, dtype=np.int64)
    rest: int | None = None
    for place, positions, lottery, elsewhere in _entries(root, roster, options, folder):
        if lottery is None:
            continue
        number = numbers.setdefault(lottery, len(numbers))
        if elsewhere:
            if rest is not None:
                report.add(
                    place,
                    "a second entry without at",
                    "at most one, for every other profile",
                    "Say which profile it is for, or remove it.",
                )
            rest = number
        elif positions is not None:
            profile = sum(step * a for step, a in zip(steps, positions, strict=True))
            if taken[profile] >= 0:
                report.add(
                    place, "a profile given before", "each profile once", "Remove one of them."
                )
            taken[profile] = number
    if len(report) > before or not roster.complete:
        return None
    open_profiles = np.flatnonzero(taken < 0)
    if rest is not None:
        taken[open_profiles] = rest
    elif len(open_profiles):
        _report_missing(open_profiles, roster, report)
        return None
    lotteries = list(numbers)
    shared = smallest([chance for lottery in lotteries for chance in lottery], "rule", report)
    if shared is None:
        return None
    rows = np.array(shared, dtype=object).reshape(len(lotteries), len(options))
    den = int(rows[0].sum())
    return frozen(integers(rows)[taken]), den


def _report_missing(missing: Any, roster: Roster, report: Report) -> None:
    first = profiles.positions(int(missing[0]), roster.shape)
    named = ", ".join(
        f"{name} = {kinds[a].label}"
        for name, kinds, a in zip(roster.names, roster.types, first, strict=True)
        if kinds is not None
    )
    more = f" and {len(missing) - 1:,} more" if len(missing) > 1 else ""
    report.add(
        "rule",
        f"no decision at {named}{more}",
        "a decision at every profile",
        "Add it; one [[rule]] with take and without at covers every profile not named.",
    )


def _entries(
    root: Section, roster: Roster, options: Sequence[str], folder: Path | None
) -> Iterator[Entry]:
    report = root.report
    raw = root.values["rule"]
    if isinstance(raw, str):
        sheet = read_sheet(raw, folder, "rule", report)
        if sheet is not None and roster.complete and options:
            yield from _sheet_entries(sheet, roster, options, report)
        return
    for section in root.sections("rule"):
        section.only("at", "take")
        lottery = None
        if "take" not in section:
            section.wrong("take", "an option or a lottery", 'Write take = "OPTION".')
        elif options:
            lottery = read_lottery(section.values["take"], section.at("take"), options, report)
        at = section.section("at")
        positions = None if at is None else roster.profile(at.values, at.place, report)
        yield section.place, positions, lottery, "at" not in section


def read_lottery(raw: object, place: str, options: Sequence[str], report: Report) -> Lottery | None:
    """An option, or a table option = probability; probabilities sum to 1."""
    if isinstance(raw, str):
        if raw in options:
            return tuple(Fraction(option == raw) for option in options)
        remedy = report.near(raw, options) or "Name an option."
        report.add(place, describe(raw), f"one of {listing(options)}", remedy)
        return None
    if not isinstance(raw, dict):
        report.add(
            place,
            describe(raw),
            "an option or a lottery",
            'Write take = "OPTION" or take = { OPTION = "1/2", … }.',
        )
        return None
    table = Section(raw, place, report)
    unknown_keys(raw, options, place, report, "option")
    chances = []
    for option in options:
        value = table.number(option) if option in table else Fraction(0)
        if value is not None and value < 0:
            table.wrong(option, "a probability", "Write a number from 0 to 1.")
        elif value is not None:
            chances.append(value)
    if len(chances) < len(options) or any(key not in options for key in raw):
        return None
    return _summing_to_one(tuple(chances), place, report)


def _summing_to_one(lottery: Lottery, place: str, report: Report) -> Lottery | None:
    total = sum(lottery)
    if total == 1:
        return lottery
    report.add(
        place,
        f"probabilities that sum to {exact.text(Fraction(total))}",
        "a sum of 1",
        'Write fractions such as "1/3" if rounding is the cause.',
    )
    return None


def _sheet_entries(
    sheet: Sheet, roster: Roster, options: Sequence[str], report: Report
) -> Iterator[Entry]:
    """Rows of a rule sheet: a column per party, and `take` or a column per option.

    The columns of a saved payment table (type:NAME, decides:OPTION) serve as well; its
    probabilities and payments are then passed over.
    """
    header = sheet.header
    saved = any(title.startswith("decides:") for title in header)
    if saved:
        keep = [c for c, title in enumerate(header) if title.startswith(("type:", "decides:"))]
        header = [header[c].removeprefix("decides:") for c in keep]
    else:
        keep = list(range(len(header)))
    also = ["take"] if "take" in header and "take" not in options else list(options)
    columns = party_columns(sheet.name, header, roster, also, report)
    if columns is None:
        return
    decides = [header.index(title) for title in also]
    known: dict[tuple[str, ...], Lottery | None] = {}
    for place, cells in sheet.rows(report):
        kept = [cells[c] for c in keep]
        positions = row_profile(kept, columns, header, roster, place, report)
        drawn = tuple(kept[c] for c in decides)
        lottery = known.get(drawn)
        if lottery is None:
            if also == ["take"]:
                lottery = read_lottery(drawn[0], f"{place}, column 'take'", options, report)
            else:
                lottery = _row_lottery(drawn, options, place, report)
            known[drawn] = lottery
        yield place, positions, lottery, False


def _row_lottery(
    drawn: Sequence[str], options: Sequence[str], place: str, report: Report
) -> Lottery | None:
    chances = []
    for option, cell in zip(options, drawn, strict=True):
        where = f"{place}, column {option!r}"
        value = read_number(cell, where, report)
        if value is not None and value < 0:
            report.add(where, cell, "a probability", "Write a number from 0 to 1.")
        elif value is not None:
            chances.append(value)
    return _summing_to_one(tuple(chances), place, report) if len(chances) == len(options) else None
