"""Bayesian incentive compatibility: honest reports pay, on average over the others' types."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from designer.demands.kinds import Demand
from designer.demands.terms import Terms
from designer.program.draft import Draft
from designer.program.labels import Honest, Label
from designer.program.linear import IndexArray
from designer.setting.setting import Party


def lies(size: int) -> tuple[IndexArray, IndexArray]:
    """All ordered pairs (true, told) of distinct types."""
    true, told = np.nonzero(~np.eye(size, dtype=bool))
    return true.astype(np.int64), told.astype(np.int64)


def _rows(draft: Draft, terms: Terms) -> None:
    """U_i(a, a) - U_i(a, b) >= -slack for every party i and types a != b.

    U_i(a, b) = sum_theta_-i P(theta_-i | a) [sum_k x_k(b, theta_-i) v_i(k, .) - t_i(b, theta_-i)].
    """
    for index in draft.judged:
        party = draft.setting.parties[index]
        true, told = draft.lies(index)
        if party.name in terms.trusted or not len(true):
            continue
        honest = draft.interim_utility(index, true, true)
        lying = draft.interim_utility(index, true, told)
        slack = draft.allowance("slack", terms.slack).repeat(len(true))
        draft.require(honest - lying + slack, ">=", "honest", _label(party, true, told))


def _label(party: Party, true: IndexArray, told: IndexArray) -> Callable[[int], Label]:
    def label(j: int) -> Label:
        return Honest(party.name, party.types[true[j]].label, party.types[told[j]].label)

    return label


DEMAND = Demand("ic bayesian", lambda terms: terms.ic == "bayesian", _rows)
