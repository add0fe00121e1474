"""Smallest swing: the smallest largest payment, in either direction."""

from __future__ import annotations

from fractions import Fraction

from designer.demands.kinds import Goal
from designer.demands.terms import Terms
from designer.program.affine import Affine
from designer.program.draft import Draft
from designer.program.labels import Clause
from designer.program.linear import IndexArray


def _objective(draft: Draft, terms: Terms) -> Affine:
    """Min z with -z <= t_i(theta) <= z at every profile."""
    setting = draft.setting
    swing = draft.unknown("swing", Fraction(0))
    for index in draft.judged:
        at = draft.everywhere_of(index)
        paid = draft.pays(index, at)
        repeated = swing.repeat(len(at))

        def label(j: int, name: str = setting.parties[index].name, at: IndexArray = at) -> Clause:
            return Clause("goal", "swing", name, setting.labels_at(int(at[j])))

        draft.require(repeated - paid, ">=", "goal swing", label)
        draft.require(repeated + paid, ">=", "goal swing", label)
    return swing


GOAL = Goal("swing", "min", "smallest largest payment", _objective)
