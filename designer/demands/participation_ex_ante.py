"""Ex-ante participation: before types are known, nobody expects to do better outside."""

from __future__ import annotations

from designer.demands.kinds import Demand
from designer.demands.terms import Terms
from designer.program.draft import Draft
from designer.program.labels import TakesPart, always


def _rows(draft: Draft, terms: Terms) -> None:
    """E[u_i] - E[outside_i] >= -shortfall, one row per party that is not compelled."""
    for index in draft.judged:
        party = draft.setting.parties[index]
        if party.name in terms.compelled:
            continue
        label = TakesPart(party.name)
        gain = draft.expected_utility(index) - draft.expected_outside(index)
        allowed = draft.allowance("shortfall", terms.shortfall, party.name)
        draft.require(gain + allowed, ">=", "takes part", always(label))


DEMAND = Demand("ir ex-ante", lambda terms: terms.ir == "ex-ante", _rows)
