"""The figures the project holds itself to, read off one run."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from benchmarks.measure import Measured
from benchmarks.startup import Start

ROWS = 10_000
"""Rows from which formulation and proof together must cost less than half of HiGHS."""

NONZEROS = 900_000
"""Nonzeros from which a program counts as one of about a million."""


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
            ratio = one.ratio("textbook")
            if ratio is not None:
                told = f"{'> ' if ratio[2] else ''}{ratio[0]:.0f}×"
                found.append(
                    Target(f"{name}: faster than the textbook", "≥ 15×", told, ratio[0] >= 15)
                )
        ours, alone = one.series.get("ours"), one.series.get("highs")
        if ours and alone and ours.runs and alone.median and ours.runs[0].sizes["rows"] >= ROWS:
            share = ours.part("formulate", "prove") / alone.median
            found.append(
                Target(
                    f"{name}: formulate + prove over HiGHS alone",
                    "< 0.5",
                    f"{share:.2f}",
                    share < 0.5,
                )
            )
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
