"""Getters that know where they are: every mistake names its place in the file.

A `Section` wraps one table of the parsed file together with its place ("party[1] 'Suth'").
Its getters return a value of the right kind, or note a mistake in the shared `Report` and
return None (or the default), so that reading goes on and finds the other mistakes too.
"""

from __future__ import annotations

import re
from collections.abc import Collection, Iterable, Sequence
from fractions import Fraction
from itertools import islice
from typing import Any

from designer.errors import Mistake
from designer.setting import exact

MAX_BITS = 10_000
"""Longest numerator or (common) denominator of the numbers of a scenario, in binary digits."""

SHOWN = 60
"""Mistakes listed before the rest is only counted."""

_BARE = re.compile(r"[A-Za-z0-9_-]+", re.ASCII)


class Refused:
    """A number the file writes but exact arithmetic has no place for: nan, inf, 1e99999."""

    def __init__(self, written: str) -> None:
        """Keep the text, for the message."""
        self.written = written


class Report:
    """The mistakes found so far, in the order of reading."""

    def __init__(self) -> None:
        """Start with none."""
        self._found: list[Mistake] = []
        self._more = 0

    def add(self, place: str, found: str, expected: str, remedy: str) -> None:
        """Note one mistake; past `SHOWN` of them only the count grows."""
        if len(self._found) < SHOWN:
            self._found.append(Mistake(place, found, expected, remedy))
        else:
            self._more += 1

    def __len__(self) -> int:
        return len(self._found) + self._more

    def near(self, word: object, known: Iterable[str]) -> str:
        """'Did you mean …?' when a known word is near; empty when none is, or in a long report.

        The search costs far more than the mistake it helps with, so that a sheet with a
        million wrong cells gets it for those that are listed only.
        """
        return suggestion(word, known) if len(self._found) < SHOWN else ""

    def mistakes(self) -> list[Mistake]:
        """The mistakes, the last line counting those not listed."""
        if not self._more:
            return list(self._found)
        rest = Mistake(
            "further on",
            f"{self._more} more mistake{'s' if self._more > 1 else ''}",
            "none",
            "Mend the ones above first, then read the file again.",
        )
        return [*self._found, rest]


class Section:
    """One table of the file: its values, its place, and the report its mistakes go to."""

    def __init__(self, values: dict[str, Any], place: str, report: Report) -> None:
        """Wrap a table; `place` is empty for the file itself."""
        self.values = values
        self.place = place
        self.report = report

    def __contains__(self, key: str) -> bool:
        return key in self.values

    def at(self, key: str) -> str:
        """The place of a key of this table."""
        return join(self.place, key)

    def wrong(self, key: str, expected: str, remedy: str) -> None:
        """Note that the value under a key (or its absence) is not what was expected."""
        found = describe(self.values[key]) if key in self.values else "nothing"
        self.report.add(self.at(key), found, expected, remedy)

    def only(self, *known: str) -> None:
        """Note every key that is not among the known ones."""
        unknown_keys(self.values, known, self.place, self.report)

    def text(self, key: str, default: str, *, lines: bool = False) -> str:
        """A text that can be printed; several lines where `lines` says so."""
        value = self.values.get(key, default)
        if not isinstance(value, str):
            self.wrong(key, "text in quotes", f'Write {key} = "…".')
        elif not _printable(value, lines=lines):
            self.wrong(key, "text of printable characters", "Remove the control characters.")
        else:
            return value
        return default

    def flag(self, key: str, default: bool = False) -> bool:
        """True or false."""
        value = self.values.get(key, default)
        if isinstance(value, bool):
            return value
        self.wrong(key, "true or false", "Write true or false, without quotes.")
        return default

    def word(self, key: str, choices: Sequence[str], default: str) -> str:
        """One word of a fixed list."""
        value = self.values.get(key, default)
        if isinstance(value, str) and value in choices:
            return value
        remedy = self.report.near(value, choices) or "Pick one."
        self.wrong(key, f"one of {listing(choices)}", remedy)
        return default

    def number(self, key: str) -> Fraction | None:
        """An exact number; None when absent or mistaken."""
        if key not in self.values:
            return None
        return read_number(self.values[key], self.at(key), self.report)

    def section(self, key: str) -> Section | None:
        """A table inside this one; None when absent or not a table."""
        if key not in self.values:
            return None
        value = self.values[key]
        if isinstance(value, dict):
            return Section(value, self.at(key), self.report)
        self.wrong(key, "a table", f"Write {key} = {{ … }}.")
        return None

    def sections(self, key: str) -> list[Section]:
        """The tables of an array of tables; empty when absent or mistaken."""
        value = self.values.get(key)
        if value is None:
            return []
        if not isinstance(value, list) or not value:
            self.wrong(key, "one or more tables", f"Write [[{self.at(key)}]] before each.")
            return []
        found = []
        for index, entry in enumerate(value):
            place = f"{self.at(key)}[{index}]"
            if isinstance(entry, dict):
                found.append(Section(entry, place, self.report))
            else:
                self.report.add(
                    place, describe(entry), "a table", f"Write [[{self.at(key)}]] before each."
                )
        return found


def read_number(value: object, place: str, report: Report) -> Fraction | None:
    """An exact number: an integer, a decimal, or exact text such as "1/3" (convention 7)."""
    if isinstance(value, (int, Fraction)) and not isinstance(value, bool):
        return _bounded(Fraction(value), place, report)
    if isinstance(value, Refused):
        report.add(
            place,
            describe(value),
            "a finite exact number",
            "Write an integer, a decimal with an exponent below 1000, or a fraction in quotes.",
        )
        return None
    if isinstance(value, str):
        try:
            return _bounded(exact.number(value), place, report)
        except ValueError:
            pass
    report.add(place, describe(value), "an exact number", 'Write 3, 0.25 or "1/3".')
    return None


def _bounded(value: Fraction, place: str, report: Report) -> Fraction | None:
    if max(value.numerator.bit_length(), value.denominator.bit_length()) <= MAX_BITS:
        return value
    report.add(
        place,
        f"a number of more than {MAX_BITS:,} binary digits",
        "a number of money or weight",
        "Choose a larger unit of money, or round the number.",
    )
    return None


def read_name(value: object, place: str, report: Report, what: str) -> str | None:
    """A name: printable, no space around it, at most 200 characters."""
    if not isinstance(value, str):
        report.add(place, describe(value), f"{what} in quotes", 'Write it as "…".')
    elif not value.strip():
        report.add(place, describe(value), what, "Give it a name.")
    elif not _printable(value) or value != value.strip() or len(value) > 200:
        report.add(
            place,
            describe(value),
            f"{what} of at most 200 printable characters, with no space around it",
            "Shorten or retype it.",
        )
    else:
        return value
    return None


def unknown_keys(
    keys: Iterable[str], known: Sequence[str], place: str, report: Report, what: str = "key"
) -> None:
    """Note every key that is not among the known ones, with the nearest known one."""
    for key in keys:
        if key not in known:
            report.add(
                join(place, key),
                f"an unknown {what} {describe(key)}",
                f"one of {listing(known)}",
                report.near(key, known) or "Remove it.",
            )


def suggestion(word: object, known: Iterable[str]) -> str:
    """'Did you mean …?' when a known word is near; else empty."""
    import difflib  # only on the way to an error

    if not isinstance(word, str):
        return ""
    folded = {name.casefold(): name for name in islice(known, 1000)}
    near = difflib.get_close_matches(word[:80].casefold(), folded, n=1, cutoff=0.65)
    return f"Did you mean '{folded[near[0]]}'?" if near else ""


def listing(words: Collection[str], most: int = 12) -> str:
    """A comma-separated list, cut when long."""
    shown = ", ".join(islice(words, most))
    return f"{shown}, … ({len(words)} in all)" if len(words) > most else shown


def join(place: str, key: str) -> str:
    """The place of a key inside a place; keys TOML would quote are quoted."""
    written = key if _BARE.fullmatch(key) and len(key) <= 60 else f'"{describe(key)[1:-1]}"'
    return f"{place}.{written}" if place else written


def describe(value: object) -> str:
    """What was found, short and on one line."""
    match value:
        case bool():
            return "true" if value else "false"
        case int() | Fraction():
            return _short(exact.text(value))
        case Refused():
            return _short(value.written)
        case str():
            return repr(value) if len(value) <= 60 else f"{value[:57]!r}…"
        case list():
            return f"a list of {len(value)}" if value else "an empty list"
        case dict():
            return "a table" if value else "an empty table"
        case _:
            return f"the date or time {_short(str(value))}"


def _short(written: str) -> str:
    return written if len(written) <= 60 else f"{written[:57]}…"


def _printable(value: str, *, lines: bool = False) -> bool:
    """Whether a terminal can show it as it is: no control, format or bidi characters."""
    if lines:
        return all(line.replace("\t", " ").isprintable() for line in value.split("\n"))
    return value.isprintable()
