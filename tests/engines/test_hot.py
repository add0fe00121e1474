"""The warm engine gives what a fresh one gives, whatever changes between two solves."""

from __future__ import annotations

import random
from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest

from designer.engines import hot
from designer.engines.highs import HIGHS
from designer.engines.hot import HotHighs
from designer.engines.model import quiet_highs
from designer.engines.watch import Watch
from designer.program.linear import Bound, LinearProgram
from designer.proof.prove import prove
from tests.engines.interim import interim_program
from tests.engines.programs import program


def example(seed: int) -> LinearProgram:
    rng = np.random.default_rng(seed)
    types = [sorted(rng.choice(30, size=4, replace=False).tolist()) for _ in range(2)]
    return interim_program(types, rng.integers(1, 5, size=(2, 4)).tolist(), 20)


@pytest.mark.parametrize("seed", range(4))
def test_costs_and_bounds_change_under_a_warm_model(seed: int) -> None:
    rng = random.Random(seed)  # noqa: S311 - repeatable test data
    lp, engine = example(seed), HotHighs()
    for _ in range(12):
        cost = np.array([rng.randint(-2, 2) for _ in range(lp.columns)], dtype=np.int64)
        low = Bound(np.full(lp.columns, -rng.randint(1, 90)), np.ones(lp.columns, dtype=bool))
        high = Bound(np.full(lp.columns, rng.randint(1, 90)), np.ones(lp.columns, dtype=bool))
        asked = replace(lp, cost=cost, col_lo=low, col_hi=high)
        warm, fresh = prove(asked, engine=engine), prove(asked, engine=HIGHS)
        assert warm.proved
        assert (warm.status, warm.value) == (fresh.status, fresh.value)


def test_few_changes_keep_the_model_and_many_do_not(monkeypatch: pytest.MonkeyPatch) -> None:
    lp, engine = example(0), HotHighs()
    box = replace(
        lp,
        col_lo=Bound(np.full(lp.columns, -50), np.ones(lp.columns, dtype=bool)),
        col_hi=Bound(np.full(lp.columns, 50), np.ones(lp.columns, dtype=bool)),
    )
    made = 0

    def counted() -> object:
        nonlocal made
        made += 1
        return quiet_highs()

    monkeypatch.setattr(hot, "quiet_highs", counted)
    for sign in (1, -1, 1):
        cost = np.full(lp.columns, sign, dtype=np.int64)
        assert engine.solve(replace(box, cost=cost), Watch()).status == "optimal"
    assert made == 1
    monkeypatch.setattr(hot, "FEW", 3)
    shifted = replace(box, col_hi=Bound(box.col_hi.num + 1, box.col_hi.finite))
    assert engine.solve(shifted, Watch()).status == "optimal"
    assert made == 2


def test_infeasible_then_feasible_again() -> None:
    engine = HotHighs()
    lp = program([[1, 1]], [4], [None], [0, 0], [3, 3], [1, 2])
    full = prove(lp, engine=engine)
    assert full.value == Fraction(5)
    tight = replace(lp, col_hi=Bound(np.array([1, 1]), lp.col_hi.finite))
    assert prove(tight, engine=engine).status == "infeasible"
    assert prove(lp, engine=engine).value == Fraction(5)


def test_no_time_is_a_limit_not_a_result() -> None:
    watch = Watch(limit=0.0)
    assert HotHighs().solve(example(1), watch).status == "time-limit"
