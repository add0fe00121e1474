"""Even-handedness (anonymity): parties with equal data are treated alike.

Alike is said in `setting/likeness.py`. Swapping two parties that are must leave the table as it
was, with theta's types swapped and k' the option that takes the place of k:

    t_i(theta) = t_j(swapped),   t_l(theta) = t_l(swapped),   x_k(theta) = x_k'(swapped)
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from designer.demands.kinds import Demand
from designer.demands.terms import Terms
from designer.program.draft import Draft
from designer.program.labels import Clause, Label
from designer.program.linear import IndexArray
from designer.setting.likeness import swapped, twins
from designer.setting.setting import Setting


def _rows(draft: Draft, terms: Terms) -> None:
    setting = draft.setting
    everywhere = np.arange(setting.profiles, dtype=np.int64)
    for i, j, option in twins(setting):
        profile = swapped(setting, i, j)
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
