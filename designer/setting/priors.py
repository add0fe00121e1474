"""Priors: each party's own, or one joint table; to the smallest whole weights."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from fractions import Fraction
from pathlib import Path
from typing import Any

import numpy as np

from designer.setting import exact, profiles
from designer.setting.evaluate import common_multiple
from designer.setting.expression import ExpressionError
from designer.setting.parties import Roster
from designer.setting.reading import MAX_BITS, Report, Section, describe, read_number
from designer.setting.setting import IntArray, integers
from designer.setting.sheet import read_sheet
from designer.setting.worths import frozen, too_many


def read_own_priors(roster: Roster) -> list[tuple[int, ...] | None]:
    """The weights of each party's types, from its prior or weights; read once for a group."""
    weights: list[tuple[int, ...] | None] = []
    for party, head in enumerate(roster.heads):
        types = roster.types[party]
        weights.append(
            weights[head]
            if head < party
            else _own_prior(roster.sections[party], None if types is None else len(types))
        )
    return weights


def _own_prior(section: Section, size: int | None) -> tuple[int, ...] | None:
    given = [key for key in ("prior", "weights") if key in section]
    if len(given) != 1:
        section.report.add(
            section.at("prior"),
            "both prior and weights" if given else "nothing",
            "prior or weights, one number per type",
            "Remove one of them." if given else "Write weights = [1, …] if all are equally likely.",
        )
        return None
    key = given[0]
    raw = section.values[key]
    if not isinstance(raw, list) or not raw:
        section.wrong(key, "a list with one number per type", f"Write {key} = [ … ].")
        return None
    before = len(section.report)
    if size is not None and len(raw) != size:
        section.report.add(
            section.at(key), describe(raw), f"{size}, one per type", "Add or remove entries."
        )
    weights: list[Fraction] = []
    for index, entry in enumerate(raw):
        place = f"{section.at(key)}[{index}]"
        value = read_number(entry, place, section.report)
        if value is not None and value <= 0:
            section.report.add(
                place,
                exact.text(value),
                "a positive number",
                "Remove the type if it cannot occur.",
            )
        elif value is not None:
            weights.append(value)
    if len(section.report) > before:
        return None
    if key == "prior" and (total := sum(weights)) != 1:
        section.report.add(
            section.at(key),
            f"weights that sum to {exact.text(Fraction(total))}",
            "a sum of 1",
            'Write fractions such as "1/3" if rounding is the cause, or use weights.',
        )
        return None
    return smallest(weights, section.at(key), section.report)


def smallest(weights: Sequence[Fraction], place: str, report: Report) -> tuple[int, ...] | None:
    """Proportional whole numbers without a common factor."""
    try:
        common = common_multiple(weight.denominator for weight in weights)
    except ExpressionError:
        _no_common(place, report)
        return None
    whole = [weight.numerator * (common // weight.denominator) for weight in weights]
    factor = math.gcd(*whole) or 1
    if max(whole, default=0) // factor >= 2**MAX_BITS:
        _no_common(place, report)
        return None
    return tuple(weight // factor for weight in whole)


def _no_common(place: str, report: Report) -> None:
    report.add(
        place,
        f"weights whose common denominator has more than {MAX_BITS:,} binary digits",
        "weights with common denominators",
        "Round them to a common unit.",
    )


def read_joint(
    root: Section, roster: Roster, folder: Path | None
) -> tuple[IntArray, list[tuple[int, ...]]] | None:
    """The joint prior: weights over all N profiles, and each party's marginal weights."""
    report = root.report
    for party in sorted(set(roster.heads)):
        section = roster.sections[party]
        for key in ("prior", "weights"):
            if key in section:
                section.report.add(
                    section.at(key),
                    f"a {key} beside a joint prior",
                    "one or the other",
                    "Remove it: the joint prior already gives this party's probabilities.",
                )
    before = len(report)
    count = math.prod(roster.shape)
    if count > profiles.MOST:
        too_many(count, "joint", report)
        return None
    weights: dict[int, Fraction] = {}
    steps = profiles.strides(roster.shape)
    for place, positions, weight in _entries(root, roster, folder):
        if positions is None or weight is None:
            continue
        profile = sum(step * a for step, a in zip(steps, positions, strict=True))
        if profile in weights:
            report.add(place, "a profile given before", "each profile once", "Remove one of them.")
        weights[profile] = weight
    if len(report) > before or not roster.complete:
        return None
    place = "joint"
    listed = smallest(list(weights.values()), place, report)
    if listed is None:
        return None
    dense = np.zeros(count, dtype=object)
    dense[list(weights)] = listed
    marginals = []
    for party, section in enumerate(roster.sections):
        blocks = dense.reshape(-1, roster.shape[party], steps[party])
        along = [int(weight) for weight in blocks.sum(axis=(0, 2))]
        whose = f" of {roster.names[party]}" if party in roster.group_of else ""
        for kind, mass in zip(roster.types[party] or (), along, strict=True):
            if mass == 0:
                report.add(
                    section.at("types"),
                    f"the type {kind.label!r}{whose} of probability 0 in the joint prior",
                    "a positive probability for every type",
                    "Give a profile with it some weight, or remove the type.",
                )
        factor = math.gcd(*along) or 1
        marginals.append(tuple(weight // factor for weight in along))
    if len(report) > before:
        return None
    return frozen(integers(dense)), marginals


Entry = tuple[str, tuple[int, ...] | None, Fraction | None]


def _entries(root: Section, roster: Roster, folder: Path | None) -> Iterator[Entry]:
    report = root.report
    raw = root.values["joint"]
    if isinstance(raw, str):
        yield from _sheet_entries(raw, roster, folder, report)
        return
    for section in root.sections("joint"):
        section.only("at", "weight")
        positions = None
        at = section.section("at")
        if at is not None:
            positions = roster.profile(at.values, at.place, report)
        elif "at" not in section:
            section.wrong("at", "a type of every party", "Write at = { PARTY = TYPE, … }.")
        if "weight" not in section:
            section.wrong("weight", "a number", "Write weight = 1, or another share.")
        yield section.place, positions, _weight(section.values, section.at("weight"), report)


def _weight(values: dict[str, Any], place: str, report: Report) -> Fraction | None:
    if "weight" not in values:
        return None
    weight = read_number(values["weight"], place, report)
    if weight is not None and weight < 0:
        report.add(place, exact.text(weight), "a weight of 0 or more", "Write its share.")
        return None
    return weight


def _sheet_entries(
    written: str, roster: Roster, folder: Path | None, report: Report
) -> Iterator[Entry]:
    sheet = read_sheet(written, folder, "joint", report)
    if sheet is None or not roster.complete:
        return
    columns = party_columns(sheet.name, sheet.header, roster, ("weight",), report)
    if columns is None:
        return
    weight_at = sheet.header.index("weight")
    for place, cells in sheet.rows(report):
        positions = row_profile(cells, columns, sheet.header, roster, place, report)
        weight = _weight({"weight": cells[weight_at]}, f"{place}, column 'weight'", report)
        yield place, positions, weight


def party_columns(
    name: str, header: Sequence[str], roster: Roster, also: Sequence[str], report: Report
) -> list[int] | None:
    """The column of each party, called NAME or type:NAME; `also` are the other columns."""
    before = len(report)
    place = f"{name}, line 1"
    found: list[int] = []
    known = roster.known_names()
    for party in known:
        here = [c for c, title in enumerate(header) if title in (party, f"type:{party}")]
        if len(here) != 1 or party in also:
            report.add(
                place,
                f"{len(here)} columns for {party!r}" if party not in also else f"{party!r}",
                "one column per party, unlike the other columns",
                f"Call the party's column 'type:{party}'." if here else f"Add {party}'s types.",
            )
        found.extend(here[:1])
    for title in also:
        if title not in header:
            report.add(place, "nothing", f"a column {title!r}", "Add it.")
    for c, title in enumerate(header):
        if title not in also and c not in found and title not in known:
            report.add(
                place,
                f"an unknown column {describe(title)}",
                f"a column per party and {', '.join(also)}",
                "Rename or remove it.",
            )
    return found if len(report) == before else None


def row_profile(
    cells: Sequence[str],
    columns: Sequence[int],
    header: Sequence[str],
    roster: Roster,
    place: str,
    report: Report,
) -> tuple[int, ...] | None:
    """One type position per party from a row of a sheet."""
    found = []
    for party, column in enumerate(columns):
        known = roster.positions[party]
        position = known.get(cells[column])  # already canonical in most sheets
        if position is None:
            where = f"{place}, column {header[column]!r}"
            position = roster.position(party, cells[column], where, report)
        if position is not None:
            found.append(position)
    return tuple(found) if len(found) == len(columns) else None
