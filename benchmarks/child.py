"""One measurement in a process of its own: `python -m benchmarks.child WAY SCENARIO [once]`.

Writes the line "ready" once everything is imported and a tiny problem has been answered, then
one line of JSON: the runs and the peak memory of this process. The first answer, which still
imports what only larger problems need, does not count unless it is a long one; quick ones
are repeated. `once`: one answer and no more, for a smoke run, whose times mean little.
"""

from __future__ import annotations

import json
import os
import resource
import sys
import tempfile
from pathlib import Path
from typing import TextIO

from benchmarks.registry import problem
from benchmarks.ways import WAYS

LONG = 3.0
"""Seconds from which even a first answer counts: imports no longer matter in it."""

ENOUGH = 0.5
"""Seconds of answering after which nothing is repeated."""

MOST = 5
"""Answers at most."""


def peak_mib() -> float:
    """Peak resident memory of this process in MiB.

    Linux keeps the peak from before `exec` in `ru_maxrss`; the kernel's own high-water mark
    of this program does not have that flaw.
    """
    try:
        for line in Path("/proc/self/status").read_text(encoding="ascii").splitlines():
            if line.startswith("VmHWM:"):
                return int(line.split()[1]) / 1024
    except OSError:
        pass
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    return peak / (1024 * 1024 if sys.platform == "darwin" else 1024)


def warm(way: str) -> None:
    """Answer a tiny problem so that imports and first calls are behind us."""
    with tempfile.TemporaryDirectory() as folder:
        name = {"type-graph": "certain-3x4", "likeness": "alike-3x3"}.get(way, "money-3x4")
        WAYS[way](write(problem(name).files(), Path(folder)))


def write(files: dict[str, str], folder: Path) -> Path:
    """Write a scenario's files into a folder; the path of the scenario itself."""
    for name, text in files.items():
        (folder / name).write_text(text, encoding="utf-8")
    return folder / "scenario.toml"


def main() -> None:
    """Measure the way and the scenario named on the command line."""
    way, path = sys.argv[1], Path(sys.argv[2])
    # Engines greet on stdout; the report goes to the real one, everything else nowhere.
    with os.fdopen(os.dup(1), "w") as told, open(os.devnull, "wb") as nowhere:
        os.dup2(nowhere.fileno(), 1)
        _report(way, path, told, once=sys.argv[3:] == ["once"])


def _report(way: str, path: Path, told: TextIO, once: bool) -> None:
    if not once:
        warm(way)
    before = peak_mib()
    print("ready", file=told, flush=True)
    runs = [WAYS[way](path)]
    if not once and runs[0].seconds < LONG:
        runs = [WAYS[way](path)]
    while not once and sum(run.seconds for run in runs) < ENOUGH and len(runs) < MOST:
        runs.append(WAYS[way](path))
    report = {"runs": [run.plain() for run in runs], "before": before, "peak": peak_mib()}
    print(json.dumps(report), file=told, flush=True)


if __name__ == "__main__":
    main()
