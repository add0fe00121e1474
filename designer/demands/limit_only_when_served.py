"""A party pays only when it is served: when the decision is worth something to it."""

from __future__ import annotations

from designer.demands.kinds import Demand
from designer.demands.terms import Terms
from designer.program.draft import Draft
from designer.program.labels import Clause
from designer.program.linear import IndexArray


def _rows(draft: Draft, terms: Terms) -> None:
    """t_i(theta) <= cap * P(i is served at theta), i served by k when v_i(k, theta) > 0.

    This is what collecting at most `cap` (the limit pays_at_most) upon service, and nothing
    otherwise, amounts to. Without a cap only the profiles that surely leave i unserved bind,
    which is possible only where the decision there is fixed.
    """
    setting, cap = draft.setting, terms.limits.pays_at_most
    for index in draft.judged:
        party, everywhere = setting.parties[index], draft.everywhere_of(index)
        serves = (draft.value_at(index, everywhere) > 0).astype(draft.dtype)
        served = draft.chosen(everywhere, serves, 1)
        if cap is None:
            unserved = served.const == 0
            unserved[served.row] = False
            at = everywhere[unserved]
            form = -draft.pays(index, at)
        else:
            at = everywhere
            form = served.times(cap) - draft.pays(index, at)

        def label(j: int, name: str = party.name, at: IndexArray = at) -> Clause:
            return Clause("limit", "only_when_served", name, setting.labels_at(int(at[j])))

        draft.require(form, ">=", "only when served", label)


DEMAND = Demand("limit only when served", lambda terms: terms.limits.only_when_served, _rows)
