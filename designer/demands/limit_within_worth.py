"""No party ever pays more than the decision is worth to it, as reported."""

from __future__ import annotations

from designer.demands.kinds import Demand
from designer.demands.terms import Terms
from designer.program.draft import Draft
from designer.program.labels import Clause
from designer.program.linear import IndexArray


def _rows(draft: Draft, terms: Terms) -> None:
    """sum_k x_k(theta) v_i(k, theta) - t_i(theta) >= 0 at every profile, whatever is outside."""
    setting = draft.setting
    for index in draft.judged:
        at = draft.everywhere_of(index)
        form = draft.worth(index, at, at) - draft.pays(index, at)

        def label(j: int, name: str = setting.parties[index].name, at: IndexArray = at) -> Clause:
            return Clause("limit", "within_worth", name, setting.labels_at(int(at[j])))

        draft.require(form, ">=", "within worth", label)


DEMAND = Demand("limit within worth", lambda terms: terms.limits.within_worth, _rows)
