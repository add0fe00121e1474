"""Full extraction in Bayesian form: bets that follow one's own report as well as the others'.

    t_i(a, theta_-i) = pivotal payment + z_a(theta_-i),
    E[z_a | a] = L(a, a),     E[z_a | b] >= L(a, b) for every other type b.

L(a, b) is what a type b expects from the pivotal rule over staying out when it says a. Hence an
honest type keeps nothing over staying out, and a lie brings no more than that. Of all such bets
z_a the smallest in squares is taken. It exists for all worths where no mix of the other types'
beliefs reproduces those of a (the cone condition, which asks less than the independence of
full_extraction.py), and otherwise only for some worths: what is checked is whether it exists.

With w_b the weights of the others' profiles beside type b and m_b their sum, and C the cone of
the vectors (w_b, -m_b L(a, b)), b != a, and of both signs of (w_a, -m_a L(a, a)): let c be the
point of C nearest to (0, -1) and x = c - (0, -1). Then z_a = x_theta / x_last; there is no bet
exactly if x = 0, for then a mix of types stands between (Farkas). The nearest point is found in
whole numbers, by stepping through sets of types as nonnegative least squares does (C. L. Lawson
and R. J. Hanson 1974, Solving Least Squares Problems, ch. 23); no linear program. Honesty and
participation hold on average only, and bets can dwarf the gains they take.

Source: J. Cremer and R. P. McLean (1988), Full extraction of the surplus in Bayesian and dominant
strategy auctions, Econometrica 56:1247-1257, Theorem 2 (from memory).
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from fractions import Fraction

import numpy as np

from designer.ruling import checks
from designer.ruling.amounts import Amounts, stacked
from designer.ruling.full_extraction import beliefs, sized
from designer.ruling.groves import others
from designer.ruling.kinds import Built, Refusal, Rule
from designer.ruling.pivotal import best_without
from designer.ruling.profiles import (
    TIES,
    by_profile,
    certain,
    chosen,
    efficient,
    expected_by_type,
    independent,
    split,
    total_worth,
)
from designer.setting.setting import IntArray, Setting
from designer.table import Table, held, largest

MOST_TYPES = 40
"""Types of a party up to which nearest points are found in seconds."""


def nearest(gram: list[list[int]], aim: list[int], free: int) -> list[Fraction]:
    """Find y, y_b >= 0 for b != free, with sum_b y_b v_b nearest to a point.

    gram  v_b . v_c        aim  v_b . point

    >>> nearest([[1, 0], [0, 1]], [-2, 3], free=0)
    [Fraction(-2, 1), Fraction(3, 1)]
    """
    size = len(gram)
    y = [Fraction(0)] * size
    active = [free]
    while True:
        mix = _solved(gram, aim, active)
        while any(mix[b] <= 0 for b in active if b != free):
            # Go towards the mix until the first share runs out, and drop what ran out.
            step = min(y[b] / (y[b] - mix[b]) for b in active if b != free and mix[b] <= 0)
            for b in active:
                y[b] += step * (mix[b] - y[b])
            active = [b for b in active if b == free or y[b] > 0]
            mix = _solved(gram, aim, active)
        y = [mix.get(b, Fraction(0)) for b in range(size)]
        pull = {
            b: aim[b] - sum((y[c] * gram[b][c] for c in active), Fraction(0))
            for b in range(size)
            if b not in active
        }
        # Only what leaves the span of the active ones can pull: they stay independent.
        best = max(pull, key=lambda b: pull[b], default=free)
        if best == free or pull[best] <= 0:
            return y
        active.append(best)


def _solved(gram: list[list[int]], aim: list[int], active: list[int]) -> dict[int, Fraction]:
    """The mix of some linearly independent vectors nearest to the point, signs left open."""
    from flint import fmpz_mat

    matrix = fmpz_mat([[gram[b][c] for c in active] for b in active])
    solution = matrix.solve(fmpz_mat([[aim[b]] for b in active]))
    entries = ((b, solution[j, 0]) for j, b in enumerate(active))
    return {b: Fraction(int(entry.p), int(entry.q)) for b, entry in entries}


def temptations(
    setting: Setting, party: int, choice: IntArray, paid: Amounts
) -> list[list[Fraction]]:
    """L(a, b) by report a and true type b, under payments `paid` over profiles."""
    rows = beliefs(setting, party)
    before, own, after = split(setting, party)
    told = np.moveaxis(choice.reshape(before, own, after), 1, 0).reshape(own, -1)
    pays = np.moveaxis(paid.num.reshape(before, own, after), 1, 0).reshape(own, -1)
    value = setting.parties[party].value
    away = setting.parties[party].outside.tolist()
    masses = rows.sum(axis=1).tolist()
    bound = (largest(rows) + 1) * (max(largest(value), largest(pays)) + 1) * rows.shape[1]
    weights = held(rows, bound)
    found = []
    for a in range(own):
        worth = (held(value, bound)[:, told[a]] * weights).sum(axis=1).tolist()
        cost = (weights @ held(pays[a], bound)).tolist()
        found.append(
            [
                Fraction(worth[b] - away[b] * masses[b], masses[b] * setting.grain)
                - Fraction(cost[b], masses[b] * paid.den)
                for b in range(own)
            ]
        )
    return found


def mixes(setting: Setting, party: int, tempted: list[list[Fraction]]) -> Iterator[Amounts | None]:
    """The weights on the rows w_b that make up z_a, type by type; None where there is no bet."""
    rows = beliefs(setting, party)
    masses = rows.sum(axis=1).tolist()
    bound = (largest(rows) + 1) ** 2 * rows.shape[1]
    plain = (held(rows, bound) @ held(rows, bound).T).tolist()
    for a, expects in enumerate(tempted):
        owed = [mass * amount for mass, amount in zip(masses, expects, strict=True)]
        # The last coordinate in whole numbers; its unit does not move the nearest direction.
        unit = math.lcm(*(amount.denominator for amount in owed))
        last = [-int(amount * unit) for amount in owed]
        gram = [
            [dot + last[b] * last[c] for c, dot in enumerate(line)] for b, line in enumerate(plain)
        ]
        y = nearest(gram, [-part for part in last], free=a)
        height = 1 + sum((part * top for part, top in zip(y, last, strict=True)), Fraction(0))
        yield Amounts.of([part / (unit * height) for part in y]) if height else None


def paid_before(setting: Setting) -> tuple[IntArray, list[Amounts]]:
    """The efficient decisions and everyone's pivotal payments."""
    choice, welfare = efficient(setting), total_worth(setting)
    rests = [others(setting, welfare, i) for i in range(len(setting.parties))]
    return choice, [best_without(rest) - chosen(rest, choice) for rest in rests]


def few_types(setting: Setting) -> Refusal | None:
    """Check that nearest points are found in seconds."""
    for party in setting.parties:
        if party.size > MOST_TYPES:
            return Refusal(
                f"at most {MOST_TYPES} types to a party",
                f"{party.size} of {party.name}",
                "Give it fewer types, or ask `designer pose --goal revenue`.",
            )
    return None


def apart(setting: Setting) -> Refusal | None:
    """Check that every type's gain can be bet away without tempting another type."""
    choice, paid = paid_before(setting)
    for i, party in enumerate(setting.parties):
        tempted = temptations(setting, i, choice, paid[i])
        for kind, mix in zip(party.types, mixes(setting, i, tempted), strict=True):
            if mix is None:
                return Refusal(
                    "beliefs so unlike that a type can bet its gain away and tempt no other",
                    f"{party.name}'s when it is {kind.label}, too near a mix of its other types'",
                    "Independent types never meet it: use optimal-auction or "
                    "revenue-greatest-efficient."
                    if independent(setting)
                    else "Ask `designer pose --goal revenue` how much can be had all the same.",
                )
    return None


def bets(setting: Setting, party: int, choice: IntArray, paid: Amounts) -> Amounts:
    """z_a(theta_-i) over profiles: (N,)."""
    rows = beliefs(setting, party)
    parts = []
    for mix in mixes(setting, party, temptations(setting, party, choice, paid)):
        if mix is None:
            raise ValueError("some type's gain cannot be bet away")
        bound = (largest(mix.num) + 1) * (largest(rows) + 1) * len(rows)
        parts.append(Amounts(held(mix.num, bound) @ held(rows, bound), mix.den))
    before, own, after = split(setting, party)
    num, den = stacked(parts)
    cube = np.moveaxis(num.reshape(own, before, after), 0, 1)
    return Amounts(np.ascontiguousarray(cube).reshape(-1), den).lowest()


def build(setting: Setting) -> Built:
    """Build the pivotal rule with bets that take back what it leaves on average."""
    choice, paid = paid_before(setting)
    pays, notes = [], [TIES]
    for i, party in enumerate(setting.parties):
        bet = bets(setting, i, choice, paid[i])
        # What moves with the others' reports is the bet; its average is a plain charge.
        charge = by_profile(setting, i, expected_by_type(setting, i, bet))
        notes.append(sized(setting, party.name, bet - charge))
        pays.append(paid[i] + bet)
    return Built(Table(certain(setting, choice), 1, *stacked(pays)), tuple(notes))


RULE = Rule(
    name="bayesian-full-extraction",
    source="Cremer and McLean 1988",
    assumes="private worths; beliefs that differ enough from type to type; risk is no object",
    checks=(checks.tabulated, checks.private, few_types, apart),
    build=build,
)
