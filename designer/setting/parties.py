"""The parties' names and types, read before anything that refers to them.

A [[party]] with `count = 8` states eight parties alike, NAME 1 to NAME 8: a *group*. Each has
its own type; types, prior, worths and the rest are read once and stand for each of them.
Wherever the file names parties, the group's name stands for each of its members.
"""

from __future__ import annotations

import keyword
from collections.abc import Mapping
from dataclasses import dataclass, field
from fractions import Fraction
from functools import cached_property
from types import MappingProxyType
from typing import Any

from designer.setting import exact
from designer.setting.expression import RESERVED, Names
from designer.setting.reading import (
    Refused,
    Report,
    Section,
    describe,
    join,
    listing,
    read_name,
    read_number,
)
from designer.setting.setting import Type

KEYS = ("name", "count", "types", "prior", "weights", "value", "outside", "compelled")
TAKEN = ("worth", "pot", "parties")
"""Words of the [goal] blend; a party of that name could not be told from them."""

OWN = "name"
"""In the options and worths of parties alike, {name} is the party's own name."""

MOST_ALIKE = 1_000
"""Largest count. Tables, proofs and screens have an entry or a line for every party: more would
be read by nobody, and a count beyond this is more likely a slip of the pen."""


@dataclass
class Roster:
    """Who the parties are, as far as could be read; None where it could not.

    Filled by `read_roster`, and left as it is from then on. Every list has an entry per party.

    sections  its table in the file: one and the same for all parties of a group
    heads     the first party of its table: the party itself unless it is one of a group
    groups    the members of each group, by the group's name
    counted   whether every count could be read
    """

    sections: list[Section] = field(default_factory=list)
    names: list[str | None] = field(default_factory=list)
    types: list[tuple[Type, ...] | None] = field(default_factory=list)
    positions: list[dict[str, int]] = field(default_factory=list)
    heads: list[int] = field(default_factory=list)
    groups: dict[str, tuple[int, ...]] = field(default_factory=dict)
    counted: bool = True

    @property
    def complete(self) -> bool:
        """Whether every name and type list was read."""
        return None not in self.names and None not in self.types

    @cached_property
    def shape(self) -> tuple[int, ...]:
        """(T_1, ..., T_n), counting 1 where the types could not be read."""
        return tuple(len(types) if types else 1 for types in self.types)

    def expression_names(self, own: int | None) -> Names:
        """What expressions of one party (None: the designer) may name."""
        return Names(own, *self._names, self.groups)

    @cached_property
    def _names(self) -> tuple[tuple[str | None, ...], tuple[frozenset[str] | None, ...]]:
        fields = tuple(
            None if types is None else frozenset(name for kind in types for name in kind.fields)
            for types in self.types
        )
        return tuple(self.names), fields

    def known_names(self) -> list[str]:
        """The names that could be read."""
        return [name for name in self.names if name is not None]

    @cached_property
    def group_of(self) -> Mapping[int, str]:
        """The group of each party that is one of parties alike."""
        return {party: group for group, members in self.groups.items() for party in members}

    def called(self, name: str) -> tuple[int, ...]:
        """The parties a name stands for: a party, or all members of a group; maybe none."""
        if name in self.names:
            return (self.names.index(name),)
        return self.groups.get(name, ())

    def position(self, party: int, raw: object, place: str, report: Report) -> int | None:
        """The position of a type of a party, matched by value if a number, else by name."""
        label = canonical(raw)
        known = self.positions[party]
        if label is not None and label in known:
            return known[label]
        if self.types[party] is not None:
            report.add(
                place,
                describe(raw),
                f"a type of {self.names[party] or 'that party'}: {listing(known)}",
                report.near(raw, known) or "Write one of its types.",
            )
        return None

    def profile(self, at: dict[str, Any], place: str, report: Report) -> tuple[int, ...] | None:
        """One type position per party from a table party = type; every party once.

        A group's name gives the type of those of its members that are not named themselves.
        """
        known = [*self.known_names(), *self.groups]
        for key in at:
            if key not in known and None not in self.names:
                report.add(
                    join(place, key),
                    f"an unknown party {describe(key)}",
                    f"one of {listing(self.known_names())}",
                    report.near(key, known) or "Remove it.",
                )
        found: dict[str, int | None] = {}
        steps: list[int | None] = []
        for party, name in enumerate(self.names):
            called = name if name in at else self.group_of.get(party)
            if name is None or called is None or called not in at:
                if name is not None:
                    self._no_type(party, at, place, report)
                steps.append(None)
                continue
            if called not in found:
                found[called] = self.position(party, at[called], join(place, called), report)
            steps.append(found[called])
        complete = [step for step in steps if step is not None]
        return tuple(complete) if len(complete) == len(steps) else None

    def _no_type(self, party: int, at: dict[str, Any], place: str, report: Report) -> None:
        """Note that a profile says nothing of a party; once for a group none of which it names."""
        name = str(self.names[party])
        group = self.group_of.get(party)
        if group is not None and not any(self.names[one] in at for one in self.groups[group]):
            if party != self.heads[party]:
                return
            name = group
        report.add(join(place, name), "nothing", "a type of every party", f"Add {name} = TYPE.")


def canonical(raw: object) -> str | None:
    """The label a raw type goes by: exact text for numbers ("1/2" for 0.5), else the name."""
    if isinstance(raw, bool):
        return None
    if isinstance(raw, (int, Fraction)):
        return exact.text(raw)
    if isinstance(raw, str):
        try:
            return exact.text(exact.number(raw))
        except ValueError:
            return raw
    return None


def read_roster(root: Section) -> Roster:
    """Names and types of all [[party]] tables."""
    if "party" not in root:
        root.wrong("party", "at least one [[party]]", "Describe each party in a table [[party]].")
    roster = Roster()
    sections = root.sections("party")
    taken: dict[str, str] = {}
    counts: list[int] = []
    for section in sections:
        count = read_count(section)
        names = read_party_names(section, count, taken)
        taken |= {name: section.place for name in names if name is not None}
        if names[0] is not None:
            section.place += f" '{section.values['name']}'"
        head = len(roster.names)
        if count is not None and "count" in section and names[0] is not None:
            members = tuple(range(head, head + count))
            roster.groups[section.values["name"]] = members
            taken[section.values["name"]] = taken[names[0]]
        roster.counted = roster.counted and count is not None
        roster.names += names
        counts.append(len(names))
    for section, count in zip(sections, counts, strict=True):
        section.only(*KEYS)
        types = read_types(section)
        positions = {kind.label: a for a, kind in enumerate(types or ())}
        roster.heads += [len(roster.heads)] * count
        roster.sections += [section] * count
        roster.types += [types] * count
        roster.positions += [positions] * count
    return roster


def read_count(section: Section) -> int | None:
    """How many parties alike a table states; 1 where it does not say, None where mistaken."""
    count = section.values.get("count", 1)
    if isinstance(count, int) and not isinstance(count, bool) and 1 <= count <= MOST_ALIKE:
        return count
    remedy = "Write count = 8 for eight parties alike, each with its own type."
    if isinstance(count, int) and count > MOST_ALIKE:
        remedy = "State fewer parties, each standing for several."
    section.wrong("count", f"a whole number from 1 to {MOST_ALIKE:,}", remedy)
    return None


def read_party_names(
    section: Section, count: int | None, taken: Mapping[str, str]
) -> list[str | None]:
    """The names of the parties of one table, unlike those taken and the words the blend keeps.

    NAME alone, or NAME 1 to NAME count; [None] for each where the name is mistaken, and a
    single None where the count is. `taken` says by which table.
    """
    unknown: list[str | None] = [None] * (count or 1)
    if "name" not in section:
        section.wrong("name", "a name", 'Write name = "…".')
        return unknown
    name = read_name(section.values["name"], section.at("name"), section.report, "a name")
    if name is None:
        return unknown
    if name in TAKEN:
        section.wrong(
            "name",
            f"a name other than {listing(TAKEN)}",
            "Rename it: in the blend of goals these words mean something else.",
        )
        return unknown
    if name == OWN and "count" in section:
        section.wrong(
            "name",
            f"a name other than {OWN}",
            f"Rename them: {{{OWN}}} stands for each one's own name.",
        )
        return unknown
    if count is None:
        return unknown
    names = [name] if count == 1 else [f"{name} {number}" for number in range(1, count + 1)]
    for one in (name, *names):
        if one in taken:
            _collides(section, one, taken[one])
            return unknown
    if count > 1 and read_name(names[-1], section.at("name"), section.report, "a name") is None:
        return unknown  # too long with its number
    return list(names)


def _collides(section: Section, name: str, other: str) -> None:
    """Note that a name is another table's already."""
    if name == section.values["name"]:
        section.wrong("name", f"a name unlike {other}'s", "Give each party its own name.")
    else:
        section.report.add(
            section.at("name"),
            f"{describe(section.values['name'])}, whose count makes {describe(name)} of it",
            f"a name unlike {other}'s",
            "Give each party its own name.",
        )


def read_types(section: Section) -> tuple[Type, ...] | None:
    """The types of a party; None if any is mistaken."""
    raw = section.values.get("types")
    if not isinstance(raw, list) or not raw:
        section.wrong("types", "a list of types", 'Write types = [20, 50] or ["low", "high"].')
        return None
    types: list[Type] = []
    labels: set[str] = set()
    for index, entry in enumerate(raw):
        place = f"{section.at('types')}[{index}]"
        kind = read_type(entry, place, section.report)
        if kind is None:
            continue
        if kind.label in labels:
            section.report.add(
                place,
                f"the type {describe(kind.label)} a second time",
                "each type once",
                "Remove it, and add its weight to the other.",
            )
            continue
        labels.add(kind.label)
        types.append(kind)
    return tuple(types) if len(types) == len(raw) else None


def read_type(entry: object, place: str, report: Report) -> Type | None:
    """A number, a name, or a table { name = ..., number = ..., FIELD = ... }."""
    if isinstance(entry, dict):
        return _type_with_fields(Section(entry, place, report))
    if isinstance(entry, (int, Fraction, Refused)) and not isinstance(entry, bool):
        value = read_number(entry, place, report)
        return None if value is None else Type(exact.text(value), value)
    if not isinstance(entry, str):
        report.add(
            place,
            describe(entry),
            "a number, a name or a table",
            'Write 20, "low" or { name = "low", a = 3 }.',
        )
        return None
    try:
        exact.number(entry)
    except ValueError:
        name = read_name(entry, place, report, "a name")
        return None if name is None else Type(name)
    value = read_number(entry, place, report)
    return None if value is None else Type(exact.text(value), value)


def _type_with_fields(section: Section) -> Type | None:
    report = section.report
    before = len(report)
    if "name" not in section:
        section.wrong("name", "a name or a number", 'Write { name = "low", … }.')
        return None
    if isinstance(section.values["name"], dict):
        section.wrong("name", "a name or a number", 'Write { name = "low", … }.')
        return None
    kind = read_type(section.values["name"], section.at("name"), report)
    number = kind.number if kind is not None else None
    if "number" in section:
        number = section.number("number")
    fields: dict[str, Fraction] = {}
    for key in section.values:
        if key in ("name", "number"):
            continue
        if not key.isidentifier() or keyword.iskeyword(key) or key in RESERVED or len(key) > 60:
            report.add(
                section.at(key),
                f"a field called {describe(key)}",
                "a plain word that the value language does not use itself",
                "Rename it: letters, digits and _, other than type, types, min, max, abs, if, …",
            )
            continue
        value = section.number(key)
        if value is not None:
            fields[key] = value
    if kind is None or len(report) > before:
        return None
    return Type(kind.label, number, MappingProxyType(dict(sorted(fields.items()))))
