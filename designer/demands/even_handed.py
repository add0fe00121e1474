"""Even-handedness (anonymity): parties with equal data are treated alike.

Two parties are alike when swapping them, together with a matching swap of the options, leaves
every number of the setting as it was. Swapping them must then leave the table as it was:

    t_i(theta) = t_j(swapped),   t_l(theta) = t_l(swapped),   x_k(theta) = x_k'(swapped)
"""

from __future__ import annotations

from collections.abc import Callable, Iterator

import numpy as np

from designer.demands.kinds import Demand
from designer.demands.terms import Terms
from designer.program.draft import Draft
from designer.program.labels import Clause, Label
from designer.program.linear import IndexArray
from designer.setting.setting import Setting


def alike(setting: Setting) -> Iterator[tuple[int, int, IndexArray, IndexArray]]:
    """Pairs (i, j) of alike parties that generate all swaps, with what each swap does.

    Yields (i, j, profile, option): profile[theta] is theta with i's and j's types swapped,
    option[k] the option that takes the place of k.
    """
    grid = np.arange(setting.profiles, dtype=np.int64).reshape(setting.shape)
    last: dict[int, int] = {}
    for j in range(len(setting.parties)):
        for i in reversed(range(j)):
            if last.get(i) is not None and last[i] < j:
                continue  # i already has a nearer twin, through which j is reached
            if not _same_types(setting, i, j):
                continue
            profile = np.swapaxes(grid, i, j).ravel()
            option = _matching(setting, i, j, profile)
            if option is not None:
                last[i] = j
                yield i, j, profile, option
                break


def _same_types(setting: Setting, i: int, j: int) -> bool:
    one, two = setting.parties[i], setting.parties[j]
    return (
        [t.label for t in one.types] == [t.label for t in two.types]
        and one.marginal == two.marginal
        and one.compelled == two.compelled
    )


def _values(setting: Setting, index: int) -> object:
    party = setting.parties[index]
    if party.depends:
        return party.value
    after = int(np.prod(setting.shape[index + 1 :], dtype=np.int64))
    own = np.arange(setting.profiles, dtype=np.int64) // after % party.size
    return party.value[own]


def _matching(setting: Setting, i: int, j: int, profile: IndexArray) -> IndexArray | None:
    """The option swap that makes the parties' swap a symmetry, or None if there is none."""
    if setting.joint is not None and not np.array_equal(setting.joint, setting.joint[profile]):
        return None
    values = [np.asarray(_values(setting, index)) for index in range(len(setting.parties))]
    outside = []
    for index, party in enumerate(setting.parties):
        if party.outside_depends:
            outside.append(party.outside)
        else:
            after = int(np.prod(setting.shape[index + 1 :], dtype=np.int64))
            own = np.arange(setting.profiles, dtype=np.int64) // after % party.size
            outside.append(party.outside[own])
    order = list(range(len(setting.parties)))
    order[i], order[j] = j, i
    for index, other in enumerate(order):
        if not np.array_equal(outside[index], outside[other][profile]):
            return None
    options = len(setting.options)

    def mark(k: int, swapped: bool) -> tuple[object, ...]:
        parts: list[object] = [int(setting.outlay[k]), int(setting.worth[k])]
        for index, other in enumerate(order):
            column = values[other][profile, k] if swapped else values[index][:, k]
            parts.append(tuple(int(v) for v in column))
        return tuple(parts)

    places: dict[tuple[object, ...], list[int]] = {}
    for k in range(options):
        places.setdefault(mark(k, swapped=True), []).append(k)
    match = []
    for k in range(options):
        waiting = places.get(mark(k, swapped=False))
        if not waiting:
            return None
        match.append(waiting.pop(0))
    return np.array(match, dtype=np.int64)


def _rows(draft: Draft, terms: Terms) -> None:
    setting = draft.setting
    everywhere = np.arange(setting.profiles, dtype=np.int64)
    for i, j, profile, option in alike(setting):
        pair = f"{setting.parties[i].name} and {setting.parties[j].name}"
        for index, party in enumerate(setting.parties):
            other = {i: j, j: i}.get(index, index)
            keep = everywhere if index != other else np.flatnonzero(everywhere < profile)
            if index == j or not len(keep):
                continue  # the mirror image of the rows of i

            def label(
                n: int, name: str = party.name, keep: IndexArray = keep, pair: str = pair
            ) -> Clause:
                return Clause("even-handed", pair, name, setting.labels_at(int(keep[n])))

            form = draft.pays(index, keep) - draft.pays(other, profile[keep])
            draft.require(form, "=", "even-handed", label)
        for k in range(len(setting.options)):
            pick = np.zeros(len(setting.options), dtype=draft.dtype)
            pick[k] = 1
            twin = np.zeros(len(setting.options), dtype=draft.dtype)
            twin[option[k]] = 1
            form = draft.chosen(everywhere, pick, 1) - draft.chosen(profile, twin, 1)
            draft.require(
                form,
                "=",
                "even-handed",
                _option_label(setting, pair),
            )


def _option_label(setting: Setting, pair: str) -> Callable[[int], Label]:
    return lambda n: Clause("even-handed", pair, None, setting.labels_at(n))


DEMAND = Demand("even-handed", lambda terms: terms.even_handed, _rows)
