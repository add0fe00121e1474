"""Demand groups: what can be dropped as one, and which group a row belongs to.

decision   the decision rule that is demanded (dropped: any lottery over the options)
ic:NAME    honesty of one party            ir:NAME   participation of one party
balance    the balance of the pot          limit:KEY a limit on payments
side:KEY   a side demand                   even-handed
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import replace

from designer.demands.terms import Terms
from designer.program.labels import Balances, Clause, Honest, Label, TakesPart
from designer.setting.setting import Setting


def groups_of(setting: Setting, terms: Terms) -> tuple[str, ...]:
    """The groups that the terms ask for, in reading order."""
    found = []
    if terms.decision != "randomized":
        found.append("decision")
    if terms.ic != "none":
        found += [
            f"ic:{p.name}" for p in setting.parties if p.name not in terms.trusted and p.size > 1
        ]
    if terms.ir != "none":
        found += [f"ir:{p.name}" for p in setting.parties if p.name not in terms.compelled]
    if terms.balance != "none":
        found.append("balance")
    for key in ("pays_at_most", "pays_at_least"):
        if getattr(terms.limits, key) is not None:
            found.append(f"limit:{key}")
    for key in ("only_when_served", "within_worth"):
        if getattr(terms.limits, key):
            found.append(f"limit:{key}")
    for key in ("welfare_at_least", "revenue_at_least"):
        if getattr(terms.side, key) is not None:
            found.append(f"side:{key}")
    found += [f"side:chance[{place}]" for place in range(len(terms.side.chances))]
    if terms.even_handed:
        found.append("even-handed")
    return tuple(found)


def without(terms: Terms, dropped: Iterable[str]) -> Terms:
    """The terms with some groups dropped."""
    dropped = set(dropped)
    named = {"ic": set(terms.trusted), "ir": set(terms.compelled)}
    limits, side = terms.limits, terms.side
    for group in dropped:
        kind, _, key = group.partition(":")
        if kind in named:
            named[kind].add(key)
        elif kind == "limit":
            limits = replace(
                limits, **{key: False if key in ("only_when_served", "within_worth") else None}
            )
        elif kind == "side" and not key.startswith("chance"):
            side = replace(side, **{key: None})
    kept = tuple(
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
        side=replace(side, chances=kept),
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
