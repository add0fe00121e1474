"""Demand groups: what can be dropped as one, and which group a row belongs to.

decision   the decision rule that is demanded (dropped: any lottery over the options)
ic:NAME    honesty of one party            ir:NAME   participation of one party
balance    the balance of the pot          limit:KEY a limit on payments
side:KEY   a side demand                   even-handed
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import replace
from typing import Any, cast

from designer.demands.terms import Terms
from designer.program.labels import Balances, Clause, Honest, Label, TakesPart
from designer.setting.likeness import twins
from designer.setting.setting import Setting

CAPS = ("pays_at_most", "pays_at_least")
"""Limits that are amounts; pays_at_most is implied by only_when_served, which repeats it."""
CLAUSES = ("only_when_served", "within_worth")
FLOORS = ("welfare_at_least", "revenue_at_least")


def groups_of(setting: Setting, terms: Terms) -> tuple[str, ...]:
    """The groups that the terms ask for, in reading order."""
    found = []
    if may_free_decision(terms):
        found.append("decision")
    if terms.ic != "none":
        found += [
            f"ic:{p.name}" for p in setting.parties if p.name not in terms.trusted and p.size > 1
        ]
    if terms.ir != "none":
        found += [f"ir:{p.name}" for p in setting.parties if p.name not in terms.compelled]
    if terms.balance != "none":
        found.append("balance")
    found += [f"limit:{key}" for key in CAPS if getattr(terms.limits, key) is not None]
    found += [f"limit:{key}" for key in CLAUSES if getattr(terms.limits, key)]
    found += [f"side:{key}" for key in FLOORS if getattr(terms.side, key) is not None]
    found += [f"side:chance[{place}]" for place in range(len(terms.side.chances))]
    if terms.even_handed and next(twins(setting), None) is not None:
        found.append("even-handed")
    return tuple(found)


def may_free_decision(terms: Terms) -> bool:
    """Whether the decision is demanded and can be let go.

    A given rule whose parties pay only when served, without a cap, cannot be: how much they
    may pay once the decision is open would have no bound that a linear program could hold.
    """
    endless = terms.limits.only_when_served and terms.limits.pays_at_most is None
    return terms.decision != "randomized" and not endless


def without(terms: Terms, dropped: Iterable[str]) -> Terms:
    """The terms with some groups dropped.

    Where pays_at_most is dropped but only_when_served kept, nothing changes: what is collected
    upon service keeps its cap, and so does every payment.
    """
    dropped = set(dropped)
    named = {"ic": set(terms.trusted), "ir": set(terms.compelled)}
    limits, side = terms.limits, terms.side
    served = limits.only_when_served and "limit:only_when_served" not in dropped
    for group in dropped:
        kind, _, key = group.partition(":")
        if kind in named:
            named[kind].add(key)
        elif kind == "limit" and key in CLAUSES:
            limits = replace(limits, **cast(Any, {key: False}))
        elif kind == "limit" and not (served and key == "pays_at_most"):
            limits = replace(limits, **cast(Any, {key: None}))
        elif kind == "side" and key in FLOORS:
            side = replace(side, **cast(Any, {key: None}))
    chances = tuple(
        chance
        for place, chance in enumerate(side.chances)
        if f"side:chance[{place}]" not in dropped
    )
    return replace(
        terms,
        decision="randomized" if "decision" in dropped else terms.decision,
        balance="none" if "balance" in dropped else terms.balance,
        even_handed=terms.even_handed and "even-handed" not in dropped,
        trusted=frozenset(named["ic"]),
        compelled=frozenset(named["ir"]),
        limits=limits,
        side=replace(side, chances=chances),
    )


def group_of(label: Label) -> str | None:
    """The group of a row, None for rows that every program of its kind has."""
    if isinstance(label, Honest):
        return f"ic:{label.party}"
    if isinstance(label, TakesPart):
        return f"ir:{label.party}"
    if isinstance(label, Balances):
        return "balance"
    if isinstance(label, Clause):
        return label.group if label.group == "even-handed" else f"{label.group}:{label.key}"
    return None
