"""Answers that floats get wrong: wrong bases, thresholds below every tolerance, big numbers."""

# ruff: noqa: S311 - repeatable test data, nothing secret

from __future__ import annotations

import random
from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest

from designer.engines.highs import HIGHS
from designer.engines.report import BASIC, LOWER, UPPER, ZERO, Basis, Report
from designer.engines.watch import Watch
from designer.program.linear import LinearProgram
from designer.proof import settle
from designer.proof.corner import Corner
from designer.proof.elastic import elastic, row_sizes
from designer.proof.exact import Exact, Point
from designer.proof.kernel import Singular
from designer.proof.magnify import magnified
from designer.proof.pivot import pivot, slack_basis
from designer.proof.prove import prove
from designer.proof.settle import Effort, find_feasible, repair
from tests.engines.interim import interim_program
from tests.engines.programs import dense, judge, program


def posed(seed: int, correlated: bool, **how: object) -> LinearProgram:
    rng = random.Random(seed)
    types = [sorted(rng.sample(range(10, 60), 3)) for _ in range(3)]
    weights = [[rng.randint(1, 5) for _ in range(3)] for _ in range(3)]
    joint = [rng.randint(1, 9) for _ in range(27)] if correlated else None
    return interim_program(types, None if correlated else weights, 100, joint=joint, **how)  # type: ignore[arg-type]


class Wrong:
    """An engine that answers with what it was given: a basis, or only a word."""

    name = "wrong"

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


def shuffled(lp: LinearProgram, seed: int) -> Basis:
    """A basis with the right number of entries and nothing else right about it."""
    rng = random.Random(seed)
    basic = set(rng.sample(range(lp.columns + lp.rows), lp.rows))
    status = np.array([BASIC if k in basic else LOWER for k in range(lp.columns + lp.rows)])
    columns, rows = status[: lp.columns].astype(np.int8), status[lp.columns :].astype(np.int8)
    for part, lo, hi in ((columns, lp.col_lo, lp.col_hi), (rows, lp.row_lo, lp.row_hi)):
        part[(part == LOWER) & ~lo.finite] = UPPER
        part[(part == UPPER) & ~hi.finite] = ZERO
    return Basis(columns, rows)


@pytest.mark.parametrize("seed", range(6))
@pytest.mark.parametrize("correlated", [False, True])
def test_a_wrong_basis_is_repaired(seed: int, correlated: bool) -> None:
    lp = posed(seed, correlated)
    right = prove(lp)
    judge(lp, right)
    engine = Wrong(Report("optimal", "wrong", basis=shuffled(lp, seed)))
    repaired = prove(lp, engine=engine)
    judge(lp, repaired)
    assert repaired.value == right.value
    assert repaired.effort["repairs"] >= 1


@pytest.mark.parametrize("word", ["infeasible", "unbounded", "unclear", "failed"])
def test_a_wrong_word_is_overruled(word: str) -> None:
    lp = posed(1, True)
    right = prove(lp)
    outcome = prove(lp, engine=Wrong(Report(word, "wrong")))  # type: ignore[arg-type]
    judge(lp, outcome)
    assert (outcome.status, outcome.value) == ("optimal", right.value)
    assert outcome.reason == f"wrong said {word!r}; the exact proof stands on HiGHS's basis"


def test_optimal_is_overruled_where_nothing_is_feasible() -> None:
    lp = program([[1], [1]], [2, None], [None, 1], [0], [None], [1])
    basis = Basis(np.array([BASIC], dtype=np.int8), np.array([LOWER, BASIC], dtype=np.int8))
    outcome = prove(lp, engine=Wrong(Report("optimal", "wrong", basis=basis)))
    judge(lp, outcome)
    assert outcome.status == "infeasible"


def test_optimal_is_overruled_where_the_goal_has_no_end() -> None:
    lp = program([[1, -1]], [0], [None], [0, 0], [None, None], [0, 1], "max")
    outcome = prove(lp, engine=Wrong(Report("optimal", "wrong", basis=slack_basis(Exact(lp)))))
    judge(lp, outcome)
    assert outcome.status == "unbounded"


@pytest.mark.parametrize("correlated", [False, True])
@pytest.mark.parametrize("seed", range(5))
@pytest.mark.parametrize("digits", [8, 10, 13, 40])
def test_thresholds_below_every_tolerance(correlated: bool, seed: int, digits: int) -> None:
    # Fixing the subsidy a hair below its least value leaves nothing; at the value itself and
    # above, something. Engines call all three feasible (their tolerance is 1e-7).
    least = prove(posed(seed, correlated)).value
    assert least is not None
    hair = Fraction(1, 10**digits)
    for amount, status in (
        (least - hair, "infeasible"),
        (least, "optimal"),
        (least + hair, "optimal"),
    ):
        fixed = posed(seed, correlated, subsidy=(amount.numerator, amount.denominator))
        outcome = prove(fixed)
        judge(fixed, outcome)
        assert outcome.status == status, (amount, outcome)


def test_a_threshold_in_one_column() -> None:
    tiny = 10**30
    for right, status in ((tiny, "optimal"), (tiny + 1, "infeasible")):
        lp = program([[tiny]], [right], [None], [0], [1], [1])
        outcome = prove(lp)
        judge(lp, outcome)
        assert outcome.status == status


def test_integers_beyond_64_bits_and_beyond_floats() -> None:
    for size in (2**63 + 1, 10**40 + 7, 10**400 + 9):
        lp = program(
            [[size, 3], [1, size]], [size + 3, size], [None, None], [0, 0], [None, None], [size, 1]
        )
        outcome = prove(lp)
        judge(lp, outcome)
        assert outcome.status == "optimal"
    rich = program([[1, 1]], [10**400], [10**400], [0, 0], [None, None], [2, 1])
    outcome = prove(rich)
    judge(rich, outcome)
    assert outcome.value == 10**400


def test_rows_scaled_by_a_big_prior() -> None:
    base = posed(2, True)
    factor = 3**60
    scaled = replace(
        base,
        data=base.data.astype(object) * factor,
        row_lo=replace(base.row_lo, num=base.row_lo.num.astype(object) * factor),
        row_hi=replace(base.row_hi, num=base.row_hi.num.astype(object) * factor),
    )
    outcome = prove(scaled)
    judge(scaled, outcome)
    assert outcome.value == prove(base).value


@pytest.mark.parametrize("seed", range(4))
def test_pivots_alone_reach_the_optimum(seed: int) -> None:
    lp = posed(seed, True)
    exact = Exact(lp)
    ended = pivot(exact, slack_basis(exact), Watch(), 5_000)
    assert ended is not None
    assert ended.corner is not None
    assert ended.corner.optimal
    assert exact.value(ended.corner.x) == prove(lp).value


def test_pivots_give_up_at_their_cap() -> None:
    exact = Exact(posed(0, True))
    assert pivot(exact, slack_basis(exact), Watch(), 3) is None


@pytest.mark.parametrize("seed", range(4))
def test_the_magnified_program_mends_what_a_tolerance_hides(seed: int) -> None:
    # With the floor 1e-9 below the optimum HiGHS's own basis is off by less than its
    # tolerance; magnified at that basis the violation is as large as 1.
    least = prove(posed(seed, True)).value
    assert least is not None
    amount = least + Fraction(1, 10**9)
    lp = posed(seed, True, subsidy=(amount.numerator, amount.denominator))
    tight = Exact(lp)
    at = prove(posed(seed, True, subsidy=(least.numerator, least.denominator)))
    assert at.primal is not None
    report = HIGHS.solve(lp, Watch())
    assert report.basis is not None
    corner = Corner(tight, report.basis, Watch())
    for _ in range(3):
        if corner.optimal:
            break
        again = magnified(corner, Watch())
        assert again.basis is not None
        corner = Corner(tight, again.basis, Watch())
    assert corner.optimal


def test_a_singular_basis_is_found_out_and_repaired() -> None:
    lp = program([[1, 1], [2, 2]], [2, 4], [None, None], [0, 0], [None, None], [1, 2])
    both = Basis(np.array([BASIC, BASIC], dtype=np.int8), np.array([LOWER, LOWER], dtype=np.int8))
    with pytest.raises(Singular):
        _ = Corner(Exact(lp), both, Watch()).x
    settled = repair(Exact(lp), both, Watch(), Effort())
    assert settled is not None
    assert settled.corner is not None
    assert settled.corner.optimal
    uneven = Basis(np.array([BASIC, BASIC], dtype=np.int8), np.array([BASIC, LOWER], dtype=np.int8))
    with pytest.raises(Singular):
        _ = Corner(Exact(lp), uneven, Watch()).x


def test_the_elastic_program_and_its_scale() -> None:
    lp = program([[1], [-1], [4]], [3, None, 0], [None, -1, 0], [None], [None], [5])
    assert row_sizes(lp).tolist() == [1, 1, 4]
    wide = elastic(lp, np.array([2, 7, 1]))
    assert wide.columns == 2
    # x >= 3 - 2 tau;  -x <= -1 + 7 tau;  4 x = 0 is left alone
    assert (wide.indices.tolist(), wide.data.tolist()) == ([0, 1, 0, 1, 0], [1, 2, -1, -7, 4])
    best = prove(wide)
    judge(wide, best)
    assert best.value == Fraction(3, 2)
    full = elastic(lp, full=True)
    assert full.columns == 4
    judge(full, prove(full))
    outcome = prove(lp, scale=np.array([2, 7, 1]))
    judge(lp, outcome)
    assert outcome.status == "infeasible"


def test_a_feasible_corner_is_one_of_the_program_itself() -> None:
    lp = posed(3, True, subsidy=(10**6, 1))
    found = find_feasible(lp, Watch(), Effort())
    assert found.corner is not None
    assert found.corner.feasible
    assert len(found.corner.basis.columns) == lp.columns


def test_certificates_that_do_not_hold_are_refused() -> None:
    lp = program([[1, 1]], [2], [None], [0, 0], [None, None], [1, 1])
    exact = Exact(lp)
    assert not exact.proves_infeasible(Point(np.array([1]), 1))
    assert not exact.proves_ray(Point(np.array([1, 0]), 1))
    assert not exact.proves_ray(Point(np.array([-1, 0]), 1))
    assert exact.proves_bound(Point(np.array([1]), 1), Fraction(2))
    assert not exact.proves_bound(Point(np.array([1]), 1), Fraction(3))
    assert not exact.proves_bound(Point(np.array([-1]), 1), Fraction(-9))
    outcome = prove(lp)
    judge(lp, outcome)
    assert outcome.dual is not None
    lying = replace(outcome, dual=replace(outcome.dual, num=(2,)))
    with pytest.raises(AssertionError):
        judge(lp, lying)
    assert dense(outcome.dual) == [1]


@pytest.mark.parametrize("word", ["optimal", "infeasible", "unbounded", "failed"])
def test_without_an_exact_proof_the_word_is_the_engines(
    word: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    lp = program([[1, 1]], [2], [None], [0, 0], [9, 9], [1, 1])
    said = Report(word, "lone", np.array([2.0, 0.0]), basis=slack_basis(Exact(lp)))  # type: ignore[arg-type]
    monkeypatch.setattr(settle, "repair", lambda *given: None)
    monkeypatch.setattr(settle, "_pivoted", lambda *given: None)
    outcome = prove(lp, engine=Wrong(said))
    assert outcome.status == ("undecided" if word == "failed" else word)
    assert not outcome.proved
    assert not outcome.table_proved
    assert (outcome.primal, outcome.dual, outcome.farkas, outcome.ray) == (None,) * 4
    assert outcome.bound == (2.0 if word == "optimal" else None)
    assert outcome.reason == (
        f"lone says {word!r} but no exact proof was found; try another engine, or state the "
        "amounts with smaller denominators"
    )
