"""Welfare by profile and option, for judging whether decisions are efficient."""

from __future__ import annotations

import numpy as np

from designer.setting.setting import IntArray, Setting
from designer.table import held, largest


def welfare(setting: Setting) -> IntArray:
    """W_k(theta) = sum_i v_i(k, theta) + worth(k) - outlay(k) (convention 2).

    Returns int, shape (N, K), money in units of 1/grain.
    """
    bound = largest(setting.worth) + largest(setting.outlay)
    bound += sum(largest(party.value) for party in setting.parties)
    base = held(setting.worth, bound) - held(setting.outlay, bound)
    total = np.tile(base, (setting.profiles, 1))
    for index, party in enumerate(setting.parties):
        split = total.reshape(*around(setting, index), -1)
        split += by_own_type(setting, index, held(party.value, bound), party.depends)
    return total


def around(setting: Setting, index: int) -> tuple[int, int, int]:
    """(profiles before, own types, profiles after): how a party's type sits in the numbering."""
    before = after = 1
    for size in setting.shape[:index]:
        before *= size
    for size in setting.shape[index + 1 :]:
        after *= size
    return before, setting.shape[index], after


def by_own_type(setting: Setting, index: int, data: IntArray, depends: bool) -> IntArray:
    """Shape data by type, or by profile, to meet arrays (before, own, after, …)."""
    if depends:
        return data.reshape(*around(setting, index), *data.shape[1:])
    return data[None, :, None]
