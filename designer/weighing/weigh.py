"""What must give: `weigh` asks every question about a mix and keeps what it finds."""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import replace
from fractions import Fraction
from pathlib import Path

from designer.demands.terms import Demands, Terms
from designer.engines.choose import engine_named
from designer.engines.watch import Progress, Stopped, Watch
from designer.setting.setting import Setting
from designer.weighing.collisions import explore
from designer.weighing.frontier import PAIRS, applies, corner_list, frontier
from designer.weighing.groups import groups_of
from designer.weighing.ladders import climb_down, climb_up, least_steps, most_steps
from designer.weighing.ledger import ledger
from designer.weighing.oracle import Oracle, Unsettled
from designer.weighing.prices import Price, ways_out
from designer.weighing.relaxed import Bounds, Relaxed
from designer.weighing.tradeoff import Room, Tradeoff

Found = Callable[[Tradeoff], None]


def weigh(
    setting: Setting | str | Path,
    demands: Demands | None = None,
    *,
    engine: str = "highs",
    time_limit: float | None = None,
    progress: Progress | None = None,
    found: Found | None = None,
) -> Tradeoff:
    """Which demands collide, what each way out costs, and what trades against what.

    As `pose`, with `found` called each time the page has grown. A time limit or Ctrl-C ends
    it with what was found so far, `complete` False.

    Raises ScenarioError and UsageError as `pose` does.
    """
    if not isinstance(setting, Setting):
        from designer.setting.scenario import read_scenario

        setting = read_scenario(setting)
    terms = (demands or Demands()).over(setting)
    watch = Watch(time_limit, progress)
    page = _Page(setting, terms, Oracle(setting, engine_named(engine), watch), found)
    try:
        page.fill()
    except (Stopped, KeyboardInterrupt) as stop:
        page.grow(complete=False, reason=getattr(stop, "reason", "interrupted"))
    except Unsettled as stop:
        page.grow(complete=False, reason=str(stop))
    return page.tradeoff


class _Page:
    """The page as it fills."""

    def __init__(self, setting: Setting, terms: Terms, oracle: Oracle, found: Found | None) -> None:
        self.oracle, self.terms, self.found = oracle, terms, found
        self.tradeoff = Tradeoff(
            setting, terms, "undecided", False, groups=groups_of(setting, terms)
        )

    def grow(self, **more: object) -> None:
        self.tradeoff = replace(self.tradeoff, **more)  # type: ignore[arg-type]
        if self.found is not None:
            self.found(self.tradeoff)

    def fill(self) -> None:
        """The verdict first, then prices as they are found, then the dearer questions."""
        finding = self.oracle.ask(_bare(self.terms))
        self.grow(status="possible" if finding.possible else "impossible", proved=finding.proved)
        if finding.possible:
            self._timed("room", self._room)
            self._timed("ladders", self._up)
            return
        self._timed("prices", self._prices)
        self._timed("ledger", self._ledger)
        self._timed("ladders", self._down)
        self._timed("collisions", self._collisions)
        self._timed("frontiers", self._frontiers)

    def _timed(self, name: str, work: Callable[[], None]) -> None:
        since = time.perf_counter()
        try:
            work()
        finally:
            self.tradeoff.seconds[name] = time.perf_counter() - since

    def _prices(self) -> None:
        prices: list[Price] = []
        for price in ways_out(self.oracle, _bare(self.terms)):
            prices.append(price)
            self.grow(prices=tuple(prices))

    def _ledger(self) -> None:
        self.grow(ledger=ledger(self.oracle, _bare(self.terms), self.tradeoff.prices))

    def _down(self) -> None:
        self.grow(ladders=climb_down(self.oracle, _bare(self.terms)))
        self.grow(steps=least_steps(self.oracle, _bare(self.terms)))

    def _up(self) -> None:
        self.grow(ladders=climb_up(self.oracle, _bare(self.terms)))
        self.grow(steps=most_steps(self.oracle, _bare(self.terms)))

    def _collisions(self) -> None:
        sets = []
        for one in explore(self.oracle, _bare(self.terms), self.tradeoff.groups):
            sets.append(one)
            self.grow(sets=tuple(sets))

    def _frontiers(self) -> None:
        terms, frontiers = _bare(self.terms), []
        for x, y in PAIRS:
            if applies(terms, (x, y)):
                frontiers.append(frontier(self.oracle, terms, x, y))
                self.grow(frontiers=tuple(frontiers))
        if applies(terms, ("money", "shortfall", "welfare")):
            self.grow(corners=corner_list(self.oracle, terms))

    def _room(self) -> None:
        terms = _bare(self.terms)
        room = []
        for kind, allowance, criterion, asked in (
            ("hand-back", "subsidy", "money", terms.balance),
            ("floor", "shortfall", "shortfall", terms.ir),
            ("margin", "slack", "lies", terms.ic),
        ):
            if asked == "none":
                continue
            free: dict[str, Bounds] = {allowance: (None, None)}
            relaxed = Relaxed(
                self.oracle.setting, terms, free, self.oracle.engine, self.oracle.watch
            )
            answer = relaxed.minimise({criterion: Fraction(1)})
            amount = -answer.at[criterion] if answer.status == "optimal" and answer.at else None
            room.append(
                Room(kind, amount, answer.proved, "" if amount is not None else answer.status)
            )
            self.grow(room=tuple(room))


def _bare(terms: Terms) -> Terms:
    """The demands without goals: what is weighed is whether they can be met."""
    return replace(terms, goals=("any",), tidy="none", blend=())
