"""Worths, decisions and expectations over whole arrays of profiles.

Efficient ties (convention 6): of several decisions with the most total worth, the rules take
the first in the order of the scenario's options, at every profile.
"""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np

from designer.ruling.amounts import Amounts, total
from designer.setting.profiles import spread
from designer.setting.setting import IntArray, Setting
from designer.table import held, largest

TIES = "Of equally efficient decisions the first in the order of the options is taken."


def own(setting: Setting, party: int) -> IntArray:
    """Give the position of the party's type at every profile: (N,)."""
    return spread(np.arange(setting.shape[party]), (party,), setting.shape)


def by_profile(setting: Setting, party: int, amounts: Amounts) -> Amounts:
    """Repeat amounts by the party's own type over all profiles: (N,)."""
    return Amounts(spread(amounts.num, (party,), setting.shape), amounts.den)


def worth(setting: Setting, party: int) -> Amounts:
    """v_i(k, theta): (N, K)."""
    value = setting.parties[party].value
    rows = value if setting.parties[party].depends else value[own(setting, party)]
    return Amounts(rows, setting.grain)


def outside(setting: Setting, party: int) -> Amounts:
    """Worth of staying out at every profile: (N,)."""
    worths = setting.parties[party].outside
    if setting.parties[party].outside_depends:
        return Amounts(worths, setting.grain)
    return by_profile(setting, party, Amounts(worths, setting.grain))


def outlay(setting: Setting) -> Amounts:
    """Money that each decision costs the pot: (K,)."""
    return Amounts(setting.outlay, setting.grain)


def designers(setting: Setting) -> Amounts:
    """What each decision is to party 0: worth(k) - outlay(k), (K,) (convention 2)."""
    return Amounts(setting.worth, setting.grain) - outlay(setting)


def total_worth(setting: Setting) -> Amounts:
    """W_k(theta) = sum_i v_i(k, theta) + worth(k) - outlay(k): (N, K) (convention 2)."""
    return total([worth(setting, i) for i in range(len(setting.parties))]) + designers(setting)


def efficient(setting: Setting) -> IntArray:
    """k*(theta), the first of the decisions with the most total worth: (N,)."""
    return first_best(total_worth(setting))


def first_best(scores: Amounts) -> IntArray:
    """Position of each row's largest entry, the first of several: (N,)."""
    best: IntArray = scores.num.argmax(axis=1)
    return best


def chosen(amounts: Amounts, choice: IntArray) -> Amounts:
    """Read (N, K) or (K,) amounts at the decision chosen at each profile: (N,)."""
    if amounts.num.ndim == 1:
        return Amounts(amounts.num[choice], amounts.den)
    return Amounts(amounts.num[np.arange(len(choice)), choice], amounts.den)


def certain(setting: Setting, choice: IntArray) -> IntArray:
    """Write decisions as a rule without lotteries: 0 or 1, (N, K)."""
    rows: IntArray = (choice[:, None] == np.arange(len(setting.options))).astype(np.int64)
    return rows


def split(setting: Setting, party: int) -> tuple[int, int, int]:
    """(profiles before, own types, profiles after): where the party sits in the numbering."""
    shape = setting.shape
    return math.prod(shape[:party]), shape[party], math.prod(shape[party + 1 :])


def expected(setting: Setting, amounts: Amounts) -> Fraction:
    """E[amounts] under the prior, of amounts over profiles."""
    weights = setting.weights
    bound = (largest(amounts.num) + 1) * setting.total_weight
    summed = int((held(amounts.num, bound) * held(weights, bound)).sum())
    return Fraction(summed, setting.total_weight * amounts.den)


def expected_by_type(setting: Setting, party: int, amounts: Amounts) -> Amounts:
    """E[amounts | theta_i = a] for each type a of the party: (T_i,).

    With a joint prior the expectation is conditional on the type (convention 8).
    """
    weights = setting.weights
    bound = (largest(amounts.num) + 1) * setting.total_weight
    weighted = held(amounts.num, bound) * held(weights, bound)
    at = split(setting, party)
    sums = weighted.reshape(at).sum(axis=(0, 2)).tolist()
    masses = held(weights, bound).reshape(at).sum(axis=(0, 2)).tolist()
    return Amounts.of(
        [Fraction(top, mass * amounts.den) for top, mass in zip(sums, masses, strict=True)]
    )


def independent(setting: Setting) -> bool:
    """Whether types are independent: no joint table, or one that is exactly a product."""
    joint = setting.joint
    if joint is None:
        return True
    n, mass = len(setting.parties), setting.total_weight
    product: IntArray = np.ones(setting.profiles, dtype=object)
    for i in range(n):
        sums = joint.astype(object).reshape(split(setting, i)).sum(axis=(0, 2))
        product = product * spread(sums, (i,), setting.shape)
    return bool((product == joint.astype(object) * mass ** (n - 1)).all())
