"""HiGHS: the engine everything is asked first.

The model goes over in flat arrays (several times faster than setting attributes), presolve
stays on, and nothing is printed: HiGHS greets on stdout when a callback or a run comes
before `output_flag` is off, so the base class is built and silenced first.
"""

from __future__ import annotations

import signal
import threading
import time
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from functools import cache
from types import FrameType
from typing import Any

import numpy as np

from designer.engines.floats import FloatProgram, floats
from designer.engines.report import BASIC, LOWER, UPPER, ZERO, Basis, Report, Said
from designer.engines.watch import Watch
from designer.program.linear import LinearProgram

SMALL = 20_000
"""Nonzeros below which a solve takes milliseconds: run it without callbacks."""

EVERY = 0.2
"""Seconds between two progress reports."""


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
        model = quiet_highs()
        mixed = bool(program.integer.any())
        if watch.limit is not None:
            model.setOptionValue("time_limit", watch.left)
        if self.threads:
            model.setOptionValue("threads", self.threads)
        if tolerance is not None:
            model.setOptionValue("primal_feasibility_tolerance", tolerance)
            model.setOptionValue("dual_feasibility_tolerance", tolerance)
        if mixed:
            model.setOptionValue("mip_rel_gap", self.gap)
        if not load(model, program):
            return Report("failed", self.name, message="the model was refused")
        if basis is not None:
            model.setBasis(_their_basis(basis))
        with _listening(model, watch, mixed or len(program.data) >= SMALL) as stop:
            model.run()
        return _report(model, program, self.name, began, stop)

    def cross(self, lp: LinearProgram, report: Report, watch: Watch) -> Report:
        """Make an optimal corner of another engine's optimal point, by HiGHS's crossover."""
        import highspy

        if report.x is None:
            return Report("failed", self.name, message="no point to start from")
        program = floats(lp)
        model = quiet_highs()
        if not load(model, program):
            return Report("failed", self.name, message="the model was refused")
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


def quiet_highs() -> Any:
    """Make a HiGHS instance that prints nothing, not even its banner."""
    import highspy

    model = highspy.Highs.__bases__[0]()
    model.setOptionValue("output_flag", False)
    model.setOptionValue("small_matrix_value", 1e-12)
    return model


def load(model: Any, program: FloatProgram) -> bool:
    """Pass the float program to HiGHS; whether all of it arrived."""
    integer, rows, columns = program.integer, len(program.row_lo), len(program.cost)
    status = model.passModel(
        columns,
        rows,
        len(program.data),
        2,  # row-wise
        1,  # minimise
        0.0,
        program.cost,
        program.col_lo,
        program.col_hi,
        program.row_lo,
        program.row_hi,
        program.indptr.astype(np.int32),
        program.indices.astype(np.int32),
        program.data,
        integer.astype(np.int32),
    )
    return int(status) != -1 and model.getNumCol() == columns and model.getNumRow() == rows


def read_basis(model: Any, program: FloatProgram) -> Basis | None:
    """Return the basis HiGHS ended with, if it has one."""
    theirs = model.getBasis()
    if not theirs.valid:
        return None
    return Basis(
        _ours(theirs.col_status, np.isfinite(program.col_lo), np.isfinite(program.col_hi)),
        _ours(theirs.row_status, np.isfinite(program.row_lo), np.isfinite(program.row_hi)),
    )


def _ours(statuses: list[Any], lo: Any, hi: Any) -> Any:
    ours = np.array([int(status) for status in statuses], dtype=np.int8)
    # 'nonbasic' without a side, and sides that have no bound, fall back to the bound there is
    ours[(ours > ZERO) | ((ours == ZERO) & (lo | hi))] = LOWER
    ours[(ours == LOWER) & ~lo] = UPPER
    ours[(ours == UPPER) & ~hi] = LOWER
    ours[(ours != BASIC) & ~lo & ~hi] = ZERO
    return ours


def _their_basis(basis: Basis) -> Any:
    import highspy

    words = [highspy.HighsBasisStatus(code) for code in range(4)]
    theirs = highspy.HighsBasis()
    theirs.col_status = [words[code] for code in basis.columns.tolist()]
    theirs.row_status = [words[code] for code in basis.rows.tolist()]
    theirs.valid = True
    theirs.alien = True  # HiGHS then repairs a singular or miscounted basis instead of refusing
    return theirs


@cache
def _version() -> str:
    from importlib.metadata import version

    return version("highspy")


@dataclass
class _Stop:
    """Why a running solve was told to stop."""

    interrupted: bool = False
    error: BaseException | None = None


@contextmanager
def _listening(model: Any, watch: Watch, attached: bool) -> Iterator[_Stop]:
    """Progress reports and Ctrl-C while HiGHS runs.

    HiGHS calls back between iterations. Ctrl-C only raises a flag there: an exception must
    not travel through compiled code.
    """
    stop = _Stop()
    if not attached:
        yield stop
        return
    import highspy

    Kind = highspy.cb.HighsCallbackType

    last = time.monotonic()

    def called(kind: Any, message: str, said: Any, answer: Any, data: Any) -> None:
        nonlocal last
        if stop.interrupted or stop.error is not None:
            answer.user_interrupt = True
            return
        now = time.monotonic()
        if watch.progress is None or now - last < EVERY:
            return
        last = now
        try:
            steps = said.mip_node_count if kind == Kind.kCallbackMipInterrupt else 0
            watch.progress("solve", watch.seconds, max(steps, said.simplex_iteration_count))
        except BaseException as error:  # a listener's own failure is raised after the run
            stop.error = error
            answer.user_interrupt = True

    def pressed(number: int, frame: FrameType | None) -> None:
        stop.interrupted = True

    model.setCallback(called, None)
    for kind in (
        Kind.kCallbackSimplexInterrupt,
        Kind.kCallbackIpmInterrupt,
        Kind.kCallbackMipInterrupt,
    ):
        model.startCallback(kind)
    main = threading.current_thread() is threading.main_thread()
    before = signal.signal(signal.SIGINT, pressed) if main else None
    try:
        yield stop
    finally:
        if main:
            signal.signal(signal.SIGINT, before)
        model.setCallback(None, None)
    if isinstance(stop.error, KeyboardInterrupt):
        stop.interrupted = True
    elif stop.error is not None:
        raise stop.error


def _report(model: Any, program: FloatProgram, name: str, began: float, stop: _Stop) -> Report:
    import highspy

    words: dict[Any, Said] = {
        highspy.HighsModelStatus.kOptimal: "optimal",
        highspy.HighsModelStatus.kModelEmpty: "optimal",
        highspy.HighsModelStatus.kInfeasible: "infeasible",
        highspy.HighsModelStatus.kUnbounded: "unbounded",
        highspy.HighsModelStatus.kUnboundedOrInfeasible: "unclear",
        highspy.HighsModelStatus.kTimeLimit: "time-limit",
        highspy.HighsModelStatus.kInterrupt: "interrupted",
    }
    said = model.getModelStatus()
    status = "interrupted" if stop.interrupted else words.get(said, "failed")
    info = model.getInfo()
    mixed = bool(program.integer.any())
    x = y = basis = bound = None
    solution = model.getSolution()
    if solution.value_valid and (
        status == "optimal" or (mixed and info.primal_solution_status == 2)
    ):
        x = program.point(np.array(solution.col_value, dtype=np.float64))
    if solution.dual_valid and status == "optimal" and not mixed:
        y = program.multipliers(np.array(solution.row_dual, dtype=np.float64))
    if status in ("optimal", "unbounded") and not mixed:
        basis = read_basis(model, program)
    if mixed and np.isfinite(info.mip_dual_bound):
        bound = float(info.mip_dual_bound) * 2.0 ** (-program.cost_exp)
    return Report(
        status,
        name,
        x,
        y,
        basis,
        bound,
        max(0, int(info.simplex_iteration_count)),
        time.monotonic() - began,
        str(model.modelStatusToString(said)),
    )
