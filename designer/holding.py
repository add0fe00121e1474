"""Audit any table file, ours or anyone's: a CSV with a row per profile, or our table.json."""

from __future__ import annotations

import json
import os
from pathlib import Path
from typing import Any

from designer import auditing
from designer.auditing import Audit
from designer.errors import Mistake, TableError
from designer.setting.setting import Setting
from designer.table import OnDemand, Table

MOST = 2_000_000
"""Profiles up to which a table on demand is written out to be audited."""
BYTES = 1 << 28


def audit(setting: Setting, table: Table | str | os.PathLike[str], **asked: Any) -> Audit:
    """Hold a payment table against every demand, exactly; see `designer.auditing.audit`.

    table  a Table, the path of a CSV file, or of a table.json that `--save` wrote

    Raises TableError for a file that is no table of this setting, or has too many profiles.
    """
    if not isinstance(table, Table) and Path(table).suffix == ".json":
        mechanism = read_on_demand(table, setting)
        if setting.profiles > MOST:
            raise _unfit(
                table,
                f"{setting.profiles:,} profiles",
                f"at most {MOST:,}, which can be audited one by one",
                "Recheck the proof with the scenario instead: it is about every profile.",
            )
        table = mechanism.table()
    return auditing.audit(setting, table, **asked)


def read_on_demand(path: str | os.PathLike[str], setting: Setting) -> OnDemand:
    """The table that a table.json describes. Raises TableError for any other file."""
    try:
        if Path(path).stat().st_size > BYTES:
            raise ValueError("the file is larger than any table.json")
        plain = json.loads(Path(path).read_bytes())
        if not isinstance(plain, dict):
            raise ValueError("not a JSON object")
        if plain.get("scenario", {}).get("digest") != setting.digest:
            raise ValueError("the table of another scenario")
        if plain.get("kind") == "type-graph":
            from designer.roads.typegraph.mechanism import from_plain as from_graph

            return from_graph(plain, setting)
        if plain.get("kind") == "likeness":
            from designer.roads.likeness.mechanism import from_plain as from_likeness

            return from_likeness(plain, setting)
        from designer.roads.interim.mechanism import from_plain

        return from_plain(plain, setting)
    except OSError as problem:
        raise _unfit(
            path, problem.strerror or str(problem), "a file that can be read", "Check the path."
        ) from None
    except (ValueError, KeyError, TypeError, AttributeError, RecursionError) as problem:
        raise _unfit(
            path,
            str(problem)[:200],
            "a table.json that --save wrote for this scenario",
            "Save the table again.",
        ) from None


def _unfit(path: str | os.PathLike[str], found: str, expected: str, remedy: str) -> TableError:
    return TableError([Mistake("the file", found, expected, remedy)], str(path))
