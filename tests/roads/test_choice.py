"""Which road a question takes by itself, by its size and by what its reduction has to do."""

from __future__ import annotations

import pytest

from benchmarks.invented import general, joint_project
from designer import parse_scenario
from designer.demands.terms import Demands
from designer.roads.registry import choose

MONEY = {"goal": "outside-money", "ic": "bayesian", "ir": "interim", "tidy": "none"}
RENT = {
    "goal": "revenue",
    "ic": "bayesian",
    "ir": "interim",
    "balance": "ex-ante",
    "budget": "no-deficit",
    "decision": "randomized",
    "tidy": "none",
}


@pytest.mark.parametrize(
    ("parties", "types", "road"), [(3, 3, "full"), (3, 5, "interim"), (3, 8, "interim")]
)
def test_one_multiplier_is_quick_from_a_hundred_payments(
    parties: int, types: int, road: str
) -> None:
    setting = parse_scenario(joint_project(parties, types, MONEY)["scenario.toml"])
    chosen = choose(setting, Demands().over(setting))
    assert chosen.road.name == road
    assert chosen.small == (road == "full")


@pytest.mark.parametrize(("parties", "types", "road"), [(3, 5, "full"), (4, 5, "interim")])
def test_a_search_for_rules_pays_later(parties: int, types: int, road: str) -> None:
    text = general(parties, types, 3, 1000, RENT)["scenario.toml"]
    setting = parse_scenario(text)
    chosen = choose(setting, Demands().over(setting))
    assert chosen.road.name == road
    why = dict(chosen.reasons)["interim"]
    assert why is None if road == "interim" else why is not None and "small" in why
    assert choose(setting, Demands().over(setting), "interim").road.name == "interim"
