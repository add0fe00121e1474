"""Decision, honesty, participation, balance, budget and goal, each with each."""

from __future__ import annotations

import itertools

import pytest

from designer import Demands, parse_scenario, pose
from designer.errors import UsageError
from designer.setting.vocabulary import BALANCE, BUDGET, DECISIONS, GOALS, HONESTY, PARTICIPATION
from tests.everything import DEEP
from tests.everything.judged import hold

ENDING = """
[goal]
blend = {{ worth = 1, pot = -1, Ada = 2 }}
[[rule]]
at = {{ Ada = {ada}, Bo = {bo} }}
take = {{ a = "1/2", b = "1/2" }}
[[rule]]
take = "b"
"""
PRIVATE = """
title = "Private worths"
decisions.options = ["a", "b"]
designer.outlay = { a = 3 }
designer.worth = { b = 1 }
[[party]]
name = "Ada"
types = [1, 4]
weights = [1, 2]
value = { a = "type", b = 0 }
[[party]]
name = "Bo"
types = [0, 5]
weights = [1, 1]
value = { a = "type", b = 1 }
outside = "type / 4"
""" + ENDING.format(ada=4, bo=0)
JOINT = """
title = "Correlated types, one case impossible"
decisions.options = ["a", "b"]
designer.outlay = { a = 1 }
[[party]]
name = "Ada"
types = ["low", "high"]
value = { a = [1, 5], b = 0 }
[[party]]
name = "Bo"
types = ["low", "high"]
value = { a = [-2, 3], b = 1 }
compelled = true
[[joint]]
at = { Ada = "low", Bo = "low" }
weight = 2
[[joint]]
at = { Ada = "high", Bo = "low" }
weight = 1
[[joint]]
at = { Ada = "high", Bo = "high" }
weight = 3
""" + ENDING.format(ada='"high"', bo='"low"')
INTERDEPENDENT = """
title = "Worths that depend on the other's type"
decisions.options = ["a", "b"]
[[party]]
name = "Ada"
types = [0, 2]
weights = [1, 1]
value = { a = "type + types.Bo / 2", b = 0 }
[[party]]
name = "Bo"
types = [1, 3]
weights = [3, 1]
value = { a = 0, b = "type * types.Ada" }
outside = "types.Ada / 2"
""" + ENDING.format(ada=0, bo=1)
SETTINGS = {
    "private": parse_scenario(PRIVATE),
    "joint": parse_scenario(JOINT),
    "support": parse_scenario('profiles = "support"\n' + JOINT),
    "interdependent": parse_scenario(INTERDEPENDENT),
}
EVERY = list(itertools.product(DECISIONS, HONESTY, PARTICIPATION, BALANCE, BUDGET, GOALS))
PARTS = 12 if DEEP else 3
STEP = 1 if DEEP else 13
"""Shares no factor with the number of choices anywhere: a sample meets every word."""


def impossible_to_ask(ic: str, balance: str, goal: str) -> bool:
    """The combinations that the errors rule out."""
    if goal == "outside-money":
        return balance == "none"
    if goal == "margin":
        return ic == "none"
    return False


@pytest.mark.parametrize("part", range(PARTS))
@pytest.mark.parametrize("name", SETTINGS)
def test_every_combination(name: str, part: int) -> None:
    setting = SETTINGS[name]
    held = 0
    for decision, ic, ir, balance, budget, goal in EVERY[::STEP][part::PARTS]:
        demands = Demands(
            decision=decision, ic=ic, ir=ir, balance=balance, budget=budget, goal=goal
        )
        try:
            verdict = pose(setting, demands)
        except UsageError:
            assert impossible_to_ask(ic, balance, goal)
            continue
        assert not impossible_to_ask(ic, balance, goal)
        hold(verdict)
        held += 1
    assert held
