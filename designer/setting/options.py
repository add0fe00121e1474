"""The options, and short ways to write one for each of several parties alike.

In a file with a group of parties alike (`count`), an option such as "to {Farm}" stands for one
option per member: "to Farm 1", "to Farm 2", ... Tables with an amount per option may use

    "to {Farm}"   as the key of all these options
    "to {name}"   in a party's own table: the option with its own name in it

Two places among the farms are "to {Farm} and {Farm}": one option for every pair, each pair once.
To a farm "to {name} and {Farm}" are those that it is in.

{name} goes before an option written out, and that before {Farm}. In a file without `count`
braces are characters like any other.
"""

from __future__ import annotations

import itertools
import math
import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field

from designer.setting.parties import OWN, Roster
from designer.setting.reading import Report, describe, join, listing, read_name

MOST = 5_000
"""Most options of a file with braces. Every party has a worth for each, written out in all that is
saved; {Farm} three times over among 50 farms would be 19,600."""

_BRACES = re.compile(r"\{([^{}]*)\}")


@dataclass(frozen=True)
class Options:
    """The options, and what stood for several of them.

    names   every option, in the order listed everywhere
    series  per option written with {GROUP}, as written: the positions of those it stands for
    within  per such option, by position: the parties put for {GROUP}
    """

    names: tuple[str, ...]
    series: Mapping[str, tuple[int, ...]] = field(default_factory=dict)
    within: Mapping[int, frozenset[str]] = field(default_factory=dict)

    def keys(
        self, written: Iterable[str], own: str | None, group: str | None = None
    ) -> tuple[list[str | None], list[str]]:
        """Per option the key of a table it takes its amount from (or None), and unknown keys.

        own    the name that {name} stands for in this table; None where it stands for nothing
        group  the group of that party
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
            elif (
                own is not None
                and f"{{{OWN}}}" in key
                and named(key, f"{{{group}}}") in self.series
            ):
                series = self.series[named(key, f"{{{group}}}")]
                mine += [(key, k) for k in series if own in self.within[k]]
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
    names: dict[str, None] = {}
    series: dict[str, tuple[int, ...]] = {}
    within: dict[int, frozenset[str]] = {}
    for index, option in enumerate(raw):
        here = f"{place}[{index}]"
        group = _group(option, here, roster, report)
        if group is None:
            continue
        first, braces = len(names), f"{{{group}}}"
        parties = [str(roster.names[i]) for i in roster.groups.get(group, ())]
        places = option.count(braces) if group else 0
        count = math.comb(len(parties), places)
        if not count:
            remedy = "Write fewer places, or a larger count."
            report.add(here, describe(option), f"{braces} at most {len(parties)} times", remedy)
            continue
        if first + count > MOST:
            found = f"{describe(option)}, which makes {first + count:,} options"
            report.add(here, found, f"at most {MOST:,}", "Take fewer parties or fewer places.")
            continue
        longest = ""
        for chosen in itertools.combinations(parties, places):
            name = _written(option, braces, chosen)
            longest = max(longest, name, key=len)
            if name in names:
                report.add(here, f"{name!r} a second time", "each once", "Remove one.")
            within[len(names)] = frozenset(chosen)
            names[name] = None
        if group:
            series[option] = tuple(range(first, len(names)))
            read_name(longest, here, report, "a name")
    sound = len(report) == before and roster.counted
    return Options(tuple(names), series, within) if sound else Options(())


def _written(option: str, braces: str, chosen: Sequence[str]) -> str:
    """An option with parties put for the braces, one after the other."""
    for name in chosen:
        option = option.replace(braces, name, 1)
    return option


def _group(option: str, place: str, roster: Roster, report: Report) -> str | None:
    """The group an option has in braces, empty for none; None after noting that it is no group."""
    words: list[str] = list(dict.fromkeys(_BRACES.findall(option)))
    if not words:
        return ""
    if len(words) == 1 and words[0] in roster.groups:
        return words[0]
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
