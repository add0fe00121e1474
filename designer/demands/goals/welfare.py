"""Most welfare: the largest expected total worth net of outlay."""

from __future__ import annotations

from designer.demands.kinds import Goal
from designer.demands.terms import Terms
from designer.program.affine import Affine
from designer.program.draft import Draft


def _objective(draft: Draft, terms: Terms) -> Affine:
    """E[sum_k x_k (sum_i v_i(k) + worth(k) - outlay(k))]; worth is the designer's."""
    return draft.expected_welfare()


GOAL = Goal("welfare", "max", "largest expected welfare", _objective)
