"""Smallest swing: the smallest largest payment, in either direction."""

from __future__ import annotations

from fractions import Fraction

import numpy as np

from designer.demands.kinds import Goal
from designer.demands.terms import Terms
from designer.program.affine import Affine
from designer.program.draft import Draft
from designer.program.labels import Clause


def _objective(draft: Draft, terms: Terms) -> Affine:
    """Min z with -z <= t_i(theta) <= z at every profile."""
    setting = draft.setting
    swing = draft.unknown("swing", Fraction(0))
    everywhere = np.arange(setting.profiles, dtype=np.int64)
    repeated = swing.repeat(setting.profiles)
    for index, party in enumerate(setting.parties):
        paid = draft.pays(index, everywhere)

        def label(j: int, name: str = party.name) -> Clause:
            return Clause("goal", "swing", name, setting.labels_at(j))

        draft.require(repeated - paid, ">=", "goal swing", label)
        draft.require(repeated + paid, ">=", "goal swing", label)
    return swing


GOAL = Goal("swing", "min", "smallest largest payment", _objective)
