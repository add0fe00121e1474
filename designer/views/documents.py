"""JSON documents for programs: a verdict, a rechecked proof, an error. Exact numbers are text."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from fractions import Fraction
from typing import TYPE_CHECKING, Any

from designer.errors import Mistake
from designer.setting import exact
from designer.views.caution import CAUTION

if TYPE_CHECKING:
    from designer.proof.recheck import Finding
    from designer.verdict import Verdict

VERDICT = "designer.verdict/1"
RECHECK = "designer.recheck/1"
ERROR = "designer.error/1"


def verdict_document(verdict: Verdict, files: Mapping[str, str] | None = None) -> dict[str, Any]:
    """A verdict as JSON-ready values.

    `goal` is the first goal, `goals` all of them and the tidy stage; a value is an integer or
    "p/q" as text, null where there is none, and `approx` the nearest float, null beyond the
    range of floats. `files` maps what was saved to where it is.
    """
    from designer.demands.plain import as_plain

    goals = [
        {
            **_valued(goal.goal, goal.value),
            "proved": goal.proved,
            "tidy": goal.tidy,
            **({"bound": goal.bound} if goal.bound is not None else {}),
            **({"reason": goal.reason} if goal.reason else {}),
        }
        for goal in verdict.goals
    ]
    first = verdict.goals[0] if verdict.goals else None
    name = first.goal if first else verdict.terms.goals[0]
    return {
        "format": VERDICT,
        "scenario": {"title": verdict.setting.title, "digest": verdict.setting.digest},
        "demands": as_plain(verdict.terms),
        "verdict": verdict.status,
        "proved": verdict.proved,
        "goal": _valued(name, first.value if first else None),
        "goals": goals,
        "money": verdict.setting.money,
        "path": verdict.path,
        "engine": verdict.engine,
        "reason": verdict.reason,
        "claims": list(verdict.claims),
        "seconds": {part: round(seconds, 6) for part, seconds in verdict.seconds.items()},
        "files": dict(files or {}),
        "caution": CAUTION,
    }


def _valued(name: str, value: Fraction | None) -> dict[str, Any]:
    return {
        "name": name,
        "value": None if value is None else exact.text(value),
        "approx": None if value is None else nearest(value),
    }


def nearest(value: Fraction) -> float | None:
    """The nearest float; None beyond their range (JSON has no infinity)."""
    try:
        found = float(value)
    except OverflowError:
        return None
    return found if math.isfinite(found) else None


def recheck_document(
    title: str, digest: str, finding: Finding, compared: bool, differences: Sequence[str] = ()
) -> dict[str, Any]:
    """A rechecked proof; `holds` is false if it is not the scenario's, where one was given."""
    return {
        "format": RECHECK,
        "scenario": {"title": title, "digest": digest},
        "holds": finding.holds and not differences,
        "verdict": finding.verdict,
        "claims": list(finding.claims),
        "faults": list(finding.faults),
        "open": list(finding.open),
        "reduced": finding.reduced,
        "compared": compared,
        "differences": list(differences),
    }


def error_document(
    kind: str, code: int, message: str, mistakes: Sequence[Mistake] = ()
) -> dict[str, Any]:
    """What went wrong; kind is "input", "usage", "interrupted", "memory" or "bug"."""
    return {
        "format": ERROR,
        "kind": kind,
        "exit_code": code,
        "message": message,
        "mistakes": [vars(mistake) for mistake in mistakes],
    }
