"""The reverse of a price: how far a possible mix can be pushed while it stays possible."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from fractions import Fraction

from designer.weighing.groups import CAPS, FLOORS
from designer.weighing.mix import Mix
from designer.weighing.relaxed import ALLOWANCE, Relaxed


@dataclass(frozen=True)
class Room:
    """How far one direction can be pushed alone, all else kept whole.

    kind    "money" that could be handed back, "shortfall": by how much every type could be
            lifted above its outside option, "lies": what every lie could be made to cost
            beyond what is asked, "limit:KEY" and "side:KEY": by how much a limit or floor could
            be tightened
    amount  exact; None: without end (`reason` then says "unbounded") or not found
    asked, becomes   what the terms allow, and what they could allow instead
    """

    kind: str
    amount: Fraction | None
    proved: bool
    asked: Fraction | None = None
    becomes: Fraction | None = None
    reason: str = ""


def rooms(mix: Mix) -> Iterator[Room]:
    """The room in every direction that the terms have."""
    terms = mix.terms
    open_to = []
    if terms.balance != "none":
        open_to.append("money")
    if terms.ir != "none" and any(group.startswith("ir:") for group in mix.groups):
        open_to.append("shortfall")
    if terms.ic != "none" and any(group.startswith("ic:") for group in mix.groups):
        open_to.append("lies")
    for criterion in open_to:
        yield _pushed(mix, criterion, ALLOWANCE[criterion], criterion, 1)
    for kind, keys, part in (("limit", CAPS, terms.limits), ("side", FLOORS, terms.side)):
        for key in keys:
            served = terms.limits.only_when_served and key == "pays_at_most"
            if getattr(part, key) is not None and not served:
                yield _pushed(mix, f"{kind}:{key}", key, key, 1 if key == CAPS[0] else -1)


def _pushed(mix: Mix, kind: str, allowance: str, criterion: str, sign: int) -> Room:
    """The least of an allowance (sign 1), or the most of a floor (sign -1)."""
    free = {allowance: (None, None)}
    relaxed = Relaxed(mix.setting, mix.terms, free, mix.engine, mix.watch)
    answer = relaxed.minimise({criterion: Fraction(sign)})
    if answer.status != "optimal" or answer.at is None:
        return Room(kind, None, answer.proved, reason=answer.status)
    asked, becomes = relaxed.asked(criterion), answer.at[criterion]
    return Room(kind, sign * (asked - becomes), answer.proved, asked, becomes)
