"""The checks of what stands behind a reduced program, by the road that reduced it."""

from __future__ import annotations

from typing import Any

from designer.engines.watch import Stopped, Watch
from designer.setting.setting import Setting

CLAIMS = {
    "interim": "no rule that is not listed does better",
    "likeness": "it is the scenario's, up to trading places between parties that are alike",
    "type-graph": "its rows, paths and payments are those of the scenario, case by case",
}
"""What a passed check adds to what the plain checker found, by road."""


def check(setting: Setting, document: dict[str, Any], watch: Watch | None = None) -> list[str]:
    """What keeps a reduced proof from being one about the full program; empty if nothing.

    The document must have passed the plain checker and have a `reduction`.
    """
    try:
        return _checked(setting, document, watch)
    except Stopped as stop:
        return [f"the check was not finished: {stop.reason}; {stop.remedy}"]


def _checked(setting: Setting, document: dict[str, Any], watch: Watch | None) -> list[str]:
    road = document["path"]
    if road == "interim":
        from designer.roads.interim import check as interim

        return interim.check(setting, document, watch)
    if road == "type-graph":
        from designer.roads.typegraph import check as typegraph

        return typegraph.check(setting, document, watch)
    if road == "likeness":
        from designer.roads.likeness import check as likeness

        return likeness.check(setting, document, watch)
    return [f"no road called {str(road)[:40]!r} reduces programs"]
