"""`datapackage.json`: the saved tables described by the open Data Package standard.

Follows the Frictionless Data Package standard, version 2 (datapackage.org), with the `profile`
of version 1 beside it for older readers. Exact numbers are declared as text under a pattern,
since the standard's "number" would read 1/3 as a mistake and 0.1 as a float.
"""

from __future__ import annotations

import json
import re
from typing import Any

from designer.setting.setting import Setting

EXACT = r"[+-]?([0-9]+|0x[0-9a-f]+)(/([0-9]+|0x[0-9a-f]+))?"
_SCHEMA = "https://datapackage.org/profiles/2.0/"


def datapackage(setting: Setting, *, transfers: bool = True) -> bytes:
    """Describe transfers.csv (unless it is not there) and interim.csv: columns, units, keys."""
    money = setting.money
    resources = [_resource("interim", _interim(money), ["party", "type"])]
    if transfers:
        key = [f"type:{party.name}" for party in setting.parties]
        resources.insert(0, _resource("transfers", _transfers(setting), key))
    document: dict[str, Any] = {
        "$schema": f"{_SCHEMA}datapackage.json",
        "profile": "tabular-data-package",
        "name": _slug(setting.title) or "payments",
        "title": setting.title,
        "description": (
            "A payment rule for a shared decision, exact. It is analysis under the stated "
            "priors and types, not legal or financial advice."
        ),
        "resources": resources,
    }
    if setting.digest:
        document["scenario_digest"] = f"sha256:{setting.digest}"
    return (json.dumps(document, indent=2, ensure_ascii=False) + "\n").encode()


def _resource(name: str, fields: list[dict[str, Any]], key: list[str]) -> dict[str, Any]:
    return {
        "$schema": f"{_SCHEMA}dataresource.json",
        "profile": "tabular-data-resource",
        "name": name,
        "type": "table",
        "path": f"{name}.csv",
        "format": "csv",
        "mediatype": "text/csv",
        "encoding": "utf-8",
        "dialect": {"delimiter": ",", "lineTerminator": "\n", "quoteChar": '"', "header": True},
        "schema": {"fields": fields, "primaryKey": key},
    }


def _transfers(setting: Setting) -> list[dict[str, Any]]:
    money = setting.money
    fields = []
    for party in setting.parties:
        labels = [kind.label for kind in party.types]
        field = _text(f"type:{party.name}", f"The type {party.name} reports.")
        field["constraints"]["enum"] = labels
        fields.append(field)
    fields.append(_exact("probability", "The probability of the profile; the column sums to 1."))
    for option in setting.options:
        fields.append(_exact(f"decides:{option}", f"The probability that {option} is decided."))
    for party in setting.parties:
        what = f"What {party.name} pays (negative: receives), in {money}."
        fields.append(_exact(f"pays:{party.name}", what))
    fields.append(_exact("pot", f"All payments less the expected outlay, in {money}."))
    return fields


def _interim(money: str) -> list[dict[str, Any]]:
    fields = [
        _text("party", "The name of the party."),
        _text("type", "Its true type."),
        _exact("expected payment", f"What it pays on average, given its type, in {money}."),
        _exact("expected utility", f"Its worth less its payment, on average, in {money}."),
        _exact("gain over staying out", f"That, less its outside option, in {money}."),
        _text("closest lie", "The type whose report would serve it best after the truth."),
        _exact("margin", f"What that lie costs it on average, in {money}; negative: it pays."),
    ]
    for field in fields[-2:]:  # empty for a party of one type
        field["constraints"].pop("required")
    return fields


def _text(name: str, description: str) -> dict[str, Any]:
    return {
        "name": name,
        "type": "string",
        "description": description,
        "constraints": {"required": True},
    }


def _exact(name: str, description: str) -> dict[str, Any]:
    field = _text(name, f"{description} Exact: an integer or a fraction p/q.")
    field["constraints"]["pattern"] = EXACT
    return field


def _slug(title: str) -> str:
    return re.sub(r"[^a-z0-9]+", "-", title.lower(), flags=re.ASCII).strip("-")
