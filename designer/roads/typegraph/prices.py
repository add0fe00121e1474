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
from designer.roads.typegraph.bases import Base, Flow, kind
from designer.roads.typegraph.decided import Decided
from designer.roads.typegraph.fibers import Fibers, others_weights
from designer.roads.typegraph.paths import carried
from designer.setting.profiles import strides
from designer.setting.setting import IntArray, Setting

Kind = type[np.int64] | type[object]


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
    fixed = natural(program, "rule", dual)
    bounds = iter(natural(program, "at most", dual))
    charges = [Fraction(0) if base.most is None else next(bounds) for base in bases]
    dens = [_flow_den(base, work) for base, work in zip(bases, works, strict=True)]
    scale = math.lcm(*(v.denominator for v in (*fixed, *charges))) * math.lcm(*dens)
    largest = max(abs(int(v * scale)) for v in (*fixed, *charges, Fraction(1)))
    reach = max(work.reach for work in works) * setting.total_weight
    dtype = np.int64 if reach * largest * (2 * len(works) + 2) < 2**61 else object
    total: IntArray = np.zeros((len(decided.tied), len(setting.options)), dtype=dtype)
    weights = setting.weights[decided.tied].astype(dtype)
    den = works[0].den // setting.grain
    for i, work in enumerate(works):
        rows, types = _places(setting, i, decided.tied)
        party = setting.parties[i]
        value = party.value[decided.tied if party.depends else types].astype(dtype)
        total += weights[:, None] * value * (den * int(fixed[i] * scale))
        whole = int(charges[i] * scale)
        if whole:
            total -= _bound_price(work, bases[i], rows, types, dtype) * (whole // dens[i])
    for worth, multiplier in ((setting.outlay, fixed[-2]), (setting.worth, fixed[-1])):
        total += weights[:, None] * worth.astype(dtype)[None, :] * (den * int(multiplier * scale))
    return total


def _flow_den(base: Base, work: Fibers) -> int:
    """What the coefficients of a bound are over."""
    if base.flow is None:
        return 1
    return base.flow.den * math.lcm(*{int(work.mass[g]) for g, *_ in base.flow.lies})


def _places(setting: Setting, party: int, profiles: IntArray) -> tuple[IntArray, IntArray]:
    """The others' profile number and the party's type at listed profiles."""
    step, size = strides(setting.shape)[party], setting.shape[party]
    return profiles // (step * size) * step + profiles % step, profiles // step % size


def _bound_price(
    work: Fibers, base: Base, rows: IntArray, types: IntArray, dtype: Kind
) -> IntArray:
    """The coefficient of x_k(theta) in what bounds E[t_i], int (M, K), over the flow's den.

    x_k(a, r) enters the room of a and the costs of a's own lies through v(k, a), and the
    costs of the lies of others that say a through -v(k, b).
    """
    setting = work.setting
    party = setting.parties[work.party]
    scale = work.den // setting.grain
    if work.merged:
        private = (party.value.astype(dtype) * scale)[None]
        graphs = np.arange(work.classes)
        each = _prices_by_type(work, base, graphs, private, dtype)
        weight = others_weights(setting, work.party)[rows].astype(dtype)
        merged: IntArray = each[work.of[rows], types] * weight[:, None]
        return merged
    graphs, back = np.unique(rows, return_inverse=True)
    if party.depends:
        value = party.value[work.apart[graphs]].astype(dtype) * scale
    else:
        value = (party.value.astype(dtype) * scale)[None]
    found: IntArray = _prices_by_type(work, base, graphs, value, dtype)[back, types]
    if setting.joint is None:
        found = found * others_weights(setting, work.party)[rows].astype(dtype)[:, None]
    return found


def _prices_by_type(
    work: Fibers, base: Base, graphs: IntArray, value: IntArray, dtype: Kind
) -> IntArray:
    """As `_bound_price` for listed classes, all types, per unit of mass: (G, T, K)."""
    if base.flow is not None:
        return _prices_of_flow(work, base.flow, graphs, value, dtype)
    types = work.types
    if work.setting.joint is None:
        sinks = np.tile(work.own.astype(dtype), (len(graphs), 1))
    else:
        sinks = work.setting.joint[work.apart[graphs]].astype(dtype)
    if kind(work) == "mean" or base.tree is None:
        return sinks[:, :, None] * value
    tree = base.tree[graphs]
    carry = carried(tree, sinks)
    found: IntArray = carry[:, :, None] * value
    places = np.arange(len(graphs))
    for a in range(types):
        lying = tree[:, a] != a
        told, flow = tree[lying, a], carry[lying, a]
        own = value[:, a] if len(value) == 1 else value[lying, a]
        found[places[lying], told] -= flow[:, None] * own
    return found


def _prices_of_flow(
    work: Fibers, flow: Flow, graphs: IntArray, value: IntArray, dtype: Kind
) -> IntArray:
    """The same for a flow, over its den and what divides the mass of every class it uses."""
    own = int(work.own.sum())
    whole = math.lcm(*{int(work.mass[g]) for g, *_ in flow.lies})
    roots = np.array([share * own * whole for share in flow.roots], dtype=dtype)
    found: IntArray = roots[None, :, None] * np.broadcast_to(value, (len(graphs), *value.shape[1:]))
    place = {int(g): j for j, g in enumerate(graphs)}
    for g, true, told, amount in flow.lies:
        if g not in place:
            continue
        j = place[g]
        worth = value[0 if len(value) == 1 else j, true]
        carry = amount * own * (whole // int(work.mass[g]))
        found[j, true] += carry * worth
        found[j, told] -= carry * worth
    return found


def better(decided: Decided, priced: IntArray) -> IntArray:
    """For each tied profile the cheapest efficient option; the present choice where as cheap."""
    if not len(decided.tied):
        return decided.choices
    rows = np.arange(len(decided.tied))
    out = np.where(decided.torn, priced, priced.max() + 1)
    cheapest = out.min(axis=1)
    keep = out[rows, decided.choices] == cheapest
    return np.where(keep, decided.choices, out.argmin(axis=1)).astype(np.int64)
