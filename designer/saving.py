"""What `--save` writes: the tables with their data package, the verdict, the proof.

    transfers.csv      one row per profile (possible, up to a number of rows)
    interim.csv        one row per party and type (possible only)
    table.json         the table as a formula, where the road gives one (possible only)
    datapackage.json   describes the CSVs in the open Data Package standard (possible only)
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
from designer.verdict import Verdict

NAMES = (
    "transfers.csv",
    "interim.csv",
    "table.json",
    "datapackage.json",
    "verdict.json",
    "proof.json",
)
"""Every file a verdict may have; ours to replace or take away."""

ROWS_UP_TO = 200_000
"""Profiles up to which transfers.csv is written unless asked otherwise."""


def planned(
    verdict: Verdict, folder: str | os.PathLike[str], rows_up_to: int = ROWS_UP_TO
) -> dict[str, str]:
    """The files that `save` will write: short name to path."""
    names = ["verdict.json"]
    if verdict.proof:
        names.append("proof.json")
    if verdict.standings:
        names = ["interim.csv", "datapackage.json", *names]
        if verdict.mechanism is not None:
            names = ["table.json", *names]
        if _written_out(verdict, rows_up_to):
            names = ["transfers.csv", *names]
    return {name.partition(".")[0]: str(Path(folder) / name) for name in names}


def _written_out(verdict: Verdict, rows_up_to: int) -> bool:
    held = verdict.table is not None or verdict.mechanism is not None
    return held and verdict.setting.profiles <= rows_up_to


def save(
    verdict: Verdict,
    folder: str | os.PathLike[str],
    document: Mapping[str, Any],
    rows_up_to: int = ROWS_UP_TO,
) -> dict[str, str]:
    """Write everything a verdict has into a folder; what was written, short name to path.

    document    the verdict document, for verdict.json
    rows_up_to  the most profiles for which the table is written out, a row each

    Raises InputError when the folder cannot be written; whatever was there is then untouched.
    """
    from designer.proof.document import as_bytes

    contents: dict[str, Content] = {"verdict.json": _json(document)}
    if verdict.proof:
        contents["proof.json"] = as_bytes(verdict.proof)
    if verdict.standings:
        from designer.auditing import interim_csv
        from designer.tablefile import datapackage, transfers_csv

        written_out = _written_out(verdict, rows_up_to)
        table = verdict.table
        if written_out and verdict.mechanism is not None and table is None:
            table = verdict.mechanism.table()
        if written_out and table is not None:
            contents["transfers.csv"] = transfers_csv(table, verdict.setting)
        if verdict.mechanism is not None:
            contents["table.json"] = _json(verdict.mechanism.plain())
        contents["interim.csv"] = interim_csv(verdict.standings)
        contents["datapackage.json"] = datapackage(verdict.setting, transfers=written_out)
    write_all(folder, contents, retire=NAMES)
    return planned(verdict, folder, rows_up_to)


def _json(document: Mapping[str, Any]) -> str:
    return json.dumps(document, indent=2, ensure_ascii=False, allow_nan=False) + "\n"
