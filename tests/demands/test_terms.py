"""What is asked, settled: amounts, names and words as a caller may write them."""

from __future__ import annotations

from fractions import Fraction
from typing import Any

import pytest

from designer import Demands
from designer.errors import UsageError
from designer.setting.scenario import parse_scenario

SETTING = parse_scenario(
    """
title = "One slot"
decisions.options = ["yes", "no"]
[[party]]
name = "Ada"
types = [1, 2]
weights = [1, 1]
value = { yes = "type", no = 0 }
"""
)


@pytest.mark.parametrize(
    "written", ["1e999999999", "1e1000", "9" * 5000, "1/0", "nan", "", "1_0", "three"]
)
def test_amounts_are_read_as_in_a_scenario(written: str) -> None:
    with pytest.raises(UsageError) as caught:
        Demands(slack=written, subsidy=written).over(SETTING)
    assert [mistake.place for mistake in caught.value.mistakes] == [
        "demands.subsidy",
        "demands.slack",
    ]
    assert len(caught.value.report()) < 500


@pytest.mark.parametrize(
    ("written", "value"),
    [
        ("0.25", Fraction(1, 4)),
        (" 1/3 ", Fraction(1, 3)),
        ("-2e3", Fraction(-2000)),
        (7, Fraction(7)),
        (Fraction(2, 5), Fraction(2, 5)),
    ],
)
def test_exact_amounts(written: Any, value: Fraction) -> None:
    assert Demands(slack=written).over(SETTING).slack == value


@pytest.mark.parametrize("wrong", [0.5, True, None, b"1"])
def test_what_is_no_exact_amount(wrong: Any) -> None:
    demands = Demands(blend={"pot": wrong}, goal="blend")
    with pytest.raises(UsageError, match=r"goal\.blend\.pot"):
        demands.over(SETTING)


def test_parties_to_compel_in_any_container() -> None:
    name: Any
    for name in ("Ada", ["Ada"], {"Ada"}, ("Ada",)):
        assert Demands(compelled=name).over(SETTING).compelled == frozenset({"Ada"})
    with pytest.raises(UsageError, match="'Bo'"):
        Demands(compelled=frozenset({"Bo"})).over(SETTING)


def test_long_words_are_cut() -> None:
    demands = Demands(ic="x" * 10_000, goal=["y" * 10_000, "any", "any"])
    with pytest.raises(UsageError) as caught:
        demands.over(SETTING)
    assert len(caught.value.mistakes) == 3
    assert len(caught.value.report()) < 800
