"""From one multiplier's optimum to a point and multipliers of the master program.

Whole arrays of integers over one denominator at a time: with a thousand types, fractions one by
one would take longer than finding the optimum.
"""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np

from designer.demands.terms import Terms
from designer.program.linear import IndexArray
from designer.program.program import Program
from designer.proof.outcome import Outcome
from designer.proof.vector import Vector
from designer.roads.interim.draft import InterimDraft
from designer.roads.interim.multiplier import Flow, Optimum, Side, utilities
from designer.setting.setting import IntArray, Setting

Part = tuple[IndexArray, IntArray, int]
"""Rows, and their natural multipliers as numerators over one denominator."""


def outcome_of(
    setting: Setting,
    terms: Terms,
    found: tuple[Side, ...],
    best: Optimum,
    draft: InterimDraft,
    program: Program,
) -> Outcome:
    """The outcome of the master program whose shares are the optimum's, in order.

    Nothing is believed of it: the checker holds it against the program like any other.
    """
    dual = _stored(_multipliers(setting, terms, found, best, draft, program), program)
    if not best.possible:
        return Outcome("infeasible", proved=True, farkas=dual)
    primal, value = _point(setting, terms, found, best, draft, program)
    if terms.goals[0] == "any":
        dual = Vector.of({}, dual.size)
    return Outcome("optimal", proved=True, table_proved=True, value=value, primal=primal, dual=dual)


def _others(side: Side, taken: IntArray) -> IntArray:
    """The weight of the others' profiles at which each option is taken, given one's type."""
    others: IntArray = taken // side.weights[:, None]
    return others


def _point(
    setting: Setting,
    terms: Terms,
    found: tuple[Side, ...],
    best: Optimum,
    draft: InterimDraft,
    program: Program,
) -> tuple[Vector, Fraction]:
    """Shares, interim quantities and payments, and the goal's value there."""
    goal, grain = terms.goals[0], setting.grain
    # What the pot holds over and above what is asked goes to the first party.
    spare = Fraction(0)
    if terms.balance != "none" and goal in ("any", "welfare"):
        spare = best.pot + terms.subsidy
    split = math.lcm(*(share.denominator for share, _ in best.shares))
    eachs = [setting.total_weight // sum(side.party.weights) for side in found]
    den = grain * math.lcm(split * math.lcm(*eachs), spare.denominator, best.pot.denominator)
    den = math.lcm(den, terms.shortfall.denominator)
    x = np.zeros(program.matrix.columns, dtype=object)
    for column, (share, _) in zip(draft.share_columns, best.shares, strict=True):
        x[column] = int(share * den)
    for index, (side, each) in enumerate(zip(found, eachs, strict=True)):
        chances = np.zeros(side.value.shape, dtype=object)
        for share, listed in best.shares:
            chances += _others(side, listed.counts.taken[0][index]) * int(share * split)
        columns, _ = draft.expected_decision(index)
        unit = den // (split * each)
        x[columns] = draft.merged[index].sums(chances) * unit
        least = int(side.party.outside[side.order[-1]]) * split * each
        worth = (side.value * chances).sum(axis=1) - utilities(side, chances) - least
        pays = worth * (unit // grain) + int(terms.shortfall * den)
        x[draft.expected_pay(index)] = pays if index else pays - int(spare * den)
    if goal == "outside-money":
        form = draft.allowance("subsidy", Fraction(0))
        x[int(form.col[0])] = -int(best.pot * den)
        value = -best.pot
    elif goal == "revenue":
        value = best.pot
    else:
        stage = program.stages[0]
        used = np.flatnonzero(stage.cost)
        total = int((stage.cost[used].astype(object) * x[used]).sum())
        value = Fraction(total, den * stage.cost_den) + stage.cost_const
    return Vector.over(den, x.tolist()), value


def _multipliers(
    setting: Setting,
    terms: Terms,
    found: tuple[Side, ...],
    best: Optimum,
    draft: InterimDraft,
    program: Program,
) -> list[Part]:
    """Multipliers of the natural rows."""
    parts: list[Part] = []
    starts = _starts(program)
    pi = best.pi
    slices = Fraction(0)
    place = starts["expected decision"][0]
    for index, (side, flow) in enumerate(zip(found, best.flows, strict=True)):
        table, den = _weights(setting, side, best, index)
        each = setting.total_weight // sum(side.party.weights)
        others = _others(side, best.shares[0][1].counts.taken[0][index])
        slices += Fraction(int((table * others).sum()), each * den)
        table = table[:, draft.merged[index].first]
        parts.append((place + np.arange(table.size), table.ravel(), den))
        place += table.size
        if side.party.size > 1:
            rows, num = _told(side, flow, *draft.lies(index))
            parts.append((starts["honest"].pop(0) + rows, num, flow.den))
        parts.append(_one(starts["takes part"].pop(0) + side.order[-1], pi))
    parts.append(_one(starts["slice"][0], -slices))
    goal = terms.goals[0]
    if "balance" in starts and (goal != "revenue" or not best.possible):
        parts.append(_one(starts["balance"][0], pi))
    return parts


def _one(row: int, value: Fraction) -> Part:
    return np.array([row]), np.array([value.numerator], dtype=object), value.denominator


def _weights(setting: Setting, side: Side, best: Optimum, index: int) -> tuple[IntArray, int]:
    """The weight of q_i(k, a) in the objective and all rows, money units: integers, over one."""
    flow, value = best.flows[index], side.value
    total = sum(side.party.weights)
    den = math.lcm(total * best.alpha.denominator, best.pi.denominator, flow.den)
    own = side.weights * (int(best.alpha * den) // total)
    own[side.order[-1]] += int(best.pi * den)
    order = np.array(side.line.order)
    low, high, unit = order[:-1], order[1:], den // flow.den
    up, down = flow.up * unit, flow.down * unit
    own[low] += up
    own[high] += down
    table = value * own[:, None]
    table[high] -= value[low] * up[:, None]
    table[low] -= value[high] * down[:, None]
    if not index:
        alpha, both = int(best.alpha * den) // total, int((best.alpha + best.pi) * den) // total
        row = setting.worth.astype(object) * alpha - setting.outlay.astype(object) * both
        table += np.multiply.outer(side.weights, row)
    return table, den * setting.grain


def _starts(program: Program) -> dict[str, list[int]]:
    """Where each family's blocks of rows start."""
    found: dict[str, list[int]] = {}
    place = 0
    for block in program.row_axis.blocks:
        found.setdefault(block.family, []).append(place)
        place += block.count
    return found


def _told(
    side: Side, flow: Flow, true: IndexArray, told: IndexArray
) -> tuple[IndexArray, IntArray]:
    """Which of the written lies carry a multiplier, and its numerator."""
    spot = np.empty(side.party.size, dtype=np.int64)
    spot[list(side.line.order)] = np.arange(side.party.size)
    step = spot[told] - spot[true]
    up, down = np.flatnonzero(step == 1), np.flatnonzero(step == -1)
    num = np.concatenate([flow.up[spot[true[up]]], flow.down[spot[told[down]]]])
    return np.concatenate([up, down]), num


def _stored(parts: list[Part], program: Program) -> Vector:
    """Natural multipliers as those of the stored rows."""
    common = math.lcm(*(den for _, _, den in parts))
    rows = np.concatenate([rows for rows, _, _ in parts])
    num = np.concatenate([num * (common // den) for _, num, den in parts])
    used = np.flatnonzero(num)
    rows, num = rows[used], num[used]
    above, below = (scale[rows].astype(object) for scale in program.row_scale)
    num = num * below
    rest = above // np.gcd(num, above)
    over = math.lcm(*set(rest.tolist()))
    dense = np.zeros(len(program.row_scale[0]), dtype=object)
    dense[rows] = num * over // above
    return Vector.over(common * over, dense.tolist())
