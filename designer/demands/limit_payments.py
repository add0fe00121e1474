"""A floor and a cap on every payment t_i(theta)."""

from __future__ import annotations

from designer.demands.kinds import Demand
from designer.demands.terms import Terms
from designer.program.draft import Draft


def _rows(draft: Draft, terms: Terms) -> None:
    """pays_at_least <= t_i(theta) <= pays_at_most, as bounds of the payment columns."""
    draft.bound_payments(terms.limits.pays_at_least, terms.limits.pays_at_most)


def _asked(terms: Terms) -> bool:
    return terms.limits.pays_at_most is not None or terms.limits.pays_at_least is not None


DEMAND = Demand("limit payments", _asked, _rows)
