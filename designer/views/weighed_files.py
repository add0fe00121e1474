"""The document of `designer weigh`, and the files that `--save` writes beside it."""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Mapping
from fractions import Fraction
from typing import Any

from designer.demands.plain import as_plain
from designer.setting.exact import decimal, text
from designer.views.caution import CAUTION
from designer.views.documents import nearest
from designer.weighing.frontier import PAIRS, TRIPLE, Frontier
from designer.weighing.ledger import Ledger
from designer.weighing.prices import Price
from designer.weighing.tradeoff import Tradeoff

FORMAT = "designer.tradeoff/1"
DOCUMENT, WAYS, CORNERS = "tradeoff.json", "ways-out.csv", f"corners-{'-'.join(TRIPLE)}.csv"
NAMES = (
    DOCUMENT,
    WAYS,
    CORNERS,
    "datapackage.json",
    *(f"frontier-{x}-{y}.{kind}" for x, y in PAIRS for kind in ("csv", "png", "svg")),
)
"""Every file a page may have; ours to replace or take away."""


def tradeoff_document(found: Tradeoff, files: Mapping[str, str] | None = None) -> dict[str, Any]:
    """The page as JSON-ready values, format designer.tradeoff/1.

    Exact numbers are text ("p/q" or an integer), `approx` the nearest float. Groups are named
    decision, ic:NAME, ir:NAME, balance, limit:KEY, side:KEY and even-handed. `ways_out` is
    empty for a possible mix, `room` for an impossible one; `complete` tells whether anything
    is missing, `reasons` what and why.
    """
    unit = found.setting.money
    return {
        "format": FORMAT,
        "scenario": {"title": found.setting.title, "digest": found.setting.digest},
        "demands": as_plain(found.terms),
        "verdict": found.status,
        "proved": found.proved,
        "complete": found.complete,
        "reasons": dict(found.reasons),
        "money": unit,
        "groups": list(found.groups),
        "collisions": [
            {"groups": list(one.groups), "proved": one.proved} for one in found.collisions
        ],
        "possible_sets": [
            {"groups": list(one.groups), "proved": one.proved} for one in found.possible_sets
        ],
        "ladders": [
            {
                "demand": one.demand,
                "asked": one.asked,
                "settles_at": one.settled,
                "tried": [{"form": form, "possible": held} for form, held in one.tried],
                "proved": one.proved,
            }
            for one in found.ladders
        ],
        "steps": [{"forms": dict(one.forms), "proved": one.proved} for one in found.steps],
        "ways_out": [_price(one, unit) for one in found.prices],
        "frontiers": [_frontier(one, unit) for one in found.frontiers],
        "corners": None
        if found.corners is None
        else {
            "criteria": list(found.corners.criteria),
            "corners": [[text(part) for part in corner] for corner in found.corners.corners],
            "unit": unit,
            "proved": found.corners.proved,
            "complete": found.corners.complete,
            "reason": found.corners.reason,
        },
        "ledger": None if found.ledger is None else _ledger(found.ledger, unit),
        "room": [
            {
                "kind": one.kind,
                **_amount(one.amount),
                "unit": unit,
                "asked": _text(one.asked),
                "becomes": _text(one.becomes),
                "proved": one.proved,
                "reason": one.reason,
            }
            for one in found.room
        ],
        "seconds": {part: round(seconds, 6) for part, seconds in found.seconds.items()},
        "files": dict(files or {}),
        "caution": CAUTION,
    }


def _text(value: Fraction | None) -> str | None:
    return None if value is None else text(value)


def _amount(value: Fraction | None) -> dict[str, Any]:
    return {"amount": _text(value), "approx": None if value is None else nearest(value)}


def _price(one: Price, unit: str) -> dict[str, Any]:
    return {
        "relax": one.relax,
        **_amount(one.amount),
        "unit": "parties" if one.relax == "compel" else unit,
        "asked": _text(one.asked),
        "becomes": _text(one.becomes),
        "parties": list(one.parties),
        "buys": {name: text(worth) for name, worth in one.buys},
        "idle": list(one.idle),
        "changes": [
            {"at": list(at), "decides": {option: text(chance) for option, chance in lottery}}
            for at, lottery in one.changes
        ],
        "proved": one.proved,
        "reason": one.reason,
    }


def _frontier(one: Frontier, unit: str) -> dict[str, Any]:
    return {
        "x": one.x,
        "y": one.y,
        "corners": [[text(part) for part in corner] for corner in one.corners],
        "unit": unit,
        "proved": one.proved and one.complete,
        "complete": one.complete,
        "reason": one.reason,
    }


def _ledger(one: Ledger, unit: str) -> dict[str, Any]:
    return {
        "entries": [
            {
                "kind": entry.kind,
                "party": entry.party,
                "type": entry.type,
                "probability": text(entry.chance),
                "each": text(entry.each),
                "amount": text(entry.amount),
            }
            for entry in one.entries
        ],
        "allowed": text(one.allowed),
        "gap": text(one.gap),
        "unit": unit,
        "proved": one.proved,
        "reason": one.reason,
    }


# -- files -------------------------------------------------------------------------------------


def contents(
    found: Tradeoff, folder: str, plots: bool = True
) -> tuple[dict[str, bytes | str], dict[str, str]]:
    """What to write, by file name, and the files by short name; the document names them all.

    `plots` False leaves the figures out (matplotlib is an extra).
    """
    written: dict[str, bytes | str] = {WAYS: _ways_csv(found)} if found.prices else {}
    for one in found.frontiers:
        if one.corners:
            written[f"{frontier_name(one)}.csv"] = corners_csv((one.x, one.y), one.corners)
            if plots:
                from designer.views.figure import figure

                for kind in ("png", "svg"):
                    written[f"{frontier_name(one)}.{kind}"] = figure(found, one, kind)
    if found.corners is not None and found.corners.corners:
        written[CORNERS] = corners_csv(found.corners.criteria, found.corners.corners)
    if written:
        written["datapackage.json"] = _package(found, [n for n in written if n.endswith(".csv")])
    files = {name: f"{folder}/{name}" for name in (DOCUMENT, *written)}
    document = tradeoff_document(found, files)
    written[DOCUMENT] = json.dumps(document, indent=2, ensure_ascii=False, allow_nan=False) + "\n"
    return written, files


def frontier_name(one: Frontier) -> str:
    """The name of a frontier's files, without the ending."""
    return f"frontier-{one.x}-{one.y}"


def corners_csv(criteria: tuple[str, ...], corners: tuple[tuple[Fraction, ...], ...]) -> str:
    """A row per corner: every criterion exactly, then each as a decimal."""
    header = [*criteria, *(f"{name}_decimal" for name in criteria)]
    rows = [[*map(text, at), *(decimal(part, 12) for part in at)] for at in corners]
    return _csv([header, *rows])


def _ways_csv(found: Tradeoff) -> str:
    rows = [["relax", "amount", "amount_decimal", "unit", "parties", "proved"]]
    for one in found.prices:
        plain = _price(one, found.setting.money)
        rounded = "" if one.amount is None else decimal(one.amount, 12)
        parties = "; ".join(one.parties)
        proved = str(one.proved).lower()
        rows.append([one.relax, plain["amount"] or "", rounded, plain["unit"], parties, proved])
    return _csv(rows)


def _csv(rows: list[list[str]]) -> str:
    stream = io.StringIO()
    csv.writer(stream, lineterminator="\n").writerows(rows)
    return stream.getvalue()


def _package(found: Tradeoff, names: list[str]) -> str:
    """The tables described in the open Data Package standard (frictionlessdata.io, v1)."""
    resources = []
    for name in names:
        if name == WAYS:
            fields = {
                "relax": "the way out",
                "amount": "exact: an integer or p/q; empty if this alone does not help",
                "amount_decimal": "the same, rounded",
                "unit": "of the amount",
                "parties": "the parties to compel",
                "proved": "whether exact arithmetic confirmed it",
            }
        else:
            criteria = (
                TRIPLE
                if name == CORNERS
                else next(
                    (one.x, one.y) for one in found.frontiers if name == f"{frontier_name(one)}.csv"
                )
            )
            exact = f"exact: an integer or p/q, in {found.setting.money}"
            fields = dict.fromkeys(criteria, exact)
            fields |= {f"{criterion}_decimal": "the same, rounded" for criterion in criteria}
        resources.append(
            {
                "name": name.removesuffix(".csv"),
                "path": name,
                "format": "csv",
                "mediatype": "text/csv",
                "encoding": "utf-8",
                "profile": "tabular-data-resource",
                "schema": {
                    "fields": [
                        {"name": key, "type": _kind(key), "description": what}
                        for key, what in fields.items()
                    ]
                },
            }
        )
    package = {
        "name": "tradeoff",
        "title": found.setting.title,
        "profile": "tabular-data-package",
        "resources": resources,
    }
    return json.dumps(package, indent=2, ensure_ascii=False) + "\n"


def _kind(field: str) -> str:
    if field == "proved":
        return "boolean"
    return "number" if field.endswith("_decimal") else "string"
