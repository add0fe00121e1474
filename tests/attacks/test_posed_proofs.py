"""The proofs that `pose` writes, spoiled: rejected, or still true by the slow oracle."""

from __future__ import annotations

import random
from typing import Any

import pytest

from designer.demands.terms import Demands
from designer.posing import pose
from designer.proof.recheck import recheck
from designer.setting.scenario import parse_scenario
from tests.attacks.mutations import blind, copied, knowing
from tests.attacks.truth import TooLarge, is_true

QUAY = """
title = "A crane on the quay"
[decisions]
options = ["hire", "wait"]
[designer]
outlay = { hire = 3 }
[[party]]
name  = "Outer quay"
types = [1, 4]
prior = ["1/2", "1/2"]
value = { hire = "type", wait = 0 }
[[party]]
name  = "Inner quay"
types = [0, 3]
prior = ["1/3", "2/3"]
value = { hire = "type", wait = 0 }
"""

ASKED = {
    "best welfare, then revenue": (
        Demands(decision="randomized", balance="none", goal="welfare,revenue", tidy="none"),
        "possible",
    ),
    "least outside money": (Demands(goal="outside-money", balance="ex-ante"), "possible"),
    "deterministic": (
        Demands(decision="deterministic", balance="none", goal="revenue", tidy="none"),
        "possible",
    ),
    "nothing works": (Demands(goal="any"), "impossible"),
    "no end": (Demands(ir="none", balance="none", goal="revenue"), "unbounded"),
}


@pytest.mark.parametrize("name", ASKED)
def test_mutations_of_posed_proofs_are_rejected_or_still_true(name: str) -> None:
    demands, status = ASKED[name]
    scenario = QUAY
    if demands.decision == "deterministic":  # the oracle tries all its whole numbers
        scenario = QUAY.replace("[1, 4]", "[4]").replace('["1/2", "1/2"]', "[1]")
    verdict = pose(parse_scenario(scenario), demands)
    assert (verdict.status, verdict.proved) == (status, True)
    original: Any = verdict.proof
    assert recheck(original).holds
    assert is_true(original)
    dice = random.Random(name)  # noqa: S311
    rejected = survived = 0
    for turn in range(600):
        document = copied(original)
        try:
            (blind, knowing)[turn % 2](document, dice)
        except (KeyError, IndexError, TypeError, AttributeError):
            continue
        if not recheck(document).holds:
            rejected += 1
        elif document != original and survived < 12:
            try:
                assert is_true(document), document
            except TooLarge:
                continue
            survived += 1
    assert rejected > 300
