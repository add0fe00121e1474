"""What `weigh` returns: the whole page of what must give, frozen."""

from __future__ import annotations

from dataclasses import dataclass, field
from fractions import Fraction
from typing import Any

from designer.demands.plain import as_plain
from designer.demands.terms import Terms
from designer.setting.exact import decimal, text
from designer.setting.setting import Setting
from designer.weighing.collisions import GroupSet
from designer.weighing.frontier import CornerList, Frontier
from designer.weighing.ladders import Ladder, Step
from designer.weighing.ledger import Ledger
from designer.weighing.prices import Price


@dataclass(frozen=True)
class Room:
    """How far one direction can be pushed while the mix stays possible (None: for ever).

    kind  "hand-back" money that could be handed back, "floor" by how much every type could
          be lifted above staying out, "margin" what every lie could be made to cost
    """

    kind: str
    amount: Fraction | None
    proved: bool
    reason: str = ""


@dataclass(frozen=True, eq=False)
class Tradeoff:
    """Everything `weigh` found; `complete` is False when it was stopped on the way.

    status  "possible" or "impossible" as posed; "undecided" if not even that was settled
    """

    setting: Setting
    terms: Terms
    status: str
    proved: bool
    groups: tuple[str, ...] = ()
    sets: tuple[GroupSet, ...] = ()
    ladders: tuple[Ladder, ...] = ()
    steps: tuple[Step, ...] = ()
    prices: tuple[Price, ...] = ()
    frontiers: tuple[Frontier, ...] = ()
    corners: CornerList | None = None
    ledger: Ledger | None = None
    room: tuple[Room, ...] = ()
    complete: bool = True
    reason: str = ""
    seconds: dict[str, float] = field(default_factory=dict)

    @property
    def collisions(self) -> tuple[GroupSet, ...]:
        """The minimal sets of groups that cannot hold together."""
        return tuple(found for found in self.sets if found.collides)

    @property
    def possible_sets(self) -> tuple[GroupSet, ...]:
        """The maximal sets of groups that can."""
        return tuple(found for found in self.sets if not found.collides)


def _amount(value: Fraction | None) -> dict[str, Any]:
    if value is None:
        return {"amount": None, "approx": None}
    return {"amount": text(value), "approx": decimal(value)}


def as_json(found: Tradeoff) -> dict[str, Any]:
    """The document `weigh --json` prints, format designer.tradeoff/1."""
    unit = found.setting.money
    document: dict[str, Any] = {
        "format": "designer.tradeoff/1",
        "scenario": {"title": found.setting.title, "digest": found.setting.digest},
        "demands": as_plain(found.terms),
        "verdict": found.status,
        "proved": found.proved,
        "complete": found.complete,
        "reason": found.reason,
        "groups": list(found.groups),
        "collisions": [
            {"groups": list(one.groups), "proved": one.proved} for one in found.collisions
        ],
        "possible_sets": [
            {"groups": list(one.groups), "proved": one.proved} for one in found.possible_sets
        ],
        "ladders": [
            {
                "demand": one.demand,
                "asked": one.asked,
                "settles_at": one.cured_by,
                "tried": [{"form": form, "possible": held} for form, held in one.tried],
                "proved": one.proved,
            }
            for one in found.ladders
        ],
        "steps": [{"forms": dict(one.forms), "proved": one.proved} for one in found.steps],
        "ways_out": [_price(one, unit) for one in found.prices],
        "frontiers": [
            {
                "x": one.x,
                "y": one.y,
                "corners": [[text(part) for part in corner] for corner in one.corners],
                "unit": unit,
                "proved": one.proved,
                "complete": one.complete,
                "reason": one.reason,
            }
            for one in found.frontiers
        ],
        "room": [
            {"kind": one.kind, **_amount(one.amount), "proved": one.proved} for one in found.room
        ],
        "seconds": found.seconds,
    }
    if found.corners is not None:
        document["corners"] = {
            "criteria": list(found.corners.criteria),
            "corners": [[text(part) for part in corner] for corner in found.corners.corners],
            "proved": found.corners.proved,
            "complete": found.corners.complete,
        }
    if found.ledger is not None:
        document["ledger"] = {
            "entries": [
                {
                    "kind": entry.kind,
                    "party": entry.party,
                    "type": entry.type,
                    "probability": text(entry.chance),
                    "each": text(entry.each),
                    "amount": text(entry.amount),
                }
                for entry in found.ledger.entries
            ],
            "allowed": text(found.ledger.allowed),
            "gap": text(found.ledger.gap),
            "unit": unit,
            "proved": found.ledger.proved,
            "reason": found.ledger.reason,
        }
    return document


def _price(price: Price, unit: str) -> dict[str, Any]:
    parties = price.relax == "compel"
    return {
        "relax": price.relax,
        **_amount(price.amount),
        "unit": "parties" if parties else unit,
        "parties": list(price.parties),
        "buys": {name: text(worth) for name, worth in price.buys},
        "changes": [
            {"at": list(at), "decides": {option: text(chance) for option, chance in lottery}}
            for at, lottery in price.changes
        ],
        "proved": price.proved,
        "reason": price.reason,
    }
