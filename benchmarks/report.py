"""The results as Markdown, which also reads well in a terminal."""

from __future__ import annotations

import os
import platform
from collections.abc import Sequence
from datetime import UTC, datetime
from importlib.metadata import version

from benchmarks.growth import Family, rows
from benchmarks.measure import Measured, Series
from benchmarks.startup import Start
from benchmarks.targets import Target
from benchmarks.ways import ROADS

BASELINES = (
    *("full", "interim", "type-graph", "likeness", "textbook", "textbook-quick", "linprog"),
    *("highs", "simplex", "ipm"),
)
PARTS = ("read", "count", "formulate", "solve", "prove", "table", "check", "save")
VERSIONS = ("highspy", "numpy", "scipy", "pulp")

NOTES = """\
Every figure comes from one run. Each measurement has a process of its own and the ways of a
problem take turns. Times are medians in seconds, with the least in brackets; memory is the
peak of the whole process in MiB, imports included.

- **ours**: `read_scenario` and `pose`, from the file to the checked proof. Saving (tables, their
  audit, verdict, proof) is timed apart: the other ways save nothing.
- **full**: the same on the plain program; **ours** takes the first road that applies, named
  beside its answer.
- **interim**, **type-graph**, **likeness**: the same by the road of that name.
- **shell**: `designer pose FILE --json`, start-up included.
- **textbook**: PuLP and HiGHS with a loop per quantifier (`tests/oracles/textbook.py`), from the
  setting in memory to a float answer; **textbook-quick** adds terms up in dictionaries.
- **linprog**: scipy's `linprog` on sparse rows built with numpy (`benchmarks/naive.py`), likewise.
- **highs**: HiGHS alone on our arrays, already floats: it starts where our formulation ends.
  **simplex** and **ipm** name its method; interior point stops before the crossover to a vertex.
- **B/profile**: peak memory less what the process held once warm, over the number of profiles;
  from 1,000 profiles on, since below that it is noise. A road that never lists the profiles
  comes out near 0. Saving is in it, up to 200,000 profiles; from there nothing is saved.
- Times in the form `4.2×` say how often our time fits into theirs; `>` marks a way that was
  stopped, so that the true figure is larger.
"""


GROWTH = """\
Least-squares slope of the quantity's logarithm on that of T, the types a party has, of T^n,
the profiles, or of n, the parties where they are alike. Joint projects; bytes are beyond the
warm process. Fixed costs flatten the fit at small sizes, so the slope between the last two
sizes stands beside it.
"""


def seconds(value: float | None) -> str:
    """Three significant figures."""
    return "–" if value is None else f"{value:.3g}" if value >= 0.1 else f"{value:.2g}"


def table(head: Sequence[str], rows: Sequence[Sequence[str]]) -> str:
    """A Markdown table, padded so that its source is readable."""
    widths = [max(len(row[j]) for row in (head, *rows)) for j in range(len(head))]
    lines = [[cell.ljust(width) for cell, width in zip(head, widths, strict=True)]]
    lines.append(["-" * width for width in widths])
    lines += [[cell.ljust(w) for cell, w in zip(row, widths, strict=True)] for row in rows]
    return "\n".join(f"| {' | '.join(line)} |" for line in lines) + "\n"


def compared(measured: Sequence[Measured]) -> str:
    """Time, memory and ratio of every way, a row per problem and way."""
    rows = []
    for one in measured:
        if "ours" not in one.series:
            continue
        for way, series in one.series.items():
            ratio = one.ratio(way)
            told = ""
            if way in BASELINES and ratio is not None:
                sign = "> " if ratio[2] else ""
                told = f"{sign}{ratio[0]:.3g}× ({sign}{ratio[1]:.3g}×)"
            rows.append(
                [
                    one.problem.name,
                    way,
                    _time(series),
                    _peak(series),
                    _bytes(series, one),
                    told,
                    _answer(series),
                ]
            )
    head = ["problem", "way", "seconds", "MiB", "B/profile", "times ours", "answer"]
    return table(head, rows)


def growing(families: Sequence[tuple[Family, Sequence[Measured]]]) -> str:
    """Fitted exponents beside the theoretical ones, a row per family and quantity."""
    head = ["family", "quantity", "parties × types", "fitted", "last step", "theory", "why"]
    return table(head, [row for family, found in families for row in rows(family, found)])


def shares(measured: Sequence[Measured]) -> str:
    """Where our time goes, in percent, saving included."""
    rows = []
    for one in measured:
        for way in ROADS:
            series = one.series.get(way)
            if series is None or not series.runs:
                continue
            run = series.runs[0]
            if way == "ours" and run.path in one.series:
                continue  # one and the same
            total = series.part(*PARTS)
            rows.append(
                [
                    one.problem.name,
                    run.path,
                    f"{run.sizes['rows']:,}",
                    f"{run.sizes['nonzeros']:,}",
                    seconds(total),
                    *(f"{100 * series.part(part) / total:.0f} %" for part in PARTS),
                ]
            )
    return table(["problem", "road", "rows", "nonzeros", "seconds", *PARTS], rows)


def alone(measured: Sequence[Measured]) -> str:
    """Formulation and rechecking on their own."""
    rows = []
    for one in measured:
        for way in ("formulate", "recheck"):
            series = one.series.get(way)
            if series is None or not series.runs:
                continue
            run = series.runs[0]
            more = ", ".join(f"{name} {seconds(series.part(name))} s" for name in run.parts)
            rows.append(
                [
                    one.problem.name,
                    way,
                    f"{run.sizes['rows']:,}",
                    f"{run.sizes['nonzeros']:,}",
                    _time(series),
                    _peak(series),
                    more,
                ]
            )
    return table(["problem", "part", "rows", "nonzeros", "seconds", "MiB", "beside it"], rows)


def starting(found: Sequence[Start]) -> str:
    """Start-up times."""
    rows = [
        [one.says, f"{seconds(one.median)} ({seconds(one.least)})", f"{one.peak:.0f}"]
        for one in found
    ]
    return table(["command", "seconds", "MiB"], rows)


def aims(found: Sequence[Target]) -> str:
    """Targets, measured and met or not."""
    rows = [[one.says, one.wanted, one.found, "yes" if one.met else "NO"] for one in found]
    return table(["target", "wanted", "measured", "met"], rows)


def machine() -> str:
    """Date, versions and machine size, one line each."""
    memory = os.sysconf("SC_PAGE_SIZE") * os.sysconf("SC_PHYS_PAGES") / 2**30
    packages = ", ".join(f"{name} {version(name)}" for name in VERSIONS)
    return (
        f"- {datetime.now(UTC):%Y-%m-%d}, designer {version('designer')}\n"
        f"- Python {platform.python_version()}, {packages}\n"
        f"- {os.cpu_count()} cores ({platform.machine()}), {memory:.0f} GiB of memory\n"
    )


def document(
    measured: Sequence[Measured],
    start: Sequence[Start],
    found: Sequence[Target],
    faults: Sequence[str],
    families: Sequence[tuple[Family, Sequence[Measured]]] = (),
) -> str:
    """Everything, as one Markdown document."""
    parts = ["# Benchmarks\n", "Written by `python -m benchmarks --write`.\n", machine(), NOTES]
    for title, text, any_of in (
        ("Targets", aims(found), found),
        ("Start-up", starting(start), start),
        ("Beside other ways", compared(measured), measured),
        ("Growth", f"{GROWTH}\n{growing(families)}" if families else "", families),
        ("Where our time goes", shares(measured), measured),
        ("Formulating and rechecking alone", alone(measured), measured),
    ):
        if any_of:
            parts += [f"## {title}\n", text]
    parts.append("## Answers\n")
    if faults:
        parts.append("\n".join(f"- {fault}" for fault in faults) + "\n")
    else:
        parts.append("All ways gave the same answers; all of ours are proved.\n")
    every = [*measured, *(one for _, some in families for one in some)]
    left = [f"{one.problem.name}, {way}" for one in every for way in one.left_out]
    if left:
        parts.append(f"Left out for want of time (`--within`): {'; '.join(left)}.\n")
    says = "\n".join(f"- **{one.problem.name}**: {one.problem.says}" for one in measured)
    parts += ["## The problems\n", says + "\n"]
    return "\n".join(parts)


def _time(series: Series) -> str:
    if series.failure:
        return "failed"
    if series.median is None:
        return f"> {series.over:.0f}" if series.over else "not measured"
    return f"{seconds(series.median)} ({seconds(series.least)})"


def _peak(series: Series) -> str:
    return "–" if series.peak is None else f"{series.peak:,.0f}"


def _bytes(series: Series, one: Measured) -> str:
    """Bytes per profile; the number of profiles is the same in every way."""
    every = (kept.quantity("profiles") for kept in one.series.values())
    profiles = next((count for count in every if count), None)
    grown = series.quantity("bytes")
    if grown is None or profiles is None or profiles < 1000:
        return "–"
    return f"{grown / profiles:.3g}"


def _answer(series: Series) -> str:
    if not series.runs:
        return ""
    run = series.runs[0]
    value = run.exact or ("" if run.value is None else f"{run.value:.8g}")
    road = f" by {run.path}" if run.path else ""
    return f"{run.status} {value}".strip() + road
