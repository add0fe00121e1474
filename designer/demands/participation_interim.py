"""Interim participation: knowing its own type, nobody expects to do better outside."""

from __future__ import annotations

from collections.abc import Callable

from designer.demands.kinds import Demand
from designer.demands.terms import Terms
from designer.program.draft import Draft
from designer.program.labels import Label, TakesPart
from designer.setting.setting import Party


def _rows(draft: Draft, terms: Terms) -> None:
    """U_i(a) - E[outside_i | a] >= -shortfall, per type of each party not compelled."""
    for index in draft.judged:
        party = draft.setting.parties[index]
        if party.name in terms.compelled:
            continue
        allowed = draft.allowance("shortfall", terms.shortfall, party.name).repeat(party.size)
        draft.require(draft.interim_gain(index) + allowed, ">=", "takes part", _label(party))


def _label(party: Party) -> Callable[[int], Label]:
    return lambda a: TakesPart(party.name, party.types[a].label)


DEMAND = Demand("ir interim", lambda terms: terms.ir == "interim", _rows)
