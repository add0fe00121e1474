"""The register of roads, in the order they are tried; the plain road last."""

from __future__ import annotations

from dataclasses import dataclass

from designer.demands.terms import Terms
from designer.engines.report import Engine
from designer.engines.watch import Watch
from designer.errors import Mistake, UsageError
from designer.roads import full
from designer.roads.interim.road import Interim
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


ROADS: tuple[Road, ...] = (Interim(), TypeGraph(), Full())


@dataclass(frozen=True)
class Choice:
    """The road to take, and every road with None or the reason why it does not go there."""

    road: Road
    reasons: tuple[tuple[str, str | None], ...]


def choose(setting: Setting, terms: Terms, forced: str | None = None) -> Choice:
    """Pick a road by reading the setting and the terms; nothing is built yet.

    Small settings take the plain road, whose table a tidy stage can still improve.
    Raises UsageError if the forced road does not exist or does not apply, or if none does.
    """
    reasons = [(road.name, road.applies(setting, terms)) for road in ROADS]
    if forced is not None:
        return Choice(_forced(forced, dict(reasons)), tuple(reasons))
    small = full.tidies(setting, terms)
    for road, (name, reason) in zip(ROADS, reasons, strict=True):
        if reason is None and not (small and name != "full"):
            if small:
                note = "the setting is small: the plain road also tidies the table"
                reasons = [(n, r if r is not None or n == "full" else note) for n, r in reasons]
            return Choice(road, tuple(reasons))
    raise UsageError(
        [
            Mistake(
                "the design",
                f"{setting.profiles:,} profiles, and no road that goes there: "
                + "; ".join(f"{name}: {reason}" for name, reason in reasons),
                "a design that some road can decide",
                "Weaken a demand that is asked profile by profile, or take fewer types.",
            )
        ]
    )


def _forced(name: str, reasons: dict[str, str | None]) -> Road:
    if name not in reasons:
        raise UsageError(
            [Mistake("--path", repr(name), f"one of {', '.join(reasons)}", "Pick a road.")]
        )
    if reasons[name] is not None:
        raise UsageError(
            [
                Mistake(
                    "--path",
                    f"{name!r}, which does not apply because {reasons[name]}",
                    "a road that applies: "
                    + ", ".join(road for road, reason in reasons.items() if reason is None),
                    "Leave the option out, or see --why-path.",
                )
            ]
        )
    return next(road for road in ROADS if road.name == name)
