"""Worths and outside options: numbers, expressions and lists, to integers over one grain."""

from __future__ import annotations

import math
from collections.abc import Sequence
from fractions import Fraction
from typing import Any, cast

import numpy as np

from designer.setting import exact, profiles
from designer.setting.evaluate import Amounts, collect, common_multiple, constant, evaluate
from designer.setting.expression import ExpressionError, parse, references
from designer.setting.options import Options, unknown_options
from designer.setting.parties import Roster
from designer.setting.reading import Report, Section, describe, read_number
from designer.setting.setting import IntArray, Type, integers

FORMS = 'Write a number, an expression such as "type / 2", or a list with one entry per type.'


class WorthReader:
    """Reads the money amounts of one party (or, with `own` None, of the designer).

    Parties alike share what is read: an amount of the own type alone is read for the first
    of them and moved to the others' types; one of others' types is read for each.
    """

    def __init__(
        self, roster: Roster, own: int | None, report: Report, like: WorthReader | None = None
    ) -> None:
        """Amounts may refer to the types in `roster`; `like` has read those of a party alike."""
        self.roster = roster
        self.own = own
        self.report = report
        self.first = like is None
        self.known: dict[str, tuple[Amounts | None, bool]] = {} if like is None else like.known

    def per_option(
        self, section: Section, key: str, options: Options, *, rest_is_zero: bool
    ) -> list[Amounts | None]:
        """One amount per option from a table option = amount."""
        missing = constant(Fraction(0)) if rest_is_zero else None
        result: list[Amounts | None] = [missing] * len(options.names)
        if key not in section:
            if not rest_is_zero and self.first:
                section.wrong(key, "a worth for every option", f"Write {key} = {{ … }}.")
            return result
        table = section.section(key) if self.first else Section(section.values[key], "", Report())
        if table is None or not isinstance(table.values, dict):
            return result
        table.place = section.at(key)
        own = self.own
        alike = own is not None and own in self.roster.group_of
        mine = self.roster.names[own] if own is not None and alike else None
        chosen: list[str | None] = []
        if options.names:
            chosen, unknown = options.keys(
                table.values, mine, None if own is None else self.roster.group_of.get(own)
            )
            if self.first:
                unknown_options(unknown, options, mine, table.place, self.report)
        else:
            for name, raw in table.values.items():
                self.read(raw, table.at(name))
        for k, written in enumerate(chosen):
            if written is not None:
                result[k] = self.read(table.values[written], table.at(written))
        if self.first and not rest_is_zero:
            for name in options.written(k for k, one in enumerate(chosen) if one is None):
                table.wrong(name, "a worth for every option", "Write 0 if it is worth nothing.")
        return result

    def read(self, raw: object, place: str) -> Amounts | None:
        """An amount in any of its forms, in its shortest form; None when mistaken."""
        if place in self.known:
            amounts, others = self.known[place]
            if amounts is None or not amounts.axes:
                return amounts
            if not others and self.own is not None:
                return Amounts((self.own,), amounts.num, amounts.den)
        amounts = self._read(raw, place)
        # The expression itself tells: types["Farm 2"] is its own type to one of the group.
        self.known[place] = amounts, "types" in str(raw) or _deep(raw)
        return amounts

    def _read(self, raw: object, place: str) -> Amounts | None:
        before = len(self.report)
        amounts = None
        try:
            if isinstance(raw, list) and self.own is not None:
                amounts = self.listed(raw, place, self.own)
            else:
                amounts = self.single(raw, place, self.roster.types)
        except ExpressionError as fault:
            self.report.add(place, fault.found, fault.expected, fault.remedy)
        if amounts is None or len(self.report) > before:
            return None
        num, axes = profiles.narrow(amounts.num, amounts.axes)
        return Amounts(axes, num, amounts.den)

    def single(
        self, raw: object, place: str, types: Sequence[tuple[Type, ...] | None]
    ) -> Amounts | None:
        """A number or an expression."""
        if not isinstance(raw, str) or _is_number(raw):
            if isinstance(raw, (list, dict)):
                remedy = FORMS if self.own is not None else "Write a number."
                self.report.add(place, describe(raw), "an amount of money", remedy)
                return None
            value = read_number(raw, place, self.report)
            return None if value is None else constant(value)
        try:
            tree = parse(raw, self.roster.expression_names(self.own))
            if any(types[party] is None for party in references(tree)):
                return None  # the mistakes in those types are already noted
            names = [name or f"party[{i}]" for i, name in enumerate(self.roster.names)]
            return evaluate(tree, [kinds or () for kinds in types], names)
        except ExpressionError as fault:
            self.report.add(place, fault.found, fault.expected, fault.remedy)
            return None

    def listed(self, raw: list[object], place: str, own: int) -> Amounts | None:
        """One entry per own type; or lists in lists, one level per party in file order."""
        types = self.roster.types
        if types[own] is None:
            return None
        if _deep(raw):
            return self.nested(raw, place)
        if not self.counted(raw, place, own):
            return None
        slices: list[Amounts] = []
        for a, (entry, kind) in enumerate(zip(raw, types[own] or (), strict=True)):
            alone = [*types[:own], (kind,), *types[own + 1 :]]
            amounts = self.single(entry, f"{place}[{a}]", alone)
            if amounts is not None:
                slices.append(amounts)
        if len(slices) < len(raw):
            return None
        return _stack(slices, own, self.roster.shape)

    def nested(self, raw: list[object], place: str) -> Amounts | None:
        """A number for every profile."""
        if len(self.roster.groups.get(self.roster.group_of.get(self.own or 0, ""), ())) > 1:
            self.report.add(
                place,
                "lists in lists, for several parties alike",
                "worths that each one's own position gives",
                "Write an expression of type and types.PARTY, or the parties one by one.",
            )
            return None
        if not self.roster.complete:
            return None
        shape = self.roster.shape
        if math.prod(shape) > profiles.MOST:
            too_many(math.prod(shape), place, self.report)
            return None
        values: list[Fraction] = []
        before = len(self.report)

        def walk(level: object, depth: int, place: str) -> None:
            if depth == len(shape):
                value = read_number(level, place, self.report)
                values.append(value if value is not None else Fraction(0))
            elif not isinstance(level, list):
                self.report.add(
                    place,
                    describe(level),
                    f"a list, one entry per type of {self.roster.names[depth]}",
                    "Lists in lists have one level per party, in file order.",
                )
            elif self.counted(level, place, depth):
                for a, entry in enumerate(level):
                    walk(entry, depth + 1, f"{place}[{a}]")

        walk(raw, 0, place)
        if len(self.report) > before:
            return None
        axes = profiles.wide(shape)
        return collect(values, axes, tuple(shape[axis] for axis in axes))

    def counted(self, raw: list[object], place: str, party: int) -> bool:
        """Whether a list has one entry per type of a party; a mistake if not."""
        size = self.roster.shape[party]
        if len(raw) == size:
            return True
        self.report.add(
            place,
            describe(raw),
            f"{size} entr{'ies' if size > 1 else 'y'}, one per type of {self.roster.names[party]}",
            "Add or remove entries.",
        )
        return False


def too_many(count: int, place: str, report: Report) -> None:
    """Note that a table over all profiles would be too large."""
    report.add(
        place,
        f"a table over {profiles.shown(count)} profiles",
        f"at most {profiles.MOST:,}",
        "Use independent priors and worths of the own type, or coarser types.",
    )


def grain_of(amounts: Sequence[Amounts]) -> int:
    """The least common denominator of all money in the setting.

    Raises ExpressionError when it has more than `MAX_BITS` binary digits.
    """
    return common_multiple(
        each.den // math.gcd(each.den, int(np.gcd.reduce(np.ravel(each.num)))) for each in amounts
    )


def whole(amounts: Amounts, grain: int) -> IntArray:
    """Units of 1/grain, num * grain / den: whole, as the grain is a common denominator."""
    num = np.asarray(amounts.num, dtype=object) * grain // amounts.den
    return integers(num, np.shape(amounts.num))


def per_type(amounts: Sequence[Amounts], size: int, grain: int) -> IntArray:
    """Amounts of the own type only, as columns: (T_i, columns)."""
    columns = [np.broadcast_to(cast(Any, whole(each, grain)), (size,)) for each in amounts]
    return frozen(integers(np.stack(columns, axis=1)))


def per_profile(amounts: Sequence[Amounts], shape: Sequence[int], grain: int) -> IntArray:
    """Amounts of any types, as columns over all profiles: (N, columns)."""
    columns: list[Any] = [profiles.spread(whole(each, grain), each.axes, shape) for each in amounts]
    table: IntArray = np.stack(columns, axis=1)  # one wide column makes all of them Python ints
    return frozen(table)


def frozen(array: IntArray) -> IntArray:
    """The array, closed to writing."""
    array.flags.writeable = False
    return array


def _stack(slices: Sequence[Amounts], own: int, shape: Sequence[int]) -> Amounts:
    """Amounts of one own type each, joined along the own axis."""
    axes = tuple(sorted({own}.union(*(each.axes for each in slices))))
    at = axes.index(own)
    den = common_multiple(each.den for each in slices)
    full = [1 if axis == own else shape[axis] for axis in axes]
    parts = []
    for each in slices:
        sizes = [1 if axis == own or axis not in each.axes else shape[axis] for axis in axes]
        part = np.asarray(each.num, dtype=object).reshape(sizes) * (den // each.den)
        parts.append(np.broadcast_to(part, full))
    return Amounts(axes, np.concatenate(parts, axis=at), den)


def _deep(raw: object) -> bool:
    """Whether lists are in lists: amounts over profiles."""
    return isinstance(raw, list) and any(isinstance(entry, list) for entry in raw)


def _is_number(raw: str) -> bool:
    try:
        exact.number(raw)
    except ValueError:
        return False
    return True
