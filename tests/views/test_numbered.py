"""Numbered names said once, and only where nothing is lost by it."""

from __future__ import annotations

from dataclasses import replace

from designer import Demands, parse_scenario, pose
from designer.setting.setting import Setting
from designer.views.numbered import runs, span
from designer.views.page import plain
from designer.views.posed import scenario
from designer.views.possible import alike_once, standings

DAIRIES = """
title = "One place"
[decisions]
options = ["to {Dairy}", "empty"]
[[party]]
name = "Dairy"
count = 4
types = [20, 60]
weights = [1, 1]
value = { "to {Dairy}" = 0, "to {name}" = "type", empty = 0 }
[demands]
decision = "randomized"
ic = "dominant"
ir = "ex-post"
balance = "ex-post"
budget = "no-deficit"
goal = "revenue"
"""


def names(items: list[str]) -> list[list[str]]:
    return runs(items, str, lambda _: None)


def test_only_rising_numbers_of_one_name_run_on() -> None:
    assert names(["a 1", "a 2", "a 3", "a 5", "a 6"]) == [
        ["a 1", "a 2", "a 3"],
        ["a 5"],
        ["a 6"],
    ]
    assert names(["a 1", "b 2", "a 3"]) == [["a 1"], ["b 2"], ["a 3"]]
    assert names(["a 3", "a 2", "a 1"]) == [["a 3"], ["a 2"], ["a 1"]]
    assert names(["a", "a", "a"]) == [["a"], ["a"], ["a"]]
    assert names(["b 08", "b 09", "b 10"]) == [["b 08"], ["b 09"], ["b 10"]]
    assert runs(["a 1", "a 2", "a 3", "a 40"], str, len)[0] == ["a 1", "a 2", "a 3"]
    assert span("a 1", "a 1") == "a 1"


def dairies() -> Setting:
    return parse_scenario(DAIRIES)


def test_alike_parties_and_options_are_said_once() -> None:
    top = plain(scenario(dairies()), 100)
    assert "Dairy 1 … Dairy 4 (2 each): 16 cases" in top
    assert "to Dairy 1 … to Dairy 4, empty" in top


def test_lines_that_differ_are_all_shown() -> None:
    verdict = pose(dairies(), Demands(even_handed=True))
    found = list(verdict.standings)
    assert len(found) == 8
    assert [one.party for one in alike_once(found)] == ["Dairy 1 … Dairy 4"] * 2
    assert "Dairy 1 … Dairy 4" in plain(standings(found))
    assert found[2].party == "Dairy 2"
    found[2] = replace(found[2], pays=found[2].pays + 1)
    assert [one.party for one in alike_once(found)] == [one.party for one in found]
