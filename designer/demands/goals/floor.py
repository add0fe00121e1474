"""Highest floor: the largest gain over staying out that every type of every party is left."""

from __future__ import annotations

from designer.demands.kinds import Goal
from designer.demands.terms import Terms
from designer.program.affine import Affine
from designer.program.draft import Draft
from designer.program.labels import Clause, always


def _objective(draft: Draft, terms: Terms) -> Affine:
    """Max z with U_i(a) - E[outside_i | a] >= z for every party and type.

    Compelled parties count too: leaving them out would let the table take from them at will.
    """
    floor = draft.unknown("floor")
    for index in draft.judged:
        party = draft.setting.parties[index]
        form = draft.interim_gain(index) - floor.repeat(party.size)
        draft.require(form, ">=", "goal floor", always(Clause("goal", "floor", party.name)))
    return floor


GOAL = Goal("floor", "max", "largest worst interim gain over staying out", _objective)
