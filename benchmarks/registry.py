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

REDUCED = ("ours", "full", "textbook", "highs", "ipm")
"""Where a road does away with most of the program: beside both methods of the engine."""

ROADS = (*COMPARED, "interim")
"""Where the plain road and the reduced one take about as long: beside both."""

EITHER = ("ours", "full", "interim")
"""The same without the baselines."""

METHODS = ("ours", "full", "simplex", "ipm")
"""Where presolve could do what our reduction does: beside the engine's two methods."""

ENGINES = ("ours", "simplex", "ipm")
"""Beside the engine's two methods alone."""

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
    budget    seconds per answer, where the run's own would be too few
    """

    name: str
    says: str
    files: Callable[[], Files]
    expected: str = "possible"
    ways: tuple[str, ...] = COMPARED
    small: bool = False
    smoke: bool = False
    budget: float | None = None


def _asks(
    decision: str, ic: str, ir: str, balance: str, budget: str, goal: str, tidy: str = "none"
) -> Asked:
    named = {"decision": decision, "ic": ic, "ir": ir, "balance": balance, "budget": budget}
    asked = {**named, "goal": goal}
    return asked | {"tidy": tidy} if tidy else asked


FLOOR = _asks("efficient", "bayesian", "none", "ex-post", "exact", "floor")
MONEY = _asks("efficient", "bayesian", "interim", "ex-post", "exact", "outside-money")
WHOLE = _asks("efficient", "bayesian", "interim", "ex-post", "exact", "any")
HELPED = {**WHOLE, "subsidy": "100"}
HELPED_FLOOR = {**HELPED, "goal": "floor"}
DEFAULT = _asks("efficient", "bayesian", "none", "ex-post", "exact", "floor", tidy="")
CERTAIN = _asks("efficient", "dominant", "ex-post", "ex-post", "no-deficit", "outside-money")
MEAN = _asks("efficient", "dominant", "interim", "ex-ante", "exact", "outside-money")
SECOND = _asks("randomized", "bayesian", "interim", "ex-post", "exact", "welfare")
POSTED = _asks("randomized", "dominant", "ex-post", "ex-post", "exact", "welfare")
PICKED = _asks("deterministic", "dominant", "ex-post", "ex-post", "exact", "welfare")
RENT = _asks("randomized", "bayesian", "interim", "ex-ante", "no-deficit", "revenue")
SURE_SECOND = _asks("randomized", "dominant", "ex-post", "ex-post", "no-deficit", "welfare")
SURE_RENT = _asks("randomized", "dominant", "ex-post", "ex-post", "no-deficit", "revenue")
ONE_RENT = _asks("efficient", "bayesian", "interim", "ex-ante", "no-deficit", "revenue")


def _project(parties: int, types: int, asked: Asked) -> Callable[[], Files]:
    return partial(invented.joint_project, parties, types, asked)


def _general(
    parties: int, types: int, options: int, asked: Asked, high: int = 1000
) -> Callable[[], Files]:
    return partial(invented.general, parties, types, options, high, asked)


def _trade(size: int, asked: Asked) -> Callable[[], Files]:
    return partial(invented.trade, size, asked)


def _alike(parties: int, types: int, asked: Asked) -> Callable[[], Files]:
    return partial(invented.alike_project, parties, types, asked)


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
        "floor-3x4",
        "joint project, best floor",
        _project(3, 4, FLOOR),
        ways=ROADS,
        small=True,
        smoke=True,
    ),
    Problem("floor-3x6", "joint project, best floor", _project(3, 6, FLOOR), ways=EITHER),
    Problem("floor-3x8", "joint project, best floor", _project(3, 8, FLOOR), ways=EITHER),
    Problem("money-3x6", "least outside money", _project(3, 6, MONEY), ways=EITHER),
    Problem(
        "general-2x3x3",
        "a choice of sites, vector types, most rent",
        _general(2, 3, 3, RENT),
        ways=("ours", "interim", "full", "textbook", "simplex", "ipm"),
        small=True,
        smoke=True,
    ),
    Problem("general-3x6x3", "most rent", _general(3, 6, 3, RENT), ways=EITHER),
    Problem("general-3x8x3", "most rent", _general(3, 8, 3, RENT), ways=EITHER),
    Problem("rule-3x4x3", "a choice of sites", _general(3, 4, 3, MONEY), ways=ROADS, small=True),
    Problem("rule-3x6x3", "a choice of sites", _general(3, 6, 3, MONEY), ways=EITHER),
    Problem("rule-3x8x3", "a choice of sites", _general(3, 8, 3, MONEY), ways=EITHER),
    Problem("item-3x4", "one item", partial(invented.one_item, 3, 4, RENT), ways=EITHER),
    Problem("item-3x6", "one item", partial(invented.one_item, 3, 6, RENT), ways=EITHER),
    Problem(
        "certain-3x6",
        "honest in every case",
        _project(3, 6, CERTAIN),
        ways=("ours", "full", "type-graph"),
    ),
    Problem(
        "whole-3x25", "everything asked at once", _project(3, 25, WHOLE), "impossible", REDUCED
    ),
    Problem("money-3x25", "least outside money", _project(3, 25, MONEY), ways=METHODS),
    Problem("helped-3x25", "all at once, 100 given", _project(3, 25, HELPED), ways=METHODS),
    Problem("lifted-3x25", "best floor, 100 given", _project(3, 25, HELPED_FLOOR), ways=METHODS),
    Problem(
        "odds-3x25",
        "all at once, odds up to 999",
        partial(invented.joint_project, 3, 25, WHOLE, uneven=True),
        "impossible",
        METHODS,
    ),
    Problem(
        "odds-money-3x25",
        "outside money, odds up to 999",
        partial(invented.joint_project, 3, 25, MONEY, uneven=True),
        ways=METHODS,
    ),
    Problem("rule-9x10x3", "a choice of sites, 10^9", _general(9, 10, 3, MONEY), ways=("ours",)),
    Problem(
        "rule-10x10x3",
        "a choice of sites, 10^10",
        _general(10, 10, 3, MONEY),
        ways=("ours",),
        budget=90.0,
    ),
    Problem("money-8x9", "joint project, 4.3e7", _project(8, 9, MONEY), ways=("ours",)),
    Problem("money-12x10", "joint project, 10^12", _project(12, 10, MONEY), ways=("ours",)),
    Problem(
        "wide-12x10",
        "two sites, worths below 10^7, 10^12",
        _general(12, 10, 2, MONEY, 10**7),
        ways=("ours",),
    ),
    Problem(
        "money-20x10",
        "joint project, 10^20",
        partial(invented.joint_project, 20, 10, MONEY, untied=True),
        ways=("ours",),
    ),
    Problem("second-200", "sale, best lottery", _trade(200, SECOND), ways=ENGINES),
    Problem("second-1000", "sale, best lottery", _trade(1000, SECOND), ways=("ours",)),
    Problem("free-6x60", "joint project, best lottery", _project(6, 60, SECOND), ways=("ours",)),
    Problem(
        "item-4x12", "one item, most rent", partial(invented.one_item, 4, 12, RENT), ways=ENGINES
    ),
    Problem(
        "item-50x20",
        "one item, most rent",
        partial(invented.one_item, 50, 20, RENT),
        ways=("ours",),
    ),
    Problem(
        "general-4x12x4",
        "a choice of sites, vector types, most rent",
        _general(4, 12, 4, RENT, 100),
        ways=ENGINES,
    ),
    Problem(
        "general-6x10x4",
        "a choice of sites, vector types, most rent",
        _general(6, 10, 4, RENT, 100),
        ways=("ours",),
        budget=60.0,
    ),
    Problem("floor-3x12", "joint project, best floor", _project(3, 12, FLOOR)),
    Problem(
        "floor-3x15",
        "joint project, best floor",
        _project(3, 15, FLOOR),
        ways=("shell", *COMPARED, "textbook-quick"),
    ),
    Problem(
        "money-3x4",
        "joint project, least outside money",
        _project(3, 4, MONEY),
        ways=(*COMPARED, "interim", "ipm"),
        small=True,
    ),
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
        "certain-3x4",
        "joint project, honest in every case",
        _project(3, 4, CERTAIN),
        ways=(*COMPARED, "type-graph"),
        small=True,
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
    Problem(
        "alike-3x3",
        "parties alike, honest in every case, best lottery",
        _alike(3, 3, SURE_SECOND),
        ways=("ours", "likeness", "full"),
        small=True,
    ),
    Problem(
        "alike-5x5",
        "parties alike, honest in every case, best lottery",
        _alike(5, 5, SURE_SECOND),
        ways=("ours", "full", "simplex", "ipm"),
    ),
    Problem(
        "alike-8x6",
        "parties alike, best lottery, 1.7e6",
        _alike(8, 6, SURE_SECOND),
        ways=("ours",),
    ),
    Problem(
        "alike-8x10",
        "parties alike, honest in every case, 10^8",
        _alike(8, 10, CERTAIN),
        ways=("ours",),
        budget=60.0,
    ),
    Problem(
        "alike-money-20x10",
        "parties alike, tied cases, 10^20",
        _alike(20, 10, MONEY),
        ways=("ours",),
    ),
    Problem("second-4", "sale, best lottery", _trade(4, SECOND), ways=ROADS, small=True),
    Problem("second-30", "sale, best lottery", _trade(30, SECOND)),
    Problem("posted-4", "sale, honest in every case", _trade(4, POSTED), small=True),
    Problem("posted-16", "sale, honest in every case", _trade(16, POSTED)),
    Problem("sale-15", "sale, everything asked at once", _trade(15, WHOLE), expected="impossible"),
    Problem("picked-3", "sale, whole decisions", _trade(3, PICKED), small=True, smoke=True),
    Problem("picked-6", "sale, whole decisions", _trade(6, PICKED)),
    Problem(
        "item-2x4",
        "one item, most rent",
        partial(invented.one_item, 2, 4, RENT),
        ways=ROADS,
        small=True,
    ),
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
