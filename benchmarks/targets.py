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
        gain = one.ratio("full")
        road = one.series["ours"].runs[0].path if gain else "full"
        if gain is not None and road != "full":
            told = f"{gain[0]:.2f}× ({gain[1]:.2f}×)"
            # Two times as noisy as one; the least of each is the better judge of a loss.
            met = max(gain[:2]) >= 0.9
            found.append(Target(f"{name}: {road}, no slower than full", "≥ 1×", told, met))
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
