"""The type-graph road: which demands it can decide.

The rule is settled (efficient, or the given table) and honesty is asked whatever the others
report. Then payments are distances in one small graph per party and profile of the others,
and what is left of the program is a handful of averages, or one path that decides.
"""

from __future__ import annotations

from designer.demands.terms import Terms
from designer.engines.report import Engine
from designer.engines.watch import Watch
from designer.roads.product import as_independent
from designer.roads.settled import Settled
from designer.setting.setting import Limits, Setting, Side

ON_AVERAGE = ("any", "outside-money", "revenue", "welfare", "parties", "blend")
"""Goals that see only what each party pays on average."""
IN_EVERY_CASE = ("any", "outside-money", "revenue", "welfare", "worst-pot")
"""Goals that the componentwise greatest table serves best."""
MOST = 20_000_000
"""Profiles that a pass may hold: a few hundred MiB."""


class TypeGraph:
    """Dominant honesty under a settled rule."""

    name = "type-graph"

    def applies(self, setting: Setting, terms: Terms) -> str | None:
        """None, or why the payments are not distances in type graphs."""
        if terms.ic != "dominant":
            return "honesty is not asked whatever the others report"
        if terms.decision not in ("efficient", "table"):
            return "the decision is left open"
        if terms.limits != Limits():
            return "payments are limited profile by profile"
        if terms.side != Side():
            return "side demands are made"
        if terms.even_handed:
            return "even-handedness ties profiles together"
        if terms.tidy == "swing":
            return "a tidy table is asked, profile by profile"
        if len(terms.goals) > 1:
            return "several goals are asked one after the other"
        reason = _goal(setting, terms)
        if reason is not None:
            return reason
        if setting.profiles > MOST:
            return f"there are more than {MOST:,} profiles to hold"
        asked = any(p.name not in terms.compelled for p in setting.parties)
        if terms.ir == "interim" and asked and as_independent(setting) is None:
            return "participation is asked type by type and the types are correlated"
        return None

    def travel(self, setting: Setting, terms: Terms, engine: Engine, watch: Watch) -> Settled:
        """Down, settle, and back."""
        from designer.roads.typegraph.walk import Walk

        return Walk(as_independent(setting) or setting, setting, terms, engine, watch).walk()


def _goal(setting: Setting, terms: Terms) -> str | None:
    """Why the goal and the balance do not go together here."""
    goal = terms.goals[0]
    if goal != "worst-pot" and terms.balance != "ex-post":
        return None if goal in ON_AVERAGE else f"the goal {goal} is about single payments"
    if goal not in IN_EVERY_CASE:
        return f"the goal {goal} is not served best by the largest payments"
    if terms.balance == "ex-post" and terms.budget == "exact":
        return "a pot that balances exactly in every case ties all parties' payments together"
    if terms.balance == "ex-ante":
        return "the worst pot is asked with balance on average"
    if terms.ir != "ex-post":
        return "the pot is asked in every case but participation is not"
    if any(party.name in terms.compelled for party in setting.parties):
        return "the pot is asked in every case and a compelled party has no most to pay"
    return None


def in_every_case(terms: Terms) -> bool:
    """Whether pots are asked profile by profile."""
    return terms.balance == "ex-post" or terms.goals[0] == "worst-pot"
