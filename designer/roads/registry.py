"""The register of roads, in the order they are tried; the plain road last."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from importlib import import_module

from designer.demands.terms import Terms
from designer.engines.report import Engine
from designer.engines.watch import Watch
from designer.errors import Mistake, UsageError
from designer.roads import full
from designer.roads.road import Road
from designer.roads.settled import Settled
from designer.roads.typegraph.road import TypeGraph
from designer.setting.setting import Setting


class Full:
    """The plain program over every profile: the reference."""

    name = "full"

    def applies(self, setting: Setting, terms: Terms) -> str | None:
        """None, or why the program would not fit this machine."""
        cells = setting.profiles * (len(setting.parties) + len(setting.options))
        if cells > full.CELLS_UP_TO:
            return f"the plain program would have {cells:,} columns"
        return None

    def travel(self, setting: Setting, terms: Terms, engine: Engine, watch: Watch) -> Settled:
        """As `roads.full.travel`."""
        return full.travel(setting, terms, engine, watch)


class Later:
    """A road that is loaded when it is first asked: most small questions never do."""

    def __init__(self, name: str, module: str, road: str) -> None:
        """Keep where it is."""
        self.name, self.module, self.road = name, module, road

    @cached_property
    def found(self) -> Road:
        """The road itself."""
        road: Road = getattr(import_module(self.module), self.road)()
        return road

    def applies(self, setting: Setting, terms: Terms) -> str | None:
        """As the road says."""
        return self.found.applies(setting, terms)

    def travel(self, setting: Setting, terms: Terms, engine: Engine, watch: Watch) -> Settled:
        """As the road does."""
        return self.found.travel(setting, terms, engine, watch)


ROADS: tuple[Road, ...] = (
    Later("interim", "designer.roads.interim.road", "Interim"),
    TypeGraph(),
    Later("likeness", "designer.roads.likeness.road", "ByLikeness"),
    Full(),
)
PLAIN = ROADS[-1]


@dataclass(frozen=True, eq=False)
class Choice:
    """The road to take; `small` where that is the plain one because the setting is small."""

    road: Road
    setting: Setting
    terms: Terms
    small: bool = False

    @cached_property
    def reasons(self) -> tuple[tuple[str, str | None], ...]:
        """Every road with None, or the reason why it is not taken."""
        found = _reasons(self.setting, self.terms)
        if not self.small:
            return found
        note = "the setting is small: the plain road is as fast, and can tidy the table"
        return tuple(
            (name, note if reason is None and name != PLAIN.name else reason)
            for name, reason in found
        )


def _payments(setting: Setting) -> int:
    return setting.profiles * len(setting.parties)


def _reasons(setting: Setting, terms: Terms) -> tuple[tuple[str, str | None], ...]:
    return tuple((road.name, road.applies(setting, terms)) for road in ROADS)


def choose(setting: Setting, terms: Terms, forced: str | None = None) -> Choice:
    """Pick a road by reading the setting and the terms; nothing is built yet.

    Small settings take the plain road, whose table a tidy stage can still improve.
    Raises UsageError if the forced road does not exist or does not apply, or if none does.
    """
    if forced is not None:
        named = next((road for road in ROADS if road.name == forced), None)
        if named is not None and named.applies(setting, terms) is None:
            return Choice(named, setting, terms)
        raise _cannot(forced, dict(_reasons(setting, terms)))
    small = full.tidies(setting, terms) or _payments(setting) <= full.SMALL_UP_TO
    if small and PLAIN.applies(setting, terms) is None:
        return Choice(PLAIN, setting, terms, small=True)
    for road in ROADS:
        if road.applies(setting, terms) is None:
            small = road.name == "interim" and _searched_longer(setting, terms)
            return Choice(PLAIN if small else road, setting, terms, small)
    raise UsageError(
        [
            Mistake(
                "the design",
                f"{setting.profiles:,} profiles, and no road that goes there: "
                + "; ".join(f"{name}: {reason}" for name, reason in _reasons(setting, terms)),
                "a design that some road can decide",
                "Weaken a demand that is asked profile by profile, or take fewer types.",
            )
        ]
    )


def _searched_longer(setting: Setting, terms: Terms) -> bool:
    """Whether the interim road would search for rules for longer than the plain road takes."""
    from designer.roads.interim.multiplier import direct

    return _payments(setting) <= full.SEARCHED_UP_TO and not direct(setting, terms)


def _cannot(name: str, reasons: dict[str, str | None]) -> UsageError:
    """Why a road cannot be forced."""
    if name not in reasons:
        found, expected, remedy = repr(name), f"one of {', '.join(reasons)}", "Pick a road."
    else:
        found = f"{name!r}, which does not apply because {reasons[name]}"
        able = ", ".join(road for road, reason in reasons.items() if reason is None)
        expected, remedy = (
            f"a road that applies: {able}",
            "Leave the option out, or see --why-path.",
        )
    return UsageError([Mistake("--path", found, expected, remedy)])
