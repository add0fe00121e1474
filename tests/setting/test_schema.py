"""The JSON Schema that ships with the package, against the scenarios and the reader."""

from __future__ import annotations

import json
import tomllib
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import jsonschema
import pytest
from hypothesis import given
from hypothesis import settings as effort

from designer.errors import ScenarioError
from designer.setting import vocabulary
from designer.setting.asked import DEMANDS
from designer.setting.parties import KEYS as PARTY_KEYS
from designer.setting.scenario import KEYS, dump, parse_scenario
from designer.setting.schema import schema_path, schema_text
from tests.setting.test_mistakes import BASE, JOINT, RULE
from tests.strategies import scenario_texts

SCHEMA: dict[str, Any] = json.loads(schema_text())
CHECK = jsonschema.Draft202012Validator(SCHEMA)
SCENARIOS = sorted((Path(__file__).parents[2] / "scenarios").glob("*.toml"))


def complaints(text: str) -> list[str]:
    return [error.message for error in CHECK.iter_errors(tomllib.loads(text))]


def test_the_schema_is_one() -> None:
    jsonschema.Draft202012Validator.check_schema(SCHEMA)
    assert schema_path().name == "scenario.schema.json"


def test_the_schema_knows_the_keys_the_reader_knows() -> None:
    assert tuple(SCHEMA["properties"]) == KEYS
    assert set(SCHEMA["$defs"]["party"]["properties"]) == set(PARTY_KEYS)
    demands = SCHEMA["properties"]["demands"]["properties"]
    assert set(demands) == set(DEMANDS)
    for key, words in vocabulary.CHOICES.items():
        assert tuple(demands[key]["enum"]) == words
    text, listed = demands["goal"]["oneOf"]
    assert tuple(listed["items"]["enum"]) == vocabulary.GOALS
    assert text["pattern"].count("|".join(vocabulary.GOALS)) == 2


def test_every_key_is_described() -> None:
    def described(schema: dict[str, Any], place: str) -> Iterator[str]:
        for name, part in schema.get("properties", {}).items():
            if (
                schema is not SCHEMA.get("then")
                and "description" not in part
                and ("$ref" not in part)
            ):
                yield f"{place}.{name}"
            yield from described(part, f"{place}.{name}")
        for key in ("items", "additionalProperties"):
            if isinstance(schema.get(key), dict):
                yield from described(schema[key], f"{place}[]")
        for part in schema.get("oneOf", []):
            yield from described(part, place)

    missing = list(described(SCHEMA, ""))
    for name, part in SCHEMA["$defs"].items():
        missing += described(part, name)
        if "description" not in part:
            missing.append(name)
    assert missing == []


@pytest.mark.parametrize("path", SCENARIOS, ids=lambda path: path.name)
def test_our_scenarios_keep_to_it(path: Path) -> None:
    assert complaints(path.read_text(encoding="utf-8")) == []


@pytest.mark.parametrize("text", [BASE, JOINT, RULE])
def test_scenarios_without_mistakes_keep_to_it(text: str) -> None:
    assert complaints(text) == []


@given(scenario_texts())
@effort(max_examples=60, deadline=None)
def test_drawn_scenarios_and_their_canonical_texts_keep_to_it(text: str) -> None:
    assert complaints(text) == []
    assert complaints(dump(parse_scenario(text))) == []


@pytest.mark.parametrize(
    ("base", "old", "new"),
    [
        (BASE, "title =", "titel ="),
        (BASE, '"A gate"', "3"),
        (BASE, "[limits]", 'profiles = "some"\n[limits]'),
        (BASE, '["open", "shut"]', '["open", "open"]'),
        (BASE, '["open", "shut"]', "[]"),
        (BASE, "open = 5", "open = true"),
        (BASE, 'name = "Suth"\n', ""),
        (BASE, 'name = "Suth"', 'name = "pot"'),
        (BASE, 'name = "Suth"', 'name = " Suth"'),
        (BASE, "types = [20, 50]", "types = [20, 20]"),
        (BASE, "types = [20, 50]", "types = [20, true]"),
        (BASE, "a = 3", "type = 3"),
        (BASE, "a = 3", 'a = "x"'),
        (BASE, '"1/4"', '"1/x"'),
        (BASE, '"1/4"', '"1/0"'),
        (BASE, "weights = [1, 2]", "weights = [1, 0]"),
        (BASE, "weights = [1, 2]\n", ""),
        (BASE, "weights = [1, 2]", "weights = [1, 2]\nprior = [0.5, 0.5]"),
        (BASE, "pays_at_most", "pays_most"),
        (BASE, "pays_at_most = 100", 'within_worth = "yes"'),
        (BASE, '"bayesian"', '"honest"'),
        (BASE, 'ic = "bayesian"', 'goal = "flor"'),
        (BASE, 'ic = "bayesian"', 'goal = ["floor", "floor"]'),
        (BASE, "[demands]", "[goal]\nblend = 3\n[demands]"),
        (
            BASE,
            "[demands]",
            '[[side.chance]]\nparty = "Suth"\ntype = "low"\noption = "open"\n[demands]',
        ),
        (JOINT, "weight = 2", "weight = -2"),
        (JOINT, "weight = 2\n", ""),
        (JOINT, "types = [20, 50]", "types = [20, 50]\nprior = [0.5, 0.5]"),
        (RULE, '"1/3"', '"4/3x"'),
        (RULE, 'take = "open"\n', ""),
    ],
)
def test_single_slips_are_seen_by_the_schema_and_by_the_reader(
    base: str, old: str, new: str
) -> None:
    assert old in base
    text = base.replace(old, new, 1)
    assert complaints(text)
    with pytest.raises(ScenarioError):
        parse_scenario(text)
