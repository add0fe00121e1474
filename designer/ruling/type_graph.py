"""The largest payments that honesty and participation leave room for: shortest paths.

For a decision rule and independent types, a party of type a who says b can expect the worth
u(a told b) = sum_k E[x_k(b, .)] v(k, a) and pays m(b). Honesty and participation read

    m(a) <= m(b) + u(a told a) - u(a told b)          m(a) <= u(a told a) - outside(a)

so the componentwise largest m are the distances of the types from 'staying out' in a graph
with an edge for each of these lines. Bellman-Ford in whole numbers; a cycle of negative length
means that no payments make the rule honest.

Source: J.-C. Rochet (1987), J. Mathematical Economics 16:191-200, for the graph; R. Bellman
(1958), Quarterly of Applied Mathematics 16:87-90, for the distances (both from memory).
"""

from __future__ import annotations

from fractions import Fraction

import numpy as np

from designer.ruling.amounts import Amounts, stacked
from designer.ruling.profiles import expected_by_type
from designer.setting.setting import IntArray, Setting
from designer.table import held, largest


def chances(setting: Setting, party: int, decides: IntArray, decides_den: int) -> Amounts:
    """E[x_k | the party says b]: (T_i, K)."""
    columns = [
        expected_by_type(setting, party, Amounts(decides[:, k], decides_den))
        for k in range(len(setting.options))
    ]
    rows, den = stacked(columns)
    return Amounts(rows.T, den)


def hoped(setting: Setting, party: int, decides: IntArray, decides_den: int) -> Amounts:
    """u(a told b), worth before payment: (T_i, T_i), true type first. Private worths only."""
    odds = chances(setting, party, decides, decides_den)
    value = setting.parties[party].value
    bound = (largest(value) + 1) * (largest(odds.num) + 1) * len(setting.options)
    product: IntArray = held(value, bound) @ held(odds.num, bound).T
    return Amounts(product, odds.den * setting.grain).lowest()


def largest_payments(
    setting: Setting, party: int, decides: IntArray, decides_den: int
) -> Amounts | None:
    """Find the largest m(a), (T_i,); None if no payments make the rule honest."""
    u = hoped(setting, party, decides, decides_den)
    outside = Amounts(setting.parties[party].outside, setting.grain)
    honest = Amounts(u.num.diagonal(), u.den)
    distance = honest - outside
    edges = Amounts(honest.num[:, None] - u.num, u.den)
    den = edges.den * distance.den
    bound = (largest(edges.num) * distance.den + largest(distance.num) * edges.den) * (
        len(honest.num) + 2
    )
    m: IntArray = held(distance.num, bound) * edges.den
    steps: IntArray = held(edges.num, bound) * distance.den
    for _ in range(len(m)):
        shorter = np.minimum(m, (m[None, :] + steps).min(axis=1))
        if (shorter == m).all():
            return Amounts(m, den).lowest()
        m = shorter
    return None


def mean(setting: Setting, party: int, by_type: Amounts) -> Fraction:
    """E[m(theta_i)] of payments by type."""
    weights = setting.parties[party].weights
    tops = by_type.num.tolist()
    return Fraction(
        sum(weight * top for weight, top in zip(weights, tops, strict=True)),
        sum(weights) * by_type.den,
    )
