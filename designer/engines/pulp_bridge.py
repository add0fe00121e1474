"""Any engine PuLP finds, as a second opinion: its answer is a hint like any other.

The model goes over through `LpProblem.fromDict`, which PuLP 2.9, 3 and 4 share, and comes
back as a point; HiGHS then makes a corner of the point, and the exact proof decides.
"""

from __future__ import annotations

import math
import time
import warnings
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from designer.engines.floats import FloatProgram, floats
from designer.engines.pulp_process import ask
from designer.engines.report import Basis, FloatArray, Report, Said
from designer.engines.silence import silent_stdout
from designer.engines.watch import Watch
from designer.errors import Mistake, UsageError
from designer.program.linear import LinearProgram

BOX = 2.0**20
"""First box put around free columns for engines that need one, in scaled units."""
WIDER = 2.0**7
"""Each further box is wider by this much."""
BOXES = 3
"""Boxes tried before 'infeasible' is called unclear."""

NEEDS_BOX = ("CBC", "COIN", "CYLP")
"""Engines whose dual simplex invents bounds of 1e10 on free columns and may stop there."""


def available() -> list[str]:
    """List the names of the engines PuLP finds on this machine."""
    import pulp

    with silent_stdout(), warnings.catch_warnings():
        # PuLP 3.3 warns about engines that PuLP 4 drops merely for being listed
        warnings.simplefilter("ignore", DeprecationWarning)
        return [str(name) for name in pulp.listSolvers(onlyAvailable=True)]


def bridge(name: str) -> PulpEngine:
    """Return the engine PuLP calls `name` (capitals do not matter).

    Raises UsageError when PuLP does not know it or does not find it installed.
    """
    found = available()
    for known in found:
        if known.lower() == name.lower():
            return PulpEngine(known)
    raise UsageError(
        [
            Mistake(
                "--engine",
                f"'pulp:{name}'",
                f"an engine that PuLP finds here: {', '.join(found) or 'none'}",
                "Pick one of these, install the engine so that PuLP finds it, or leave the "
                "option out to use HiGHS.",
            )
        ]
    )


@dataclass(frozen=True)
class PulpEngine:
    """One of PuLP's engines."""

    solver: str

    @property
    def name(self) -> str:
        """'pulp:' and PuLP's name of the engine."""
        return f"pulp:{self.solver}"

    def solve(
        self,
        lp: LinearProgram,
        watch: Watch,
        *,
        basis: Basis | None = None,
        tolerance: float | None = None,
    ) -> Report:
        """Return the engine's answer to `lp`; `basis` and `tolerance` are not passed on.

        A point on the side of a box is passed on as a hint like any other; only where a box
        leaves nothing feasible is a wider one tried.
        """
        program = floats(lp)
        free = ~np.isfinite(program.col_lo) | ~np.isfinite(program.col_hi)
        boxed = any(word in self.solver.upper() for word in NEEDS_BOX) and bool(free.any())
        if not boxed:
            return self._once(program, watch, math.inf)
        seconds, report = 0.0, Report("failed", self.name)
        for k in range(BOXES):
            report = self._once(program, watch, BOX * WIDER**k)
            seconds += report.seconds
            if report.status != "infeasible":
                return replace(report, seconds=seconds)
        # the boxes may be what leaves nothing
        return replace(report, status="unclear", seconds=seconds)

    def _once(self, program: FloatProgram, watch: Watch, box: float) -> Report:
        began = time.monotonic()
        if watch.left <= 0:
            return Report("time-limit", self.name, message="no time left to start")
        asked = {
            "solver": self.solver,
            "seconds": None if watch.limit is None else max(1.0, watch.left),
            "program": as_dict(program, box),
        }
        told = ask(asked, watch)
        seconds = time.monotonic() - began
        if told is None:
            return Report("time-limit", self.name, seconds=seconds, message="ended by us")
        if "failed" in told:
            return Report("failed", self.name, seconds=seconds, message=str(told["failed"]))
        status = _said(int(told["status"]), watch)
        values = [told["values"].get(f"x{j}") for j in range(len(program.cost))]
        x: FloatArray | None = None
        if status in ("optimal", "time-limit") and any(value is not None for value in values):
            # PuLP drops columns that no row and no cost mentions
            x = program.point(_filled(values, program))
        return Report(status, self.name, x, seconds=seconds, message=str(status))


def as_dict(program: FloatProgram, box: float = math.inf) -> dict[str, Any]:
    """Write a float program as PuLP's dictionary; columns x0, x1, ..., rows r0, r1, ....

    A row with two different bounds becomes two; one with none is left out. Unbounded sides
    of columns are put at `box`.
    """
    data = program.data.tolist()
    names = [f"x{j}" for j in program.indices.tolist()]
    cuts = program.indptr.tolist()
    rows: list[dict[str, Any]] = []
    for i, (low, high) in enumerate(
        zip(program.row_lo.tolist(), program.row_hi.tolist(), strict=True)
    ):
        terms = [
            {"name": name, "value": value}
            for name, value in zip(
                names[cuts[i] : cuts[i + 1]], data[cuts[i] : cuts[i + 1]], strict=True
            )
        ]
        sides = [(0, low)] if low == high else [(1, low), (-1, high)]
        for sense, right in sides:
            if math.isfinite(right):
                rows.append(
                    {
                        "sense": sense,
                        "pi": None,
                        "constant": -right,
                        "name": f"r{i}_{sense + 1}",
                        "coefficients": terms,
                    }
                )
    columns = [
        {
            "name": f"x{j}",
            "cat": "Integer" if whole else "Continuous",
            "lowBound": _side(low, -box),
            "upBound": _side(high, box),
            "varValue": None,
            "dj": None,
        }
        for j, (low, high, whole) in enumerate(
            zip(
                program.col_lo.tolist(),
                program.col_hi.tolist(),
                program.integer.tolist(),
                strict=True,
            )
        )
    ]
    cost = [
        {"name": f"x{j}", "value": value} for j, value in enumerate(program.cost.tolist()) if value
    ]
    return {
        "parameters": {"name": "program", "sense": 1, "status": 0, "sol_status": 0},
        "objective": {"name": "goal", "coefficients": cost},
        "variables": columns,
        "constraints": rows,
        "sos1": [],
        "sos2": [],
    }


def _side(value: float, box: float) -> float | None:
    if math.isfinite(value):
        return value
    return box if math.isfinite(box) else None


def _said(status: int, watch: Watch) -> Said:
    if watch.left <= 0 and status != -1:
        return "time-limit"  # whatever the engine calls what it has by then
    words: dict[int, Said] = {1: "optimal", -1: "infeasible", -2: "unbounded", -3: "unclear"}
    # the codes below -3 are PuLP 4's: limits of several kinds, Ctrl-C, numerical trouble
    limits: dict[int, Said] = {-4: "time-limit", -10: "interrupted"}
    return words.get(status) or limits.get(status, "failed")


def _filled(values: Sequence[float | None], program: FloatProgram) -> FloatArray:
    filled = np.array([0.0 if value is None else value for value in values], dtype=np.float64)
    clipped: FloatArray = np.clip(filled, program.col_lo, program.col_hi)
    return clipped
