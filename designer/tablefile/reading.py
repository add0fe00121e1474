"""Payment tables in: any CSV file to a table of the setting, or every mistake in it."""

from __future__ import annotations

import csv
import itertools
import math
import os
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path
from typing import Literal

import numpy as np
import numpy.typing as npt

from designer import files
from designer.setting.exact import text
from designer.setting.profiles import strides
from designer.setting.setting import IntArray, Setting
from designer.table import Table, held, largest, pot
from designer.tablefile.cells import Lookup, Mistakes, Numbers

CHUNK = 16_384
MOST_BITS = 4_000_000_000
"""Bits of all numerators together beyond which a common denominator is refused."""


@dataclass(frozen=True, eq=False)
class ReadTable:
    """A table from a file, and what the file said about itself.

    exact      no entry looks rounded
    tolerance  money; what rounding alone can amount to, 0 when exact
    chance_tolerance  the same for the sum of a lottery
    decisions  where they come from: "file", the scenario's "rule", or "efficient"
    """

    table: Table
    exact: bool
    tolerance: Fraction
    chance_tolerance: Fraction
    decisions: Literal["file", "rule", "efficient"]


def read_table(path: str | os.PathLike[str], setting: Setting) -> ReadTable:
    """Read a payment table for a setting; see the module docstring for what is allowed.

    Raises TableError with every mistake (the first 20 of them spelled out), whatever the
    file holds.
    """
    files.recover(Path(path).parent)
    mistakes = Mistakes(str(path))
    try:
        with open(path, encoding="utf-8-sig", newline="") as lines:
            rows = csv.reader(lines, strict=True)
            return _Reading(setting, next(rows, []), mistakes).table(rows)
    except UnicodeDecodeError:
        mistakes.add("the file", "bytes that are not UTF-8", "UTF-8 text", "Save it as CSV UTF-8.")
    except csv.Error as problem:
        mistakes.add(
            "the file",
            f"'{problem}'",
            "comma-separated values (RFC 4180)",
            "Check the quotation marks, or save the table as CSV again.",
        )
    except OSError as problem:
        mistakes.add(
            "the file",
            f"'{problem.strerror or problem}'",
            "a CSV file that can be read",
            "Check the name and the permissions.",
        )
    except ValueError as problem:
        if "\0" not in str(path):
            raise
        mistakes.add("the file", f"'{problem}'", "a file name", "Check the name.")
    raise mistakes.error()


class _Reading:
    """One file on its way to a table."""

    def __init__(self, setting: Setting, header: list[str], mistakes: Mistakes) -> None:
        self.setting = setting
        self.mistakes = mistakes
        self.lookups = {
            f"type:{party.name}": Lookup([kind.label for kind in party.types])
            for party in setting.parties
        }
        self.pays = [f"pays:{party.name}" for party in setting.parties]
        self.decides = [f"decides:{option}" for option in setting.options]
        self.known = [*self.lookups, "probability", *self.decides, *self.pays, "pot"]
        self.names = [name if name in self.known else name.strip() for name in header]
        self._check_header()
        self.at = {name: place for place, name in enumerate(self.names)}
        self.has_decisions = self.decides[0] in self.at
        self.numbers = {name: Numbers() for name in self.names if name not in self.lookups}
        self.profiles: list[npt.NDArray[np.int64]] = []
        self.rows: list[npt.NDArray[np.int64]] = []

    def table(self, rows: Iterator[list[str]]) -> ReadTable:
        count = 1
        while chunk := list(itertools.islice(rows, CHUNK)):
            self._take(chunk, count + 1)
            count += len(chunk)
        self.mistakes.check()
        order = self._order()
        return self._build(order)

    def _check_header(self) -> None:
        known = self.known
        counts = {name: self.names.count(name) for name in self.names}
        for name, count in counts.items():
            if name not in known:
                self.mistakes.add(
                    "the first row",
                    f"a column {name[:60]!r}",
                    f"columns among {', '.join(known[:12])}{', …' if len(known) > 12 else ''}",
                    "Separate columns by commas; rename the column or take it out.",
                )
            elif count > 1:
                self.mistakes.add(
                    "the first row",
                    f"the column {name!r} {count} times",
                    "each column once",
                    "Take out all but one.",
                )
        needed = [*self.lookups, *self.pays]
        if any(name in counts for name in self.decides):
            needed += self.decides
        for name in needed:
            if name not in counts:
                self.mistakes.add(
                    "the first row",
                    f"no column {name!r}",
                    "a column per party for its type and its payment, and per option if any",
                    "Add the column.",
                )
        self.mistakes.check()

    def _take(self, chunk: list[list[str]], first: int) -> None:
        """Take in some rows; `first` is the number of the first of them, the header being 1."""
        numbers = np.arange(first, first + len(chunk), dtype=np.int64)
        width = len(self.names)
        if any(len(row) != width for row in chunk):
            kept: list[int] = []
            for place, row in enumerate(chunk, first):
                if len(row) == width:
                    kept.append(place)
                elif row:  # an empty line is no mistake
                    self.mistakes.add(
                        f"row {place}",
                        f"{len(row)} cells",
                        f"{width}, as in the first row",
                        "Check the commas and quotation marks of the row.",
                    )
            chunk = [row for row in chunk if len(row) == width]
            numbers = np.array(kept, dtype=np.int64)
        if not chunk:
            return
        columns = list(zip(*chunk, strict=True))
        profile = np.zeros(len(chunk), dtype=np.int64)
        steps = strides(self.setting.shape)
        for (name, lookup), step in zip(self.lookups.items(), steps, strict=True):
            cells = columns[self.at[name]]
            own = np.array([lookup[cell] for cell in cells], dtype=np.int64)
            profile += own * step
            for bad in np.flatnonzero(own < 0):
                self._bad_type(int(numbers[bad]), name, cells[bad])
        for name, column in self.numbers.items():
            cells = columns[self.at[name]]
            for at in column.read(cells):
                self.mistakes.add(
                    f"row {numbers[at]}, column {name!r}",
                    repr(cells[at][:40]),
                    "an exact number",
                    "Write an integer, a decimal with a point, or a fraction such as 1/3.",
                )
        self.profiles.append(profile)
        self.rows.append(numbers)

    def _bad_type(self, row: int, name: str, cell: str) -> None:
        party = self.setting.parties[list(self.lookups).index(name)]
        known = [kind.label for kind in party.types]
        self.mistakes.add(
            f"row {row}, column {name!r}",
            repr(cell[:40]),
            f"one of its types {', '.join(known[:8])}{', …' if len(known) > 8 else ''}",
            "Write the type as the scenario does.",
        )

    def _order(self) -> npt.NDArray[np.int64]:
        """Where the row of each profile is; every profile must have one, and one only."""
        total = self.setting.profiles
        profile = np.concatenate(self.profiles) if self.profiles else np.zeros(0, dtype=np.int64)
        rows = np.concatenate(self.rows) if self.rows else profile
        order = np.argsort(profile, kind="stable")
        met = profile[order]
        for at in np.flatnonzero(met[1:] == met[:-1]):
            self.mistakes.add(
                f"row {rows[order[at + 1]]}",
                f"the profile of row {rows[order[at]]} again ({self._where(int(met[at]))})",
                "each profile once",
                "Take out one of the two rows.",
            )
        distinct = np.unique(met)
        if len(distinct) < total:
            # The first profile missing is where the sorted list first runs ahead.
            ahead = np.flatnonzero(distinct != np.arange(len(distinct)))
            first = int(ahead[0]) if len(ahead) else len(distinct)
            missing = total - len(distinct)
            self.mistakes.add(
                "the rows",
                f"{missing} of {total} profiles missing, the first {self._where(first)}",
                "a row for every profile, for a lie can lead to any",
                "Add the rows.",
            )
        self.mistakes.check()
        return order

    def _where(self, profile: int) -> str:
        labels = self.setting.labels_at(profile)
        names = (party.name for party in self.setting.parties)
        return ", ".join(f"{name} {label}" for name, label in zip(names, labels, strict=True))

    def _build(self, order: npt.NDArray[np.int64]) -> ReadTable:
        columns = {name: column.settle(order) for name, column in self.numbers.items()}
        pays, pays_den = self._over_one("payments", [columns[name] for name in self.pays])
        decisions: Literal["file", "rule", "efficient"] = "file"
        if self.has_decisions:
            lotteries, decides_den = self._over_one(
                "chances", [columns[name] for name in self.decides]
            )
            decides: IntArray = lotteries.T.copy()
        else:
            decides, decides_den, decisions = self._settled_decisions()
        table = Table(decides, decides_den, pays, pays_den)
        pay_unit = max(self.numbers[name].unit for name in self.pays)
        chance_unit = max(
            (self.numbers[n].unit for n in self.decides if n in self.at), default=Fraction(0)
        )
        exact = not (pay_unit or chance_unit)
        gain, pots = self._rounding(pay_unit, chance_unit)
        rows = np.concatenate(self.rows)[order]
        if "probability" in columns:
            odds = (self.setting.weights, self.setting.total_weight)
            slack = self._coarse("probability")
            self._compare("probability", columns["probability"], odds, slack, rows)
        if "pot" in columns:
            slack = pots + self._coarse("pot")
            slack += sum((self._coarse(name) for name in self.pays), Fraction(0))
            self._compare("pot", columns["pot"], pot(table, self.setting), slack, rows)
        self.mistakes.check()
        chances = len(self.decides) * chance_unit / 2
        return ReadTable(table, exact, max(gain, pots), chances, decisions)

    def _coarse(self, name: str) -> Fraction:
        """Half the last place of a column's decimals: what follows from others may be rounded.

        Payments of two places are taken at their word, but the pot beside them may have been
        rounded, or may be the sum of what they were before.
        """
        column = self.numbers[name]
        return max(column.unit, column.place) / 2

    def _rounding(self, pay_unit: Fraction, chance_unit: Fraction) -> tuple[Fraction, Fraction]:
        """Bound what rounding can do to a gain from a lie, and to a pot."""
        setting = self.setting
        worth = Fraction(max(largest(p.value) for p in setting.parties), setting.grain)
        outlay = Fraction(sum(abs(int(cost)) for cost in setting.outlay), setting.grain)
        gain = pay_unit + chance_unit * len(setting.options) * worth
        return gain, (len(setting.parties) * pay_unit + chance_unit * outlay) / 2

    def _over_one(
        self, what: str, columns: Sequence[tuple[IntArray, IntArray]]
    ) -> tuple[IntArray, int]:
        """Columns of fractions as one array (columns, N) of integers over one denominator."""
        cells = sum(len(tops) for tops, _ in columns)
        common = 1
        for den in sorted({den for _, dens in columns for den in set(dens.tolist())}):
            common = math.lcm(common, den)
            if common.bit_length() * cells > MOST_BITS:
                self.mistakes.add(
                    "the rows",
                    f"{what} without a common denominator of manageable length",
                    "fractions that share their denominators, or decimals",
                    "Write the numbers as decimals; six places or more mark them as rounded.",
                )
                self.mistakes.check()
        bound = max(common, max(largest(tops) for tops, _ in columns) * common)
        parts = [held(tops, bound) * (common // held(dens, bound)) for tops, dens in columns]
        array = np.stack(parts)
        return held(array, largest(array)), common

    def _settled_decisions(self) -> tuple[IntArray, int, Literal["rule", "efficient"]]:
        """Decide for a file that does not: as the scenario does, if it settles it."""
        from designer.auditing.welfare import welfare

        setting = self.setting
        if setting.rule is not None:
            return setting.rule, setting.rule_den, "rule"
        if setting.asked.get("decision", "efficient") == "efficient":
            worth = welfare(setting)
            best = worth == worth.max(axis=1)[:, None]
            ties = np.flatnonzero(best.sum(axis=1) > 1)
            if not len(ties):
                return best.astype(np.int64), 1, "efficient"
            found = f"no 'decides:' columns, and two best options where {self._where(int(ties[0]))}"
        else:
            found = f"no 'decides:' columns, and decision {setting.asked['decision']!r}"
        self.mistakes.add(
            "the first row",
            found,
            f"columns {', '.join(map(repr, self.decides[:6]))}",
            "Add a column per option with its probability at every profile.",
        )
        raise self.mistakes.error()

    def _compare(
        self,
        name: str,
        given: tuple[IntArray, IntArray],
        right: tuple[IntArray, int],
        slack: Fraction,
        rows: npt.NDArray[np.int64],
    ) -> None:
        """Note where a column that follows from the rest says something else."""
        (tops, dens), (numerators, den) = given, right
        bound = largest(tops) * den + largest(dens) * (largest(numerators) + den)
        bound = max(bound * slack.denominator, largest(dens) * den * slack.numerator)
        tops, dens, numerators = held(tops, bound), held(dens, bound), held(numerators, bound)
        gap = np.abs(tops * den - numerators * dens) * slack.denominator
        for at in np.flatnonzero(gap > dens * (den * slack.numerator)):
            self.mistakes.add(
                f"row {rows[at]}, column {name!r}",
                text(Fraction(int(tops[at]), int(dens[at]))),
                text(Fraction(int(numerators[at]), den)),
                "Correct the number, or leave the column out: it follows from the others.",
            )
