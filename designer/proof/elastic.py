"""Programs made from a program: its elastic relaxation and its directions.

`elastic` adds one column tau >= 0 that relaxes every one-sided row by tau times the row's
scale and minimises tau: always feasible unless the two-sided rows clash among themselves.
Its optimum is 0 exactly when the program is feasible; above 0 its optimal multipliers are a
Farkas vector. `elastic(..., full=True)` also gives every two-sided row a pair of columns.
"""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction

import numpy as np

from designer.program.linear import Bound, LinearProgram
from designer.proof.sparse import Indices, largest
from designer.setting.setting import IntArray


def elastic(
    lp: LinearProgram, scale: IntArray | None = None, *, full: bool = False
) -> LinearProgram:
    """Build the elastic program; its first columns are those of `lp`, the next is tau.

    scale  positive int per row: how much of tau the row may be missed by; by default the
           row's largest coefficient
    """
    if scale is None:
        scale = row_sizes(lp)
    low, high = lp.row_lo.finite, lp.row_hi.finite
    rows: list[Indices] = [np.flatnonzero(low ^ high)]
    signs = [np.where(low[rows[0]], 1, -1)]
    columns = [np.full(len(rows[0]), lp.columns, dtype=np.int64)]
    added = 1
    if full:
        both = np.flatnonzero(low & high)
        for sign in (1, -1):
            rows.append(both)
            signs.append(np.full(len(both), sign))
            columns.append(lp.columns + added + np.arange(len(both)))
            added += len(both)
    row = np.concatenate(rows)
    return _widened(
        replace(lp, cost=np.zeros(lp.columns, dtype=np.int64)),
        row,
        np.concatenate(columns),
        np.concatenate(signs) * scale[row],
        added,
    )


def row_sizes(lp: LinearProgram) -> IntArray:
    """The largest absolute coefficient of each row, 1 for an empty one."""
    if largest(lp.data) < 2**62:
        sizes: IntArray = np.ones(lp.rows, dtype=np.int64)
    else:
        sizes = np.ones(lp.rows, dtype=object)
    starts = lp.indptr[:-1]
    filled = starts < lp.indptr[1:]
    if lp.nonzeros:
        sizes[filled] = np.maximum.reduceat(np.abs(lp.data), starts[filled])
    return sizes


def directions(lp: LinearProgram) -> LinearProgram:
    """The program whose optimum is -1 when `lp` has a direction that improves for ever, else 0.

    Minimise c.r over directions r (finite bounds become 0) with c.r >= -1, c the cost of
    the min problem. `lp` is unbounded exactly when it is feasible and the optimum is -1.
    """
    sign = -1 if lp.sense == "max" else 1
    cost = sign * lp.cost
    used = np.flatnonzero(np.asarray(cost != 0, dtype=bool))
    flat_rows, flat_columns = np.zeros(lp.rows + 1, np.int64), np.zeros(lp.columns, np.int64)
    floor = flat_rows.astype(object)
    floor[-1] = -1
    return LinearProgram(
        indptr=np.append(lp.indptr, lp.nonzeros + len(used)),
        indices=np.concatenate([lp.indices, used]),
        data=np.concatenate([lp.data, cost[used]]),
        row_lo=Bound(floor.astype(np.int64), np.append(lp.row_lo.finite, True)),
        row_hi=Bound(flat_rows, np.append(lp.row_hi.finite, False)),
        col_lo=Bound(flat_columns, lp.col_lo.finite),
        col_hi=Bound(flat_columns, lp.col_hi.finite),
        col_den=1,
        cost=cost,
        integer=np.zeros(lp.columns, dtype=bool),
    )


def _widened(
    lp: LinearProgram, row: Indices, column: Indices, data: IntArray, added: int
) -> LinearProgram:
    """The program with `added` columns >= 0 of cost 1, entries given, to be minimised."""
    row_of = np.repeat(np.arange(lp.rows), np.diff(lp.indptr))
    all_rows = np.concatenate([row_of, row])
    order = np.argsort(all_rows, kind="stable")
    counts = np.bincount(all_rows, minlength=lp.rows)
    zeros = np.zeros(added, dtype=np.int64)
    finite, absent = np.ones(added, dtype=bool), np.zeros(added, dtype=bool)
    return replace(
        lp,
        indptr=np.concatenate([[0], np.cumsum(counts)]).astype(np.int64),
        indices=np.concatenate([lp.indices, column])[order],
        data=np.concatenate([lp.data, data])[order],
        col_lo=Bound(
            np.concatenate([lp.col_lo.num, zeros]), np.concatenate([lp.col_lo.finite, finite])
        ),
        col_hi=Bound(
            np.concatenate([lp.col_hi.num, zeros]), np.concatenate([lp.col_hi.finite, absent])
        ),
        cost=np.concatenate([lp.cost, zeros + 1]),
        cost_den=1,
        cost_const=Fraction(0),
        integer=np.zeros(lp.columns + added, dtype=bool),
        sense="min",
    )
