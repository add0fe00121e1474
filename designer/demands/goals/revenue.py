"""Most revenue: the largest expected pot."""

from __future__ import annotations

from designer.demands.kinds import Goal
from designer.demands.terms import Terms
from designer.program.affine import Affine
from designer.program.draft import Draft


def _objective(draft: Draft, terms: Terms) -> Affine:
    """E[sum_i t_i - outlay]."""
    return draft.expected_pot()


GOAL = Goal("revenue", "max", "largest expected pot", _objective)
