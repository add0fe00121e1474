"""Even-handedness: parties whose data are equal are treated alike."""

from __future__ import annotations

from collections.abc import Iterator
from fractions import Fraction

import numpy as np
import numpy.typing as npt

from designer.auditing.outcome import Finding
from designer.auditing.view import labels
from designer.auditing.welfare import around
from designer.setting.setting import IntArray, Setting
from designer.table import Table, held, largest

Profiles = npt.NDArray[np.int64]
Groups = list[tuple[list[int], list[int]]]


def even_handed(
    setting: Setting, table: Table, tolerance: Fraction, chance_tolerance: Fraction
) -> Finding:
    """Judge whether swapping two parties of equal data leaves the table as it was.

    Two parties have equal data when swapping their types at every profile, with some
    matching swap of options, leaves every worth, outside option, probability and the
    designer's numbers unchanged. Then t_i(theta) = t_j(swapped), t_l(theta) = t_l(swapped)
    for everyone else, and options that cannot be told apart are as likely together as the
    ones they are swapped for. The margin is minus the largest difference in a payment, or
    in a probability if no payment differs.
    """
    worst = Finding("even-handed", True, Fraction(0))
    for i, j, swapped, groups in _alike(setting):
        for one in range(len(setting.parties)):
            other = {i: j, j: i}.get(one, one)
            bound = 2 * largest(table.pays)
            pays = held(table.pays, bound)
            gap = np.abs(pays[one] - pays[other][swapped])
            worst = _worse(setting, worst, one, gap, table.pays_den, tolerance)
        bound = 2 * len(setting.options) * largest(table.decides)
        chosen = held(table.decides, bound)
        for here, there in groups:
            gap = np.abs(chosen[:, here].sum(axis=1) - chosen[swapped][:, there].sum(axis=1))
            worst = _worse(setting, worst, i, gap, table.decides_den, chance_tolerance)
    return worst


def _worse(
    setting: Setting, so_far: Finding, index: int, gap: IntArray, den: int, tolerance: Fraction
) -> Finding:
    at = int(gap.argmax())
    margin = Fraction(-int(gap[at]), den)
    if margin == 0 or (so_far.margin is not None and so_far.margin <= margin):
        return so_far
    holds = so_far.holds and margin >= -tolerance
    where = labels(setting, at)
    name = setting.parties[index].name
    return Finding("even-handed", holds, margin, name, where[name], profile=where)


def _alike(setting: Setting) -> Iterator[tuple[int, int, Profiles, Groups]]:
    """Each party with the nearest earlier one of equal data, if any: their swaps make all."""
    for j in range(len(setting.parties)):
        for i in range(j - 1, -1, -1):
            one, two = setting.parties[i], setting.parties[j]
            if [k.label for k in one.types] != [k.label for k in two.types]:
                continue
            if one.marginal != two.marginal or one.compelled != two.compelled:
                continue
            swapped = _swap(setting, i, j)
            groups = _matched(setting, i, j, swapped)
            if groups is not None:
                yield i, j, swapped, groups
                break


def _swap(setting: Setting, i: int, j: int) -> Profiles:
    """Number, for every profile, the one in which i and j have each other's types."""
    numbers = np.arange(setting.profiles, dtype=np.int64)
    (_, size, after_i), (_, _, after_j) = around(setting, i), around(setting, j)
    a, b = (numbers // after_i) % size, (numbers // after_j) % size
    swapped: Profiles = numbers + (b - a) * after_i + (a - b) * after_j
    return swapped


def _everywhere(setting: Setting, index: int, data: IntArray, depends: bool) -> IntArray:
    if depends:
        return data
    _, size, after = around(setting, index)
    by_profile: IntArray = data[(np.arange(setting.profiles) // after) % size]
    return by_profile


def _matched(setting: Setting, i: int, j: int, swapped: Profiles) -> Groups | None:
    """Options that look the same, with those that look so after the swap; None if unmatched."""
    if setting.joint is not None and not np.array_equal(setting.joint, setting.joint[swapped]):
        return None
    before: list[list[object]] = [
        [int(c), int(w)] for c, w in zip(setting.outlay, setting.worth, strict=True)
    ]
    after = [list(mark) for mark in before]
    for index, party in enumerate(setting.parties):
        other = {i: j, j: i}.get(index, index)
        twin = setting.parties[other]
        outside = _everywhere(setting, index, party.outside, party.outside_depends)
        outside_twin = _everywhere(setting, other, twin.outside, twin.outside_depends)
        if not np.array_equal(outside, outside_twin[swapped]):
            return None
        value = _everywhere(setting, index, party.value, party.depends)
        value_twin = _everywhere(setting, other, twin.value, twin.depends)[swapped]
        for k in range(len(setting.options)):
            before[k].append(tuple(value[:, k].tolist()))
            after[k].append(tuple(value_twin[:, k].tolist()))
    groups: dict[tuple[object, ...], tuple[list[int], list[int]]] = {}
    for k in range(len(setting.options)):
        groups.setdefault(tuple(before[k]), ([], []))[0].append(k)
        groups.setdefault(tuple(after[k]), ([], []))[1].append(k)
    if any(len(here) != len(there) for here, there in groups.values()):
        return None
    return list(groups.values())
