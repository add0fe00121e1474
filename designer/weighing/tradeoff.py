"""What `weigh` returns: the whole page of what must give, frozen."""

from __future__ import annotations

from dataclasses import dataclass, field

from designer.demands.terms import Terms
from designer.setting.setting import Setting
from designer.weighing.collisions import GroupSet
from designer.weighing.frontier import CornerList, Frontier
from designer.weighing.ladders import Ladder, Step
from designer.weighing.ledger import Ledger
from designer.weighing.prices import Price
from designer.weighing.room import Room

PARTS = ("prices", "ledger", "ladders", "collisions", "frontiers")
"""The parts of the page of an impossible mix, in the order in which they are worked out."""


@dataclass(frozen=True, eq=False)
class Tradeoff:
    """Everything `weigh` found.

    status      "possible" or "impossible" as posed; "undecided" if not even that was settled
    proved      whether the status is
    groups      the demand groups of the mix, in reading order
    sets        its minimal collisions and maximal possible sets
    room        for a possible mix: how far each direction can be pushed; `ladders` and `steps`
                then lead up instead of down
    complete    False when it was stopped on the way, or a part could not be settled
    reasons     what is missing, and why, by part
    seconds     wall time by part
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
    reasons: dict[str, str] = field(default_factory=dict)
    seconds: dict[str, float] = field(default_factory=dict)

    @property
    def collisions(self) -> tuple[GroupSet, ...]:
        """The minimal sets of groups that cannot hold together."""
        return tuple(found for found in self.sets if found.collides)

    @property
    def possible_sets(self) -> tuple[GroupSet, ...]:
        """The maximal sets of groups that can."""
        return tuple(found for found in self.sets if not found.collides)

    def price(self, relax: str) -> Price | None:
        """The first price of a way out, by its word."""
        return next((price for price in self.prices if price.relax == relax), None)
