"""Balance on average: the expected pot covers the outlay less the outside money."""

from __future__ import annotations

from designer.demands.kinds import Demand
from designer.demands.terms import Terms
from designer.program.draft import Draft
from designer.program.labels import Balances


def _rows(draft: Draft, terms: Terms) -> None:
    """E[pot] = -subsidy (exact) or >= -subsidy (no deficit)."""
    form = draft.expected_pot() + draft.allowance("subsidy", terms.subsidy)
    relation = "=" if terms.budget == "exact" else ">="
    draft.require(form, relation, "balance", lambda _: Balances())


DEMAND = Demand("balance ex-ante", lambda terms: terms.balance == "ex-ante", _rows)
