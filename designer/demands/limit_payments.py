"""A floor and a cap on every payment t_i(theta)."""

from __future__ import annotations

from fractions import Fraction

from designer.demands.kinds import Demand
from designer.demands.terms import Terms
from designer.program.draft import Draft
from designer.program.labels import Clause
from designer.program.linear import IndexArray


def _rows(draft: Draft, terms: Terms) -> None:
    """pays_at_least <= t_i(theta) <= pays_at_most, as bounds of the payment columns.

    A limit that has been freed, to see how far it must give, is an unknown: rows then.
    """
    limits = terms.limits
    cap, floor = draft.freed("pays_at_most"), draft.freed("pays_at_least")
    draft.bound_payments(
        None if floor else limits.pays_at_least, None if cap else limits.pays_at_most
    )
    for key, given, sign in (("pays_at_most", cap, 1), ("pays_at_least", floor, -1)):
        if given:
            _free_limit(draft, key, sign)


def _free_limit(draft: Draft, key: str, sign: int) -> None:
    """Sign * (limit - t_i(theta)) >= 0 at every profile."""
    setting = draft.setting
    for index in draft.judged:
        at = draft.everywhere_of(index)

        def label(j: int, name: str = setting.parties[index].name, at: IndexArray = at) -> Clause:
            return Clause("limit", key, name, setting.labels_at(int(at[j])))

        limit = draft.allowance(key, Fraction(0)).repeat(len(at))
        room = (limit - draft.pays(index, at)).times(Fraction(sign))
        draft.require(room, ">=", "limit", label)


def _asked(terms: Terms) -> bool:
    return terms.limits.pays_at_most is not None or terms.limits.pays_at_least is not None


DEMAND = Demand("limit payments", _asked, _rows)
