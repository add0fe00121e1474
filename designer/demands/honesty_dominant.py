"""Dominant-strategy incentive compatibility: honest reports pay whatever the others report.

With interdependent worths this is ex-post incentive compatibility (convention 4): honest
reports pay at every profile when the others are honest.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from designer.demands.honesty_bayesian import lies
from designer.demands.kinds import Demand
from designer.demands.terms import Terms
from designer.program.draft import Draft
from designer.program.labels import Honest, Label
from designer.program.linear import IndexArray
from designer.setting.setting import Party, Setting


def _rows(draft: Draft, terms: Terms) -> None:
    """u_i(theta; theta) - u_i(theta; b, theta_-i) >= -slack at every profile in scope, b != a."""
    for index in draft.judged:
        party = draft.setting.parties[index]
        true, told = lies(party.size)
        if party.name in terms.trusted or not len(true):
            continue
        fiber = draft.fiber(index)
        truth, lie = fiber[true].ravel(), fiber[told].ravel()
        told_at = np.repeat(told, fiber.shape[1])
        keep = draft.in_scope(truth)
        truth, lie, told_at = truth[keep], lie[keep], told_at[keep]
        honest = draft.worth(index, truth, truth) - draft.pays(index, truth)
        lying = draft.worth(index, truth, lie) - draft.pays(index, lie)
        slack = draft.allowance("slack", terms.slack).repeat(len(truth))
        draft.require(
            honest - lying + slack, ">=", "honest", _label(draft.setting, index, truth, told_at)
        )


def _label(
    setting: Setting, index: int, truth: IndexArray, told: IndexArray
) -> Callable[[int], Label]:
    party: Party = setting.parties[index]

    def label(j: int) -> Label:
        at = setting.labels_at(int(truth[j]))
        return Honest(party.name, at[index], party.types[told[j]].label, at)

    return label


DEMAND = Demand("ic dominant", lambda terms: terms.ic == "dominant", _rows)
