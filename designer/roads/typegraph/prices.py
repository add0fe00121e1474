"""What another choice at a tied profile would be worth, at the multipliers of a totals program.

The multipliers of a totals program and of the paths behind its bounds prove a value for the
choices made at tied profiles. The same sum of rows, read as a function of the choices, is
linear in the chance of each option at each tied profile. If no option that is efficient there
makes it smaller, the same multipliers prove the value for every choice, lotteries included.
"""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np

from designer.program.program import Program
from designer.roads.typegraph.bases import Base, kind
from designer.roads.typegraph.decided import Decided
from designer.roads.typegraph.fibers import Fibers, others_weights
from designer.roads.typegraph.paths import carried
from designer.setting.profiles import strides
from designer.setting.setting import IntArray, Setting


def natural(program: Program, family: str, dual: dict[int, Fraction]) -> list[Fraction]:
    """A family's multipliers in natural units."""
    try:
        start = program.row_axis.start(family)
    except KeyError:
        return []
    count = sum(block.count for block in program.row_axis.blocks if block.family == family)
    num, den = program.row_scale
    return [
        dual.get(row, Fraction(0)) * int(num[row]) / int(den[row])
        for row in range(start, start + count)
    ]


def prices(
    setting: Setting,
    decided: Decided,
    works: list[Fibers],
    bases: list[Base],
    program: Program,
    dual: dict[int, Fraction],
) -> IntArray:
    """The price of each option at each tied profile, int (M, K), over one positive factor.

    A choice is proved when no option that is efficient there has a lower price.
    """
    parties, options = len(works), len(setting.options)
    fixed = natural(program, "rule", dual)
    bounds = natural(program, "at most", dual)
    charges = [Fraction(0)] * parties
    for i, charge in zip(
        (i for i, b in enumerate(bases) if b.most is not None), bounds, strict=True
    ):
        charges[i] = charge
    flows = [base.flow.den if base.flow else 1 for base in bases]
    scale = math.lcm(*(v.denominator for v in (*fixed, *charges))) * math.lcm(*flows)
    total: IntArray = np.zeros((len(decided.tied), options), dtype=object)
    weights = setting.weights[decided.tied].astype(object)
    den = works[0].den // setting.grain
    for i, work in enumerate(works):
        rows, types = _places(setting, i, decided.tied)
        party = setting.parties[i]
        value = (party.value[decided.tied] if party.depends else party.value[types]).astype(object)
        total += weights[:, None] * value * (den * int(fixed[i] * scale))
        whole = int(charges[i] * scale)
        if whole:
            total -= _bound_price(work, bases[i], rows, types) * (whole // flows[i])
    for worth, multiplier in ((setting.outlay, fixed[-2]), (setting.worth, fixed[-1])):
        total += weights[:, None] * worth.astype(object)[None, :] * (den * int(multiplier * scale))
    return total


def _places(setting: Setting, party: int, profiles: IntArray) -> tuple[IntArray, IntArray]:
    """The others' profile number and the party's type at listed profiles."""
    step, size = strides(setting.shape)[party], setting.shape[party]
    return profiles // (step * size) * step + profiles % step, profiles // step % size


def _bound_price(work: Fibers, base: Base, rows: IntArray, types: IntArray) -> IntArray:
    """The coefficient of x_k(theta) in what bounds E[t_i], int (M, K), over the flow's den.

    x_k(a, r) enters the room of a and the costs of a's own lies through v(k, a), and the
    costs of the lies of others that say a through -v(k, b).
    """
    setting = work.setting
    party, size = setting.parties[work.party], work.types
    weight = (
        others_weights(setting, work.party)[rows].astype(object)
        if setting.joint is None
        else np.ones(len(rows), dtype=object)
    )
    scale = work.den // setting.grain
    if party.depends:
        value = party.value[work.apart[rows]].astype(object) * scale
    else:
        value = np.broadcast_to(party.value.astype(object) * scale, (len(rows), *party.value.shape))
    places = np.arange(len(rows))
    inward, outward = _flows(work, base, rows)
    found: IntArray = value[places, types] * inward[places, types][:, None]
    for b in range(size):
        found = found - value[:, b] * outward[places, b, types][:, None]
    total: IntArray = found * weight[:, None]
    return total


def _flows(work: Fibers, base: Base, rows: IntArray) -> tuple[IntArray, IntArray]:
    """What enters each type, (M, T), and each lie's flow, (M, T true, T told), per unit mass."""
    size, count = work.types, len(rows)
    classes = work.of[rows]
    outward = np.zeros((count, size, size), dtype=object)
    if base.flow is not None:
        own = int(work.own.sum())
        inward = np.tile(np.array(base.flow.roots, dtype=object) * own, (count, 1))
        lies: dict[int, list[tuple[int, int, int]]] = {}
        for g, true, told, amount in base.flow.lies:
            lies.setdefault(g, []).append((true, told, amount))
        for row, g in enumerate(classes):
            for true, told, amount in lies.get(int(g), ()):
                flow = Fraction(amount * own, int(work.mass[g]))
                outward[row, true, told] += flow
                inward[row, true] += flow
        return inward, outward
    sinks = (
        np.tile(work.own, (count, 1))
        if work.setting.joint is None
        else work.setting.joint[work.apart[rows]].astype(object)
    )
    if kind(work) == "mean" or base.tree is None:
        return sinks, outward
    tree = base.tree[classes]
    carry = carried(tree, sinks)
    places = np.arange(count)
    for a in range(size):
        lying = tree[:, a] != a
        outward[places[lying], a, tree[lying, a]] = carry[lying, a]
    return carry, outward


def better(decided: Decided, priced: IntArray) -> IntArray:
    """For each tied profile the cheapest efficient option; the present choice where as cheap."""
    if not len(decided.tied):
        return decided.choices
    rows = np.arange(len(decided.tied))
    out = np.where(decided.torn, priced, priced.max() + 1)
    cheapest = out.min(axis=1)
    keep = out[rows, decided.choices] == cheapest
    return np.where(keep, decided.choices, out.argmin(axis=1)).astype(decided.at.dtype)
