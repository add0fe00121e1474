"""Tables side by side, and who gains and who loses, type by type."""

from __future__ import annotations

import os
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path

from designer.auditing import Standing
from designer.demands.terms import Demands, Terms
from designer.errors import Mistake, UsageError
from designer.ruling.judged import Judged, judged
from designer.setting.setting import Setting
from designer.table import Table

Given = Table | str | os.PathLike[str]


@dataclass(frozen=True)
class Change:
    """How one type of one party fares: its expected utility under each table, in order."""

    party: str
    type: str
    probability: Fraction
    utility: tuple[Fraction, ...]
    outside: Fraction

    @property
    def against_first(self) -> tuple[Fraction, ...]:
        """Gain (or loss, negative) of each table over the first."""
        return tuple(value - self.utility[0] for value in self.utility)

    @property
    def best(self) -> tuple[int, ...]:
        """Positions of the tables under which this type fares best."""
        top = max(self.utility)
        return tuple(at for at, value in enumerate(self.utility) if value == top)


@dataclass(frozen=True, eq=False)
class Comparison:
    """What `compare` returns: the tables in the order given, and each type's fortunes."""

    setting: Setting
    terms: Terms
    names: tuple[str, ...]
    tables: tuple[Judged, ...]
    changes: tuple[Change, ...]


def compare(
    setting: Setting | str | Path,
    tables: Sequence[tuple[str, Given]] | Sequence[Given],
    demands: Demands | None = None,
) -> Comparison:
    """Hold tables of one setting side by side.

    setting  a Setting, or the path of a scenario file
    tables   two or more: a Table or the path of a CSV file, each alone or as (name, table);
             the first is the one the others' gains and losses are counted against
    demands  overrides of the scenario's own demands

    Raises UsageError for fewer than two tables, TableError for one that cannot be read.
    """
    if not isinstance(setting, Setting):
        from designer.setting.scenario import read_scenario

        setting = read_scenario(setting)
    if len(tables) < 2:
        raise UsageError(
            [
                Mistake(
                    "the tables",
                    f"{len(tables)}",
                    "two or more to set side by side",
                    "Name another table, or use `designer audit` for one.",
                )
            ]
        )
    terms = (demands or Demands()).over(setting)
    names: list[str] = []
    found: list[Judged] = []
    for at, entry in enumerate(tables):
        name, given = entry if isinstance(entry, tuple) else (_name(entry, at), entry)
        names.append(name)
        found.append(judged(setting, given, terms))
    return Comparison(setting, terms, _distinct(names), tuple(found), _changes(found))


def _name(given: Given, at: int) -> str:
    return f"table {at + 1}" if isinstance(given, Table) else Path(given).stem


def _distinct(names: list[str]) -> tuple[str, ...]:
    """Tell tables of one name apart by their place."""
    return tuple(
        f"{name} ({at + 1})" if names.count(name) > 1 else name for at, name in enumerate(names)
    )


def _changes(found: Sequence[Judged]) -> tuple[Change, ...]:
    rows: list[Sequence[Standing]] = [entry.audit.standings for entry in found]
    return tuple(
        Change(
            party=each[0].party,
            type=each[0].type,
            probability=each[0].probability,
            utility=tuple(standing.utility for standing in each),
            outside=each[0].outside,
        )
        for each in zip(*rows, strict=True)
    )
