"""Balance in every case: at each profile the pot covers the outlay less the outside money."""

from __future__ import annotations

from designer.demands.kinds import Demand
from designer.demands.terms import Terms
from designer.program.draft import Draft
from designer.program.labels import Balances


def _rows(draft: Draft, terms: Terms) -> None:
    """pot(theta) = -subsidy (exact) or >= -subsidy (no deficit) at every profile in scope."""
    scope = draft.scope
    form = draft.pot(scope) + draft.allowance("subsidy", terms.subsidy).repeat(len(scope))
    relation = "=" if terms.budget == "exact" else ">="
    draft.require(
        form, relation, "balance", lambda j: Balances(draft.setting.labels_at(int(scope[j])))
    )


DEMAND = Demand("balance ex-post", lambda terms: terms.balance == "ex-post", _rows)
