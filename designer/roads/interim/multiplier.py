"""One-dimensional types and a known worst-off type: one multiplier decides.

alpha * welfare + pi * (the largest pot that honesty and participation leave) is maximised
profile by profile: by the option k with the largest sum over parties of

    (alpha + pi) v_i(k, a) + (zbar_i(a) - (alpha + pi) theta_i(a)) slope_i(k)

less (alpha + pi) outlay(k), plus alpha worth(k). Here z_i is the virtual type (Myerson 1981) and
zbar_i its ironing, the slopes of the greatest convex minorant of its sums. For welfare under
a balance demand (alpha, pi) = (1, mu), and the best mu is where the lines of two rules cross:
found by intersecting lines, in rationals. Where efficiency is demanded, the pot's weights
break ties. The multipliers of lie, participation and balance
rows follow in closed form; `certificate.py` writes them down.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from fractions import Fraction
from itertools import pairwise

import numpy as np
import numpy.typing as npt

from designer.demands.terms import Terms
from designer.roads.interim.lies import Line, line
from designer.roads.interim.rule import Counts, Index, Listed, Rule, welfare_index
from designer.setting.setting import IntArray, Party, Setting

GOALS = ("any", "welfare", "revenue", "outside-money")
ROUNDS = 500
BITS = 40
"""Bits of the indices of rules that only steer the search."""


@dataclass(frozen=True, eq=False)
class Side:
    """A party on a line. `order` runs from its best-off to its worst-off type."""

    party: Party
    line: Line
    order: tuple[int, ...]


@dataclass(frozen=True, eq=False)
class Flow:
    """One party's multipliers at some weights of welfare and pot.

    lies     (true, told) -> multiplier, per probability of the true type's whole party
    virtual  zbar by type
    """

    lies: dict[tuple[int, int], Fraction]
    virtual: tuple[Fraction, ...]


@dataclass(frozen=True, eq=False)
class Optimum:
    """What one multiplier finds: one or two rules with shares, and the weights that prove it.

    alpha, pi  the weights of welfare and pot; welfare's own weight is 0 where no rule balances
    pot        the largest expected pot of the mixture, shortfall and all; money units
    possible   whether the balance demand can be met
    """

    shares: tuple[tuple[Fraction, Listed], ...]
    alpha: Fraction
    pi: Fraction
    pot: Fraction
    flows: tuple[Flow, ...]
    possible: bool


def sides(setting: Setting, terms: Terms) -> tuple[Side, ...] | None:
    """Every party's line and the direction of its lies, if one multiplier decides; else None."""
    goal, side = terms.goals[0], terms.side
    free = terms.decision in ("randomized", "efficient")
    asked = free and (terms.ic, terms.ir) == ("bayesian", "interim")
    floors = side.welfare_at_least is None and side.revenue_at_least is None
    if not asked or goal not in GOALS or side.chances or not floors:
        return None
    if terms.slack or terms.trusted or terms.compelled:
        return None
    if goal == "revenue" and terms.balance != "none" and terms.budget == "exact":
        return None
    found = []
    for party in setting.parties:
        own = line(party)
        order = None if own is None else _order(party, own)
        if own is None or order is None:
            return None
        found.append(Side(party, own, order))
    return tuple(found)


def _order(party: Party, own: Line) -> tuple[int, ...] | None:
    """From the best-off to the worst-off type, whatever the rule; None if that depends on it.

    From type a to the next b the gain over staying out changes by
    common(b) - common(a) - (outside(b) - outside(a)) + (theta(b) - theta(a)) Q, with Q the
    expected slope, somewhere between the least and the largest.
    """
    level = party.value.astype(object)[:, 0] - party.outside.astype(object)
    pairs = pairwise(own.order)
    steps = [(level[b] - level[a], own.theta[b] - own.theta[a]) for a, b in pairs]
    if any(gap == 0 for _, gap in steps):
        return None
    low, high = min(own.slope), max(own.slope)
    if all(step + gap * low >= 0 for step, gap in steps):
        return tuple(reversed(own.order))
    if all(step + gap * high <= 0 for step, gap in steps):
        return own.order
    return None


def flow(side: Side, alpha: Fraction, pi: Fraction, pooled: bool = True) -> Flow:
    """The lies' multipliers and the ironed virtual types (not `pooled`: before ironing).

    Every type passes pi times its probability on to the next worse-off type, which it could
    claim to be; what it would gain there counts against the decisions taken there.
    """
    theta, weights, total = side.line.theta, side.party.weights, sum(side.party.weights)
    virtual, raw, unit = _virtual(side, alpha, pi, pooled)
    lies: dict[tuple[int, int], Fraction] = {}
    passing = 0
    for a, b in pairwise(side.order):
        passing += weights[a]
        lies[a, b] = pi * Fraction(passing, total)
    over = Fraction(0)
    for a, b in pairwise(side.line.order):
        over += (Fraction(raw[a], unit) - virtual[a]) * weights[a] / total
        if over:
            # Lies both ways between pooled neighbours lift the lower one's virtual type.
            each = over / int(theta[b] - theta[a])
            for pair in ((a, b), (b, a)):
                lies[pair] = lies.get(pair, Fraction(0)) + each
    return Flow({pair: value for pair, value in lies.items() if value}, tuple(virtual))


def _virtual(
    side: Side, alpha: Fraction, pi: Fraction, pooled: bool
) -> tuple[list[Fraction], list[int], int]:
    """Ironed virtual types; and before ironing, as integers over a unit."""
    weights = side.party.weights
    den, scale = math.lcm(alpha.denominator, pi.denominator), math.lcm(*weights)
    theta = [int(value) for value in side.line.theta]
    both, push = int((alpha + pi) * den) * scale, int(pi * den)
    raw = [both * value for value in theta]
    passing = 0
    for a, b in pairwise(side.order):
        passing += weights[a]
        raw[b] -= push * passing * (theta[a] - theta[b]) * (scale // weights[b])
    unit = den * scale
    if not pooled:
        return [Fraction(value, unit) for value in raw], raw, unit
    pools: list[tuple[int, int, list[int]]] = []
    for a in side.line.order:
        mass, total, members = weights[a], raw[a] * weights[a], [a]
        # Neighbours are pooled until means rise strictly from pool to pool.
        while pools and pools[-1][1] * mass >= total * pools[-1][0]:
            before = pools.pop()
            mass, total, members = mass + before[0], total + before[1], before[2] + members
        pools.append((mass, total, members))
    virtual = [Fraction(0)] * len(theta)
    for mass, total, members in pools:
        value = Fraction(total, mass * unit)
        for a in members:
            virtual[a] = value
    return virtual, raw, unit


def rule_at(
    setting: Setting,
    found: tuple[Side, ...],
    alpha: Fraction,
    pi: Fraction,
    first: tuple[Index, ...] = (),
) -> Rule:
    """The rule that is best at two weights, among those that start with some indices.

    Efficient rules decide no less for a higher type however they break ties: nothing is to be
    ironed then.
    """
    both = alpha + pi
    ironed = [_virtual(side, alpha, pi, not first)[0] for side in found]
    den = math.lcm(
        alpha.denominator,
        pi.denominator,
        *{value.denominator for row in ironed for value in row},
    )
    scale = int(both * den)
    tables = []
    for side, row in zip(found, ironed, strict=True):
        shift = [
            v.numerator * (den // v.denominator) - scale * int(place)
            for v, place in zip(row, side.line.theta, strict=True)
        ]
        value = side.party.value.astype(object) * scale
        tables.append(value + np.multiply.outer(np.array(shift, dtype=object), side.line.slope))
    worth, outlay = setting.worth.astype(object), setting.outlay.astype(object)
    return Rule((*first, Index(tuple(tables), worth * int(alpha * den) - outlay * scale)))


def rough_rule_at(setting: Setting, found: tuple[Side, ...], mu: float) -> Rule:
    """Nearly the best rule at welfare's weight 1 and the pot's mu, from floats."""
    tables = []
    for side in found:
        weights = np.array(side.party.weights, dtype=np.float64)
        theta = side.line.theta.astype(np.float64)
        order = np.array(side.order)
        tail = np.cumsum(weights[order])[:-1]
        raw = (1 + mu) * theta
        raw[order[1:]] -= mu * tail * (theta[order[:-1]] - theta[order[1:]]) / weights[order[1:]]
        virtual = _rough_ironed(raw, weights, side.line.order)
        shift = virtual - (1 + mu) * theta
        value = side.party.value.astype(np.float64) * (1 + mu)
        tables.append(value + np.multiply.outer(shift, side.line.slope.astype(np.float64)))
    options = setting.worth.astype(np.float64) - (1 + mu) * setting.outlay.astype(np.float64)
    tables.append(options[None, :])
    tables = [table - table[:, :1] for table in tables]
    top = max(float(np.abs(table).max()) for table in tables) or 1.0
    whole = [np.rint(t * (2.0**BITS / top)).astype(np.int64).astype(object) for t in tables]
    return Rule((Index(tuple(whole[:-1]), whole[-1][0]),))


def _rough_ironed(
    raw: npt.NDArray[np.float64], weights: npt.NDArray[np.float64], order: tuple[int, ...]
) -> npt.NDArray[np.float64]:
    pools: list[tuple[float, float, list[int]]] = []
    for a in order:
        mass, total, members = float(weights[a]), float(raw[a] * weights[a]), [a]
        while pools and pools[-1][1] * mass >= total * pools[-1][0]:
            before = pools.pop()
            mass, total, members = mass + before[0], total + before[1], before[2] + members
        pools.append((mass, total, members))
    virtual = np.empty(len(raw))
    for mass, total, members in pools:
        virtual[members] = total / mass
    return virtual


def utilities(side: Side, chances: list[list[Fraction]]) -> list[Fraction]:
    """What each type gets in units of 1/grain where binding lies leave the pot the most.

    The worst-off type gets what staying out brings.
    """
    value, order = side.party.value.astype(object), tuple(reversed(side.order))
    found = [Fraction(0)] * side.party.size
    found[order[0]] = Fraction(int(side.party.outside[order[0]]))
    for b, a in pairwise(order):
        gain = sum(
            (int(d) * chance for d, chance in zip(value[a] - value[b], chances[b], strict=True)),
            Fraction(0),
        )
        found[a] = found[b] + gain
    return found


def values(setting: Setting, found: tuple[Side, ...], counts: Counts) -> tuple[Fraction, Fraction]:
    """Expected welfare and the largest expected pot of a rule, in money; shortfall apart."""
    total = setting.total_weight
    welfare, pot = 0, Fraction(0)
    for side, table in zip(found, counts.taken[0], strict=True):
        value = side.party.value.astype(object)
        each = total // sum(side.party.weights)
        masses = [each * weight for weight in side.party.weights]
        worth = int((value * table).sum())
        welfare += worth
        pot += worth - _left(side, table, masses)
    decided = counts.taken[0][0].sum(axis=0)
    spent = int((decided * setting.outlay.astype(object)).sum())
    enjoyed = int((decided * setting.worth.astype(object)).sum())
    scale = total * setting.grain
    return Fraction(welfare - spent + enjoyed, scale), (pot - spent) / scale


def _left(side: Side, table: IntArray, masses: list[int]) -> Fraction:
    """Sum over types of mass times utility, as `utilities` says, from weights.

    Masses are the weights times a constant, so better-off mass over own mass needs only them.
    Whatever a type gains at the next worse-off one's decisions is left to all better-off ones.
    """
    value = side.party.value.astype(object)
    scale = math.lcm(*side.party.weights)
    order = np.array(side.order)
    better = np.cumsum(np.array([side.party.weights[a] for a in side.order], dtype=object))
    gains = ((value[order[:-1]] - value[order[1:]]) * table[order[1:]]).sum(axis=1)
    shares = np.array([scale // side.party.weights[b] for b in side.order[1:]], dtype=object)
    gained = int((gains * better[:-1] * shares).sum()) if len(gains) else 0
    return int(side.party.outside[side.order[-1]]) * Fraction(sum(masses)) + Fraction(gained, scale)


Valued = tuple[Listed, Fraction, Fraction]
"""A rule, its expected welfare and its largest expected pot."""


def _steered(
    setting: Setting,
    found: tuple[Side, ...],
    count: Callable[[Rule], Counts],
    low: Valued,
    high: Valued,
    wanted: Fraction,
    gift: Fraction,
) -> tuple[Valued, Valued] | None:
    """Two rules near the crossing, found with rounded numbers; None if they are no start."""
    for _ in range(ROUNDS):
        mu = float((low[1] - high[1]) / (high[2] - low[2]))
        rule = rough_rule_at(setting, found, mu)
        counts = count(rule)
        welfare, pot = values(setting, found, counts)
        middle = Listed(rule, counts), welfare, pot + gift
        line = float(low[1]) + mu * float(low[2])
        gain = float(middle[1]) + mu * float(middle[2]) - line
        if gain <= 1e-13 * (1 + abs(line)):
            break
        if middle[2] >= wanted:
            high = middle
        else:
            low = middle
        if low[1] < high[1]:
            return None
    return low, high


def optimum(
    setting: Setting,
    terms: Terms,
    found: tuple[Side, ...],
    count: Callable[[Rule], Counts],
) -> Optimum:
    """The best mixture and the weights that prove it."""
    zero, one = Fraction(0), Fraction(1)
    first = (welfare_index(setting),) if terms.decision == "efficient" else ()
    gift = terms.shortfall * len(found)

    def at(alpha: Fraction, pi: Fraction) -> Valued:
        rule = rule_at(setting, found, alpha, pi, first)
        counts = count(rule)
        welfare, pot = values(setting, found, counts)
        return Listed(rule, counts), welfare, pot + gift

    def ended(
        shares: tuple[tuple[Fraction, Listed], ...],
        alpha: Fraction,
        pi: Fraction,
        pot: Fraction,
        possible: bool = True,
    ) -> Optimum:
        flows = tuple(flow(side, alpha, pi, not first) for side in found)
        return Optimum(shares, alpha, pi, pot, flows, possible)

    goal, bounded = terms.goals[0], terms.balance != "none"
    wanted = -terms.subsidy
    if goal in ("welfare", "any") and not first:
        low = at(one, zero)
        if not bounded or low[2] >= wanted:
            return ended(((one, low[0]),), one, zero, low[2])
    high = at(zero, one)
    enough = not bounded or goal == "outside-money" or high[2] >= wanted
    if first and enough and goal in ("welfare", "any"):
        return ended(((one, high[0]),), one, zero, high[2])
    if goal != "welfare" or not enough:
        return ended(((one, high[0]),), zero, one, high[2], enough)
    steered = _steered(setting, found, count, low, high, wanted, gift)
    if steered is not None:
        low, high = steered
    for _ in range(ROUNDS):
        mu = (low[1] - high[1]) / (high[2] - low[2])
        middle = at(one, mu)
        if middle[1] + mu * middle[2] == low[1] + mu * low[2]:
            share = (wanted - low[2]) / (high[2] - low[2])
            parts = ((one - share, low[0]), (share, high[0]))
            return ended(tuple(part for part in parts if part[0]), one, mu, wanted)
        if middle[2] >= wanted:
            high = middle
        else:
            low = middle
    raise ArithmeticError("the lines of two rules did not meet")
