"""What the shell waits for before anything is computed."""

from __future__ import annotations

import statistics
import sys
import tempfile
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

from benchmarks.child import write
from benchmarks.measure import timed
from benchmarks.registry import problem
from benchmarks.ways import command


@dataclass(frozen=True)
class Start:
    """Wall seconds (median, least) and peak MiB of one command."""

    says: str
    median: float
    least: float
    peak: float


def starts(rounds: int, tell: Callable[[str], None]) -> list[Start]:
    """Time the interpreter, our imports and a small `pose`, in turns."""
    with tempfile.TemporaryDirectory() as folder:
        path = str(write(problem("start-3x4").files(), Path(folder)))
        asked = {
            "python -c pass": [sys.executable, "-c", "pass"],
            "import numpy": [sys.executable, "-c", "import numpy"],
            "import numpy, highspy": [sys.executable, "-c", "import numpy, highspy"],
            "import designer.posing": [sys.executable, "-c", "import designer.posing"],
            "designer --help": command("--help"),
            "designer pose, 3 parties × 4 types": command("pose", path),
            "designer pose --json, the same": command("pose", path, "--json"),
        }
        seen: dict[str, list[tuple[float, int, float]]] = {says: [] for says in asked}
        for turn in range(rounds):
            for says, words in asked.items():
                tell(f"start-up: {says}, turn {turn + 1}")
                with tempfile.TemporaryFile() as out:
                    run = timed(words, 60.0, out)
                if run is not None and run[1] == 0:
                    seen[says].append(run)
    return [
        Start(
            says,
            statistics.median(run[0] for run in runs),
            min(run[0] for run in runs),
            max(run[2] for run in runs),
        )
        for says, runs in seen.items()
        if runs
    ]
