"""Integer programs: an exact table always, and a tree of certificates where it fits."""

from __future__ import annotations

import os
import signal
from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest

from designer.engines.highs import HIGHS
from designer.engines.report import Basis, Report
from designer.engines.watch import Watch
from designer.program.linear import LinearProgram
from designer.proof.outcome import Branch, Leaf
from designer.proof.prove import prove
from tests.engines.programs import Plain, dense, judge, program


def knapsack(size: int = 12, seed: int = 0) -> LinearProgram:
    """Two rows over 0-1 columns, as hard for its size as such programs get."""
    rng = np.random.default_rng(seed)
    rows = rng.integers(20, 60, size=(2, size))
    caps = (rows.sum(axis=1) // 2).tolist()
    worth = (rows.sum(axis=0) + rng.integers(-5, 6, size=size)).tolist()
    return program(
        rows.tolist(), [None, None], caps, [0] * size, [1] * size, worth, "max",
        integer=[True] * size,
    )  # fmt: skip


class Told:
    """An engine that says what it was told, whatever it is asked."""

    name = "told"

    def __init__(self, report: Report) -> None:  # noqa: D107 - see the class
        self.report = report

    def solve(
        self,
        lp: LinearProgram,
        watch: Watch,
        *,
        basis: Basis | None = None,
        tolerance: float | None = None,
    ) -> Report:
        return self.report


@pytest.mark.parametrize("seed", range(3))
def test_knapsacks_against_all_subsets(seed: int) -> None:
    lp = knapsack(10, seed)
    plain = Plain(lp)
    outcome = prove(lp)
    judge(lp, outcome)
    assert isinstance(outcome.tree, Branch)
    assert outcome.effort["nodes"] > 1
    assert outcome.value == plain.own(min(plain.value(x) for x in plain.whole_points()))


def test_whole_and_fractional_columns_together() -> None:
    # x whole, y not: max x + y with 2x + 2y <= 7 and y <= 1/2 gives x = 3, y = 1/2
    lp = program(
        [[2, 2]], [None], [7], [0, 0], [18, 1], [1, 1], "max", col_den=2, integer=[True, False]
    )
    outcome = prove(lp)
    judge(lp, outcome)
    assert outcome.value == Fraction(7, 2)
    assert dense(outcome.primal) == [3, Fraction(1, 2)]


def test_nothing_whole_between_the_bounds() -> None:
    lp = program([[2, 2]], [1], [1], [-9, -9], [9, 9], [1, 0], integer=[True, True])
    outcome = prove(lp)
    judge(lp, outcome)
    assert outcome.status == "infeasible"
    assert outcome.tree is not None
    kinds = set()
    todo = [outcome.tree]
    while todo:
        tree = todo.pop()
        if isinstance(tree, Leaf):
            kinds.add(tree.kind)
        else:
            todo += [tree.left, tree.right]
    assert kinds == {"infeasible"}


def test_no_whole_point_where_the_goal_grows_for_ever() -> None:
    """Only halves solve 2 x + 4 y = 1, and z is free to grow: no node has an optimum."""
    lp = program(
        [[2, 4, 0]],
        [1],
        [1],
        [0, 0, 0],
        [9, 9, None],
        [0, 0, 1],
        "max",
        integer=[True, True, False],
    )
    outcome = prove(lp)
    judge(lp, outcome)
    assert (outcome.status, outcome.proved) == ("infeasible", True)
    # and a wrong word about a program that does have whole points
    lp = program([[2, 4]], [2], [2], [0, 0], [9, 9], [1, 3], integer=[True, True])
    outcome = prove(lp, engine=Told(Report("infeasible", "told")))
    judge(lp, outcome)
    assert outcome.value == 1


def test_an_integer_program_without_end() -> None:
    lp = program([[2, -3]], [1], [1], [0, 0], [None, None], [1, 1], "max", integer=[True, True])
    outcome = prove(lp)
    judge(lp, outcome)
    assert outcome.status == "unbounded"


@pytest.mark.parametrize("word", ["infeasible", "unclear", "failed"])
def test_a_wrong_word_is_overruled(word: str) -> None:
    lp = knapsack(8)
    outcome = prove(lp, engine=Told(Report(word, "told")))  # type: ignore[arg-type]
    judge(lp, outcome)
    assert outcome.value == prove(lp).value


def test_a_poor_table_is_improved() -> None:
    lp = knapsack(8)
    outcome = prove(lp, engine=Told(Report("optimal", "told", np.zeros(8))))
    judge(lp, outcome)
    assert outcome.value == prove(lp).value


def test_a_table_that_is_none_is_not_taken() -> None:
    lp = knapsack(8)
    for x in (np.ones(8), np.full(8, 7.0)):
        outcome = prove(lp, engine=Told(Report("optimal", "told", x)))
        judge(lp, outcome)
        assert outcome.value == prove(lp).value


def test_an_unfinished_search_keeps_the_table_and_the_bound() -> None:
    lp = knapsack(30)
    outcome = prove(lp, branch_seconds=0.0)
    assert (outcome.status, outcome.proved, outcome.table_proved) == ("optimal", False, True)
    assert outcome.tree is None
    assert outcome.value == Plain(lp).own(Plain(lp).value(dense(outcome.primal)))
    assert Plain(lp).feasible(dense(outcome.primal))
    assert outcome.bound == pytest.approx(float(outcome.value))
    assert outcome.reason == (
        f"{HIGHS.name} says 'optimal'; our own branch and bound did not confirm it within 0 seconds"
    )


def test_a_limit_is_never_a_result() -> None:
    lp = knapsack(8)
    best = prove(lp)
    x = np.array([float(value) for value in dense(best.primal)])
    for status, word in (
        ("time-limit", "the time limit was reached before the search ended; give it more time "
         "with --time-limit"),
        ("interrupted", "interrupted before the search ended; give it more time with --time-limit"),
    ):  # fmt: skip
        cut = Report(status, "told", x, bound=-1e3)  # type: ignore[arg-type]
        outcome = prove(lp, engine=Told(cut))
        assert (outcome.status, outcome.proved, outcome.table_proved) == ("undecided", False, True)
        assert outcome.value == best.value
        assert outcome.bound == 1e3
        assert outcome.reason == word
        empty = prove(lp, engine=Told(replace(cut, x=None)))
        assert (empty.status, empty.table_proved, empty.primal) == ("undecided", False, None)


def test_ctrl_c_within_the_search_keeps_the_table() -> None:
    lp = knapsack(30)

    def progress(doing: str, seconds: float, steps: int) -> None:
        if doing == "branch and bound" and steps > 3:
            os.kill(os.getpid(), signal.SIGINT)

    outcome = prove(lp, watch=Watch(progress=progress))
    assert (outcome.status, outcome.proved, outcome.table_proved) == ("optimal", False, True)
    assert outcome.reason.endswith("did not confirm it before it stopped: interrupted")
