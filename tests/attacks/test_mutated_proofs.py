"""Thousands of spoiled proofs: each is rejected, or an independent oracle finds it still true."""

from __future__ import annotations

import random
from collections.abc import Callable
from typing import Any

import pytest

from designer.proof.recheck import recheck
from tests.attacks.handmade import ALL, first_bounded_then_endless, two_goals
from tests.attacks.mutations import blind, copied, knowing
from tests.attacks.truth import TooLarge, is_true

Spoil = Callable[[Any, random.Random], None]


@pytest.mark.parametrize("name", ALL)
def test_the_oracle_agrees_with_every_proof_by_hand(name: str) -> None:
    document = ALL[name]()
    finding = recheck(document)
    assert finding.holds, finding.faults
    assert is_true(document)


@pytest.mark.parametrize("spoil", [blind, knowing], ids=["blind", "knowing"])
@pytest.mark.parametrize("name", ALL)
def test_mutations_are_rejected_or_still_true(name: str, spoil: Spoil) -> None:
    original = ALL[name]()
    dice = random.Random(f"{name} {spoil.__name__}")  # noqa: S311
    rejected = survived = 0
    for _ in range(1000):
        document = copied(original)
        for _ in range(dice.choice([1, 1, 1, 2, 3])):
            try:
                spoil(document, dice)
            except (KeyError, IndexError, TypeError, AttributeError):
                break  # the document is too spoiled already for a knowing hand
        finding = recheck(document)
        if not finding.holds:
            assert finding.faults
            assert not finding.claims
            rejected += 1
            continue
        try:
            assert is_true(document), (document, finding)
        except TooLarge:
            continue
        survived += 1
    assert rejected > 250
    assert survived > 5


@pytest.mark.parametrize("name", ALL)
def test_every_number_of_a_program_or_certificate_is_read(name: str) -> None:
    """Move each integer by one, alone: rejected, or still true."""
    from tests.attacks.mutations import places

    count = len(places(ALL[name]()))
    rejected = 0
    for k in range(count):
        for step in (-1, 1):
            document = ALL[name]()
            container, key = places(document)[k]
            if type(container[key]) is not int:
                continue
            container[key] += step
            if not recheck(document).holds:
                rejected += 1
                continue
            try:
                assert is_true(document), document
            except TooLarge:
                continue
    assert rejected


def test_program_and_proof_changed_together_must_still_be_true() -> None:
    """A wider first row and a higher stated value: the dual no longer reaches it."""
    document = two_goals()
    document["program"]["row_hi"]["num"][0] = 4
    assert not recheck(document).holds
    document["stages"][0]["value"] = "2"
    assert not recheck(document).holds
    document["program"]["row_lo"]["num"][0] = 8
    document["program"]["row_hi"]["num"][1] = 8
    assert not recheck(document).holds
    document["primal"] = {"den": 1, "idx": [0, 1, 2], "num": [2, 2, 2]}
    document["stages"][1]["value"] = "2"
    assert recheck(document).holds
    assert is_true(document)


def test_a_ray_that_gives_up_an_earlier_goal_is_none() -> None:
    """Without the row that keeps x = 3, the last goal x + y grows along (-1, 2)."""
    document = first_bounded_then_endless()
    program = document["program"]
    program["row_lo"] = {"idx": [], "num": []}
    program["row_hi"] = {"idx": [0, 2], "num": [3, 5]}
    program["col_lo"] = {"idx": [], "num": []}
    document["stages"][1]["cost"] |= {"idx": [0, 1], "num": [1, 1]}
    document["ray"] = {"den": 1, "idx": [0, 1], "num": [-1, 2]}
    assert recheck(document).faults == ("ray: it changes the goal floor",)
    document["ray"] = {"den": 1, "idx": [1], "num": [2]}
    assert recheck(document).holds
    assert is_true(document)


def test_later_certificates_without_the_row_that_keeps_the_earlier_value() -> None:
    """The bound 2z >= x + y = 2 needs the kept value; with any other, it proves less."""
    document = two_goals()
    program = document["program"]
    program["row_lo"]["num"][0] = 2  # x + y >= 1 is all that is left
    assert is_true(document)
    assert recheck(document).faults == (
        "stages[1] node 0: the dual leaves room for something better",
    )
