"""Interim probabilities: how likely an option is, given a party's type."""

from __future__ import annotations

import numpy as np

from designer.demands.kinds import Demand
from designer.demands.terms import Terms
from designer.program.draft import Draft
from designer.program.labels import Clause, always


def _rows(draft: Draft, terms: Terms) -> None:
    """at_least <= P(option | party has type) <= at_most; equal ends make one equation."""
    for place, chance in enumerate(terms.side.chances):
        party = draft.setting.parties[chance.party]
        form = draft.interim_chance(
            chance.party, np.array([chance.type], dtype=np.int64), chance.option
        )
        label = Clause("side", f"chance[{place}]", party.name)
        low, high = chance.at_least, chance.at_most
        if low is not None and low == high:
            draft.require(form.plus(-low), "=", "side", always(label))
            continue
        if low is not None:
            draft.require(form.plus(-low), ">=", "side", always(label))
        if high is not None:
            draft.require((-form).plus(high), ">=", "side", always(label))


DEMAND = Demand("side chance", lambda terms: bool(terms.side.chances), _rows)
