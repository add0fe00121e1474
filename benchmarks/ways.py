"""The ways of answering one problem, each timed from the same files.

A way takes the path of a scenario and returns a `Run`. Imports are not timed: a measuring
process answers a tiny problem first. What is timed is said beside each way.

Baselines start from the setting in memory, and stop at a float answer. Ours starts from the
file and stops at a checked proof; saving is timed apart, since the others save nothing.
"""

from __future__ import annotations

import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from dataclasses import asdict, dataclass, field
from functools import cache
from pathlib import Path
from typing import Any

SAVED = 200_000
"""Profiles up to which saving is timed too."""

ROADS = ("ours", "full", "interim", "type-graph", "likeness")
"""The ways that are ours: the road that is taken by itself, and each by name."""


@dataclass(frozen=True)
class Run:
    """One answer: wall seconds, status, value of the first goal, road, seconds by part, sizes."""

    seconds: float
    status: str
    value: float | None = None
    exact: str = ""
    proved: bool = False
    path: str = ""
    parts: dict[str, float] = field(default_factory=dict)
    sizes: dict[str, int] = field(default_factory=dict)

    def plain(self) -> dict[str, Any]:
        """The run as JSON values."""
        return asdict(self)


def ours(path: Path, road: str | None = None) -> Run:
    """The library call: read the file, pose, prove, check. Saving is a part of its own."""
    from designer import pose, read_scenario

    began = time.perf_counter()
    setting = read_scenario(path)
    reading = time.perf_counter() - began
    verdict = pose(setting, path=road)
    seconds = time.perf_counter() - began
    parts = {"read": reading, **verdict.seconds}
    # Saving writes a line per profile: where there are too many, no table is kept.
    if setting.profiles <= SAVED:
        began = time.perf_counter()
        _save(verdict)
        parts["save"] = time.perf_counter() - began
    matrix = verdict.program.matrix
    value = verdict.goal_value
    named = verdict.goals[0].goal != "any"
    return Run(
        seconds,
        verdict.status,
        float(value) if value is not None and named else None,
        "" if value is None or not named else _short(str(value)),
        verdict.proved,
        verdict.path,
        parts,
        {
            "rows": matrix.rows,
            "columns": matrix.columns,
            "nonzeros": matrix.nonzeros,
            "profiles": setting.profiles,
        },
    )


def full(path: Path) -> Run:
    """The same, on the plain program that reduces nothing."""
    return ours(path, "full")


def interim(path: Path) -> Run:
    """The same, by the interim road."""
    return ours(path, "interim")


def type_graph(path: Path) -> Run:
    """The same, by the type-graph road."""
    return ours(path, "type-graph")


def likeness(path: Path) -> Run:
    """The same, by the likeness road."""
    return ours(path, "likeness")


def textbook(path: Path, quick: bool = False) -> Run:
    """PuLP and HiGHS as a textbook writes it: build and solve, from the setting in memory."""
    from designer import Demands, read_scenario
    from tests.oracles.textbook import build_and_solve

    setting = read_scenario(path)
    began = time.perf_counter()
    status, value, parts = build_and_solve(setting, Demands(), quick)
    return Run(time.perf_counter() - began, status, value, parts=parts)


def textbook_quick(path: Path) -> Run:
    """The same with terms added up by a dictionary instead of `lpSum`."""
    return textbook(path, quick=True)


def linprog(path: Path) -> Run:
    """Call scipy's linprog on sparse rows built with numpy: build and solve."""
    from benchmarks.naive import Naive
    from designer import Demands, read_scenario

    setting = read_scenario(path)
    began = time.perf_counter()
    rows = Naive(setting, Demands().over(setting))
    built = time.perf_counter()
    status, value = rows.solve()
    ended = time.perf_counter()
    parts = {"formulate": built - began, "solve": ended - built}
    return Run(ended - began, status, value, parts=parts)


def highs(path: Path, solver: str = "choose") -> Run:
    """HiGHS alone on our arrays, already floats: pass the model and run, nothing else."""
    from designer import Demands, read_scenario
    from designer.demands.formulate import formulate
    from designer.engines.floats import floats
    from designer.engines.model import load, quiet_highs

    setting = read_scenario(path)
    terms = Demands().over(setting)
    program = formulate(setting, terms)
    lp = program.stage(0)
    arrays = floats(lp)
    began = time.perf_counter()
    model = quiet_highs()
    if not load(model, arrays):
        raise RuntimeError("HiGHS refused the model")
    model.setOptionValue("solver", solver)
    if solver == "ipm":
        model.setOptionValue("run_crossover", "off")
    model.run()
    seconds = time.perf_counter() - began
    words = {7: "possible", 8: "impossible", 9: "undecided", 10: "unbounded"}
    status = words.get(int(model.getModelStatus()), "undecided")
    value = None
    if status == "possible" and terms.goals[0] != "any":
        reached = model.getInfo().objective_function_value / 2.0**arrays.cost_exp
        if lp.sense == "max":
            reached = -reached
        value = float(reached / lp.cost_den + float(lp.cost_const))
    return Run(seconds, status, value)


def simplex(path: Path) -> Run:
    """The same by the simplex method."""
    return highs(path, "simplex")


def ipm(path: Path) -> Run:
    """The same by interior point, without crossover to a vertex."""
    return highs(path, "ipm")


def formulate_only(path: Path) -> Run:
    """From the setting in memory to the exact labelled program."""
    from designer import Demands, read_scenario
    from designer.demands.formulate import formulate

    setting = read_scenario(path)
    terms = Demands().over(setting)
    began = time.perf_counter()
    matrix = formulate(setting, terms).matrix
    seconds = time.perf_counter() - began
    sizes = {"rows": matrix.rows, "columns": matrix.columns, "nonzeros": matrix.nonzeros}
    return Run(seconds, "formulated", sizes=sizes)


def recheck_only(path: Path) -> Run:
    """The checker alone on a saved proof; loading it and `designer recheck` are parts."""
    from designer import recheck
    from designer.proof.document import load_document

    status, sizes, raw = _proof(path)
    with tempfile.TemporaryDirectory() as folder:
        place = Path(folder, "proof.json")
        place.write_bytes(raw)
        began = time.perf_counter()
        document = load_document(place)
        loading = time.perf_counter() - began
        began = time.perf_counter()
        finding = recheck(document)
        seconds = time.perf_counter() - began
        parts = {"load": loading}
        shell = _shell("recheck", str(place))
        if shell is not None:
            parts["shell"] = shell
    said = status if finding.holds else "rejected"
    return Run(seconds, said, proved=finding.holds, path="full", parts=parts, sizes=sizes)


WAYS: dict[str, Callable[[Path], Run]] = {
    "ours": ours,
    "full": full,
    "interim": interim,
    "type-graph": type_graph,
    "likeness": likeness,
    "textbook": textbook,
    "textbook-quick": textbook_quick,
    "linprog": linprog,
    "highs": highs,
    "simplex": simplex,
    "ipm": ipm,
    "formulate": formulate_only,
    "recheck": recheck_only,
}
"""The ways measured in a process of their own; "shell" is timed from outside."""


def command(*words: str) -> list[str]:
    """The command line that runs `designer` with these words."""
    script = Path(sys.executable).with_name("designer")
    return [str(script), *words] if script.exists() else [sys.executable, "-m", "designer", *words]


def _shell(*words: str) -> float | None:
    """Wall seconds of one command; None if it fails."""
    began = time.perf_counter()
    done = subprocess.run(command(*words), capture_output=True, check=False)
    return time.perf_counter() - began if done.returncode == 0 else None


def _save(verdict: Any) -> None:
    """As `--save` does: tables, their audit, verdict and proof."""
    from designer.saving import planned, save
    from designer.views.documents import verdict_document

    with tempfile.TemporaryDirectory() as folder:
        save(verdict, folder, verdict_document(verdict, planned(verdict, folder)))


@cache
def _proof(path: Path) -> tuple[str, dict[str, int], bytes]:
    """Status, sizes and the proof document of a scenario, posed once on the full program."""
    from designer import pose
    from designer.proof.document import as_bytes

    verdict = pose(path, path="full")
    matrix = verdict.program.matrix
    raw = as_bytes(verdict.proof)
    sizes = {"rows": matrix.rows, "columns": matrix.columns, "nonzeros": matrix.nonzeros}
    return verdict.status, {**sizes, "bytes": len(raw)}, raw


def _short(text: str) -> str:
    return text if len(text) <= 40 else f"{len(text)} characters"
