"""From one multiplier's optimum to a point and multipliers of the master program."""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np

from designer.demands.terms import Terms
from designer.program.labels import Honest
from designer.program.program import Program
from designer.proof.outcome import Outcome
from designer.proof.vector import Vector
from designer.roads.interim.draft import InterimDraft
from designer.roads.interim.multiplier import Optimum, Side, utilities
from designer.setting.setting import IntArray, Setting

Rows = dict[int, Fraction]


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
    dual = _scaled(_multipliers(setting, terms, found, best, program), program)
    if not best.possible:
        return Outcome("infeasible", proved=True, farkas=dual)
    primal, value = _point(setting, terms, found, best, draft, program)
    if terms.goals[0] == "any":
        dual = Vector.of({}, dual.size)
    return Outcome("optimal", proved=True, table_proved=True, value=value, primal=primal, dual=dual)


def _chances(setting: Setting, best: Optimum) -> list[list[list[Fraction]]]:
    """q_i(k, a), by party, type and option."""
    found = []
    for index, party in enumerate(setting.parties):
        each = setting.total_weight // sum(party.weights)
        rows = []
        for a, weight in enumerate(party.weights):
            mass = each * weight
            row = [Fraction(0)] * len(setting.options)
            for share, listed in best.shares:
                for k, taken in enumerate(listed.counts.taken[0][index][a]):
                    row[k] += share * int(taken) / mass
            rows.append(row)
        found.append(rows)
    return found


def _point(
    setting: Setting,
    terms: Terms,
    found: tuple[Side, ...],
    best: Optimum,
    draft: InterimDraft,
    program: Program,
) -> tuple[Vector, Fraction]:
    """Shares, interim quantities and payments, and the goal's value there."""
    chances = _chances(setting, best)
    x: Rows = {
        int(column): share
        for column, (share, _) in zip(draft.share_columns, best.shares, strict=True)
    }
    # What the pot holds over and above what is asked goes to the first party.
    spare = Fraction(0)
    if terms.balance != "none" and terms.goals[0] in ("any", "welfare"):
        spare = best.pot + terms.subsidy
    for index, side in enumerate(found):
        columns, _ = draft.expected_decision(index)
        pays = draft.expected_pay(index)
        value = side.party.value.astype(object)
        left = utilities(side, chances[index])
        for a, row in enumerate(chances[index]):
            for k, chance in enumerate(row):
                x[int(columns[a, k])] = chance
            worth = sum((int(v) * q for v, q in zip(value[a], row, strict=True)), Fraction(0))
            x[int(pays[a])] = (worth - left[a]) / setting.grain + terms.shortfall
            if not index:
                x[int(pays[a])] -= spare
    goal = terms.goals[0]
    if goal == "outside-money":
        form = draft.allowance("subsidy", Fraction(0))
        x[int(form.col[0])] = -best.pot
        value_found = -best.pot
    elif goal == "revenue":
        value_found = best.pot
    else:
        stage = program.stages[0]
        cost = {int(j): int(stage.cost[j]) for j in np.flatnonzero(stage.cost)}
        total = sum((c * x.get(j, Fraction(0)) for j, c in cost.items()), Fraction(0))
        value_found = total / stage.cost_den + stage.cost_const
    kept = {column: value for column, value in x.items() if value}
    return Vector.of(kept, program.matrix.columns), value_found


def _multipliers(
    setting: Setting, terms: Terms, found: tuple[Side, ...], best: Optimum, program: Program
) -> Rows:
    """Multipliers of the natural rows, by row number."""
    rows: Rows = {}
    starts = _starts(program)
    pi = best.pi
    slices = Fraction(0)
    place = starts["expected decision"][0]
    total = setting.total_weight
    for index, (side, flow) in enumerate(zip(found, best.flows, strict=True)):
        table, den = _weights(setting, side, best, index)
        each = total // sum(side.party.weights)
        taken = best.shares[0][1].counts.taken[0][index]
        for a, row in enumerate(table):
            mass = each * side.party.weights[a]
            slices += Fraction(int((row * taken[a]).sum()), mass * den)
            for k in np.flatnonzero(row):
                rows[place + int(k)] = Fraction(int(row[k]), den)
            place += len(row)
        if side.party.size > 1:
            start = starts["honest"].pop(0)
            for offset, pair in enumerate(_pairs(program, side, start)):
                if pair in flow.lies:
                    rows[start + offset] = flow.lies[pair]
        start = starts["takes part"].pop(0)
        rows[start + side.order[-1]] = pi
    rows[starts["slice"][0]] = -slices
    goal = terms.goals[0]
    if "balance" in starts and (goal != "revenue" or not best.possible):
        rows[starts["balance"][0]] = pi
    return {row: value for row, value in rows.items() if value}


def _weights(setting: Setting, side: Side, best: Optimum, index: int) -> tuple[IntArray, int]:
    """The weight of q_i(k, a) in the objective and all rows, money units: integers, over one."""
    party, flow = side.party, best.flows[index]
    value = party.value.astype(object)
    total = sum(party.weights)
    den = total * math.lcm(
        best.alpha.denominator,
        best.pi.denominator,
        *(multiplier.denominator for multiplier in flow.lies.values()),
    )
    own = [int(best.alpha * den) // total * weight for weight in party.weights]
    own[side.order[-1]] += int(best.pi * den)
    table = np.zeros(value.shape, dtype=object)
    for (a, b), multiplier in flow.lies.items():
        whole = multiplier.numerator * (den // multiplier.denominator)
        own[a] += whole
        table[b] -= value[a] * whole
    table += value * np.array(own, dtype=object)[:, None]
    if not index:
        alpha, both = int(best.alpha * den) // total, int((best.alpha + best.pi) * den) // total
        row = setting.worth.astype(object) * alpha - setting.outlay.astype(object) * both
        table += np.multiply.outer(np.array(party.weights, dtype=object), row)
    return table, den * setting.grain


def _starts(program: Program) -> dict[str, list[int]]:
    """Where each family's blocks of rows start."""
    found: dict[str, list[int]] = {}
    place = 0
    for block in program.row_axis.blocks:
        found.setdefault(block.family, []).append(place)
        place += block.count
    return found


def _pairs(program: Program, side: Side, start: int) -> list[tuple[int, int]]:
    """The lies of one party in the order of their rows."""
    place = 0
    for block in program.row_axis.blocks:
        if place == start:
            labels = [type_.label for type_ in side.party.types]
            position = {label: a for a, label in enumerate(labels)}
            pairs = []
            for label in map(block.label, range(block.count)):
                if isinstance(label, Honest):
                    pairs.append((position[label.true], position[label.told]))
            return pairs
        place += block.count
    raise KeyError(start)


def _scaled(rows: Rows, program: Program) -> Vector:
    """Natural multipliers as those of the stored rows."""
    num, den = program.row_scale
    stored = {row: value * int(den[row]) / int(num[row]) for row, value in rows.items()}
    return Vector.of(stored, len(num))
