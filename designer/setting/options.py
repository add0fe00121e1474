"""The options, and short ways to write one for each of several parties alike.

In a file with a group of parties alike (`count`), an option such as "to {Farm}" stands for one
option per member: "to Farm 1", "to Farm 2", ... Tables with an amount per option may use

    "to {Farm}"   as the key of all these options
    "to {name}"   in a party's own table: the option with its own name in it

{name} goes before an option written out, and that before {Farm}. In a file without `count`
braces are characters like any other.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field

from designer.setting.parties import OWN, Roster
from designer.setting.reading import Report, describe, join, listing, read_name

_BRACES = re.compile(r"\{([^{}]*)\}")


@dataclass(frozen=True)
class Options:
    """The options, and what stood for several of them.

    names   every option, in the order listed everywhere
    series  per option written with {GROUP}, as written: the positions of those it stands for
    """

    names: tuple[str, ...]
    series: Mapping[str, tuple[int, ...]] = field(default_factory=dict)

    def keys(self, written: Iterable[str], own: str | None) -> tuple[list[str | None], list[str]]:
        """Per option the key of a table it takes its amount from (or None), and unknown keys.

        own  the name that {name} stands for in this table; None where it stands for nothing
        """
        found: list[str | None] = [None] * len(self.names)
        place = {name: k for k, name in enumerate(self.names)}
        unknown, plain, mine = [], [], []
        for key in written:
            if key in self.series:
                for k in self.series[key]:
                    found[k] = key
            elif key in place:
                plain.append((key, place[key]))
            elif own is not None and named(key, own) in place:
                mine.append((key, place[named(key, own)]))
            else:
                unknown.append(key)
        for key, k in (*plain, *mine):
            found[k] = key
        return found, unknown

    def written(self, positions: Iterable[int]) -> list[str]:
        """Options as the file would write them: a series once."""
        series = {k: name for name, members in self.series.items() for k in members}
        return list(dict.fromkeys(series.get(k, self.names[k]) for k in positions))


def named(written: str, own: str) -> str:
    """A text with {name} replaced by a party's own name.

    >>> named("to {name}", "Farm 3")
    'to Farm 3'
    """
    return written.replace(f"{{{OWN}}}", own)


def expand(raw: Sequence[str], place: str, roster: Roster, report: Report) -> Options:
    """The options, each series written out; none, after noting why, where one is mistaken."""
    if not roster.groups and roster.counted:
        return Options(tuple(raw))
    before = len(report)
    names: list[str] = []
    series: dict[str, tuple[int, ...]] = {}
    for index, option in enumerate(raw):
        here = f"{place}[{index}]"
        members = _members(option, here, roster, report)
        if members is None:
            continue
        for name in members:
            if name in names:
                report.add(here, f"{name!r} a second time", "each once", "Remove one.")
        if option not in members:
            series[option] = tuple(range(len(names), len(names) + len(members)))
        names += members
    return (
        Options(tuple(names), series) if len(report) == before and roster.counted else Options(())
    )


def _members(option: str, place: str, roster: Roster, report: Report) -> list[str] | None:
    """The options that one stands for; None after noting why where it cannot be said."""
    words = list(dict.fromkeys(_BRACES.findall(option)))
    if not words:
        return [option]
    if len(words) == 1 and words[0] in roster.groups:
        found = [
            option.replace(f"{{{words[0]}}}", str(roster.names[i])) for i in roster.groups[words[0]]
        ]
        sound = read_name(max(found, key=len), place, report, "a name") is not None
        return found if sound else None
    if not roster.counted or None in roster.names:
        return None  # the word may be the name that is mistaken
    if len(words) > 1:
        remedy = "Write out the options for every pair."
    elif words[0] == OWN:
        remedy = f"Options are listed for all: write {{{next(iter(roster.groups))}}}."
    else:
        remedy = report.near(words[0], roster.groups) or "Leave out the braces."
    report.add(
        place,
        describe(option),
        f"one name in braces, of parties with a count: {listing(roster.groups)}",
        remedy,
    )
    return None


def unknown_options(
    keys: Iterable[str], options: Options, own: str | None, place: str, report: Report
) -> None:
    """Note keys that are no option, with the nearest one."""
    known = [*options.series, *options.names]
    shown = options.written(range(len(options.names)))
    for key in keys:
        meant = f", which is {describe(named(key, own))}" if own and named(key, own) != key else ""
        report.add(
            join(place, key),
            f"an unknown option {describe(key)}{meant}",
            f"one of {listing(shown)}",
            report.near(named(key, own) if own else key, known) or "Remove it.",
        )
