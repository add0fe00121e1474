"""No party ever pays more than the decision is worth to it, as reported."""

from __future__ import annotations

import numpy as np

from designer.demands.kinds import Demand
from designer.demands.terms import Terms
from designer.program.draft import Draft
from designer.program.labels import Clause


def _rows(draft: Draft, terms: Terms) -> None:
    """sum_k x_k(theta) v_i(k, theta) - t_i(theta) >= 0 at every profile, whatever is outside."""
    setting = draft.setting
    everywhere = np.arange(setting.profiles, dtype=np.int64)
    for index, party in enumerate(setting.parties):
        form = draft.worth(index, everywhere, everywhere) - draft.pays(index, everywhere)

        def label(j: int, name: str = party.name) -> Clause:
            return Clause("limit", "within_worth", name, setting.labels_at(j))

        draft.require(form, ">=", "within worth", label)


DEMAND = Demand("limit within worth", lambda terms: terms.limits.within_worth, _rows)
