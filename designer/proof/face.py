"""The optimal face: where a later goal may still choose, without writing the earlier value.

If y is an optimal dual of goal c1 with reduced costs d, the optimal solutions of c1 are
exactly the feasible points at which every row with y_i != 0 and every column with d_j != 0
sits at the side its sign names (complementary slackness). Posing the next goal on that face
keeps all coefficients small. Its dual y2 becomes a dual of the program that pins
c1 . x = v1 by adding M * y on the rows and -M on the pin, M large enough to set right the
signs of what the face had fixed:

    c2 - A'(y2 + M y) + M c1 = d2 + M d.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from fractions import Fraction

from designer.program.linear import Bound, LinearProgram
from designer.proof.vector import Vector


@dataclass(frozen=True, eq=False)
class Settled:
    """A settled goal, in the minimising form: its dual, its reduced costs, and its pin row.

    pin_scale  the pin's stored coefficients are pin_scale times the minimising cost
    Without a pin (None) the face can be solved on, but its duals cannot be lifted.
    """

    dual: Vector
    reduced: Vector
    pin: int | None
    pin_scale: Fraction


def reduced_costs(lp: LinearProgram, dual: Vector) -> Vector:
    """D = c - A'y of the minimising form, exactly; c includes the sign of a `max` goal.

    `dual` and the result are in units of the cost itself (its cost_den taken into account).
    """
    sign = 1 if lp.sense == "min" else -1
    common = dual.den * lp.cost_den
    total: list[int] = [sign * dual.den * int(c) for c in lp.cost]
    for row, weight in zip(dual.idx, dual.num, strict=True):
        factor = weight * lp.cost_den
        for k in range(int(lp.indptr[row]), int(lp.indptr[row + 1])):
            total[lp.indices[k]] -= factor * int(lp.data[k])
    return Vector.over(common, total)


def face(lp: LinearProgram, settled: list[Settled]) -> LinearProgram:
    """`lp` on the optimal face of the goals settled before, with their pins let go."""
    row_lo, row_hi = _copy(lp.row_lo), _copy(lp.row_hi)
    col_lo, col_hi = _copy(lp.col_lo), _copy(lp.col_hi)
    for goal in settled:
        _tighten(row_lo, row_hi, goal.dual)
        _tighten(col_lo, col_hi, goal.reduced)
    for pin in (goal.pin for goal in settled if goal.pin is not None):
        # A pin would put the earlier value, whatever its size, into the engine's floats.
        row_lo.finite[pin] = row_hi.finite[pin] = False
    return replace(lp, row_lo=row_lo, row_hi=row_hi, col_lo=col_lo, col_hi=col_hi)


def lift(
    lp: LinearProgram, settled: list[Settled], dual: Vector, least: Fraction = Fraction(0)
) -> Vector:
    """A dual on the face as a dual of `lp` itself, pins included; same value.

    `least` is an M that the last settled goal needs at least, for columns that `lp` leaves out.
    """
    rows = dual.fractions()
    columns = reduced_costs(lp, dual).fractions()
    for goal in reversed(settled):
        own_rows, own_columns = goal.dual.fractions(), goal.reduced.fractions()
        needed = max(
            _needed(lp.row_lo, lp.row_hi, rows, own_rows),
            _needed(lp.col_lo, lp.col_hi, columns, own_columns),
            least if goal is settled[-1] else Fraction(0),
        )
        if not needed:
            continue
        if goal.pin is None:
            raise ValueError("a face without a pin cannot be lifted")
        for into, own in ((rows, own_rows), (columns, own_columns)):
            for place, value in own.items():
                into[place] = into.get(place, Fraction(0)) + needed * value
        rows[goal.pin] = rows.get(goal.pin, Fraction(0)) - needed / goal.pin_scale
    return Vector.of(rows, dual.size)


def _copy(bound: Bound) -> Bound:
    return Bound(bound.num.copy(), bound.finite.copy())


def _tighten(low: Bound, high: Bound, multipliers: Vector) -> None:
    """Pull the far side to the side that the multiplier's sign names."""
    for place, number in zip(multipliers.idx, multipliers.num, strict=True):
        near, far = (low, high) if number > 0 else (high, low)
        far.num[place], far.finite[place] = near.num[place], True


def _needed(
    low: Bound, high: Bound, values: dict[int, Fraction], own: dict[int, Fraction]
) -> Fraction:
    """The least M >= 0 for which values + M * own names no other side than own does.

    The face holds what `own` names at that side; a sign that named the far side would be legal
    where that is finite, but would bound with the wrong number.
    """
    needed = Fraction(0)
    for place, value in values.items():
        mine = own.get(place)
        if not value or not mine or (value > 0) == (mine > 0):
            continue
        both = low.finite[place] and high.finite[place]
        if not (both and low.num[place] == high.num[place]):
            needed = max(needed, -value / mine)
    return needed
