"""Scenario files: text in, one complete, exact and frozen `Setting` out, or every mistake.

    setting = read_scenario("scenarios/breakwater.toml")     # or ScenarioError
    again   = parse_scenario(dump(setting))                   # equal in every array

The keys of the file are described by the JSON Schema beside this module
(`designer.setting.schema`) and in the README.
"""

from __future__ import annotations

import math
import re
import tomllib
from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path
from typing import Any, TypeVar

from designer.errors import ScenarioError
from designer.setting import exact, profiles
from designer.setting.asked import read_asked, read_limits, read_side
from designer.setting.dump import digest_of, dump
from designer.setting.evaluate import Amounts, constant
from designer.setting.expression import ExpressionError
from designer.setting.options import Options, expand
from designer.setting.parties import Roster, read_roster
from designer.setting.priors import read_joint, read_own_priors
from designer.setting.reading import Refused, Report, Section, describe, read_name
from designer.setting.rule import read_rule
from designer.setting.setting import IntArray, Party, Setting
from designer.setting.sheet import MAX_BYTES, read_text
from designer.setting.worths import (
    WorthReader,
    grain_of,
    per_profile,
    per_type,
    too_many,
)

__all__ = ["dump", "parse_scenario", "read_scenario"]

KEYS = (
    "title",
    "money",
    "note",
    "profiles",
    "decisions",
    "designer",
    "party",
    "joint",
    "rule",
    "limits",
    "side",
    "demands",
    "goal",
)
UNTITLED = "Untitled scenario"
MONEY = "money units"


def read_scenario(path: str | Path) -> Setting:
    """The setting a scenario file states (TOML, UTF-8), exact and frozen.

    Sheets named in it (joint.csv, rule.csv) are found relative to its own folder. Raises
    ScenarioError with every independent mistake: place, found, expected, remedy.
    """
    path = Path(path)
    report = Report()
    text = read_text(path, "file", report)
    if text is None:
        raise ScenarioError(report.mistakes(), str(path))
    return parse_scenario(text, folder=path.parent, source=str(path))


def parse_scenario(text: str, *, folder: Path | None = None, source: str = "scenario") -> Setting:
    """The setting a scenario's text states; see `read_scenario`.

    folder  where sheets named in the text are looked for; None: nowhere
    source  what mistakes are reported as being in

    >>> setting = parse_scenario('''
    ... title = "A gate"
    ... decisions.options = ["open", "shut"]
    ... [[party]]
    ... name = "Suth"
    ... types = [1, 2]
    ... weights = [1, 3]
    ... value = { open = "type / 2", shut = 0 }
    ... ''')
    >>> setting.parties[0].value.tolist(), setting.grain
    ([[1, 0], [2, 0]], 2)
    """
    report = Report()
    values = _toml(text, report)
    if values is None:
        raise ScenarioError(report.mistakes(), source)
    setting = _Reader(Section(values, "", report), folder).setting()
    if setting is None or len(report):
        raise ScenarioError(report.mistakes(), source)
    return replace(setting, digest=digest_of(setting))


def _toml(text: str, report: Report) -> dict[str, Any] | None:
    """The plain tree of a TOML text, decimals exact."""
    if len(text) > MAX_BYTES:
        report.add("file", f"{len(text):,} characters", f"at most {MAX_BYTES:,}", "Shorten it.")
        return None
    try:
        return tomllib.loads(text.removeprefix("\ufeff"), parse_float=_decimal)
    except tomllib.TOMLDecodeError as failure:
        report.add(*_syntax(str(failure), text))
    except ValueError:  # Python's own limit on the digits of an integer
        report.add(
            "file",
            "an integer of more than 4,300 digits",
            "numbers of a bearable size",
            "Choose a larger unit of money.",
        )
    except RecursionError:
        report.add("file", "lists or tables nested too deep", "a flatter file", "Flatten it.")
    return None


def _decimal(written: str) -> object:
    try:
        return exact.number(written.replace("_", ""))
    except ValueError:
        return Refused(written)


_WHERE = re.compile(
    r"(?P<why>.*) \(at (?:line (?P<line>\d+), column (?P<column>\d+)|end of document)\)", re.DOTALL
)


def _syntax(message: str, text: str) -> tuple[str, str, str, str]:
    """A TOML error as place, found, expected, remedy."""
    lines = text.replace("\r\n", "\n").split("\n")
    where = _WHERE.fullmatch(message)
    line, column, why = len(lines), len(lines[-1]) + 1, message
    if where:
        why = where["why"]
        if where["line"]:
            line, column = int(where["line"]), int(where["column"])
    found = describe(lines[min(line, len(lines)) - 1].strip())
    return f"line {line}, column {column}", found, "valid TOML", f"{why}."


class _Reader:
    """One reading: goes on after a mistake, so that all of them are found."""

    def __init__(self, root: Section, folder: Path | None) -> None:
        self.root = root
        self.report = root.report
        self.folder = folder

    def setting(self) -> Setting | None:
        """The setting without its digest; None if any mistake was noted."""
        root = self.root
        root.only(*KEYS)
        title = root.text("title", UNTITLED)
        money = root.text("money", MONEY)
        note = root.text("note", "", lines=True)
        support_only = root.word("profiles", ("all", "support"), "all") == "support"
        options_read = self.options()
        roster = read_roster(root)
        options = expand(options_read, "decisions.options", roster, self.report)
        outlay, worth = self.designer(roster, options)
        values, outsides = self.worths(roster, options)
        heads = sorted(set(roster.heads))
        compels = {i: roster.sections[i].flag("compelled") for i in heads}
        compelled = [compels[head] for head in roster.heads]
        joint, weights = self.priors(roster)
        rule = read_rule(root, roster, options.names, self.folder) if "rule" in root else None
        limits = read_limits(root)
        side = read_side(root, roster, options)
        asked = read_asked(root, roster)
        amounts = [*outlay, *worth, *outsides, *(one for row in values for one in row)]
        grain = self.grain(amounts)
        if len(self.report):
            return None
        shape = roster.shape
        parties = []
        for i in range(len(shape)):
            value, depends = _array([_sure(one) for one in values[i]], i, shape, grain)
            outside, outside_depends = _array([_sure(outsides[i])], i, shape, grain)
            outside = outside.reshape(-1)  # one column
            parties.append(
                Party(
                    name=_sure(roster.names[i]),
                    types=_sure(roster.types[i]),
                    weights=_sure(weights[i]),
                    value=value,
                    outside=outside,
                    depends=depends,
                    outside_depends=outside_depends,
                    compelled=compelled[i],
                )
            )
        table, rule_den = rule or (None, 1)
        return Setting(
            title=title,
            options=options.names,
            parties=tuple(parties),
            outlay=per_type([_sure(one) for one in outlay], 1, grain)[0],
            worth=per_type([_sure(one) for one in worth], 1, grain)[0],
            grain=grain,
            joint=joint,
            rule=table,
            rule_den=rule_den,
            support_only=support_only,
            limits=limits,
            side=side,
            asked=asked,
            money=money,
            note=note,
        )

    def options(self) -> list[str]:
        """The decisions to choose from; empty when mistaken, and then nothing is held to them."""
        if "decisions" not in self.root:
            self.root.wrong("decisions", "the options", 'Write [decisions] and options = ["…"].')
        section = self.root.section("decisions")
        if section is None:
            return []
        section.only("options")
        raw = section.values.get("options")
        if not isinstance(raw, list) or not raw:
            section.wrong("options", "a list of names", 'Write options = ["build", "leave"].')
            return []
        before = len(self.report)
        options: list[str] = []
        for index, entry in enumerate(raw):
            place = f"{section.at('options')}[{index}]"
            name = read_name(entry, place, self.report, "a name")
            if name in options:
                self.report.add(place, f"{name!r} a second time", "each once", "Remove one.")
            elif name is not None:
                options.append(name)
        return options if len(self.report) == before else []

    def designer(
        self, roster: Roster, options: Options
    ) -> tuple[list[Amounts | None], list[Amounts | None]]:
        """The designer's outlay and worth per option; what is not given is 0."""
        section = self.root.section("designer") or Section({}, "designer", self.report)
        section.only("outlay", "worth")
        reader = WorthReader(roster, None, self.report)
        outlay = reader.per_option(section, "outlay", options, rest_is_zero=True)
        worth = reader.per_option(section, "worth", options, rest_is_zero=True)
        return outlay, worth

    def worths(
        self, roster: Roster, options: Options
    ) -> tuple[list[list[Amounts | None]], list[Amounts | None]]:
        """Each party's worth per option, and its outside option."""
        count = math.prod(roster.shape)
        values: list[list[Amounts | None]] = []
        outsides: list[Amounts | None] = []
        readers: list[WorthReader] = []
        for i, (section, head) in enumerate(zip(roster.sections, roster.heads, strict=True)):
            reader = WorthReader(roster, i, self.report, readers[head] if head < i else None)
            readers.append(reader)
            value = reader.per_option(section, "value", options, rest_is_zero=False)
            outside: Amounts | None = constant(0)
            if "outside" in section:
                outside = reader.read(section.values["outside"], section.at("outside"))
            for key, amounts in (("value", value), ("outside", [outside])):
                others = any(one is not None and set(one.axes) - {i} for one in amounts)
                if others and head == i and count > profiles.MOST:
                    too_many(count, section.at(key), self.report)
            values.append(value)
            outsides.append(outside)
        return values, outsides

    def priors(self, roster: Roster) -> tuple[IntArray | None, Sequence[tuple[int, ...] | None]]:
        """The joint prior if there is one, and the parties' (marginal) weights."""
        if "joint" not in self.root:
            return None, read_own_priors(roster)
        read = read_joint(self.root, roster, self.folder)
        return read or (None, [])

    def grain(self, amounts: Sequence[Amounts | None]) -> int:
        """The common denominator of all money that could be read."""
        try:
            return grain_of([one for one in amounts if one is not None])
        except ExpressionError as fault:
            self.report.add("file", fault.found, fault.expected, fault.remedy)
            return 1


def _array(
    amounts: Sequence[Amounts], own: int, shape: Sequence[int], grain: int
) -> tuple[IntArray, bool]:
    """(T_i, columns), or (N, columns) and True where some amount depends on other parties."""
    if any(set(one.axes) - {own} for one in amounts):
        return per_profile(amounts, shape, grain), True
    return per_type(amounts, shape[own], grain), False


_Value = TypeVar("_Value")


def _sure(value: _Value | None) -> _Value:
    """The value, which is there because no mistake was noted."""
    if value is None:
        raise AssertionError("a part is missing although no mistake was noted")
    return value
