"""The problems that are measured: what each asks, at what size, and in which ways.

To add one, add a line to `PROBLEMS`. Names end in their size. All but the start-up problem
are posed with `tidy = "none"`, because the other ways have no tidy stage.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import partial

from benchmarks import invented
from benchmarks.invented import Asked, Files

COMPARED = ("ours", "full", "textbook", "linprog", "highs")
"""End to end beside every baseline."""

LARGE = ("ours", "full", "highs")
"""Beside the engine on our own arrays only: the other two would run for many minutes."""


@dataclass(frozen=True)
class Problem:
    """One sized problem.

    files     writes the scenario's files
    expected  the status it must come out with, in every way
    ways      names of `benchmarks.ways.WAYS`
    small     answered in a fraction of a second by every way: for the tests
    smoke     whether the smoke run includes it too
    """

    name: str
    says: str
    files: Callable[[], Files]
    expected: str = "possible"
    ways: tuple[str, ...] = COMPARED
    small: bool = False
    smoke: bool = False


def _asks(
    decision: str, ic: str, ir: str, balance: str, budget: str, goal: str, tidy: str = "none"
) -> Asked:
    named = {"decision": decision, "ic": ic, "ir": ir, "balance": balance, "budget": budget}
    asked = {**named, "goal": goal}
    return asked | {"tidy": tidy} if tidy else asked


FLOOR = _asks("efficient", "bayesian", "none", "ex-post", "exact", "floor")
MONEY = _asks("efficient", "bayesian", "interim", "ex-post", "exact", "outside-money")
WHOLE = _asks("efficient", "bayesian", "interim", "ex-post", "exact", "any")
DEFAULT = _asks("efficient", "bayesian", "none", "ex-post", "exact", "floor", tidy="")
CERTAIN = _asks("efficient", "dominant", "ex-post", "ex-post", "no-deficit", "outside-money")
MEAN = _asks("efficient", "dominant", "interim", "ex-ante", "exact", "outside-money")
SECOND = _asks("randomized", "bayesian", "interim", "ex-post", "exact", "welfare")
POSTED = _asks("randomized", "dominant", "ex-post", "ex-post", "exact", "welfare")
PICKED = _asks("deterministic", "dominant", "ex-post", "ex-post", "exact", "welfare")
RENT = _asks("randomized", "bayesian", "interim", "ex-ante", "no-deficit", "revenue")
SURE_RENT = _asks("randomized", "dominant", "ex-post", "ex-post", "no-deficit", "revenue")
ONE_RENT = _asks("efficient", "bayesian", "interim", "ex-ante", "no-deficit", "revenue")


def _project(parties: int, types: int, asked: Asked) -> Callable[[], Files]:
    return partial(invented.joint_project, parties, types, asked)


def _trade(size: int, asked: Asked) -> Callable[[], Files]:
    return partial(invented.trade, size, asked)


PROBLEMS: tuple[Problem, ...] = (
    Problem(
        "start-3x4",
        "joint project as the command line poses it, tidy stage included",
        _project(3, 4, DEFAULT),
        ways=("shell", "ours"),
        small=True,
        smoke=True,
    ),
    Problem(
        "floor-3x4", "joint project, best floor", _project(3, 4, FLOOR), small=True, smoke=True
    ),
    Problem("floor-3x8", "joint project, best floor", _project(3, 8, FLOOR)),
    Problem("floor-3x12", "joint project, best floor", _project(3, 12, FLOOR)),
    Problem(
        "floor-3x15",
        "joint project, best floor",
        _project(3, 15, FLOOR),
        ways=("shell", *COMPARED, "textbook-quick"),
    ),
    Problem("money-3x4", "joint project, least outside money", _project(3, 4, MONEY), small=True),
    Problem("money-3x12", "joint project, least outside money", _project(3, 12, MONEY)),
    Problem("money-3x15", "joint project, least outside money", _project(3, 15, MONEY)),
    Problem("money-3x22", "10,648 balance rows", _project(3, 22, MONEY), ways=LARGE),
    Problem("floor-3x22", "10,648 balance rows", _project(3, 22, FLOOR), ways=LARGE),
    Problem("money-3x30", "27,000 balance rows", _project(3, 30, MONEY), ways=LARGE),
    Problem(
        "whole-3x4",
        "joint project, everything asked at once",
        _project(3, 4, WHOLE),
        "impossible",
        small=True,
        smoke=True,
    ),
    Problem(
        "whole-3x12",
        "joint project, everything asked at once",
        _project(3, 12, WHOLE),
        "impossible",
    ),
    Problem(
        "certain-3x4", "joint project, honest in every case", _project(3, 4, CERTAIN), small=True
    ),
    Problem("certain-3x9", "joint project, honest in every case", _project(3, 9, CERTAIN)),
    Problem(
        "certain-4x12",
        "joint project, honest in every case",
        _project(4, 12, CERTAIN),
        ways=("ours", "highs"),
    ),
    Problem(
        "mean-4x12",
        "honest in every case, taking part and balance on average",
        _project(4, 12, MEAN),
        ways=("ours", "highs"),
    ),
    Problem(
        "mean-6x10",
        "a million cases, honest in every one",
        _project(6, 10, MEAN),
        ways=("ours",),
    ),
    Problem("second-4", "sale, best lottery", _trade(4, SECOND), small=True),
    Problem("second-30", "sale, best lottery", _trade(30, SECOND)),
    Problem("posted-4", "sale, honest in every case", _trade(4, POSTED), small=True),
    Problem("posted-16", "sale, honest in every case", _trade(16, POSTED)),
    Problem("sale-15", "sale, everything asked at once", _trade(15, WHOLE), expected="impossible"),
    Problem("picked-3", "sale, whole decisions", _trade(3, PICKED), small=True, smoke=True),
    Problem("picked-6", "sale, whole decisions", _trade(6, PICKED)),
    Problem("item-2x4", "one item, most rent", partial(invented.one_item, 2, 4, RENT), small=True),
    Problem("item-3x10", "one item, most rent", partial(invented.one_item, 3, 10, RENT)),
    Problem("item-4x5", "one item, most rent", partial(invented.one_item, 4, 5, RENT)),
    Problem(
        "correlated-2x4",
        "one item, types that go together",
        partial(invented.correlated_item, 2, 4, ONE_RENT),
        small=True,
        smoke=True,
    ),
    Problem(
        "correlated-2x30",
        "one item, types that go together",
        partial(invented.correlated_item, 2, 30, ONE_RENT),
    ),
    Problem(
        "correlated-3x10",
        "one item, types that go together",
        partial(invented.correlated_item, 3, 10, ONE_RENT),
    ),
    Problem(
        "common-4",
        "worths that depend on the other's type",
        partial(invented.common_worth, 4, SURE_RENT),
        small=True,
    ),
    Problem(
        "common-20",
        "worths that depend on the other's type",
        partial(invented.common_worth, 20, SURE_RENT),
    ),
    Problem("million-4x19", "130,321 balance rows", _project(4, 19, MONEY), ways=("formulate",)),
    Problem("million-3x20", "456,000 lie rows", _project(3, 20, CERTAIN), ways=("formulate",)),
    Problem(
        "formulate-3x4",
        "the same, small",
        _project(3, 4, MONEY),
        ways=("formulate",),
        small=True,
        smoke=True,
    ),
    Problem(
        "recheck-3x4",
        "the same, small",
        _project(3, 4, MONEY),
        ways=("recheck",),
        small=True,
        smoke=True,
    ),
    Problem(
        "recheck-4x19", "a proof of a million numbers", _project(4, 19, MONEY), ways=("recheck",)
    ),
)


def problem(name: str) -> Problem:
    """The problem of that name; KeyError if there is none."""
    for one in PROBLEMS:
        if one.name == name:
            return one
    raise KeyError(name)
