"""Shares of the outlay in proportion to what one says the decision is worth.

    t_i(theta) = outlay(k*) g_i / sum_j g_j,   g_i = max(0, v_i(k*, theta_i) - outside_i)

with the efficient decision k*; equal shares where nobody gains. Even at first sight, and in use
everywhere, but it pays to say less: the audit shows how much.

Source: the failure is P. A. Samuelson's (1954), The pure theory of public expenditure, Review of
Economics and Statistics 36:387-389 (from memory); the sharing itself is common practice.
"""

from __future__ import annotations

import math

import numpy as np

from designer.ruling import checks
from designer.ruling.amounts import Amounts, stacked, total
from designer.ruling.kinds import Built, Refusal, Rule
from designer.ruling.profiles import TIES, certain, chosen, efficient, outlay, outside, worth
from designer.setting.setting import IntArray, Setting
from designer.table import Table, held, largest

MOST_BITS = 400_000_000


def _gains(setting: Setting, choice: IntArray) -> tuple[IntArray, IntArray]:
    """Reported gains over one denominator, (n, N), and their sums, at least 1, (N,)."""
    n = len(setting.parties)
    rows, _ = stacked([chosen(worth(setting, i), choice) - outside(setting, i) for i in range(n)])
    gains = np.maximum(rows, 0)
    sums = gains.sum(axis=0)
    nobody = sums == 0
    gains = np.where(nobody, 1, gains)
    return gains, np.where(nobody, len(gains), sums)


def _common(sums: IntArray) -> int:
    common = 1
    for value in sorted(set(sums.tolist())):
        common = math.lcm(common, value)
        if common.bit_length() * len(sums) > MOST_BITS:
            return 0
    return common


def manageable(setting: Setting) -> Refusal | None:
    """Check that the shares have a common denominator that fits."""
    _, sums = _gains(setting, efficient(setting))
    if _common(sums):
        return None
    return Refusal(
        "shares with a common denominator of manageable length",
        f"{len(set(sums.tolist())):,} different sums of reports",
        "State the types as rounder numbers.",
    )


def build(setting: Setting) -> Built:
    """Build the efficient decision, its outlay shared by the reports."""
    choice = efficient(setting)
    cost = chosen(outlay(setting), choice)
    gains, sums = _gains(setting, choice)
    common = _common(sums)
    bound = (largest(gains) + 1) * common * (largest(cost.num) + 1)
    part = common // held(sums, bound)
    due = held(cost.num, bound) * part
    pays = [Amounts(held(gain, bound) * due, cost.den * common) for gain in gains]
    if (total(pays) - cost).num.any():
        raise AssertionError("the shares must cover the outlay")
    return Built(Table(certain(setting, choice), 1, *stacked(pays)), (TIES,))


RULE = Rule(
    name="proportional-to-report",
    source="common practice",
    assumes="an outlay to share; honesty is hoped for, not secured",
    checks=(checks.tabulated, checks.some_outlay, manageable),
    build=build,
)
