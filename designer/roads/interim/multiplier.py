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
from functools import cached_property
from itertools import pairwise
from typing import Any

import numpy as np
import numpy.typing as npt

from designer.demands.terms import Terms
from designer.program.linear import IndexArray
from designer.proof.sparse import narrow
from designer.roads.interim.lies import Line, line
from designer.roads.interim.rule import Counts, Index, Listed, Rule, welfare_index
from designer.setting.setting import IntArray, Party, Setting

GOALS = ("any", "welfare", "revenue", "outside-money")
ROUNDS = 500
Floats = npt.NDArray[np.float64]
BITS = 40
"""Bits of the indices of rules that only steer the search."""


@dataclass(frozen=True, eq=False)
class Side:
    """A party on a line. `order` runs from its best-off to its worst-off type.

    Arrays are of Python ints: products may be of any length.
    """

    party: Party
    line: Line
    order: tuple[int, ...]

    @cached_property
    def value(self) -> IntArray:
        """The party's worths, shape (T, K)."""
        return self.party.value.astype(object)

    @cached_property
    def weights(self) -> IntArray:
        """The party's weights, shape (T,)."""
        return np.array(self.party.weights, dtype=object)

    @cached_property
    def scale(self) -> int:
        """What `left` is over."""
        return math.lcm(*self.party.weights)

    @cached_property
    def left(self) -> IntArray:
        """What a unit of weight at a type and option leaves to all better-off types, (T, K)."""
        order = np.array(self.order)
        better, worse = order[:-1], order[1:]
        passing = np.cumsum(self.weights[order])[:-1] * (self.scale // self.weights[worse])
        left = np.zeros(self.value.shape, dtype=object)
        left[worse] = (self.value[better] - self.value[worse]) * passing[:, None]
        return left


@dataclass(frozen=True, eq=False)
class Flow:
    """The multipliers of one party's lies between neighbours on its line, over one den.

    up    int, shape (T - 1,): the j-th type by rising theta claims to be the next
    down  int, shape (T - 1,): the next claims to be the j-th
    Both are per probability of the whole party.
    """

    up: IntArray
    down: IntArray
    den: int


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


def direct(setting: Setting, terms: Terms) -> bool:
    """Whether no rules have to be searched for: they are given, or one multiplier finds them."""
    return terms.decision == "table" or sides(setting, terms) is not None


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
    """The lies' multipliers at some weights of welfare and pot (not `pooled`: without ironing).

    Every type passes pi times its probability on to the next worse-off type, which it could
    claim to be; what it would gain there counts against the decisions taken there.
    """
    total = sum(side.party.weights)
    passing = np.cumsum(side.weights[list(side.order)])[:-1] * pi.numerator
    ironed = _virtual(side, alpha, pi, pooled)
    order = list(side.line.order)
    over = np.cumsum(((ironed.raw - ironed.virtual) * side.weights)[order])[:-1]
    # Lies both ways between pooled neighbours lift the lower one's virtual type.
    gap = np.diff(side.line.theta[order])
    common = math.lcm(*(int(step) for step, lifted in zip(gap, over, strict=True) if lifted))
    part = math.lcm(pi.denominator, ironed.unit * common)
    up = np.array([0 if not o else o * common // g for o, g in zip(over, gap, strict=True)])
    up = up.astype(object) * (part // (ironed.unit * common))
    down = up.copy()
    passed = passing * (part // pi.denominator)
    if side.order == side.line.order:
        up = up + passed
    else:
        down = down + passed[::-1]
    return Flow(up, down, part * total)


@dataclass(frozen=True, eq=False)
class _Virtual:
    """Virtual types before ironing and ironed, over one unit."""

    raw: IntArray
    virtual: IntArray
    unit: int


def _virtual(side: Side, alpha: Fraction, pi: Fraction, pooled: bool) -> _Virtual:
    """The virtual types at two weights; without ironing where not `pooled`."""
    weights, theta = side.weights, side.line.theta
    den, scale = math.lcm(alpha.denominator, pi.denominator), math.lcm(*side.party.weights)
    raw = theta * (int((alpha + pi) * den) * scale)
    order = np.array(side.order)
    better, worse = order[:-1], order[1:]
    passing = np.cumsum(weights[order])[:-1] * int(pi * den)
    raw[worse] -= passing * (theta[better] - theta[worse]) * (scale // weights[worse])
    unit = den * scale
    rising = raw[list(side.line.order)]
    if not pooled or bool(np.all(rising[1:] > rising[:-1])):
        return _Virtual(raw, raw, unit)
    line = list(side.line.order)
    starts, mass, total = _pooled(weights[line], (raw * weights)[line])
    common = math.lcm(*set((mass // np.gcd(mass, total)).tolist()))
    virtual = np.empty(len(raw), dtype=object)
    virtual[line] = np.repeat(total * common // mass, np.diff(starts))
    return _Virtual(raw * common, virtual, unit * common)


def _pooled(
    mass: npt.NDArray[Any], total: npt.NDArray[Any]
) -> tuple[IndexArray, npt.NDArray[Any], npt.NDArray[Any]]:
    """Neighbours joined until means rise strictly: where pools start, masses, totals.

    Two neighbours whose means fall are in one pool in the end, whatever is joined first. The
    starts end with the end of the last pool.
    """
    starts = np.arange(len(mass) + 1)
    while True:
        falls = total[:-1] * mass[1:] >= total[1:] * mass[:-1]
        if not falls.any():
            return starts, mass, total
        first = np.flatnonzero(np.concatenate([[True], falls == 0]))
        mass, total = np.add.reduceat(mass, first), np.add.reduceat(total, first)
        starts = np.append(starts[first], starts[-1])


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
    ironed = [_virtual(side, alpha, pi, not first) for side in found]
    den = math.lcm(alpha.denominator, pi.denominator, *(own.unit for own in ironed))
    scale = int((alpha + pi) * den)
    tables = []
    for side, own in zip(found, ironed, strict=True):
        shift = own.virtual * (den // own.unit) - side.line.theta * scale
        tables.append(side.value * scale + np.multiply.outer(shift, side.line.slope))
    worth, outlay = setting.worth.astype(object), setting.outlay.astype(object)
    options = narrow(worth * int(alpha * den) - outlay * scale)
    return Rule((*first, Index(tuple(narrow(t.ravel()).reshape(t.shape) for t in tables), options)))


class Rough:
    """Nearly the best rules at welfare's weight 1 and the pot's mu, from floats."""

    def __init__(self, setting: Setting, found: tuple[Side, ...]) -> None:
        """Gather what does not depend on mu."""
        self.sides = [_RoughSide(side) for side in found]
        self.worth, self.outlay = _floats(setting.worth), _floats(setting.outlay)

    def rule_at(self, mu: float) -> Rule:
        """The rule, in indices of about BITS bits."""
        tables = [side.index(mu) for side in self.sides]
        options = self.worth - (1 + mu) * self.outlay
        tables.append((options - options[0])[None, :])
        top = max(float(np.abs(table).max()) for table in tables) or 1.0
        whole = [np.rint(table * (2.0**BITS / top)).astype(np.int64) for table in tables]
        return Rule((Index(tuple(whole[:-1]), whole[-1][0]),))


class _RoughSide:
    """One party in floats: its virtual types are (1 + mu) theta - mu rent, before ironing."""

    def __init__(self, side: Side) -> None:
        self.line, self.slope = list(side.line.order), _floats(side.line.slope)
        self.theta, self.weights = _floats(side.line.theta), _floats(side.weights)
        self.value = _floats(side.value - side.value[:, :1])
        order = np.array(side.order)
        better, worse = order[:-1], order[1:]
        passing = np.cumsum(self.weights[order])[:-1]
        self.rent = np.zeros(len(self.theta))
        self.rent[worse] = passing * (self.theta[better] - self.theta[worse]) / self.weights[worse]

    def index(self, mu: float) -> Floats:
        """What the party's types add to each option, relative to the first."""
        level = (1 + mu) * self.theta
        raw = level - mu * self.rent
        starts, mass, total = _pooled(self.weights[self.line], (raw * self.weights)[self.line])
        virtual = np.empty(len(raw))
        virtual[self.line] = np.repeat(total / mass, np.diff(starts))
        return self.value * (1 + mu) + np.multiply.outer(virtual - level, self.slope)


def _floats(values: IntArray) -> Floats:
    return values.astype(np.float64)


def utilities(side: Side, chances: IntArray) -> IntArray:
    """What each type gets over the worst-off one where binding lies leave the pot the most.

    chances  numerators of q(k, a), int, shape (T, K); found in units of 1/grain over their den
    """
    order = np.array(side.order)
    gains = ((side.value[order[:-1]] - side.value[order[1:]]) * chances[order[1:]]).sum(axis=1)
    found = np.zeros(side.party.size, dtype=object)
    found[order[:-1]] = np.cumsum(gains[::-1])[::-1]
    return found


def values(setting: Setting, found: tuple[Side, ...], counts: Counts) -> tuple[Fraction, Fraction]:
    """Expected welfare and the largest expected pot of a rule, in money; shortfall apart."""
    total = setting.total_weight
    welfare, pot = 0, Fraction(0)
    for side, table in zip(found, counts.taken[0], strict=True):
        worth = int((side.value * table).sum())
        welfare += worth
        pot += worth - _left(side, table, total)
    decided = counts.taken[0][0].sum(axis=0)
    spent = int((decided * setting.outlay.astype(object)).sum())
    enjoyed = int((decided * setting.worth.astype(object)).sum())
    scale = total * setting.grain
    return Fraction(welfare - spent + enjoyed, scale), (pot - spent) / scale


def _left(side: Side, table: IntArray, total: int) -> Fraction:
    """Sum over types of mass times utility, as `utilities` says, from weights.

    Masses are the weights times a constant, so better-off mass over own mass needs only them.
    Whatever a type gains at the next worse-off one's decisions is left to all better-off ones.
    """
    gained = int((side.left * table).sum())
    least = int(side.party.outside[side.order[-1]])
    return Fraction(least * total * side.scale + gained, side.scale)


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
    rough = Rough(setting, found)
    for _ in range(ROUNDS):
        mu = float((low[1] - high[1]) / (high[2] - low[2]))
        rule = rough.rule_at(mu)
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
