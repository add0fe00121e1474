"""The likeness road: the plain program with one column for what trades of places make equal."""

from __future__ import annotations

import time
from dataclasses import replace

from designer.demands.formulate import amounts_of
from designer.demands.terms import Terms
from designer.engines.report import Engine
from designer.engines.watch import Watch
from designer.roads.full import CELLS_UP_TO, settle
from designer.roads.likeness.draft import LikenessDraft
from designer.roads.likeness.likeness import Likeness, likeness
from designer.roads.likeness.mechanism import mechanism_of
from designer.roads.likeness.orbits import Orbits, count
from designer.roads.product import as_independent
from designer.roads.settled import Settled
from designer.setting.likeness import twins
from designer.setting.setting import Setting

TABLE_UP_TO = 100_000
"""Profiles up to which the whole table is made at once."""


class ByLikeness:
    """Any linear demand, where some parties are alike."""

    name = "likeness"

    def applies(self, setting: Setting, terms: Terms) -> str | None:
        """None, or why no two parties can trade places, or the program is still too large."""
        found = reduced(setting, terms)
        return found if isinstance(found, str) else None

    def travel(self, setting: Setting, terms: Terms, engine: Engine, watch: Watch) -> Settled:
        """The plain road's way over representatives, and back to a table on demand."""
        since = time.perf_counter()
        found = reduced(setting, terms)
        if isinstance(found, str):
            raise ValueError(found)
        orbits, own = found
        draft = LikenessDraft(orbits, own.decision, amounts_of(own))
        settled = settle(draft, own, engine, watch, since, self.name)
        settled = replace(settled, reduction=reduction(orbits.likeness, orbits.setting))
        if settled.status != "possible" or settled.primal is None:
            return settled
        since = time.perf_counter()
        mechanism = mechanism_of(draft, settled.primal)
        table = mechanism.table() if setting.profiles <= TABLE_UP_TO else None
        settled.seconds["table"] = time.perf_counter() - since
        return replace(settled, mechanism=mechanism, table=table)


def reduced(setting: Setting, terms: Terms) -> tuple[Orbits, Terms] | str:
    """The orbits to write the program on and the terms to write, or why not, in words."""
    if any(party.depends or party.outside_depends for party in setting.parties):
        return "a worth or an outside option depends on other parties' types"
    if terms.decision == "deterministic":
        return "the decision must be sure at every profile, and an average of tables is not"
    own = as_independent(setting)
    if own is None:
        return "the types are correlated"
    found = likeness(own, terms)
    if isinstance(found, str):
        return found
    if terms.even_handed and [(i, j) for i, j, _ in twins(own)] != found.steps:
        return "even-handedness is asked of parties of whom different things are asked"
    cells = count(own, found) * (len(own.parties) + len(own.options))
    if cells > CELLS_UP_TO:
        return f"the program would still have up to {cells:,} columns"
    # alike parties are treated alike by all tables that are left
    return Orbits(own, found), replace(terms, even_handed=False)


def reduction(found: Likeness, setting: Setting) -> dict[str, object]:
    """What the document says of the groups."""
    names = [[setting.parties[i].name for i in group] for group in found.groups]
    return {"road": "likeness", "alike": [group for group in names if len(group) > 1]}
