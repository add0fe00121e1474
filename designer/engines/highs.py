"""HiGHS: the engine everything is asked first.

The model goes over in flat arrays (several times faster than setting attributes), presolve
stays on, and nothing is printed: HiGHS greets on stdout when a callback or a run comes
before `output_flag` is off, so the base class is built and silenced first.
"""

from __future__ import annotations

import time
from dataclasses import dataclass, replace
from functools import cache
from math import isfinite
from typing import Any

import numpy as np

from designer.engines.apart import Best, run_apart
from designer.engines.floats import FloatProgram, floats
from designer.engines.listening import Stop, listening
from designer.engines.model import (
    bring_back,
    load,
    multipliers_of,
    point_of,
    presolved,
    quiet_highs,
    read_basis,
    their_basis,
    word,
)
from designer.engines.report import Basis, Report, Said
from designer.engines.watch import Watch
from designer.program.linear import LinearProgram

SMALL = 20_000
"""Nonzeros below which a solve takes milliseconds: run it without callbacks."""


@dataclass(frozen=True)
class Highs:
    """The HiGHS adapter.

    `threads` 0 leaves the choice to HiGHS. `gap` is the relative gap at which a
    mixed-integer solve may stop (0: the optimum).
    """

    threads: int = 0
    gap: float = 0.0

    @property
    def name(self) -> str:
        """'highs' and its version."""
        return f"highs {_version()}"

    def solve(
        self,
        lp: LinearProgram,
        watch: Watch,
        *,
        basis: Basis | None = None,
        tolerance: float | None = None,
    ) -> Report:
        """Return the float answer to `lp` (sense applied: HiGHS always minimises here).

        With `basis` the solve starts there, without presolve; with `tolerance` primal and
        dual feasibility tolerances are set to it. Never raises for what HiGHS says: a
        limit, an interrupt or a failure is the report's status.
        """
        return self.run(floats(lp), watch, basis=basis, tolerance=tolerance)

    def run(
        self,
        program: FloatProgram,
        watch: Watch,
        *,
        basis: Basis | None = None,
        tolerance: float | None = None,
    ) -> Report:
        """Solve a float program as it stands; see `solve`."""
        began = time.monotonic()
        if watch.left <= 0:
            return Report("time-limit", self.name, message="no time left to start")
        mixed, large = bool(program.integer.any()), len(program.data) >= SMALL
        model = quiet_highs()
        self._set(model, watch, tolerance)
        if not load(model, program):
            return Report("failed", self.name, message="the model was refused")
        if mixed:
            model.setOptionValue("mip_rel_gap", self.gap)
            return self._apart(model, program, watch, began)
        if basis is not None:
            model.setBasis(their_basis(basis))
        elif large:
            report = self._in_steps(model, program, watch, tolerance, began)
            if report is not None:
                return report
        with listening(model, watch, large) as stop:
            model.run()
        return report_of(model, program, self.name, began, stop)

    def _set(self, model: Any, watch: Watch, tolerance: float | None) -> None:
        if watch.limit is not None:
            model.setOptionValue("time_limit", watch.left)
        if self.threads:
            model.setOptionValue("threads", self.threads)
        if tolerance is not None:
            model.setOptionValue("primal_feasibility_tolerance", tolerance)
            model.setOptionValue("dual_feasibility_tolerance", tolerance)

    def _apart(self, model: Any, program: FloatProgram, watch: Watch, began: float) -> Report:
        """Solve with integers, in a thread that is not waited for beyond the time limit."""
        best = Best()
        with listening(model, watch, True, best.see) as stop:
            finished = run_apart(model, watch, stop)
        if finished:
            return report_of(model, program, self.name, began, stop)
        bound = best.bound * 2.0 ** (-program.cost_exp)
        return Report(
            "interrupted" if stop.interrupted else "time-limit",
            self.name,
            x=None if best.x is None else program.point(best.x),
            bound=bound if isfinite(bound) else None,
            seconds=time.monotonic() - began,
            message="left behind",
        )

    def _in_steps(
        self,
        model: Any,
        program: FloatProgram,
        watch: Watch,
        tolerance: float | None,
        began: float,
    ) -> Report | None:
        """Presolve, solve what is left, and bring its basis back; None: do it the usual way.

        `run` would then factor the whole basis once more to confirm the answer, which takes
        most of its time on large programs; here the exact proof is the confirmation. Only
        the basis is reported: the values HiGHS keeps are not those of its corner.
        """
        with listening(model, watch, True) as stop:
            if watch.progress is not None:
                watch.progress("presolve", watch.seconds, 0)
            model.presolve()
        early = presolved(model)
        if stop.interrupted:
            early = "interrupted"
        if early is not None and early != "reduced":
            return None if early == "whole" else self._word(early, began)
        smaller = quiet_highs()
        self._set(smaller, watch, tolerance)
        smaller.setOptionValue("presolve", "off")
        smaller.passModel(model.getPresolvedLp())
        with listening(smaller, watch, True) as stop:
            smaller.run()
        report = report_of(smaller, None, self.name, began, stop)
        if report.status != "optimal":
            return report
        bring_back(model, smaller)
        basis = read_basis(model, program, retained=True)
        if basis is None:
            return None
        return replace(report, basis=basis, seconds=time.monotonic() - began)

    def _word(self, status: Said, began: float) -> Report:
        return Report(status, self.name, seconds=time.monotonic() - began, message="in presolve")

    def cross(self, lp: LinearProgram, report: Report, watch: Watch) -> Report:
        """Make an optimal corner of another engine's optimal point, by HiGHS's crossover."""
        import highspy

        if report.x is None:
            return Report("failed", self.name, message="no point to start from")
        program = floats(lp)
        model = quiet_highs()
        if not load(model, program):
            return Report("failed", self.name, message="the model was refused")
        quiet_highs().run()  # starts HiGHS's threads, without which its crossover crashes
        point = highspy.HighsSolution()
        point.col_value = np.clip(program.scaled(report.x), program.col_lo, program.col_hi).tolist()
        point.value_valid = True
        if report.y is not None:
            point.row_dual = program.scaled_multipliers(report.y).tolist()
            point.dual_valid = True
        model.crossover(point)
        basis = read_basis(model, program)
        return self.run(program, watch, basis=basis)


HIGHS = Highs()


@cache
def _version() -> str:
    return str(quiet_highs().version())


def report_of(
    model: Any, program: FloatProgram | None, name: str, began: float, stop: Stop
) -> Report:
    """Read what a finished run has to say; without `program` only its word and its counts."""
    status = "interrupted" if stop.interrupted else word(model)
    info = model.getInfo()
    report = Report(
        status,
        name,
        iterations=max(0, int(info.simplex_iteration_count)),
        seconds=time.monotonic() - began,
        message=str(model.modelStatusToString(model.getModelStatus())),
    )
    if program is None:
        return report
    if program.integer.any():
        found = status == "optimal" or info.primal_solution_status == 2
        bound = float(info.mip_dual_bound) * 2.0 ** (-program.cost_exp)
        return replace(
            report,
            x=point_of(model, program) if found else None,
            bound=bound if isfinite(bound) else None,
        )
    return replace(
        report,
        x=point_of(model, program) if status == "optimal" else None,
        y=multipliers_of(model, program) if status == "optimal" else None,
        basis=read_basis(model, program) if status in ("optimal", "unbounded") else None,
    )
