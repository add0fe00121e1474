"""From the word after --engine to an engine."""

from __future__ import annotations

from designer.engines.report import Engine
from designer.errors import Mistake, UsageError


def engine_named(name: str) -> Engine:
    """The engine called "highs", or "pulp:NAME" for any engine PuLP finds.

    Raises UsageError for any other word, and for a NAME that PuLP does not find.
    """
    if name == "highs":
        from designer.engines.highs import HIGHS

        return HIGHS
    if name.startswith("pulp:"):
        from designer.engines.pulp_bridge import bridge

        return bridge(name.removeprefix("pulp:"))
    raise UsageError(
        [
            Mistake(
                "--engine",
                repr(name),
                "highs, or pulp:NAME for an engine that PuLP finds",
                "Leave the option out to use HiGHS.",
            )
        ]
    )
