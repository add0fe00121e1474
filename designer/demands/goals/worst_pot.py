"""Best worst pot: the largest pot at the least favourable profile."""

from __future__ import annotations

from designer.demands.kinds import Goal
from designer.demands.terms import Terms
from designer.program.affine import Affine
from designer.program.draft import Draft
from designer.program.labels import Clause


def _objective(draft: Draft, terms: Terms) -> Affine:
    """Max z with pot(theta) >= z at every profile in scope."""
    scope = draft.scope
    worst = draft.unknown("worst pot")
    form = draft.pot(scope) - worst.repeat(len(scope))

    def label(j: int) -> Clause:
        return Clause("goal", "worst-pot", None, draft.setting.labels_at(int(scope[j])))

    draft.require(form, ">=", "goal worst-pot", label)
    return worst


GOAL = Goal("worst-pot", "max", "largest pot in the worst profile", _objective)
