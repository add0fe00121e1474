"""What `--save` writes: the tables with their data package, the verdict, the proof.

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
from designer.verdict import Verdict

NAMES = ("transfers.csv", "interim.csv", "datapackage.json", "verdict.json", "proof.json")
"""Every file a verdict may have; ours to replace or take away."""


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
        from designer.tablefile import datapackage, transfers_csv

        contents["transfers.csv"] = transfers_csv(verdict.table, verdict.setting)
        contents["interim.csv"] = interim_csv(audit)
        contents["datapackage.json"] = datapackage(verdict.setting)
    write_all(folder, contents, retire=NAMES)
    return planned(verdict, folder)


def _json(document: Mapping[str, Any]) -> str:
    return json.dumps(document, indent=2, ensure_ascii=False, allow_nan=False) + "\n"
