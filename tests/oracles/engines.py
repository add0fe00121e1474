"""Second engines on the package's own exact arrays: GLPK's simplex and Clarabel's interior.

Both get the arrays as they are, without any scaling of ours, and answer in floats.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from scipy import sparse

from designer.program.linear import LinearProgram

Answer = tuple[str, float | None]
"""Status ("possible", "impossible", "unbounded", "undecided") and the objective's value."""


def arrays(lp: LinearProgram) -> dict[str, Any]:
    """The program in floats: matrix, bounds with infinities, cost with its denominator."""

    def bound(num: Any, finite: Any, den: int, absent: float) -> Any:
        entries = [int(v) / den if f else absent for v, f in zip(num, finite, strict=True)]
        return np.array(entries, dtype=float)

    data = np.array([float(int(v)) for v in lp.data])
    return {
        "matrix": sparse.csr_matrix((data, lp.indices, lp.indptr), shape=(lp.rows, lp.columns)),
        "row_lo": bound(lp.row_lo.num, lp.row_lo.finite, 1, -np.inf),
        "row_hi": bound(lp.row_hi.num, lp.row_hi.finite, 1, np.inf),
        "col_lo": bound(lp.col_lo.num, lp.col_lo.finite, lp.col_den, -np.inf),
        "col_hi": bound(lp.col_hi.num, lp.col_hi.finite, lp.col_den, np.inf),
        "cost": np.array([int(v) / lp.cost_den for v in lp.cost], dtype=float),
    }


def by_glpk(lp: LinearProgram) -> Answer:
    """GLPK: simplex, and branch and bound where columns must be whole."""
    import swiglpk as glpk

    parts = arrays(lp)
    glpk.glp_term_out(glpk.GLP_OFF)
    problem = glpk.glp_create_prob()
    try:
        _load(glpk, problem, parts, lp)
        control = glpk.glp_smcp()
        glpk.glp_init_smcp(control)
        control.msg_lev = glpk.GLP_MSG_OFF
        glpk.glp_simplex(problem, control)
        status = _glpk_word(glpk, problem)
        if status != "possible" or not lp.integer.any():
            value = glpk.glp_get_obj_val(problem) if status == "possible" else None
            return status, value
        search = glpk.glp_iocp()
        glpk.glp_init_iocp(search)
        search.msg_lev = glpk.GLP_MSG_OFF
        glpk.glp_intopt(problem, search)
        found = glpk.glp_mip_status(problem)
        if found == glpk.GLP_OPT:
            return "possible", glpk.glp_mip_obj_val(problem)
        return ("impossible" if found == glpk.GLP_NOFEAS else "undecided"), None
    finally:
        glpk.glp_delete_prob(problem)


def _load(glpk: Any, problem: Any, parts: dict[str, Any], lp: LinearProgram) -> None:
    glpk.glp_set_obj_dir(problem, glpk.GLP_MAX if lp.sense == "max" else glpk.GLP_MIN)
    if lp.rows:
        glpk.glp_add_rows(problem, lp.rows)
    glpk.glp_add_cols(problem, lp.columns)
    for r in range(lp.rows):
        low, high = parts["row_lo"][r], parts["row_hi"][r]
        glpk.glp_set_row_bnds(problem, r + 1, *_glpk_bounds(glpk, low, high))
    for j in range(lp.columns):
        low, high = parts["col_lo"][j], parts["col_hi"][j]
        glpk.glp_set_col_bnds(problem, j + 1, *_glpk_bounds(glpk, low, high))
        glpk.glp_set_obj_coef(problem, j + 1, parts["cost"][j])
        if lp.integer[j]:
            glpk.glp_set_col_kind(problem, j + 1, glpk.GLP_IV)
    glpk.glp_set_obj_coef(problem, 0, float(lp.cost_const))
    entries = parts["matrix"].tocoo()
    count = entries.nnz
    rows, columns = glpk.intArray(count + 1), glpk.intArray(count + 1)
    values = glpk.doubleArray(count + 1)
    for e in range(count):
        rows[e + 1] = int(entries.row[e]) + 1
        columns[e + 1] = int(entries.col[e]) + 1
        values[e + 1] = float(entries.data[e])
    glpk.glp_load_matrix(problem, count, rows, columns, values)


def _glpk_bounds(glpk: Any, low: float, high: float) -> tuple[int, float, float]:
    if low == high:
        return glpk.GLP_FX, low, high
    if np.isinf(low):
        return (glpk.GLP_FR, 0.0, 0.0) if np.isinf(high) else (glpk.GLP_UP, 0.0, high)
    return (glpk.GLP_LO, low, 0.0) if np.isinf(high) else (glpk.GLP_DB, low, high)


def _glpk_word(glpk: Any, problem: Any) -> str:
    words = {
        glpk.GLP_OPT: "possible",
        glpk.GLP_NOFEAS: "impossible",
        glpk.GLP_UNBND: "unbounded",
    }
    return words.get(glpk.glp_get_status(problem), "undecided")


def by_clarabel(lp: LinearProgram) -> Answer:
    """Clarabel: an interior-point cone engine; linear programs only."""
    import clarabel

    if lp.integer.any():
        raise ValueError("whole-number columns are beyond a cone engine")
    parts = arrays(lp)
    stacked = sparse.vstack([parts["matrix"], sparse.identity(lp.columns)]).tocsr()
    low = np.concatenate([parts["row_lo"], parts["col_lo"]])
    high = np.concatenate([parts["row_hi"], parts["col_hi"]])
    fixed = low == high
    upper, lower = ~fixed & np.isfinite(high), ~fixed & np.isfinite(low)
    system = sparse.vstack([stacked[fixed], stacked[upper], -stacked[lower]]).tocsc()
    bound = np.concatenate([low[fixed], high[upper], -low[lower]])
    cones = [
        clarabel.ZeroConeT(int(fixed.sum())),
        clarabel.NonnegativeConeT(int(upper.sum() + lower.sum())),
    ]
    sign = -1.0 if lp.sense == "max" else 1.0
    settings = clarabel.DefaultSettings()
    settings.verbose = False
    # Rows that repeat each other (every equality among dominant-strategy lies) stall the
    # default factorisation of 1e-8; iterative refinement takes out what this puts in.
    settings.static_regularization_constant = 1e-6
    square = sparse.csc_matrix((lp.columns, lp.columns))
    solution = clarabel.DefaultSolver(
        square, sign * parts["cost"], system, bound, cones, settings
    ).solve()
    words = {"Solved": "possible", "PrimalInfeasible": "impossible", "DualInfeasible": "unbounded"}
    status = words.get(str(solution.status), "undecided")
    value = sign * solution.obj_val + float(lp.cost_const) if status == "possible" else None
    return status, value
