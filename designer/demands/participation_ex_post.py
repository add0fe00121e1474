"""Ex-post participation: once all is known, nobody would have done better outside."""

from __future__ import annotations

from collections.abc import Callable

from designer.demands.kinds import Demand
from designer.demands.terms import Terms
from designer.program.affine import constants
from designer.program.draft import Draft
from designer.program.labels import Label, TakesPart


def _rows(draft: Draft, terms: Terms) -> None:
    """u_i(theta) - outside_i(theta) >= -shortfall at every profile in scope."""
    for index in draft.judged:
        party, scope = draft.setting.parties[index], draft.scope_of(index)
        if party.name in terms.compelled:
            continue
        outside = constants(draft.outside_at(index, scope), draft.setting.grain, draft.dtype)
        utility = draft.worth(index, scope, scope) - draft.pays(index, scope)
        allowed = draft.allowance("shortfall", terms.shortfall, party.name).repeat(len(scope))
        draft.require(utility - outside + allowed, ">=", "takes part", _label(draft, index))


def _label(draft: Draft, index: int) -> Callable[[int], Label]:
    setting, scope = draft.setting, draft.scope_of(index)

    def label(j: int) -> Label:
        at = setting.labels_at(int(scope[j]))
        return TakesPart(setting.parties[index].name, at[index], at)

    return label


DEMAND = Demand("ir ex-post", lambda terms: terms.ir == "ex-post", _rows)
