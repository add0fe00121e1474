"""The canonical text of a setting, and its digest.

Two scenario files that state the same setting have the same canonical text, however they
are laid out: sheets are written out as entries, expressions as the worths they stand for,
weights and numbers in lowest terms, keys in one order, defaults left out. Reading the
canonical text gives the setting again, equal in every array.
"""

from __future__ import annotations

import contextlib
import hashlib
import itertools
import math
import re
from collections.abc import Iterator, Mapping, Sequence
from fractions import Fraction
from typing import Any, cast

import numpy as np

from designer.setting import exact, profiles
from designer.setting.setting import IntArray, Party, Setting, Side, Type

_BARE = re.compile(r"[A-Za-z0-9_-]+", re.ASCII)
_ESCAPES = {'"': '\\"', "\\": "\\\\", "\n": "\\n", "\t": "\\t", "\r": "\\r"}


def dump(setting: Setting) -> str:
    """The canonical scenario text (TOML): parse_scenario(dump(x)) equals x in every array."""
    return "".join(f"{line}\n" for line in _lines(setting))


def digest_of(setting: Setting) -> str:
    """SHA-256 (hex) of the canonical text."""
    digest = hashlib.sha256()
    for line in _lines(setting):
        digest.update(f"{line}\n".encode())
    return digest.hexdigest()


def _lines(setting: Setting) -> Iterator[str]:
    yield f"title = {_quoted(setting.title)}"
    yield f"money = {_quoted(setting.money)}"
    if setting.note:
        yield f"note = {_quoted(setting.note)}"
    if setting.support_only:
        yield 'profiles = "support"'
    yield ""
    yield "[decisions]"
    yield f"options = [{', '.join(map(_quoted, setting.options))}]"
    yield from _designer(setting)
    for index in range(len(setting.parties)):
        yield from _party(setting, index)
    yield from _joint(setting)
    yield from _rule(setting)
    yield from _limits(setting)
    yield from _side(setting)
    yield from _asked(setting.asked)


def _designer(setting: Setting) -> Iterator[str]:
    for key, amounts in (("outlay", setting.outlay), ("worth", setting.worth)):
        if any(int(amount) for amount in amounts):
            pairs = zip(setting.options, amounts, strict=True)
            shares = {option: Fraction(int(amount), setting.grain) for option, amount in pairs}
            yield ""
            yield f"[designer.{key}]"
            yield from (f"{_key(name)} = {_number(share)}" for name, share in shares.items())


def _party(setting: Setting, index: int) -> Iterator[str]:
    party = setting.parties[index]
    yield ""
    yield "[[party]]"
    yield f"name = {_quoted(party.name)}"
    yield f"types = [{', '.join(map(_type, party.types))}]"
    if setting.joint is None:
        factor = math.gcd(*party.weights) or 1
        yield f"weights = [{', '.join(_number(w // factor) for w in party.weights)}]"
    outside = party.outside
    if party.outside_depends or any(int(amount) for amount in outside):
        yield f"outside = {_worth(outside, party.outside_depends, setting, index)}"
    if party.compelled:
        yield "compelled = true"
    yield "[party.value]"
    for k, option in enumerate(setting.options):
        yield f"{_key(option)} = {_worth(party.value[:, k], party.depends, setting, index)}"


def _worth(column: IntArray, depends: bool, setting: Setting, own: int) -> str:
    """One amount per own type; a nested list where it really depends on other types."""
    if not depends:
        return _nested(column, setting.grain)
    wide = profiles.wide(setting.shape)
    table, axes = profiles.narrow(column.reshape([setting.shape[i] for i in wide]), wide)
    if set(axes) <= {own}:
        along: IntArray = np.broadcast_to(cast(Any, table), (setting.shape[own],))
        return _nested(along, setting.grain)
    return _nested(column, setting.grain, setting.shape)


def _nested(column: IntArray, grain: int, shape: Sequence[int] = ()) -> str:
    """A list; with a shape, lists in lists, the last level of its last size."""
    known: dict[int, str] = {}

    def amount(value: int) -> str:
        written = known.get(value)
        if written is None:
            written = known[value] = _number(value if grain == 1 else Fraction(value, grain))
        return written

    level = [amount(value) for value in column.tolist()]
    for size in reversed(shape[1:]):
        level = [f"[{', '.join(level[i : i + size])}]" for i in range(0, len(level), size)]
    return f"[{', '.join(level)}]"


def _ats(setting: Setting) -> Iterator[str]:
    """The profiles in words, in the order of their numbers."""
    choices = (
        [f"{_key(party.name)} = {_label(kind)}" for kind in party.types]
        for party in setting.parties
    )
    return (f"at = {{ {', '.join(named)} }}" for named in itertools.product(*choices))


def _joint(setting: Setting) -> Iterator[str]:
    if setting.joint is None:
        return
    factor = int(np.gcd.reduce(setting.joint)) or 1
    for at, weight in zip(_ats(setting), setting.joint, strict=True):
        if weight:
            yield ""
            yield "[[joint]]"
            yield at
            yield f"weight = {_number(Fraction(int(weight) // factor))}"


def _rule(setting: Setting) -> Iterator[str]:
    if setting.rule is None:
        return
    known: dict[tuple[int, ...], str] = {}
    for at, row in zip(_ats(setting), setting.rule.tolist(), strict=True):
        drawn = tuple(row)
        if drawn not in known:
            shares = (Fraction(chance, setting.rule_den) for chance in drawn)
            pairs = zip(setting.options, shares, strict=True)
            known[drawn] = ", ".join(
                f"{_key(option)} = {_number(share)}" for option, share in pairs if share
            )
        yield ""
        yield "[[rule]]"
        yield at
        yield f"take = {{ {known[drawn]} }}"


def _limits(setting: Setting) -> Iterator[str]:
    limits = setting.limits
    numbers = {"pays_at_most": limits.pays_at_most, "pays_at_least": limits.pays_at_least}
    switches = {"only_when_served": limits.only_when_served, "within_worth": limits.within_worth}
    body = [*_pairs(numbers), *(f"{key} = true" for key, on in switches.items() if on)]
    if body:
        yield from ("", "[limits]", *body)


def _side(setting: Setting) -> Iterator[str]:
    side = setting.side
    if side == Side():
        return
    yield from ("", "[side]")
    yield from _pairs(
        {"welfare_at_least": side.welfare_at_least, "revenue_at_least": side.revenue_at_least}
    )
    for chance in side.chances:
        party: Party = setting.parties[chance.party]
        yield ""
        yield "[[side.chance]]"
        yield f"party = {_quoted(party.name)}"
        yield f"type = {_label(party.types[chance.type])}"
        yield f"option = {_quoted(setting.options[chance.option])}"
        if chance.at_least is not None and chance.at_least == chance.at_most:
            yield f"exactly = {_number(chance.at_least)}"
        else:
            yield from _pairs({"at_least": chance.at_least, "at_most": chance.at_most})


def _asked(asked: Mapping[str, object]) -> Iterator[str]:
    demands = {key: asked[key] for key in sorted(asked) if key != "blend"}
    if demands:
        yield from ("", "[demands]")
        yield from (f"{key} = {_plain(value)}" for key, value in demands.items())
    blend = asked.get("blend")
    if isinstance(blend, Mapping):
        yield from ("", "[goal.blend]")
        yield from (f"{_key(name)} = {_plain(blend[name])}" for name in sorted(blend))


def _plain(value: object) -> str:
    match value:
        case bool():
            return "true" if value else "false"
        case int() | Fraction():
            return _number(Fraction(value))
        case str():
            return _quoted(value)
        case Sequence():
            return f"[{', '.join(map(_plain, value))}]"
        case _:
            raise TypeError(f"a demand of kind {type(value).__name__} has no place in a file")


def _pairs(numbers: Mapping[str, Fraction | None]) -> Iterator[str]:
    return (f"{key} = {_number(value)}" for key, value in numbers.items() if value is not None)


def _type(kind: Type) -> str:
    """A type as read back: bare where label and number say it all, else a table."""
    label = _label(kind)
    if not kind.fields and label[0] != '"':
        return label
    own = None
    with contextlib.suppress(ValueError):
        own = exact.number(kind.label)
    parts = [f"name = {label}"]
    if kind.number is not None and kind.number != own:
        parts.append(f"number = {_number(kind.number)}")
    parts += [f"{_key(name)} = {_number(kind.fields[name])}" for name in sorted(kind.fields)]
    return label if len(parts) == 1 else f"{{ {', '.join(parts)} }}"


def _label(kind: Type) -> str:
    if kind.number is not None and exact.text(kind.number) == kind.label:
        return _number(kind.number)
    return _quoted(kind.label)


def _number(value: Fraction | int) -> str:
    """Bare where every TOML reader keeps it exact (64-bit integers), else exact text."""
    if value.denominator == 1 and abs(value.numerator) < 2**63:
        return str(value.numerator)
    return f'"{exact.text(value)}"'


def _key(name: str) -> str:
    return name if _BARE.fullmatch(name) else _quoted(name)


def _quoted(text: str) -> str:
    parts = (
        _ESCAPES.get(mark) or (mark if mark >= " " and mark != "\x7f" else f"\\u{ord(mark):04x}")
        for mark in text
    )
    return f'"{"".join(parts)}"'
