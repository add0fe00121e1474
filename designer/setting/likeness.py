"""Which parties are alike: trading places with one leaves every number of the setting as it was.

Two parties i and j are alike when swapping them, together with a matching swap of the options,
changes nothing: both have the same types and priors, the swapped option is worth to i what the
option was worth to j and the other way round, and everyone else and the designer see no
difference. "The lot goes to i" takes the place of "the lot goes to j".
"""

from __future__ import annotations

from collections.abc import Callable, Iterator

import numpy as np

from designer.setting.profiles import strides
from designer.setting.setting import IntArray, Setting

Twins = tuple[int, int, IntArray]
"""Alike parties i < j, and the option that takes each option's place when they trade places."""


def twins(setting: Setting, also: Callable[[Twins], bool] = lambda _: True) -> Iterator[Twins]:
    """Pairs of alike parties from which all swaps follow: each with the next one like it.

    `also` may ask for more: a pair that fails it does not count as alike.
    """
    followed: set[int] = set()
    for j in range(len(setting.parties)):
        for i in reversed(range(j)):
            if i in followed:
                continue  # a nearer twin of i leads to j
            option = matching(setting, i, j)
            if option is not None and also((i, j, option)):
                followed.add(i)
                yield i, j, option
                break


def matching(setting: Setting, i: int, j: int) -> IntArray | None:
    """The option that takes each option's place when i and j trade places, int (K,), else None.

    Options that nothing tells apart keep their order, so that the swap is its own inverse.
    """
    if not _same_types(setting, i, j) or not _same_worths(setting, i, j):
        return None
    profile: IntArray | None = None
    if setting.joint is not None or any(p.depends or p.outside_depends for p in setting.parties):
        profile = swapped(setting, i, j)
    if setting.joint is not None and not np.array_equal(setting.joint, setting.joint[profile]):
        return None
    order = list(range(len(setting.parties)))
    order[i], order[j] = j, i
    outside = [_table(setting, p, "outside", profile) for p in range(len(order))]
    for index, other in enumerate(order):
        if not np.array_equal(outside[index], _moved(outside[other], profile)):
            return None
    values = [_table(setting, p, "value", profile) for p in range(len(order))]
    before = [_mark(setting, values, k) for k in range(len(setting.options))]
    moved = [_moved(values[other], profile) for other in order]
    places: dict[tuple[object, ...], list[int]] = {}
    for k in range(len(setting.options)):
        places.setdefault(_mark(setting, moved, k), []).append(k)
    match = []
    for mark in before:
        waiting = places.get(mark)
        if not waiting:
            return None
        match.append(waiting.pop(0))
    return np.array(match, dtype=np.int64)


def swapped(setting: Setting, i: int, j: int) -> IntArray:
    """The number of every profile once i and j have traded types, int (N,)."""
    profiles = np.arange(setting.profiles, dtype=np.int64)
    steps = strides(setting.shape)
    size = setting.shape[i]
    own, other = profiles // steps[i] % size, profiles // steps[j] % size
    found: IntArray = profiles + (other - own) * steps[i] + (own - other) * steps[j]
    return found


def _same_types(setting: Setting, i: int, j: int) -> bool:
    one, two = setting.parties[i], setting.parties[j]
    return (
        one.size == two.size
        and [t.label for t in one.types] == [t.label for t in two.types]
        and one.marginal == two.marginal
        and one.compelled == two.compelled
    )


def _same_worths(setting: Setting, i: int, j: int) -> bool:
    """Whether private worths agree up to the order of options: settles nearly every pair."""
    one, two = setting.parties[i], setting.parties[j]
    if one.depends or two.depends:
        return one.depends == two.depends
    return sorted(one.value.T.tolist()) == sorted(two.value.T.tolist())


def _table(setting: Setting, index: int, what: str, profile: IntArray | None) -> IntArray:
    """A party's own table, or its rows at every profile where some table needs those."""
    party = setting.parties[index]
    table: IntArray = getattr(party, what)
    everywhere = party.depends if what == "value" else party.outside_depends
    if profile is None or everywhere:
        return table
    own = np.arange(setting.profiles, dtype=np.int64) // strides(setting.shape)[index] % party.size
    spread: IntArray = table[own]
    return spread


def _moved(table: IntArray, profile: IntArray | None) -> IntArray:
    """The table at the swapped profiles."""
    moved: IntArray = table if profile is None else table[profile]
    return moved


def _mark(setting: Setting, values: list[IntArray], k: int) -> tuple[object, ...]:
    """All that the setting says of an option."""
    own = (int(setting.outlay[k]), int(setting.worth[k]))
    return own + tuple(tuple(table[:, k].tolist()) for table in values)
