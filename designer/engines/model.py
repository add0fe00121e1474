"""HiGHS models: silent, filled from flat arrays, and their bases as ours."""

from __future__ import annotations

from typing import Any, Literal

import numpy as np

from designer.engines.floats import FloatProgram
from designer.engines.report import BASIC, LOWER, UPPER, ZERO, Basis, FloatArray, Said


def quiet_highs() -> Any:
    """Make a HiGHS instance that prints nothing, not even its banner."""
    import highspy

    model = highspy.Highs.__bases__[0]()
    model.setOptionValue("output_flag", False)
    model.setOptionValue("small_matrix_value", 1e-12)
    return model


def load(model: Any, program: FloatProgram) -> bool:
    """Pass the float program to HiGHS; whether all of it arrived."""
    integer, rows, columns = program.integer, len(program.row_lo), len(program.cost)
    status = model.passModel(
        columns,
        rows,
        len(program.data),
        2,  # row-wise
        1,  # minimise
        0.0,
        program.cost,
        program.col_lo,
        program.col_hi,
        program.row_lo,
        program.row_hi,
        program.indptr.astype(np.int32),
        program.indices.astype(np.int32),
        program.data,
        integer.astype(np.int32),
    )
    return int(status) != -1 and model.getNumCol() == columns and model.getNumRow() == rows


def read_basis(model: Any, program: FloatProgram, *, retained: bool = False) -> Basis | None:
    """Return the basis HiGHS ended with, if it has one.

    With `retained` also one that HiGHS no longer vouches for, as after `bring_back`.
    """
    theirs = model.getBasis()
    columns, rows = theirs.col_status, theirs.row_status
    if not (theirs.valid or retained):
        return None
    if len(columns) != len(program.cost) or len(rows) != len(program.row_lo):
        return None
    return Basis(
        sides_of(columns, np.isfinite(program.col_lo), np.isfinite(program.col_hi)),
        sides_of(rows, np.isfinite(program.row_lo), np.isfinite(program.row_hi)),
    )


def presolved(model: Any) -> Said | Literal["reduced", "whole"]:
    """Say how presolve ended: "reduced", "whole" (nothing to reduce), or the answer itself."""
    import highspy

    status = highspy.HighsPresolveStatus
    words: dict[Any, Said | Literal["reduced", "whole"]] = {
        status.kReduced: "reduced",
        status.kReducedToEmpty: "reduced",
        status.kInfeasible: "infeasible",
        status.kUnboundedOrInfeasible: "unclear",
        status.kTimeout: "time-limit",
    }
    return words.get(model.getModelPresolveStatus(), "whole")


def bring_back(model: Any, smaller: Any) -> None:
    """Undo the presolve of `model` for the answer of its presolved program.

    `postsolve` goes on to solve the whole program from the basis it recovers. An interior
    point method without an iteration to spend ends that at once and leaves the basis as it
    is, if no longer marked valid.
    """
    for name in ("ipm_iteration_limit", "simplex_iteration_limit", "pdlp_iteration_limit"):
        model.setOptionValue(name, 0)
    model.setOptionValue("solver", "ipm")
    model.setOptionValue("run_crossover", "off")
    model.postsolve(smaller.getSolution(), smaller.getBasis())


def word(model: Any) -> Said:
    """Give HiGHS's own word on the model it ran."""
    import highspy

    status = highspy.HighsModelStatus
    words: dict[Any, Said] = {
        status.kOptimal: "optimal",
        status.kModelEmpty: "optimal",
        status.kInfeasible: "infeasible",
        status.kUnbounded: "unbounded",
        status.kUnboundedOrInfeasible: "unclear",
        status.kTimeLimit: "time-limit",
        status.kInterrupt: "interrupted",
    }
    return words.get(model.getModelStatus(), "failed")


def point_of(model: Any, program: FloatProgram) -> FloatArray | None:
    """Read x in the program's own units, if HiGHS has one."""
    solution = model.getSolution()
    if not solution.value_valid:
        return None
    return program.point(np.array(solution.col_value, dtype=np.float64))


def multipliers_of(model: Any, program: FloatProgram) -> FloatArray | None:
    """Read y in units of the integer cost of the min problem, if HiGHS has one."""
    solution = model.getSolution()
    if not solution.dual_valid:
        return None
    return program.multipliers(np.array(solution.row_dual, dtype=np.float64))


def sides_of(statuses: list[Any], lo: Any, hi: Any) -> Any:
    """HiGHS's statuses as ours; `lo` and `hi` say which bounds there are."""
    ours = np.array([int(status) for status in statuses], dtype=np.int8)
    # 'nonbasic' without a side, and sides that have no bound, fall back to the bound there is
    ours[(ours > ZERO) | ((ours == ZERO) & (lo | hi))] = LOWER
    ours[(ours == LOWER) & ~lo] = UPPER
    ours[(ours == UPPER) & ~hi] = LOWER
    ours[(ours != BASIC) & ~lo & ~hi] = ZERO
    return ours


def their_basis(basis: Basis) -> Any:
    """Write a basis as HiGHS's, to be repaired rather than refused if it is none."""
    import highspy

    words = [highspy.HighsBasisStatus(code) for code in range(4)]
    theirs = highspy.HighsBasis()
    theirs.col_status = [words[code] for code in basis.columns.tolist()]
    theirs.row_status = [words[code] for code in basis.rows.tolist()]
    theirs.valid = True
    theirs.alien = True
    return theirs
