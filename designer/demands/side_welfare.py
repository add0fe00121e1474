"""A floor on expected welfare."""

from __future__ import annotations

from designer.demands.kinds import Demand
from designer.demands.terms import Terms
from designer.program.draft import Draft
from designer.program.labels import Clause


def _rows(draft: Draft, terms: Terms) -> None:
    """E[total worth net of outlay] >= welfare_at_least."""
    floor = terms.side.welfare_at_least
    if floor is not None:
        form = draft.expected_welfare() - draft.allowance("welfare_at_least", floor)
        draft.require(form, ">=", "side", lambda _: Clause("side", "welfare_at_least"))


DEMAND = Demand("side welfare", lambda terms: terms.side.welfare_at_least is not None, _rows)
