"""Which lies are written into a master program, and whether the others are kept.

With many types a party has many lies, of which few matter: with one-dimensional types only
those to a neighbour. The others are left out, and looked at exactly once there is a point.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from itertools import pairwise

import numpy as np

from designer.demands.terms import Terms
from designer.program.affine import Affine
from designer.proof.vector import Vector
from designer.roads.interim.draft import InterimDraft, Lies
from designer.setting.setting import IntArray, Party, Setting

ALL_UP_TO = 1_000
"""Lies up to which all are written."""
ROOM = 2**62
NEAR = 1e-9
"""Relative distance within which a float comparison is repeated exactly."""


@dataclass(frozen=True, eq=False)
class Line:
    """One-dimensional types: value[a, k] = common(a) + base(k) + theta[a] * slope[k].

    slope   int, shape (K,), without a common divisor, 0 at the first option
    theta   int, shape (T_i,)
    order   positions of the types by rising theta
    """

    slope: IntArray
    theta: IntArray
    order: tuple[int, ...]


def line(party: Party) -> Line | None:
    """The party's types on a line, or None; a party to whom decisions are all one has slope 0."""
    value = party.value.astype(object)
    moved = value - value[:, :1]
    moved = moved - moved[:1]
    spots = np.argwhere(moved != 0)
    if not len(spots):
        flat = np.zeros(party.size, dtype=object)
        return Line(np.zeros(value.shape[1], dtype=object), flat, tuple(range(party.size)))
    a, k = (int(v) for v in spots[0])
    slope = moved[a] // np.gcd.reduce(moved[a])
    theta = moved[:, k] // slope[k]
    if not np.array_equal(np.multiply.outer(theta, slope), moved):
        return None
    order = tuple(int(v) for v in np.argsort(theta, kind="stable"))
    return Line(slope, theta, order)


def first_lies(setting: Setting) -> Lies | None:
    """None where all lies are written; else those between neighbours."""
    if sum(size * (size - 1) for size in setting.shape) <= ALL_UP_TO:
        return None
    found = []
    for party in setting.parties:
        own = line(party)
        order: Sequence[int] = range(party.size)
        if own is not None:
            order = own.order
        elif party.size > 1:
            order = [int(v) for v in np.lexsort(party.value.astype(np.float64).T[::-1])]
        pairs = list(pairwise(order))
        found.append(tuple(sorted([*pairs, *((b, a) for a, b in pairs)])))
    return tuple(found)


def with_more(lies: Lies, more: Lies) -> Lies:
    """Both lists, each lie once, in order."""
    return tuple(tuple(sorted({*one, *two})) for one, two in zip(lies, more, strict=True))


def broken(setting: Setting, terms: Terms, draft: InterimDraft, x: Vector, ray: bool) -> Lies:
    """Per party and true type the lie that gains most at x, where it gains more than allowed.

    A lie gains sum_k v_i(k, a) q_i(k, b) - m_i(b) less the same with b = a; allowed is the
    slack, a number or an unknown. With `ray` constant terms are left out.
    """
    found: list[tuple[tuple[int, int], ...]] = [() for _ in setting.parties]
    if terms.ic != "bayesian" or draft.written is None:
        return tuple(found)
    values = np.array(x.numerators(), dtype=object)
    slack = _at(draft.allowance("slack", terms.slack), values, x.den, ray)
    for index, party in enumerate(setting.parties):
        if party.name in terms.trusted or party.size < 2:
            continue
        chance = values[draft.expected_decision(index)[0]]
        pays = values[draft.expected_pay(index)]
        value = party.value[:, draft.merged[index].first].astype(object)
        found[index] = _broken(value, chance, pays, x.den, setting.grain, slack)
    return tuple(found)


def _at(form: Affine, values: IntArray, den: int, ray: bool) -> Fraction:
    """The value of one form."""
    total = int((form.num * values[form.col]).sum())
    constant = 0 if ray else int(form.const[0])
    return (Fraction(total, den) + constant) / int(form.den[0])


def _broken(
    value: IntArray, chance: IntArray, pays: IntArray, den: int, grain: int, slack: Fraction
) -> tuple[tuple[int, int], ...]:
    allowed = slack * den * grain
    top = value.shape[1] * _largest(value) * _largest(chance) + _largest(pays) * grain
    if 2 * max(top, grain, abs(allowed)) < ROOM:
        small, chances = value.astype(np.int64), chance.astype(np.int64)
        got = small @ chances.T - pays.astype(np.int64) * grain
        more = got - np.diag(got)[:, None]
        np.fill_diagonal(more, -ROOM)
        best = more.argmax(axis=1)
        gains = more.max(axis=1) > math.floor(allowed)
        return tuple((int(a), int(best[a])) for a in np.flatnonzero(gains))
    rough_chance = _floats(chance, den)
    rough_pays = _floats(pays, den)
    rough_value = _floats(value, grain)
    utility = rough_value @ rough_chance.T - rough_pays
    gain = utility - np.diag(utility)[:, None]
    scale = 1.0 + np.abs(rough_value).sum(axis=1).max() * np.abs(rough_chance).max()
    scale += float(np.abs(rough_pays).max()) + abs(float(slack))
    near = gain > float(slack) - NEAR * scale
    np.fill_diagonal(near, False)
    worst: dict[int, tuple[Fraction, int]] = {}
    spots = np.argwhere(near)
    if not len(spots):
        return ()
    true, told = spots[:, 0], spots[:, 1]
    own = (value * chance).sum(axis=1) - pays * grain
    exact = (value[true] * chance[told]).sum(axis=1) - pays[told] * grain - own[true]
    limit = int(allowed) if allowed.denominator == 1 else allowed
    for place in np.flatnonzero(np.asarray(exact > limit, dtype=bool)):
        a, b = int(true[place]), int(told[place])
        if a not in worst or exact[place] > worst[a][0]:
            worst[a] = (exact[place], b)
    return tuple((a, b) for a, (_, b) in sorted(worst.items()))


def _largest(values: IntArray) -> int:
    return max(int(values.max()), -int(values.min()))


def _floats(values: IntArray, den: int) -> np.ndarray[tuple[int, ...], np.dtype[np.float64]]:
    """Values / den, correctly rounded whatever their size."""
    flat = [int(v) / den for v in values.ravel()]
    return np.array(flat, dtype=np.float64).reshape(values.shape)
