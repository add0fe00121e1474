"""A blend: a weighted sum of the designer's worth, the pot and the parties' utilities."""

from __future__ import annotations

import numpy as np

from designer.demands.goals.parties import expected_utilities
from designer.demands.kinds import Goal
from designer.demands.terms import Terms
from designer.program.affine import Affine, constants
from designer.program.draft import Draft


def _objective(draft: Draft, terms: Terms) -> Affine:
    """Sum of weight * part, parts: E[designer's worth], E[pot], E[sum_i u_i], E[u_NAME]."""
    form = constants(np.zeros(1, dtype=draft.dtype), 1, draft.dtype)
    for name, weight in terms.blend:
        if name == "worth":
            part = draft.expected_choice(draft.setting.worth)
        elif name == "pot":
            part = draft.expected_pot()
        elif name == "parties":
            part = expected_utilities(draft)
        else:
            part = draft.expected_utility(draft.setting.party_index(name))
        form = form + part.times(weight)
    return form


GOAL = Goal("blend", "max", "largest blend of worth, pot and utilities", _objective)
