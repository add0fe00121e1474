"""One-dimensional types, a free rule and a known worst-off type: one multiplier decides.

alpha * welfare + pi * (the largest pot that honesty and participation leave) is maximised
profile by profile: by the option k with the largest sum over parties of

    (alpha + pi) v_i(k, a) + (zbar_i(a) - (alpha + pi) theta_i(a)) slope_i(k)

less (alpha + pi) outlay(k), plus alpha worth(k). Here z_i is the virtual type (Myerson 1981) and
zbar_i its ironing, the slopes of the greatest convex minorant of its sums. For welfare under
a balance demand (alpha, pi) = (1, mu), and the best mu is where the lines of two rules cross:
found by intersecting lines, in rationals. The multipliers of lie, participation and balance
rows follow in closed form; `certificate.py` writes them down.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from fractions import Fraction
from itertools import pairwise

import numpy as np

from designer.demands.terms import Terms
from designer.roads.interim.lies import Line, line
from designer.roads.interim.rule import Counts, Index, Listed, Rule
from designer.setting.setting import IntArray, Party, Setting

GOALS = ("any", "welfare", "revenue", "outside-money")
ROUNDS = 500


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
    asked = (terms.decision, terms.ic, terms.ir) == ("randomized", "bayesian", "interim")
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


def flow(side: Side, alpha: Fraction, pi: Fraction) -> Flow:
    """The lies' multipliers and the ironed virtual types.

    Every type passes pi times its probability on to the next worse-off type, which it could
    claim to be; what it would gain there counts against the decisions taken there.
    """
    theta, weights, total = side.line.theta, side.party.weights, sum(side.party.weights)
    raw = [(alpha + pi) * int(value) for value in theta]
    lies: dict[tuple[int, int], Fraction] = {}
    passing = 0
    for a, b in pairwise(side.order):
        passing += weights[a]
        lies[a, b] = pi * Fraction(passing, total)
        raw[b] -= pi * passing * int(theta[a] - theta[b]) / weights[b]
    rising = side.line.order
    ironed = _ironed([(weights[a], raw[a]) for a in rising])
    virtual = dict(zip(rising, ironed, strict=True))
    over = Fraction(0)
    for a, b in pairwise(rising):
        over += (raw[a] - virtual[a]) * weights[a] / total
        if over:
            # Lies both ways between pooled neighbours lift the lower one's virtual type.
            each = over / int(theta[b] - theta[a])
            for pair in ((a, b), (b, a)):
                lies[pair] = lies.get(pair, Fraction(0)) + each
    kept = {pair: value for pair, value in lies.items() if value}
    return Flow(kept, tuple(virtual[a] for a in range(len(weights))))


def _ironed(pairs: list[tuple[int, Fraction]]) -> list[Fraction]:
    """Pool neighbours until values rise strictly from pool to pool; one mean per entry."""
    pools: list[tuple[int, Fraction, int]] = []
    for weight, value in pairs:
        mass, total, size = weight, value * weight, 1
        while pools and pools[-1][1] * mass >= total * pools[-1][0]:
            before = pools.pop()
            mass, total, size = mass + before[0], total + before[1], size + before[2]
        pools.append((mass, total, size))
    return [total / mass for mass, total, size in pools for _ in range(size)]


def rule_at(setting: Setting, found: tuple[Side, ...], alpha: Fraction, pi: Fraction) -> Rule:
    """The rule that is best at two weights."""
    both = alpha + pi
    shifts = [
        [virtual - both * int(place) for virtual, place in zip(own, side.line.theta, strict=True)]
        for side in found
        for own in [flow(side, alpha, pi).virtual]
    ]
    den = math.lcm(
        alpha.denominator,
        pi.denominator,
        *(shift.denominator for row in shifts for shift in row),
    )
    tables = []
    for side, row in zip(found, shifts, strict=True):
        whole = np.array([int(shift * den) for shift in row], dtype=object)
        value = side.party.value.astype(object) * int(both * den)
        tables.append(value + np.multiply.outer(whole, side.line.slope))
    worth, outlay = setting.worth.astype(object), setting.outlay.astype(object)
    return Rule((Index(tuple(tables), worth * int(alpha * den) - outlay * int(both * den)),))


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

    Whatever a type gains at the next worse-off one's decisions is left to all better-off ones.
    """
    value = side.party.value.astype(object)
    whole = int(side.party.outside[side.order[-1]]) * Fraction(sum(masses))
    better = 0
    for a, b in pairwise(side.order):
        better += masses[a]
        whole += Fraction(int(((value[a] - value[b]) * table[b]).sum()) * better, masses[b])
    return whole


def optimum(
    setting: Setting,
    terms: Terms,
    found: tuple[Side, ...],
    count: Callable[[Rule], Counts],
) -> Optimum:
    """The best mixture and the weights that prove it."""
    zero, one = Fraction(0), Fraction(1)
    gift = terms.shortfall * len(found)

    def at(alpha: Fraction, pi: Fraction) -> tuple[Listed, Fraction, Fraction]:
        rule = rule_at(setting, found, alpha, pi)
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
        flows = tuple(flow(side, alpha, pi) for side in found)
        return Optimum(shares, alpha, pi, pot, flows, possible)

    goal, bounded = terms.goals[0], terms.balance != "none"
    wanted = -terms.subsidy
    if goal in ("welfare", "any"):
        low = at(one, zero)
        if not bounded or low[2] >= wanted:
            return ended(((one, low[0]),), one, zero, low[2])
    high = at(zero, one)
    enough = not bounded or goal == "outside-money" or high[2] >= wanted
    if goal != "welfare" or not enough:
        return ended(((one, high[0]),), zero, one, high[2], enough)
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
