"""A program whose rows are mostly slack: solve it without them, add those that are missed.

Leaving rows out only widens a program. So a Farkas vector of a part is one of the whole,
with zeros on the rows left out; and an optimal corner of a part that keeps every row of the
whole is optimal there, by the part's multipliers and zeros. Each round is solved afresh:
starting from the last basis disables presolve, which costs more than it saves.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from designer.engines.report import Engine, FloatArray
from designer.engines.watch import Watch
from designer.program.linear import BoolArray, Bound, IndexArray, LinearProgram
from designer.proof.exact import Exact
from designer.proof.settle import Effort, Settled, conclude
from designer.proof.sparse import Matrix
from designer.proof.vector import Vector

ROUNDS = 12
"""Rounds after which the whole program is the better question."""
NEAR = 1e-7
"""Miss that floats must show for a row to be added on their word, relative to the largest
entry of the point: where a row's own terms are all noise, so is what it misses by."""


@dataclass(frozen=True, eq=False)
class Part:
    """Some rows of a program: `lp` has row `rows[r]` of the whole as its row r."""

    lp: LinearProgram
    rows: IndexArray
    settled: Settled

    def widened(self, multipliers: Vector | None, size: int) -> Vector | None:
        """Multipliers of the part as multipliers of the whole: zeros on the rows left out."""
        if multipliers is None:
            return None
        idx = tuple(int(self.rows[k]) for k in multipliers.idx)
        return replace(multipliers, idx=idx, size=size)


def settle_part(
    lp: LinearProgram, late: BoolArray, engine: Engine, watch: Watch, effort: Effort
) -> Part | None:
    """Settle a continuous program on the rows it needs, starting without the `late` ones.

    late  bool per row: may be left out as long as it holds

    What comes back answers the whole program, exactly; None if the whole has to be asked.
    Raises Stopped.
    """
    whole = Exact(lp)
    kept = ~late
    for _ in range(ROUNDS):
        rows = np.flatnonzero(kept)
        part = of_rows(lp, rows)
        report = effort.note(engine.solve(part, watch))
        effort.counts["rounds"] += 1
        if report.x is not None:
            missed = _roughly_missed(lp, report.x) & ~kept
            if missed.any():
                kept |= missed
                continue
        settled = conclude(part, report, watch, effort)
        if settled.farkas is None and settled.corner is None:
            return None
        missed = _missed(whole, settled) & ~kept
        if not missed.any():
            effort.counts["rows left out"] += len(kept) - len(rows)
            return Part(part, rows, settled)
        kept |= missed
    return None


def of_rows(lp: LinearProgram, rows: IndexArray) -> LinearProgram:
    """The program with the listed rows only."""
    matrix = Matrix(lp.indptr, lp.indices, lp.data, lp.columns)
    part = matrix.part(rows, np.arange(lp.columns, dtype=np.int64))
    return replace(
        lp,
        indptr=part.indptr,
        indices=part.indices,
        data=part.data,
        row_lo=Bound(lp.row_lo.num[rows], lp.row_lo.finite[rows]),
        row_hi=Bound(lp.row_hi.num[rows], lp.row_hi.finite[rows]),
    )


def _missed(whole: Exact, settled: Settled) -> BoolArray:
    """Rows of the whole that a part's corner misses, or that its ray leaves; exactly."""
    rows = np.zeros(whole.lp.rows, dtype=bool)
    if settled.corner is None:
        return rows
    rows |= whole.outside(settled.corner.x)[1]
    if settled.ray is not None:
        along = whole.matrix.times(settled.ray.num)
        rows |= whole.lp.row_lo.finite & np.asarray(along < 0, dtype=bool)
        rows |= whole.lp.row_hi.finite & np.asarray(along > 0, dtype=bool)
    return rows


def _roughly_missed(lp: LinearProgram, x: FloatArray) -> BoolArray:
    """Rows that an engine's point clearly misses: worth adding before anything is proved."""
    with np.errstate(over="ignore", invalid="ignore"):
        data = lp.data.astype(np.float64)
        row_of = np.repeat(np.arange(lp.rows), np.diff(lp.indptr))
        activity = np.bincount(row_of, data * x[lp.indices], lp.rows)
        low, high = lp.row_lo.num.astype(np.float64), lp.row_hi.num.astype(np.float64)
        size = np.bincount(row_of, np.abs(data), lp.rows) * np.abs(x).max(initial=0)
        missed = (lp.row_lo.finite & (activity < low - NEAR * size)) | (
            lp.row_hi.finite & (activity > high + NEAR * size)
        )
    return np.asarray(missed, dtype=bool)
