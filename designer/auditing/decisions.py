"""Judging the decisions of a table: lotteries, efficiency, the scenario's own rule."""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np

from designer.auditing.outcome import Decisions, Finding
from designer.auditing.view import labels
from designer.auditing.welfare import welfare
from designer.setting.setting import IntArray, Setting
from designer.table import Table, held, largest


def judge_decisions(
    setting: Setting, table: Table, tolerance: Fraction, chance_tolerance: Fraction
) -> Decisions:
    """Judge x: a lottery at every profile, and only over decisions of greatest welfare.

    lost(theta) = sum_k x_k(theta) (max_j W_j(theta) - W_k(theta)), money; every profile
    counts, of positive probability or not, since a lie can lead to any.
    """
    worth = welfare(setting)
    den = table.decides_den * setting.grain
    options = len(setting.options)
    bound = 2 * options * (largest(worth) + 1) * (largest(table.decides) + 1)
    bound = bound * setting.total_weight
    worth, chosen = held(worth, bound), held(table.decides, bound)
    weights = held(setting.weights, bound)
    best = worth.max(axis=1)
    lost = held(best * 0, bound)
    total = lost
    for k in range(options):
        lost = lost + chosen[:, k] * (best - worth[:, k])
        total = total + chosen[:, k] * worth[:, k]
    at = int(lost.argmax())
    worst = Fraction(int(lost[at]), den)
    lottery = _lottery(setting, table, chance_tolerance)
    return Decisions(
        lottery=lottery,
        certain=lottery.holds and _certain(table, chance_tolerance),
        efficient=Finding(
            "decision-efficient", worst <= tolerance, -worst, profile=labels(setting, at)
        ),
        follows=_follows(setting, table, chance_tolerance),
        welfare=Fraction(int((total * weights).sum()), den * setting.total_weight),
        lost=Fraction(int((lost * weights).sum()), den * setting.total_weight),
    )


def _lottery(setting: Setting, table: Table, tolerance: Fraction) -> Finding:
    """Find the worst of: a negative probability, a sum that is not 1."""
    bound = table.decides_den + len(setting.options) * largest(table.decides)
    chosen = held(table.decides, bound)
    off = np.maximum(np.abs(chosen.sum(axis=1) - table.decides_den), -chosen.min(axis=1))
    at = int(off.argmax())
    margin = min(Fraction(0), Fraction(-int(off[at]), table.decides_den))
    return Finding("lottery", margin >= -tolerance, margin, profile=labels(setting, at))


def _certain(table: Table, tolerance: Fraction) -> bool:
    """Whether each profile's likeliest decision is sure."""
    least = int(table.decides.max(axis=1).min())
    return 1 - Fraction(least, table.decides_den) <= tolerance


def _follows(setting: Setting, table: Table, tolerance: Fraction) -> Finding | None:
    """How far the decisions stray from the scenario's own rule."""
    if setting.rule is None:
        return None
    common = math.lcm(table.decides_den, setting.rule_den)
    own, given = common // table.decides_den, common // setting.rule_den
    bound = (largest(table.decides) + 1) * own + (largest(setting.rule) + 1) * given
    off: IntArray = np.abs(held(table.decides, bound) * own - held(setting.rule, bound) * given)
    profile, option = divmod(int(off.argmax()), len(setting.options))
    margin = Fraction(-int(off[profile, option]), common)
    return Finding(
        "decision-table",
        margin >= -tolerance,
        margin,
        option=setting.options[option],
        profile=labels(setting, profile),
    )
