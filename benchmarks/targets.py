"""The figures the project holds itself to, read off one run."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from benchmarks.measure import Measured
from benchmarks.startup import Start
from benchmarks.ways import ROADS

ROWS = 10_000
"""Rows from which formulation and proof together must cost less than half of HiGHS."""

NONZEROS = 900_000
"""Nonzeros from which a program counts as one of about a million."""


FASTER = {
    "whole-3x25": {"highs": 300, "textbook": 1000},
    "second-200": {"simplex": 1000, "ipm": 1000},
    "item-4x12": {"simplex": 100, "ipm": 100},
    "general-4x12x4": {"simplex": 20, "ipm": 20},
    "mean-4x12": {"highs": 100},
}
"""Times as fast as each way we are to be."""

WITHIN = {
    "rule-9x10x3": 15,
    "rule-10x10x3": 90,
    "money-8x9": 1,
    "money-12x10": 5,
    "money-20x10": 1,
    "second-1000": 5,
    "free-6x60": 5,
    "item-50x20": 10,
    "general-6x10x4": 60,
}
"""Seconds in which we are to have answered and proved."""

GIB = 1024.0
"""MiB that such an answer may take."""


@dataclass(frozen=True)
class Target:
    """One figure: what was wanted, what was measured, whether it was met."""

    says: str
    wanted: str
    found: str
    met: bool


def targets(measured: Iterable[Measured], start: Iterable[Start]) -> list[Target]:
    """Every target that this run measured something for."""
    found = [
        Target(
            f"{one.says}, from the shell",
            "< 0.6 s (aim 0.35 s)",
            f"{one.median:.2f} s",
            one.median < 0.6,
        )
        for one in start
        if one.says.startswith("designer pose, ")
    ]
    for one in measured:
        name = one.problem.name
        if name.endswith("3x15"):
            ratio = one.ratio("textbook", over="full")
            if ratio is not None:
                told = f"{'> ' if ratio[2] else ''}{ratio[0]:.0f}×"
                found.append(
                    Target(
                        f"{name}: full program, faster than the textbook",
                        "≥ 15×",
                        told,
                        ratio[0] >= 15,
                    )
                )
        full, alone = one.series.get("full"), one.series.get("highs")
        if full and alone and full.runs and alone.median and full.runs[0].sizes["rows"] >= ROWS:
            share = full.part("formulate", "prove") / alone.median
            found.append(
                Target(
                    f"{name}: full program, formulate + prove over HiGHS alone",
                    "< 0.5",
                    f"{share:.2f}",
                    share < 0.5,
                )
            )
        found += _chosen(one)
        found += _faster(one) + _within(one)
        made = one.series.get("formulate")
        if made and made.median and made.peak and made.runs[0].sizes["nonzeros"] >= NONZEROS:
            told = f"{made.median:.2f} s, {made.peak:,.0f} MiB"
            met = made.median < 3 and made.peak < 1536
            found.append(Target(f"{name}: formulate", "< 3 s, < 1.5 GiB", told, met))
        checked = one.series.get("recheck")
        if checked and checked.median and checked.runs[0].sizes["nonzeros"] >= NONZEROS:
            told = f"{checked.median:.2f} s"
            found.append(Target(f"{name}: recheck", "< 2 s", told, checked.median < 2))
    return found


def _chosen(one: Measured) -> list[Target]:
    """Whether the road taken by itself is no slower than the best that was forced."""
    ours = one.series.get("ours")
    if ours is None or not ours.runs:
        return []
    taken = ours.runs[0].path
    gains = {way: one.ratio(way) for way in ROADS if way not in ("ours", taken)}
    found = [(gain, way) for way, gain in gains.items() if gain is not None and not gain[2]]
    if not found:
        return []
    gain, way = min(found)
    told = f"{gain[0]:.2f}× ({gain[1]:.2f}×)"
    # Two times as noisy as one; the least of each is the better judge of a loss.
    met = max(gain[:2]) >= 0.9
    return [Target(f"{one.problem.name}: {taken}, no slower than {way}", "≥ 1×", told, met)]


def _faster(one: Measured) -> list[Target]:
    """A stopped way gives a lower bound only: it can meet a target, and never proves a miss."""
    found = []
    for way, wanted in FASTER.get(one.problem.name, {}).items():
        ratio = one.ratio(way)
        if ratio is not None:
            told = f"{'> ' if ratio[2] else ''}{ratio[0]:.3g}×"
            says = f"{one.problem.name}: ours, faster than {way}"
            found.append(Target(says, f"≥ {wanted:,}×", told, ratio[0] >= wanted))
    return found


def _within(one: Measured) -> list[Target]:
    wanted, ours = WITHIN.get(one.problem.name), one.series.get("ours")
    if wanted is None or ours is None or (ours.median is None and ours.over is None):
        return []
    says = f"{one.problem.name}: ours, answered and proved"
    asked = f"≤ {wanted} s, ≤ 1 GiB"
    if ours.median is None or ours.peak is None:
        return [Target(says, asked, f"> {ours.over:.0f} s", False)]
    met = ours.median <= wanted and ours.peak <= GIB and all(run.proved for run in ours.runs)
    return [Target(says, asked, f"{ours.median:.2f} s, {ours.peak:,.0f} MiB", met)]
