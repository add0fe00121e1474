"""A floor on the expected pot."""

from __future__ import annotations

from designer.demands.kinds import Demand
from designer.demands.terms import Terms
from designer.program.draft import Draft
from designer.program.labels import Clause


def _rows(draft: Draft, terms: Terms) -> None:
    """E[pot] >= revenue_at_least."""
    floor = terms.side.revenue_at_least
    if floor is not None:
        form = draft.expected_pot() - draft.allowance("revenue_at_least", floor)
        draft.require(form, ">=", "side", lambda _: Clause("side", "revenue_at_least"))


DEMAND = Demand("side revenue", lambda terms: terms.side.revenue_at_least is not None, _rows)
