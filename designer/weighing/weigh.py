"""What must give: `weigh` asks every question about a mix and keeps what it finds."""

from __future__ import annotations

import time
from collections.abc import Callable, Collection, Sequence
from dataclasses import replace
from pathlib import Path

from designer.demands.terms import Demands, Terms
from designer.engines.choose import engine_named
from designer.engines.watch import Progress, Stopped, Watch
from designer.errors import Mistake, UsageError
from designer.setting.setting import Setting
from designer.weighing.collisions import GroupSet, explore
from designer.weighing.frontier import (
    PAIRS,
    TRIPLE,
    Corner,
    CornerList,
    Frontier,
    corner_list,
    payable,
    trace,
)
from designer.weighing.ladders import Ladder, climb_down, climb_up, least_steps, most_steps
from designer.weighing.ledger import ledger
from designer.weighing.mix import Mix, Unsettled
from designer.weighing.oracle import Oracle, plain
from designer.weighing.prices import Price, Prices
from designer.weighing.room import Room, rooms
from designer.weighing.surface import Surface
from designer.weighing.tradeoff import PARTS, Tradeoff

Found = Callable[[Tradeoff], None]


def weigh(
    setting: Setting | str | Path,
    demands: Demands | None = None,
    *,
    only: Collection[str] = (),
    engine: str = "highs",
    time_limit: float | None = None,
    progress: Progress | None = None,
    found: Found | None = None,
) -> Tradeoff:
    """Which demands collide, what each way out costs, and what trades against what.

    setting, demands, engine, progress   as for `pose`; goals play no part
    only        parts to work out, of "prices", "ledger", "ladders", "collisions",
                "frontiers"; none named: all
    time_limit  seconds; then, and after Ctrl-C, the page keeps what was found so far and
                `complete` is False
    found       called with the page each time something was added to it

    Raises ScenarioError and UsageError as `pose` does.

    >>> from designer import weigh
    >>> page = weigh("scenarios/lock-sale.toml", only=["prices"])
    >>> page.status, page.price("outside-money").amount
    ('impossible', Fraction(5, 2))
    """
    if not isinstance(setting, Setting):
        from designer.setting.scenario import read_scenario

        setting = read_scenario(setting)
    expected = f"one of {', '.join(PARTS)}"
    unknown = [Mistake("only", repr(p), expected, "Pick one.") for p in only if p not in PARTS]
    if unknown:
        raise UsageError(unknown)
    terms = plain((demands or Demands()).over(setting), setting)
    watch = Watch(time_limit, progress)
    page = _Page(Mix(setting, terms, engine_named(engine), watch), only or PARTS, found)
    page.fill()
    return page.tradeoff


class _Page:
    """The page as it fills."""

    def __init__(self, mix: Mix, parts: Collection[str], found: Found | None) -> None:
        self.mix, self.terms, self.parts, self.found = mix, mix.terms, parts, found
        self.oracle = Oracle(mix.setting, mix.engine, mix.watch)
        self.tradeoff = Tradeoff(mix.setting, mix.terms, "undecided", False, groups=mix.groups)

    def grow(self, **more: object) -> None:
        """Add to the page and tell who listens."""
        self.tradeoff = replace(self.tradeoff, **more)  # type: ignore[arg-type]
        if self.found is not None:
            self.found(self.tradeoff)

    def fill(self) -> None:
        """The verdict first, then prices as they are found, then the dearer questions."""
        try:
            self._part("verdict", self._verdict)
            if self.tradeoff.status == "possible":
                todo: dict[str, Callable[[], None]] = {
                    "prices": self._room,
                    "ladders": self._up,
                }
            elif self.tradeoff.status == "impossible":
                todo = {
                    "prices": self._prices,
                    "ledger": self._ledger,
                    "ladders": self._down,
                    "collisions": self._collisions,
                    "frontiers": self._frontiers,
                }
            else:
                return
            for name, work in todo.items():
                if name in self.parts:
                    self._part(name, work)
        except (Stopped, KeyboardInterrupt) as stop:
            reason = stop.reason if isinstance(stop, Stopped) else "interrupted"
            self.tradeoff.reasons["page"] = reason
            self.grow(complete=False)

    def _part(self, name: str, work: Callable[[], None]) -> None:
        """One part; what cannot be settled leaves the others standing."""
        since = time.perf_counter()
        try:
            work()
        except Unsettled as stop:
            self.tradeoff.reasons[name] = str(stop)
            self.grow(complete=False)
        finally:
            self.tradeoff.seconds[name] = time.perf_counter() - since

    def _verdict(self) -> None:
        everything = frozenset(self.mix.groups)
        known = self.mix.ask(everything)
        possible = known in self.mix.possible
        self.oracle.learn(self.terms, possible, known.proved)
        self.grow(status="possible" if possible else "impossible", proved=known.proved)
        if possible:
            self.grow(sets=(GroupSet(False, self.mix.groups, known.proved),))

    def _prices(self) -> None:
        found: list[Price] = []
        for price in Prices(self.mix):
            found.append(price)
            self.grow(prices=tuple(found))

    def _ledger(self) -> None:
        self.grow(ledger=ledger(self.mix, self.tradeoff.price("outside-money")))

    def _down(self) -> None:
        found: list[Ladder] = []
        for one in climb_down(self.oracle, self.terms):
            found.append(one)
            self.grow(ladders=tuple(found))
        self.grow(steps=least_steps(self.oracle, self.terms))

    def _up(self) -> None:
        found: list[Ladder] = []
        for one in climb_up(self.oracle, self.terms):
            found.append(one)
            self.grow(ladders=tuple(found))
        self.grow(steps=most_steps(self.oracle, self.terms))

    def _collisions(self) -> None:
        found: list[GroupSet] = []
        for one in explore(self.mix):
            found.append(one)
            self.grow(sets=tuple(found))

    def _frontiers(self) -> None:
        surfaces: dict[bool, Surface] = {}
        done: list[Frontier] = []
        for x, y in PAIRS:
            if not (payable(self.terms, x) and payable(self.terms, y)):
                continue
            surface = self._surface(surfaces, (x, y))
            for known in trace(surface, x, y):
                self.grow(frontiers=(*done, known))
            done.append(self.tradeoff.frontiers[-1])
            self._unless_whole(f"frontier {x}-{y}", done[-1])
        if all(payable(self.terms, criterion) for criterion in TRIPLE):
            start = _embedded(done, self.terms)
            for triple in corner_list(self._surface(surfaces, TRIPLE), start):
                self.grow(corners=triple)
            if self.tradeoff.corners is not None:
                self._unless_whole("corners", self.tradeoff.corners)

    def _unless_whole(self, name: str, found: Frontier | CornerList) -> None:
        """Say so where corners are missing."""
        if not found.complete:
            self.tradeoff.reasons[name] = found.reason
            self.grow(complete=False)

    def _surface(self, surfaces: dict[bool, Surface], criteria: Sequence[str]) -> Surface:
        """The program with these criteria: its decision free where welfare is among them."""
        free = "welfare" in criteria and "decision" in self.mix.groups
        if free not in surfaces:
            surface = surfaces[free] = Surface(self.mix.program(decided=not free))
            for known in (*PAIRS, TRIPLE):
                if set(known) <= {*surface.relaxed.columns, "welfare"}:
                    surface.watch(known)
        return surfaces[free]

    def _room(self) -> None:
        found: list[Room] = []
        for one in rooms(self.mix):
            found.append(one)
            self.grow(room=tuple(found))


def _embedded(frontiers: Sequence[Frontier], terms: Terms) -> list[Corner]:
    """The corners of the frontiers of two of the three criteria, the third as asked."""
    asked = {"money": terms.subsidy, "shortfall": terms.shortfall}
    found = []
    for one in frontiers:
        if "welfare" in (one.x, one.y) and {one.x, one.y} < set(TRIPLE):
            for corner in one.corners:
                at = {**asked, **dict(zip((one.x, one.y), corner, strict=True))}
                found.append(tuple(at[name] for name in TRIPLE))
    return found
