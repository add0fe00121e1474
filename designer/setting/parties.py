"""The parties' names and types, read before anything that refers to them."""

from __future__ import annotations

import keyword
from collections.abc import Sequence
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

KEYS = ("name", "types", "prior", "weights", "value", "outside", "compelled")
TAKEN = ("worth", "pot", "parties")
"""Words of the [goal] blend; a party of that name could not be told from them."""


@dataclass
class Roster:
    """Who the parties are, as far as could be read; None where it could not.

    Filled by `read_roster`, and left as it is from then on.
    """

    sections: list[Section]
    names: list[str | None]
    types: list[tuple[Type, ...] | None]
    positions: list[dict[str, int]] = field(default_factory=list)

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
        return Names(own, *self._names)

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
        """One type position per party from a table party = type; every party once."""
        found: list[int | None] = []
        for key in at:
            if key not in self.names and None not in self.names:
                report.add(
                    join(place, key),
                    f"an unknown party {describe(key)}",
                    f"one of {listing(self.known_names())}",
                    report.near(key, self.known_names()) or "Remove it.",
                )
        for party, name in enumerate(self.names):
            if name is None:
                found.append(None)
            elif name not in at:
                found.append(None)
                report.add(
                    join(place, name), "nothing", "a type of every party", f"Add {name} = TYPE."
                )
            else:
                found.append(self.position(party, at[name], join(place, name), report))
        complete = [step for step in found if step is not None]
        return tuple(complete) if len(complete) == len(found) else None


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
    sections = root.sections("party")
    roster = Roster(sections, [], [])
    for section in sections:
        name = read_party_name(section, roster.names)
        if name is not None:
            section.place += f" '{name}'"
        roster.names.append(name)
    for section in sections:
        section.only(*KEYS)
        types = read_types(section)
        roster.types.append(types)
        roster.positions.append({kind.label: a for a, kind in enumerate(types or ())})
    return roster


def read_party_name(section: Section, earlier: Sequence[str | None]) -> str | None:
    """The name of a party, unlike those before it and the words the blend keeps."""
    if "name" not in section:
        section.wrong("name", "a name", 'Write name = "…".')
        return None
    name = read_name(section.values["name"], section.at("name"), section.report, "a name")
    if name in TAKEN:
        section.wrong(
            "name",
            f"a name other than {listing(TAKEN)}",
            "Rename it: in the blend of goals these words mean something else.",
        )
        return None
    if name is not None and name in earlier:
        section.wrong(
            "name", f"a name unlike party[{earlier.index(name)}]'s", "Give each party its own name."
        )
        return None
    return name


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
