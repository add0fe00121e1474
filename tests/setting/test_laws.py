"""Laws of reading and writing: what must not matter does not, and nothing is lost."""

from __future__ import annotations

import itertools
import tomllib
from dataclasses import fields
from fractions import Fraction
from typing import Any

import numpy as np
from hypothesis import given
from hypothesis import settings as effort
from hypothesis import strategies as st

from designer.setting.scenario import dump, parse_scenario
from designer.setting.setting import Party, Setting
from tests.strategies import scenario_texts, small_settings


def same(one: object, other: object) -> bool:
    """Equal in every part; arrays in shape, dtype and every entry."""
    if isinstance(one, np.ndarray) and isinstance(other, np.ndarray):
        return one.dtype == other.dtype and bool(one.tolist() == other.tolist())
    if isinstance(one, (Setting, Party)) and type(one) is type(other):
        return all(same(getattr(one, f.name), getattr(other, f.name)) for f in fields(one))
    if isinstance(one, tuple) and isinstance(other, tuple):
        return len(one) == len(other) and all(map(same, one, other))
    return bool(one == other)


@given(small_settings(extras=None))
@effort(max_examples=120, deadline=None)
def test_reading_the_canonical_text_gives_the_setting_again(setting: Setting) -> None:
    text = dump(setting)
    again = parse_scenario(text)
    assert same(again, setting)
    assert dump(again) == text
    assert len(setting.digest) == 64


def test_same_tells_settings_apart() -> None:
    text = 'decisions.options = ["a"]\n[[party]]\nname = "N"\ntypes = [1, 2]\nweights = [1, 1]\n'
    one = parse_scenario(text + 'value.a = "type"')
    assert same(one, parse_scenario(text + "value.a = [1, 2]"))
    assert not same(one, parse_scenario(text + "value.a = [1, 3]"))


@given(scenario_texts(), st.data())
@effort(max_examples=100, deadline=None)
def test_layout_order_of_keys_and_spelling_of_numbers_change_nothing(
    text: str, data: st.DataObject
) -> None:
    plain: dict[str, Any] = tomllib.loads(text, parse_float=Fraction)
    if len(plain.get("rule", [])) > 1:
        plain["rule"] = data.draw(st.permutations(plain["rule"]))
    if len(plain.get("joint", [])) > 1:
        plain["joint"] = data.draw(st.permutations(plain["joint"]))
    writer = _Writer(data)
    lines = [f"{_quoted(key)} = {writer.value(plain[key])} # a note" for key in writer.order(plain)]
    respelled = "# first\n\n" + "\n\n".join(lines)
    assert same(parse_scenario(respelled), parse_scenario(text))


class _Writer:
    """Writes plain values as TOML in another layout: inline tables, keys in any order."""

    def __init__(self, data: st.DataObject) -> None:
        self.data = data

    def order(self, table: dict[str, Any]) -> list[str]:
        return list(self.data.draw(st.permutations(sorted(table))))

    def value(self, value: Any) -> str:
        match value:
            case bool():
                return "true" if value else "false"
            case int() | Fraction():
                return self.number(Fraction(value))
            case str():
                return _quoted(value)
            case list():
                return "[\n  " + " , # and\n  ".join(map(self.value, value)) + ",\n]"
            case _:
                parts = (f"{_quoted(key)}= {self.value(value[key])}" for key in self.order(value))
                return f"{{{' ,  '.join(parts)}}}"

    def number(self, value: Fraction) -> str:
        top, bottom = value.numerator, value.denominator
        spellings = [f'"{top * 3}/{bottom * 3}"', f'"{top}/{bottom}"']
        if bottom == 1:
            spellings += [str(top), f"{top}.0", f"{top}e0", f'" {top} "', f"{top}.00e+00"]
        return self.data.draw(st.sampled_from(spellings))


def _quoted(text: str) -> str:
    escaped = text.replace("\\", "\\\\").replace('"', '\\"').replace("\n", "\\n")
    return f'"{escaped}"'


@given(scenario_texts(min_parties=2, extras=False), st.data())
@effort(max_examples=80, deadline=None)
def test_reordering_the_parties_reorders_and_changes_nothing_else(
    text: str, data: st.DataObject
) -> None:
    plain: dict[str, Any] = tomllib.loads(text, parse_float=Fraction)
    order = data.draw(st.permutations(range(len(plain["party"]))))
    plain["party"] = [plain["party"][i] for i in order]
    writer = _Writer(data)
    moved = parse_scenario("\n".join(f"{_quoted(k)} = {writer.value(plain[k])}" for k in plain))
    setting = parse_scenario(text)
    for at in itertools.product(*(range(size) for size in setting.shape)):
        here = setting.profile_of(at)
        there = moved.profile_of(tuple(at[i] for i in order))
        assert moved.probability(there) == setting.probability(here)
        for new, old in enumerate(order):
            assert _money(moved, new, there) == _money(setting, old, here)
        assert (setting.rule is None) == (moved.rule is None)
        if setting.rule is not None and moved.rule is not None:
            ours = [Fraction(int(x), setting.rule_den) for x in setting.rule[here]]
            assert ours == [Fraction(int(x), moved.rule_den) for x in moved.rule[there]]


def _money(setting: Setting, party: int, profile: int) -> list[Fraction]:
    """A party's worths and outside option at a profile."""
    one = setting.parties[party]
    own = setting.types_at(profile)[party]
    worths = one.value[profile if one.depends else own]
    outside = one.outside[profile if one.outside_depends else own]
    return [Fraction(int(amount), setting.grain) for amount in (*worths, outside)]


@given(small_settings(extras=None))
@effort(max_examples=80, deadline=None)
def test_money_is_in_lowest_terms_and_probabilities_sum_to_one(setting: Setting) -> None:
    amounts = [*setting.outlay, *setting.worth]
    for party in setting.parties:
        amounts += [*party.value.ravel(), *party.outside]
        assert sum(party.marginal) == 1
        assert np.gcd.reduce(party.weights) == 1
    assert np.gcd.reduce([setting.grain, *map(int, amounts)]) == 1
    assert sum(setting.probability(theta) for theta in range(setting.profiles)) == 1
    if setting.rule is not None:
        assert set(setting.rule.sum(axis=1).tolist()) == {setting.rule_den}
    for i, party in enumerate(setting.parties):  # marginals of the profile weights
        for a, chance in enumerate(party.marginal):
            at = [theta for theta in range(setting.profiles) if setting.types_at(theta)[i] == a]
            assert sum(map(setting.probability, at)) == chance
