"""What `--save` writes: the table, the interim table, the verdict, the proof, and their data package.

    transfers.csv      one row per profile (possible only)
    interim.csv        one row per party and type (possible only)
    datapackage.json   describes both in the open Data Package standard (possible only)
    verdict.json       the verdict document
    proof.json         the proof document (not when undecided)

All of them or none; files of an earlier verdict that this one does not have are taken away,
so that what lies in the folder always belongs together.
"""

from __future__ import annotations

import json
import os
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from designer.files import Content, write_all
from designer.setting.setting import Setting
from designer.verdict import Verdict

NAMES = ("transfers.csv", "interim.csv", "datapackage.json", "verdict.json", "proof.json")
"""Every file a verdict may have; ours to replace or take away."""

EXACT = r"-?(\d+(/\d+)?|0x[0-9a-f]+(/0x[0-9a-f]+)?)"
"""The pattern of an exact number: "p", "p/q", hexadecimal where very long."""


def planned(verdict: Verdict, folder: str | os.PathLike[str]) -> dict[str, str]:
    """The files that `save` will write: short name to path."""
    names = ["verdict.json"]
    if verdict.proof:
        names.append("proof.json")
    if verdict.table is not None and verdict.audit is not None:
        names = ["transfers.csv", "interim.csv", "datapackage.json", *names]
    return {name.partition(".")[0]: str(Path(folder) / name) for name in names}


def save(
    verdict: Verdict, folder: str | os.PathLike[str], document: Mapping[str, Any]
) -> dict[str, str]:
    """Write everything a verdict has into a folder; what was written, short name to path.

    document  the verdict document, for verdict.json

    Raises InputError when the folder cannot be written; whatever was there is then untouched.
    """
    from designer.proof.document import as_bytes

    contents: dict[str, Content] = {"verdict.json": _json(document)}
    if verdict.proof:
        contents["proof.json"] = as_bytes(verdict.proof)
    audit = verdict.audit
    if verdict.table is not None and audit is not None:
        from designer.auditing import interim_csv
        from designer.tablefile import transfers_csv

        contents["transfers.csv"] = transfers_csv(verdict.table, verdict.setting)
        contents["interim.csv"] = interim_csv(audit)
        contents["datapackage.json"] = _json(data_package(verdict.setting, bool(verdict.proof)))
    write_all(folder, contents, retire=NAMES)
    return planned(verdict, folder)


def data_package(setting: Setting, proved: bool = True) -> dict[str, Any]:
    """Describe the saved files as a Data Package (datapackage.org, version 2).

    Exact amounts are fractions, which the standard's number type cannot hold; they are
    strings with a pattern.
    """
    money = f"{setting.money}, exact"
    transfers = [_field(f"type:{party.name}", f"type of {party.name}") for party in setting.parties]
    transfers.append(_exact("probability", "probability of the profile"))
    transfers += [_exact(f"decides:{k}", f"probability of the decision {k}") for k in setting.options]
    transfers += [
        _exact(f"pays:{party.name}", f"paid by {party.name}, negative when received; {money}")
        for party in setting.parties
    ]
    transfers.append(_exact("pot", f"payments less outlay; {money}"))
    interim = [
        _field("party", "the party"),
        _field("type", "its true type"),
        _exact("expected payment", f"paid on average, given the type; {money}"),
        _exact("expected utility", f"worth less payment on average, given the type; {money}"),
        _exact("gain over staying out", f"expected utility less the outside option; {money}"),
        _field("closest lie", "the other type whose report loses least; empty if there is none"),
        _exact("margin", f"what that report loses against the truth; {money}"),
    ]
    keys = [f"type:{party.name}" for party in setting.parties]
    resources = [
        _table("transfers", "Decisions and payments, one row per profile", transfers, keys),
        _table("interim", "Expectations, one row per party and type", interim, ["party", "type"]),
        _document("verdict", "The verdict"),
    ]
    if proved:
        resources.append(_document("proof", "The proof, for `designer recheck`"))
    return {
        "$schema": "https://datapackage.org/profiles/2.0/datapackage.json",
        "name": f"transfers-{setting.digest[:12]}",
        "title": setting.title,
        "description": setting.note,
        "resources": resources,
    }


def _field(name: str, description: str) -> dict[str, Any]:
    return {"name": name, "type": "string", "description": description}


def _exact(name: str, description: str) -> dict[str, Any]:
    return {**_field(name, description), "constraints": {"pattern": EXACT}}


def _table(name: str, title: str, fields: list[dict[str, Any]], keys: list[str]) -> dict[str, Any]:
    return {
        "name": name,
        "type": "table",
        "title": title,
        "path": f"{name}.csv",
        "format": "csv",
        "mediatype": "text/csv",
        "encoding": "utf-8",
        "schema": {"fields": fields, "primaryKey": keys},
    }


def _document(name: str, title: str) -> dict[str, Any]:
    return {
        "name": name,
        "title": title,
        "path": f"{name}.json",
        "format": "json",
        "mediatype": "application/json",
        "encoding": "utf-8",
    }


def _json(document: Mapping[str, Any]) -> str:
    return json.dumps(document, indent=2, ensure_ascii=False, allow_nan=False) + "\n"
