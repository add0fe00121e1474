"""Run every way of a problem, in turns, each time in a fresh process."""

from __future__ import annotations

import json
import math
import os
import queue
import statistics
import subprocess
import sys
import tempfile
import threading
import time
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from benchmarks.child import ENOUGH, LONG, write
from benchmarks.registry import Problem
from benchmarks.ways import ROADS, Run, command

ROOT = Path(__file__).resolve().parents[1]
STARTING = 120.0
"""Seconds a measuring process may take until it is ready."""

PATIENCE = 20.0
"""Seconds of answering by one way after which it gets no further turn."""

EXITS = {0: "possible", 1: "impossible", 3: "undecided", 4: "unbounded"}


@dataclass
class Series:
    """Everything measured of one way on one problem."""

    way: str
    runs: list[Run] = field(default_factory=list)
    peaks: list[float] = field(default_factory=list)
    over: float | None = None
    failure: str = ""
    grown: list[float] = field(default_factory=list)

    @property
    def spent(self) -> float:
        """Seconds of answering so far."""
        return sum(run.seconds for run in self.runs)

    @property
    def median(self) -> float | None:
        """Median wall seconds; None without a run."""
        return statistics.median(run.seconds for run in self.runs) if self.runs else None

    @property
    def least(self) -> float | None:
        """Least wall seconds; None without a run."""
        return min((run.seconds for run in self.runs), default=None)

    @property
    def peak(self) -> float | None:
        """Largest peak memory in MiB; None without a run."""
        return max(self.peaks, default=None)

    def quantity(self, name: str) -> float | None:
        """What growth is fitted to: seconds, bytes or a size; None without a run.

        Bytes are peak memory less what the process held once warm.
        """
        if name == "seconds" or not self.runs:
            return self.median
        if name == "bytes":
            return max(self.grown) * 2**20 if self.grown else None
        return self.runs[0].sizes.get(name)

    def part(self, *names: str) -> float:
        """Median over the runs of the seconds spent in the parts named, added up."""
        if not self.runs:
            return 0.0
        return statistics.median(
            sum(run.parts.get(name, 0.0) for name in names) for run in self.runs
        )


@dataclass
class Measured:
    """One problem and all its series."""

    problem: Problem
    series: dict[str, Series]

    def ratio(self, way: str, over: str = "ours") -> tuple[float, float, bool] | None:
        """Times as long as `over` (median, least), and whether that is only a lower bound."""
        ours, theirs = self.series.get(over), self.series.get(way)
        if ours is None or theirs is None or not ours.median or not ours.least:
            return None
        if theirs.median is None or theirs.least is None:
            if theirs.over is None:
                return None
            return theirs.over / ours.median, theirs.over / ours.least, True
        return theirs.median / ours.median, theirs.least / ours.least, False

    @property
    def left_out(self) -> list[str]:
        """Ways that were never begun."""
        return [
            way
            for way, kept in self.series.items()
            if not kept.runs and kept.over is None and not kept.failure
        ]

    @property
    def faults(self) -> list[str]:
        """Answers that are not what they should be, in words."""
        found = []
        truth = self.series["ours"].runs[:1] if "ours" in self.series else []
        for way, series in self.series.items():
            if series.failure:
                found.append(f"{self.problem.name}, {way}: {series.failure}")
            for run in series.runs[:1]:
                expected = "formulated" if way == "formulate" else self.problem.expected
                if expected and run.status != expected:
                    found.append(f"{self.problem.name}, {way}: {run.status}, not {expected}")
                elif way in (*ROADS, "recheck") and not run.proved:
                    found.append(f"{self.problem.name}, {way}: not proved")
                elif truth and not _agree(truth[0].value, run.value):
                    found.append(
                        f"{self.problem.name}, {way}: {run.value}, ours is {truth[0].value}"
                    )
        return found


def _agree(exact: float | None, other: float | None) -> bool:
    if exact is None or other is None:
        return True
    return abs(exact - other) <= 1e-5 * max(1.0, abs(exact))


def measure(
    problem: Problem,
    *,
    rounds: int,
    budget: float,
    once: bool = False,
    tell: Callable[[str], None],
    until: float = math.inf,
) -> Measured:
    """Give every way of the problem `rounds` turns, one after the other, to be fair.

    A way that takes longer than `budget` seconds (or the problem's own) is stopped and gets no
    further turn. `once` neither warms up nor repeats: for smoke runs. A turn whose budget
    would end after `until` on the monotonic clock is left out.
    """
    budget = problem.budget or budget
    series = {way: Series(way) for way in problem.ways}
    with tempfile.TemporaryDirectory() as folder:
        path = write(problem.files(), Path(folder))
        for turn in range(rounds):
            for way, one in series.items():
                done = one.over is not None or one.failure or (turn and one.spent > PATIENCE)
                done = done or time.monotonic() + budget > until
                if done:
                    continue
                tell(f"{problem.name}: {way}, turn {turn + 1}")
                if way == "shell":
                    _from_shell(one, path, budget)
                else:
                    _in_child(one, path, budget, once)
    return Measured(problem, series)


def _from_shell(series: Series, path: Path, budget: float) -> None:
    """`designer pose FILE --json`, start-up included."""
    with tempfile.TemporaryFile() as said:
        run = timed(command("pose", str(path), "--json"), budget, said)
        if run is None:
            series.over = budget
            return
        seconds, code, peak = run
        said.seek(0)
        try:
            told = json.load(said)
            ok = told["verdict"] == EXITS[code]
        except (ValueError, KeyError):
            ok = False
    if not ok:
        series.failure = f"the command ended with {code} and no matching verdict"
        return
    series.peaks.append(peak)
    goal = told["goal"]
    first = goal[0] if isinstance(goal, list) and goal else goal
    value = first.get("approx") if isinstance(first, dict) else None
    number = float(value) if isinstance(value, int | float | str) else None
    series.runs.append(Run(seconds, told["verdict"], number, proved=bool(told["proved"])))


def timed(words: list[str], budget: float, out: Any) -> tuple[float, int, float] | None:
    """Wall seconds, exit code and peak MiB of a command; None if it outlived the budget."""
    began = time.perf_counter()
    with subprocess.Popen(words, stdout=out, stderr=subprocess.DEVNULL, cwd=ROOT) as child:
        timer = threading.Timer(budget, child.kill)
        timer.start()
        _, status, usage = os.wait4(child.pid, 0)
        seconds = time.perf_counter() - began
        timer.cancel()
        child.returncode = os.waitstatus_to_exitcode(status)
        code = child.returncode
    if code < 0 and seconds >= budget:
        return None
    return seconds, code, usage.ru_maxrss / (1024 * 1024 if sys.platform == "darwin" else 1024)


def _in_child(series: Series, path: Path, budget: float, once: bool) -> None:
    """One turn in a fresh process; its answers are added to the series."""
    words = [sys.executable, "-m", "benchmarks.child", series.way, str(path)]
    words += ["once"] if once else []
    with (
        tempfile.TemporaryFile("w+") as errors,
        subprocess.Popen(
            words, stdout=subprocess.PIPE, stderr=errors, text=True, cwd=ROOT
        ) as child,
    ):
        lines: queue.Queue[str] = queue.Queue()
        reader = threading.Thread(target=_feed, args=(child.stdout, lines), daemon=True)
        reader.start()
        try:
            ready = lines.get(timeout=STARTING).strip() == "ready"
            # The budget is for one answer; the first may be a dry run.
            answer = lines.get(timeout=budget + LONG + ENOUGH) if ready else ""
        except queue.Empty:
            child.kill()
            series.over = budget
            return
        child.wait()
        if not answer:
            errors.seek(0)
            last = errors.read().strip().splitlines()[-1:] or ["it ended without a word"]
            series.failure = last[0][:200]
            return
    report = json.loads(answer)
    series.runs += [Run(**run) for run in report["runs"]]
    series.peaks.append(report["peak"])
    series.grown.append(max(0.0, report["peak"] - report["before"]))


def _feed(stream: Any, lines: queue.Queue[str]) -> None:
    for line in stream:
        lines.put(line)
    lines.put("")
