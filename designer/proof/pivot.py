"""Exact simplex pivots with Bland's rule: slow, but they end, and never round.

Used to finish what floats got nearly right, and to decide programs so close to a threshold
that no tolerance can. Source: R. Bland, "New finite pivoting rules for the simplex method",
Mathematics of Operations Research 2 (1977) 103-107.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from designer.engines.report import BASIC, LOWER, UPPER, ZERO, Basis
from designer.engines.watch import Watch
from designer.proof.corner import Corner
from designer.proof.exact import Exact, Point
from designer.proof.sparse import narrow
from designer.setting.setting import IntArray


@dataclass(frozen=True)
class Ended:
    """How pivoting ended: with an optimal corner, a Farkas vector, or a point and a ray."""

    corner: Corner | None = None
    farkas: Point | None = None
    ray: Point | None = None
    pivots: int = 0


def slack_basis(exact: Exact) -> Basis:
    """The basis of all rows: columns rest at a bound, free ones at 0. Always regular."""
    columns = np.full(exact.matrix.columns, LOWER, dtype=np.int8)
    columns[~exact.col_lo.finite] = UPPER
    columns[~exact.col_lo.finite & ~exact.col_hi.finite] = ZERO
    return Basis(columns, np.full(exact.matrix.rows, BASIC, dtype=np.int8))


def pivot(exact: Exact, basis: Basis, watch: Watch, cap: int) -> Ended | None:
    """Pivot from a regular basis to an answer; None when `cap` pivots did not suffice.

    Dual pivots while the point is infeasible (with cost 0 if the multipliers are wrong too,
    which every basis is right for), then primal pivots. Raises Singular, Stopped.
    """
    corner = Corner(exact, basis, watch)
    none = np.zeros(exact.matrix.columns, dtype=np.int64)
    cost = exact.cost if corner.dual_feasible else none
    done = 0
    while not corner.feasible:
        if done == cap:
            return None
        watch.tell("exact pivots", done)
        step = _dual_step(corner, cost)
        if isinstance(step, Point):
            return Ended(farkas=step, pivots=done)
        corner, done = Corner(exact, step, watch), done + 1
    while not corner.dual_feasible:
        if done == cap:
            return None
        watch.tell("exact pivots", done)
        step = _primal_step(corner)
        if isinstance(step, Point):
            return Ended(corner=corner, ray=step, pivots=done)
        corner, done = Corner(exact, step, watch), done + 1
    return Ended(corner=corner, pivots=done)


def _dual_step(corner: Corner, cost: IntArray) -> Basis | Point:
    """One dual pivot; or the Farkas vector of a row that no column can mend."""
    exact, basis = corner.exact, corner.basis
    n = exact.matrix.columns
    missed = np.concatenate(corner.missed)
    leaving = int(np.argmax(missed))  # Bland: the first
    value = corner.x.num[leaving] if leaving < n else corner.activity[leaving - n]
    lo = exact.col_lo if leaving < n else exact.row_lo
    at = leaving if leaving < n else leaving - n
    low = bool(lo.finite[at]) and int(value) < int(lo.num[at]) * corner.x.den

    w = _combination(corner, leaving)
    alpha = np.concatenate([exact.matrix.transposed.times(w).astype(object), -w.astype(object)])
    # z_leaving = - sum alpha z over the nonbasic ones; it must rise if low, else fall
    rising = alpha if low else -alpha
    status = np.concatenate([basis.columns, basis.rows])
    may_rise, may_fall = _freedom(exact, status)
    eligible = (may_rise & np.asarray(rising < 0, dtype=bool)) | (
        may_fall & np.asarray(rising > 0, dtype=bool)
    )
    if not eligible.any():
        return Point(-w if low else w, 1)
    y = corner.multipliers(cost)
    d = np.concatenate([exact.reduced(y, cost).astype(object), y.num.astype(object)])
    candidates = np.flatnonzero(eligible).tolist()
    prices, shares = d.tolist(), alpha.tolist()
    entering = min(candidates, key=lambda k: (Fraction(abs(prices[k]), abs(shares[k])), k))
    return _exchange(basis, n, entering, leaving, LOWER if low else UPPER)


def _combination(corner: Corner, leaving: int) -> IntArray:
    """The rows' combination w with w'[A -I] positive at `leaving`, 0 at other basic entries."""
    exact = corner.exact
    n, m = exact.matrix.columns, exact.matrix.rows
    if leaving < n:
        unit = np.zeros(len(corner.basic), dtype=np.int64)
        unit[np.searchsorted(corner.basic, leaving)] = 1
        tight, den = corner.kernel.solve_transposed(unit)
    else:
        row = exact.matrix.part(np.array([leaving - n]), corner.basic)
        right: IntArray = np.zeros(len(corner.basic), dtype=object)
        right[row.indices] = row.data
        tight, den = corner.kernel.solve_transposed(right)
    w: IntArray = np.zeros(m, dtype=object)
    w[corner.tight] = tight
    if leaving >= n:
        w[leaving - n] = -den
    return narrow(w)


def drop_added(corner: Corner, kept: int) -> Basis:
    """Turn the basis of a widened program into one of the program of its first columns.

    Added columns (all at 0) that are basic are exchanged for rows by pivots of length 0.
    """
    basis = corner.basis
    for added in np.flatnonzero(basis.columns[kept:] == BASIC).tolist():
        w = _combination(corner, kept + added)
        row = int(np.flatnonzero(np.asarray(w != 0, dtype=bool))[0])
        status = basis.rows.copy()
        columns = basis.columns.copy()
        status[row], columns[kept + added] = BASIC, LOWER
        basis = Basis(columns, status)
        corner = Corner(corner.exact, basis, corner.watch)
    return Basis(basis.columns[:kept], basis.rows)


def _primal_step(corner: Corner) -> Basis | Point:
    """One primal pivot; or the ray along which the objective improves for ever."""
    exact, basis = corner.exact, corner.basis
    n = exact.matrix.columns
    wrong = np.concatenate(corner.wrong)
    entering = int(np.argmax(wrong))  # Bland: the first
    price = corner.d[entering] if entering < n else corner.y.num[entering - n]
    up = price < 0
    sign = 1 if up else -1

    # K dX_B = - A[N_r, entering] sign for a column, sign e_r for a tight row
    right: IntArray
    if entering < n:
        column = exact.matrix.transposed.part(np.array([entering]), corner.tight)
        right = np.zeros(len(corner.tight), dtype=object)
        right[column.indices] = -sign * column.data
    else:
        right = np.zeros(len(corner.tight), dtype=np.int64)
        right[np.searchsorted(corner.tight, entering - n)] = sign
    numerators, den = corner.kernel.solve(right)
    move: IntArray = np.zeros(n, dtype=object)
    move[corner.basic] = numerators
    if entering < n:
        move[entering] = sign * den
    rate = np.concatenate([move, exact.matrix.times(move).astype(object)])
    place = np.concatenate([corner.x.num.astype(object), corner.activity.astype(object)])
    sides = [
        (
            np.concatenate([c.num.astype(object), r.num.astype(object)]),
            np.concatenate([c.finite, r.finite]),
        )
        for c, r in ((exact.col_lo, exact.row_lo), (exact.col_hi, exact.row_hi))
    ]
    status = np.concatenate([basis.columns, basis.rows])
    movable = status == BASIC
    movable[entering] = True
    best: tuple[Fraction, int] | None = None
    for k in np.flatnonzero(movable).tolist():
        falling = rate[k] < 0
        if rate[k] == 0:
            continue
        bound, finite = sides[0 if falling else 1]
        if not finite[k]:
            continue
        room = Fraction(int(bound[k]) * corner.x.den - place[k], rate[k])
        if best is None or room < best[0]:
            best = (room, k)
    if best is None:
        return Point(move, den)
    leaving = best[1]
    return _exchange(basis, n, entering, leaving, LOWER if rate[leaving] < 0 else UPPER)


def _freedom(exact: Exact, status: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Which nonbasic entries may rise, and which may fall, from where they stand."""
    fixed = np.concatenate(
        [
            side.finite & other.finite & np.asarray(side.num == other.num, dtype=bool)
            for side, other in ((exact.col_lo, exact.col_hi), (exact.row_lo, exact.row_hi))
        ]
    )
    rise = ((status == LOWER) | (status == ZERO)) & ~fixed
    fall = ((status == UPPER) | (status == ZERO)) & ~fixed
    return rise, fall


def _exchange(basis: Basis, n: int, entering: int, leaving: int, at: int) -> Basis:
    """The basis after `leaving` went to one of its bounds and `entering` became basic."""
    status = np.concatenate([basis.columns, basis.rows])
    status[entering] = BASIC
    status[leaving] = at  # last: an entry that flips to its other bound leaves itself
    return Basis(status[:n], status[n:])
