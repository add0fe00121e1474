"""A solve that does not stop when told is left behind, and what it had found is kept."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import threading

import numpy as np
import pytest

from designer.engines import apart
from designer.engines.apart import Best, run_apart
from designer.engines.floats import floats
from designer.engines.highs import HIGHS
from designer.engines.listening import Stop, listening
from designer.engines.model import load, point_of, quiet_highs
from designer.engines.watch import Watch
from designer.program.linear import LinearProgram
from tests.engines.programs import program


class Deaf:
    """Stands in for HiGHS deep in a heuristic: it hears nothing until it is let go."""

    def __init__(self) -> None:
        """Start deaf."""
        self.go_on = threading.Event()

    def run(self) -> None:
        self.go_on.wait(60)


def knapsack(items: int = 30) -> LinearProgram:
    """Several rows over whole columns: not solved at the root, and presolve has work."""
    rng = np.random.default_rng(11)
    rows = rng.integers(5, 60, size=(4, items)).tolist()
    rows.append([1, -1, *([0] * (items - 2))])
    worth = [-int(value) for value in rng.integers(20, 70, size=items)]
    caps: list[int | None] = [*(sum(row) // 3 for row in rows[:4]), 0]
    lows: list[int | None] = [None, None, None, None, 0]
    return program(rows, lows, caps, [0] * items, [1] * items, worth, integer=[True] * items)


@pytest.fixture
def impatient(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(apart, "PATIENCE", 0.1)


@pytest.mark.usefixtures("impatient")
@pytest.mark.parametrize("why", ["limit", "ctrl-c", "listener"])
def test_a_deaf_solve_is_left_behind(why: str) -> None:
    deaf, stop = Deaf(), Stop()
    stop.interrupted = why == "ctrl-c"
    stop.error = LookupError() if why == "listener" else None
    watch = Watch(limit=0.05) if why == "limit" else Watch()
    assert not run_apart(deaf, watch, stop)
    assert stop.left
    assert stop.asked
    (thread,) = (thread for thread in threading.enumerate() if thread.name == "HiGHS")
    deaf.go_on.set()
    thread.join(60)
    assert not thread.is_alive()


def test_a_solve_that_ends_is_waited_for() -> None:
    deaf, stop = Deaf(), Stop()
    threading.Timer(0.2, deaf.go_on.set).start()
    assert run_apart(deaf, Watch(), stop)
    assert not stop.asked
    assert not stop.left


def test_what_callbacks_show_is_what_the_solve_ends_with() -> None:
    """The point shown last is the optimum in the program's own columns, presolve undone."""
    lp = knapsack()
    made, model, best = floats(lp), quiet_highs(), Best()
    assert load(model, made)
    with listening(model, Watch(), True, best.see) as stop:
        assert run_apart(model, Watch(), stop)
    ended = point_of(model, made)
    assert ended is not None
    assert best.x is not None
    np.testing.assert_allclose(made.point(best.x), ended, atol=1e-6)
    assert best.value == pytest.approx(model.getInfo().objective_function_value)
    assert best.bound <= best.value + 1e-6


@pytest.mark.usefixtures("impatient")
def test_the_best_point_so_far_outlives_the_solve(monkeypatch: pytest.MonkeyPatch) -> None:
    lp, gone = knapsack(), threading.Event()

    def solve_and_linger(model: object, watch: Watch, stop: Stop) -> bool:
        class Lingering:
            def run(self) -> None:
                model.run()  # type: ignore[attr-defined]
                stop.interrupted = True
                gone.wait(60)

        return run_apart(Lingering(), watch, stop)

    monkeypatch.setattr("designer.engines.highs.run_apart", solve_and_linger)
    report = HIGHS.solve(lp, Watch())
    gone.set()
    monkeypatch.undo()
    whole = HIGHS.solve(lp, Watch())
    assert (report.status, whole.status) == ("interrupted", "optimal")
    assert report.x is not None
    assert whole.x is not None
    np.testing.assert_allclose(report.x, whole.x, atol=1e-6)
    assert report.bound is not None
    assert report.bound <= float(lp.cost @ np.rint(whole.x)) + 1e-6


def test_ctrl_c_in_a_mixed_solve(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("designer.engines.listening.EVERY", 0.0)
    before = signal.getsignal(signal.SIGINT)
    pressed: list[int] = []

    def progress(doing: str, seconds: float, steps: int) -> None:
        if not pressed:
            pressed.append(steps)
            os.kill(os.getpid(), signal.SIGINT)

    report = HIGHS.solve(knapsack(), Watch(progress=progress))
    assert pressed
    assert report.status == "interrupted"
    assert signal.getsignal(signal.SIGINT) is before


def test_the_command_line_does_not_wait_for_what_is_left_behind() -> None:
    script = """
import sys, threading
from designer.__main__ import main
deaf = threading.Thread(target=threading.Event().wait)
deaf.start()
sys.argv = ["designer", "pose", "scenarios/lock-sale.toml", "--json"]
main()
"""
    ran = subprocess.run(
        [sys.executable, "-c", script], capture_output=True, text=True, check=False, timeout=120
    )
    assert ran.returncode == 1
    assert ran.stderr == ""
    assert ran.stdout.endswith("}\n")
