"""Largest returned share: how much of the pivotal rule's takings is sure to be handed back.

    max z   with   pot(theta) <= (1 - z) * takings(theta)   at every profile in scope

takings(theta) = sum_i [ max over k of W_-i(k) - W_-i(k*) ] is what the pivotal (Clarke) rule would
collect there, with W_-i(k) everyone's worth of k but party i's, the designer's net of the outlay
included (convention 2), and k* the first of the most worthy options. It is never negative.
Profiles where the rule takes nothing say nothing: no share of nothing can be handed back.

With no deficit in every case z is at most 1, all of it; the share is a number, not money. Source:
the worst-case share of M. Guo and V. Conitzer (2009), Games and Economic Behavior 67:69-98, and
H. Moulin (2009), Journal of Economic Theory 144:96-119, over all tables instead of linear rebates.
"""

from __future__ import annotations

import numpy as np

from designer.demands.kinds import Goal
from designer.demands.terms import Terms
from designer.program.affine import Affine, constants
from designer.program.draft import Draft
from designer.program.labels import Clause
from designer.setting.setting import IntArray
from designer.table import held, largest


def pivotal_takings(draft: Draft) -> IntArray:
    """What the pivotal rule would collect at every profile, int (N,), units of 1/grain."""
    welfare = draft.welfare
    parties = range(len(draft.setting.parties))
    reach = largest(welfare) + max(largest(draft.setting.parties[i].value) for i in parties) + 1
    # Rows multiply the takings by the denominator of the given rule's lotteries.
    bound = 2 * len(parties) * reach * draft.chance_den * draft.setting.grain
    every = np.arange(len(welfare))
    best = welfare.argmax(axis=1)
    total = held(np.zeros(len(welfare), dtype=np.int64), bound)
    for i in parties:
        others = held(welfare - draft.value_at(i, draft.everywhere), bound)
        total = total + others.max(axis=1) - others[every, best]
    return total


def _objective(draft: Draft, terms: Terms) -> Affine:
    """(1 - z) * takings(theta) - pot(theta) >= 0 where anything is taken."""
    share = draft.unknown("returned share")
    takings = pivotal_takings(draft)
    counts = draft.in_scope(draft.everywhere) & (takings > 0)
    scope, taken = draft.everywhere[counts], takings[counts]
    kept = share.repeat(len(scope))
    allowed = constants(taken, draft.setting.grain, taken.dtype) + Affine(
        kept.row,
        kept.col,
        -taken,
        np.zeros(len(scope), dtype=taken.dtype),
        np.full(len(scope), draft.setting.grain, dtype=taken.dtype),
    )

    def label(j: int) -> Clause:
        return Clause("goal", "returned-share", None, draft.setting.labels_at(int(scope[j])))

    draft.require(allowed - draft.pot(scope), ">=", "goal returned-share", label)
    return share


GOAL = Goal(
    "returned-share",
    "max",
    "largest share of the pivotal rule's takings that is handed back in every case",
    _objective,
    money=False,
)
