"""Most for the parties: the largest expected sum of their utilities."""

from __future__ import annotations

from designer.demands.kinds import Goal
from designer.demands.terms import Terms
from designer.program.affine import Affine
from designer.program.draft import Draft


def expected_utilities(draft: Draft) -> Affine:
    """E[sum_i u_i]."""
    form = draft.expected_utility(0)
    for index in range(1, len(draft.setting.parties)):
        form = form + draft.expected_utility(index)
    return form


def _objective(draft: Draft, terms: Terms) -> Affine:
    return expected_utilities(draft)


GOAL = Goal("parties", "max", "largest expected sum of the parties' utilities", _objective)
