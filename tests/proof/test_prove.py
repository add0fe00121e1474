"""Random small programs, each answer judged by slow independent arithmetic.

Every certificate is checked in Fractions by `tests.engines.programs.judge`; a certificate
that holds settles the status, so nothing here trusts an engine. Optima are also compared with
brute force over vertices, with GLPK's exact simplex and with Clarabel's interior point.
"""

from __future__ import annotations

from fractions import Fraction
from typing import Literal

import numpy as np
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from designer.program.linear import LinearProgram
from designer.proof.prove import prove
from tests.engines.interim import interim_program
from tests.engines.programs import Plain, dense, judge, program

SMALL = st.integers(-4, 4)


@st.composite
def bounds(draw: st.DrawFn, size: int, boxed: bool) -> tuple[list[int | None], list[int | None]]:
    lo: list[int | None] = []
    hi: list[int | None] = []
    for _ in range(size):
        low = draw(st.integers(-5, 5))
        width = draw(st.integers(0, 6))
        kind = "both" if boxed else draw(st.sampled_from(["both", "low", "high", "free", "fixed"]))
        lo.append(low if kind in ("both", "low", "fixed") else None)
        hi.append(low if kind == "fixed" else low + width if kind in ("both", "high") else None)
    return lo, hi


@st.composite
def programs(draw: st.DrawFn, boxed: bool = False, whole: bool = False) -> LinearProgram:
    n, m = draw(st.integers(1, 4)), draw(st.integers(0, 4))
    rows = [draw(st.lists(SMALL, min_size=n, max_size=n)) for _ in range(m)]
    row_lo, row_hi = draw(bounds(m, False))
    col_lo, col_hi = draw(bounds(n, boxed))
    sense: Literal["min", "max"] = draw(st.sampled_from(["min", "max"]))
    return program(
        rows,
        row_lo,
        row_hi,
        col_lo,
        col_hi,
        draw(st.lists(SMALL, min_size=n, max_size=n)),
        sense,
        col_den=1 if whole else draw(st.integers(1, 3)),
        cost_den=draw(st.integers(1, 3)),
        cost_const=Fraction(draw(st.integers(-3, 3)), 2),
        integer=[True] * n if whole else None,
    )


@settings(max_examples=250, deadline=None)
@given(programs())
def test_every_answer_is_proved(lp: LinearProgram) -> None:
    judge(lp, prove(lp))


@settings(max_examples=100, deadline=None)
@given(programs(boxed=True))
def test_optima_are_those_of_all_vertices(lp: LinearProgram) -> None:
    plain = Plain(lp)
    vertices = plain.vertices()
    outcome = prove(lp)
    judge(lp, outcome)
    assert (outcome.status == "optimal") == bool(vertices)
    if vertices:
        best = min(plain.value(vertex) for vertex in vertices)
        assert outcome.value == plain.own(best)


@settings(max_examples=60, deadline=None)
@given(programs(boxed=True, whole=True))
@example(program([[2]], [1], [1], [0], [1], [1], integer=[True]))
def test_integer_optima_are_those_of_all_points(lp: LinearProgram) -> None:
    plain = Plain(lp)
    points = plain.whole_points()
    outcome = prove(lp)
    judge(lp, outcome)
    assert (outcome.status == "optimal") == bool(points)
    if points:
        assert outcome.value == plain.own(min(plain.value(point) for point in points))


@settings(max_examples=60, deadline=None)
@given(programs(whole=True))
def test_unboxed_integer_programs_never_claim_what_does_not_hold(lp: LinearProgram) -> None:
    # a tree may be endless where nothing bounds the integers, so 'unproved' is allowed
    outcome = prove(lp, branch_seconds=0.3)
    if outcome.proved:
        judge(lp, outcome)
    elif outcome.table_proved:
        assert Plain(lp).feasible(dense(outcome.primal))
    else:
        assert outcome.reason


def test_no_rows_and_no_columns() -> None:
    judge(program([], [], [], [0], [None], [1]), prove(program([], [], [], [0], [None], [1])))
    assert prove(program([], [], [], [0], [None], [-1])).status == "unbounded"
    assert prove(program([[], []], [0, -1], [0, None], [], [], [])).status == "optimal"
    nothing = program([[]], [1], [None], [], [], [])
    judge(nothing, prove(nothing))
    assert prove(nothing).status == "infeasible"


def test_equalities_that_contradict_each_other() -> None:
    lp = program([[1, 1], [2, 2]], [3, 5], [3, 5], [None, None], [None, None], [1, 1])
    outcome = prove(lp)
    judge(lp, outcome)
    assert outcome.status == "infeasible"
    assert outcome.farkas is not None
    assert outcome.farkas.idx == (0, 1)


def test_the_dual_of_a_maximum_is_that_of_its_min_problem() -> None:
    lp = program([[1, 2]], [None], [4], [0, 0], [None, None], [1, 1], "max", cost_den=2)
    outcome = prove(lp)
    judge(lp, outcome)
    assert outcome.value == 2
    # min -(x + y)/2: the row's upper side is used, so its multiplier is negative
    assert dense(outcome.dual) == [Fraction(-1, 2)]


def test_crossing_bounds_are_named() -> None:
    lp = program([[1]], [0], [None], [3], [2], [1])
    outcome = prove(lp)
    assert (outcome.status, outcome.proved) == ("infeasible", False)
    assert outcome.reason == "column 0 has its lower bound above its upper."


@pytest.mark.parametrize("correlated", [False, True])
@pytest.mark.parametrize("seed", range(4))
def test_posed_programs_against_glpk_exact_and_clarabel(correlated: bool, seed: int) -> None:
    # second opinions from general-purpose engines: GLPK's exact simplex, Clarabel 0.11
    rng = np.random.default_rng(seed)
    types = [sorted(rng.choice(60, size=3, replace=False).tolist()) for _ in range(3)]
    weights = None if correlated else rng.integers(1, 6, size=(3, 3)).tolist()
    joint = rng.integers(1, 9, size=27).tolist() if correlated else None
    lp = interim_program(types, weights, 80, joint=joint)
    outcome = prove(lp)
    judge(lp, outcome)
    assert outcome.status == "optimal"
    assert outcome.value is not None
    assert float(outcome.value) == pytest.approx(_glpk(lp), rel=1e-9, abs=1e-9)
    assert float(outcome.value) == pytest.approx(_clarabel(lp), rel=1e-5, abs=1e-5)


def _glpk(lp: LinearProgram) -> float:
    import swiglpk as glpk

    glpk.glp_term_out(glpk.GLP_OFF)
    problem = glpk.glp_create_prob()
    glpk.glp_add_rows(problem, lp.rows)
    glpk.glp_add_cols(problem, lp.columns)
    for axis, lo, hi, den in (
        (glpk.glp_set_row_bnds, lp.row_lo, lp.row_hi, 1),
        (glpk.glp_set_col_bnds, lp.col_lo, lp.col_hi, lp.col_den),
    ):
        for k in range(len(lo.num)):
            low, high = bool(lo.finite[k]), bool(hi.finite[k])
            kind = {
                (True, True): glpk.GLP_FX if lo.num[k] == hi.num[k] else glpk.GLP_DB,
                (True, False): glpk.GLP_LO,
                (False, True): glpk.GLP_UP,
                (False, False): glpk.GLP_FR,
            }[low, high]
            axis(problem, k + 1, kind, float(lo.num[k]) / den, float(hi.num[k]) / den)
    rows = np.repeat(np.arange(lp.rows), np.diff(lp.indptr))
    row_array = glpk.intArray(lp.nonzeros + 1)
    column_array = glpk.intArray(lp.nonzeros + 1)
    values = glpk.doubleArray(lp.nonzeros + 1)
    for k in range(lp.nonzeros):
        row_array[k + 1] = int(rows[k]) + 1
        column_array[k + 1] = int(lp.indices[k]) + 1
        values[k + 1] = float(lp.data[k])
    glpk.glp_load_matrix(problem, lp.nonzeros, row_array, column_array, values)
    for j in range(lp.columns):
        glpk.glp_set_obj_coef(problem, j + 1, float(lp.cost[j]) / lp.cost_den)
    assert glpk.glp_simplex(problem, None) == 0
    assert glpk.glp_exact(problem, None) == 0
    value = float(glpk.glp_get_obj_val(problem))
    glpk.glp_delete_prob(problem)
    return value


def _clarabel(lp: LinearProgram) -> float:
    import clarabel
    from scipy import sparse

    n = lp.columns
    a = sparse.csr_array(
        (lp.data.astype(float), lp.indices.astype(np.int32), lp.indptr.astype(np.int32)),
        shape=(lp.rows, n),
    )
    equal = lp.row_lo.finite & lp.row_hi.finite
    low = lp.row_lo.finite & ~equal
    assert (equal | low).all()
    right = lp.row_lo.num.astype(float)
    system = sparse.vstack([a[np.flatnonzero(equal)], -a[np.flatnonzero(low)]]).tocsc()
    cones = [clarabel.ZeroConeT(int(equal.sum())), clarabel.NonnegativeConeT(int(low.sum()))]
    options = clarabel.DefaultSettings()
    options.verbose = False
    solver = clarabel.DefaultSolver(
        sparse.csc_matrix((n, n)),
        lp.cost.astype(float) / lp.cost_den,
        sparse.csc_matrix(system),
        np.concatenate([right[equal], -right[low]]),
        cones,
        options,
    )
    return float(solver.solve().obj_val)
