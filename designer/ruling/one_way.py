"""One-dimensional worths that all point one way: more of the thing is better for every type.

A party's net worth, over staying out, must have the form

    v_i(k, a) - outside_i(a) = q_ik x_i(a) + r_ik,      q_ik >= 0,

so that a single number x_i(a) ranks its types at every decision. A bidder for an item, a
seller (x = minus her cost, q = 1 when she sells) and a party to a joint project fit; the owner
of a share in what may go to someone else does not, for she may be buyer or seller.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from designer.ruling.amounts import Amounts
from designer.ruling.kinds import Refusal
from designer.ruling.profiles import by_profile, split
from designer.setting.setting import IntArray, Setting, integers
from designer.table import held, largest


@dataclass(frozen=True, eq=False)
class Line:
    """One party's net worths as q_k x(a) + r_k.

    level  x(a) by type, money          slope  q_k, whole, at least 0, by option
    rest   r_k by option, money         order  the types from the least x to the most
    chance P(a) by type
    """

    level: tuple[Fraction, ...]
    slope: IntArray
    rest: Amounts
    order: tuple[int, ...]
    chance: tuple[Fraction, ...]

    @property
    def virtual(self) -> list[Fraction]:
        """phi(a) = x(a) - (x(a+) - x(a)) P(above a)/P(a), a+ the next level up, by type.

        Types of one level count as one. Myerson (1981) in the form for finitely many types.
        """
        levels = sorted(set(self.level))
        mass = {x: Fraction(0) for x in levels}
        for x, chance in zip(self.level, self.chance, strict=True):
            mass[x] += chance
        found, above = {}, Fraction(0)
        for x, higher in zip(reversed(levels), [levels[-1], *reversed(levels[1:])], strict=True):
            found[x] = x - (higher - x) * above / mass[x]
            above += mass[x]
        return [found[x] for x in self.level]

    def ironed(self, scores: list[Fraction]) -> list[Fraction]:
        """Pool neighbours, weighted by their chances, until scores rise with the level.

        The nearest nondecreasing scores in the sense of least squares, by pooling adjacent
        violators; what Myerson's ironing does for finitely many types.
        """
        levels = sorted(set(self.level))
        at = {x: [a for a, y in enumerate(self.level) if y == x] for x in levels}
        pools: list[tuple[Fraction, Fraction, list[int]]] = []  # sum, mass, types
        for x in levels:
            mass = sum((self.chance[a] for a in at[x]), Fraction(0))
            total = sum((self.chance[a] * scores[a] for a in at[x]), Fraction(0))
            pools.append((total, mass, at[x]))
            while len(pools) > 1 and pools[-2][0] * pools[-1][1] >= pools[-1][0] * pools[-2][1]:
                (s, m, types), (t, n, more) = pools[-2:]
                pools[-2:] = [(s + t, m + n, types + more)]
        found = [Fraction(0)] * len(scores)
        for total, mass, types in pools:
            for a in types:
                found[a] = total / mass
        return found


def lines(setting: Setting) -> list[Line] | Refusal:
    """Bring every party's worths into the form above; a Refusal where one will not."""
    found = []
    for i in range(len(setting.parties)):
        line = _line(setting, i)
        if line is None:
            return Refusal(
                "worths ranked by one number, more being better for every type at every decision",
                f"{setting.parties[i].name}'s, which are not",
                "Ask `designer pose --decision randomized`, which takes any worths.",
            )
        found.append(line)
    return found


def fits(setting: Setting) -> Refusal | None:
    """Check that every party's worths have the form."""
    found = lines(setting)
    return found if isinstance(found, Refusal) else None


def known(setting: Setting) -> list[Line]:
    """Give the lines of a setting that is known to fit."""
    found = lines(setting)
    if isinstance(found, Refusal):
        raise ValueError(str(found))
    return found


def _line(setting: Setting, index: int) -> Line | None:
    party = setting.parties[index]
    net = party.value.astype(object) - party.outside.astype(object)[:, None]
    change = net - net[:1]
    moving = [k for k in range(net.shape[1]) if any(change[:, k])]
    slopes = [Fraction(0)] * net.shape[1]
    x = [0] * party.size
    if moving:
        x = change[:, moving[0]].tolist()
        a = next(a for a, step in enumerate(x) if step)
        for k in moving:
            slopes[k] = Fraction(int(change[a, k]), x[a])
            steps = zip(x, change[:, k].tolist(), strict=True)
            if slopes[k] < 0 or any(slopes[k] * step != moved for step, moved in steps):
                return None
    scale = math.lcm(*(slope.denominator for slope in slopes))
    level = [Fraction(step, scale * setting.grain) for step in x]
    # The zero of x is free: put it where the decision that moves most is worth nothing more.
    if moving:
        first = Fraction(int(net[0, moving[0]]), setting.grain) / (slopes[moving[0]] * scale)
        level = [step + first for step in level]
    slope = [int(q * scale) for q in slopes]
    rest = [
        Fraction(int(worth), setting.grain) - q * level[0]
        for worth, q in zip(net[0], slope, strict=True)
    ]
    return Line(
        level=tuple(level),
        slope=integers(slope),
        rest=Amounts.of(rest),
        order=tuple(sorted(range(party.size), key=level.__getitem__)),
        chance=party.marginal,
    )


def scores(setting: Setting, party: int, line: Line, by_type: list[Fraction]) -> Amounts:
    """q_ik s(theta_i) + r_ik over profiles and options, s any number by type: (N, K)."""
    s = by_profile(setting, party, Amounts.of(by_type))
    bound = (largest(s.num) + 1) * (largest(line.slope) + 1)
    product: IntArray = held(s.num, bound)[:, None] * held(line.slope, bound)
    return Amounts(product, s.den) + line.rest


def envelope(setting: Setting, party: int, line: Line, decides: IntArray, den: int) -> Amounts:
    """Largest payments that keep a rule honest and everyone aboard in every case: (N,).

    t_i(a, .) = net worth at a - sum over levels below a of q(that level) * (step up), where
    q(theta) = sum_k x_k q_ik must rise with the level; net worths count staying out as 0.
    """
    bound = (largest(decides) + 1) * (largest(line.slope) + 1) * len(setting.options)
    q = held(decides, bound) @ held(line.slope, bound)
    at = split(setting, party)
    by_level = q.reshape(at)[:, list(line.order), :]
    steps = Amounts.of(
        [line.level[b] - line.level[a] for a, b in zip(line.order, line.order[1:], strict=False)]
        or [0]
    )
    bound = (largest(q) + 1) * (largest(steps.num) + 1) * len(line.order)
    rent = np.zeros(at, dtype=np.int64 if bound < 2**60 else object)
    if len(line.order) > 1:
        rising = held(by_level[:, :-1, :], bound) * held(steps.num, bound)[None, :, None]
        rent[:, 1:, :] = rising.cumsum(axis=1)
    back = np.empty_like(rent)
    back[:, list(line.order), :] = rent
    net = scores(setting, party, line, list(line.level))
    bound = (largest(net.num) + 1) * (largest(decides) + 1) * len(setting.options)
    worth = (held(net.num, bound) * held(decides, bound)).sum(axis=1)
    return Amounts(worth, net.den * den) - Amounts(back.reshape(-1), steps.den * den)
