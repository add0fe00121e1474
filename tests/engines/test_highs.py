"""The HiGHS adapter: silent, stoppable, and never calling a limit a result."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import threading
from fractions import Fraction

import numpy as np
import pytest

from designer.engines.floats import floats
from designer.engines.highs import HIGHS, Highs
from designer.engines.highs import SMALL as SMALL_SIZE
from designer.engines.model import load, quiet_highs
from designer.engines.report import BASIC, LOWER, ZERO
from designer.engines.watch import Interrupted, TimeUp, Watch
from designer.errors import UsageError
from designer.program.linear import Bound, LinearProgram
from designer.proof.prove import prove
from tests.engines.interim import interim_program
from tests.engines.programs import judge, program

SMALL = program([[1, 2], [3, 1]], [3, 4], [None, None], [0, 0], [None, None], [1, 1])


def large(correlated: bool = True) -> LinearProgram:
    """More nonzeros than the adapter runs without listening; seconds of simplex."""
    rng = np.random.default_rng(0)
    types = [sorted(rng.choice(150, size=10, replace=False).tolist()) for _ in range(3)]
    return interim_program(
        types,
        None if correlated else rng.integers(1, 6, size=(3, 10)).tolist(),
        200,
        joint=rng.integers(1, 9, size=1000).tolist() if correlated else None,
    )


def test_the_report_of_a_small_program() -> None:
    report = HIGHS.solve(SMALL, Watch())
    assert report.status == "optimal"
    assert report.x is not None
    assert report.y is not None
    assert report.basis is not None
    np.testing.assert_allclose(report.x, [1, 1])
    np.testing.assert_allclose(report.y, [0.4, 0.2])
    assert report.basis.columns.tolist() == [BASIC, BASIC]
    assert report.basis.rows.tolist() == [LOWER, LOWER]
    assert report.engine == HIGHS.name
    assert HIGHS.name.startswith("highs 1.")


@pytest.mark.parametrize(
    ("lp", "words"),
    [
        (program([[1]], [2], [None], [0], [1], [1]), {"infeasible", "unclear"}),
        (
            program([[1, -1]], [0], [0], [None, None], [None, None], [1, 0]),
            {"unbounded", "unclear"},
        ),
    ],
)
def test_words_without_an_optimum(lp: LinearProgram, words: set[str]) -> None:
    report = HIGHS.solve(lp, Watch())
    assert report.status in words
    assert report.x is None


def test_free_columns_stand_at_zero() -> None:
    report = HIGHS.solve(program([], [], [], [None], [None], [0]), Watch())
    assert report.basis is not None
    assert report.basis.columns.tolist() == [ZERO]


def test_a_restart_from_a_basis_needs_no_iterations() -> None:
    lp = interim_program([[10, 30], [20, 40]], [[1, 2], [3, 1]], 50)
    first = HIGHS.solve(lp, Watch())
    again = HIGHS.solve(lp, Watch(), basis=first.basis, tolerance=1e-10)
    assert again.status == "optimal"
    assert again.iterations == 0


def test_nothing_is_printed_on_stdout() -> None:
    # HiGHS greets the first caller in a process; --json output must not carry that
    script = """
import numpy as np
from tests.engines.test_highs import SMALL, large
from tests.engines.programs import program
from designer.engines.highs import HIGHS
from designer.engines.watch import Watch
assert HIGHS.solve(SMALL, Watch()).status == "optimal"
assert HIGHS.solve(large(False), Watch(progress=print_nothing)).status == "optimal"
whole = program([[2, 2]], [3], [None], [0, 0], [9, 9], [1, 1], integer=[True, True])
assert HIGHS.solve(whole, Watch()).status == "optimal"
""".replace("import numpy as np", "print_nothing = lambda *told: None")
    ran = subprocess.run(
        [sys.executable, "-c", script], capture_output=True, text=True, check=False
    )
    assert ran.returncode == 0, ran.stderr
    assert ran.stdout == ""


def test_no_time_left_is_no_result() -> None:
    for lp in (SMALL, large()):
        assert HIGHS.solve(lp, Watch(limit=0.0)).status == "time-limit"
        outcome = prove(lp, watch=Watch(limit=0.0))
        assert (outcome.status, outcome.proved) == ("undecided", False)
        assert outcome.reason == "the time limit was reached; give it more time with --time-limit"


def test_a_time_limit_within_a_solve() -> None:
    report = HIGHS.solve(large(), Watch(limit=0.05))
    assert report.status == "time-limit"
    assert (report.x, report.y, report.basis) == (None, None, None)


def test_progress_is_told() -> None:
    told: list[tuple[str, float, int]] = []

    def progress(doing: str, seconds: float, steps: int) -> None:
        told.append((doing, seconds, steps))

    report = HIGHS.solve(large(), Watch(progress=progress))
    assert report.status == "optimal"
    assert told[0] == ("presolve", told[0][1], 0)
    assert {doing for doing, _, _ in told[1:]} == {"solve"}
    assert told[-1][2] > 0


@pytest.mark.parametrize("stage", ["presolve", "solve"])
def test_a_listener_that_fails_is_heard(stage: str) -> None:
    def progress(doing: str, seconds: float, steps: int) -> None:
        if doing == stage:
            raise LookupError("the screen is gone")

    with pytest.raises(LookupError, match="the screen is gone"):
        HIGHS.solve(large(), Watch(progress=progress))


def test_large_programs_are_solved_in_steps_to_an_exact_optimum() -> None:
    # above SMALL nonzeros only the basis comes back; the proof is what confirms it
    rng = np.random.default_rng(3)
    types = [sorted(rng.choice(300, size=16, replace=False).tolist()) for _ in range(3)]
    independent = interim_program(types, rng.integers(1, 6, size=(3, 16)).tolist(), 400)
    for program_ in (large(), independent):
        assert program_.nonzeros >= SMALL_SIZE
        report = HIGHS.solve(program_, Watch())
        assert report.status == "optimal"
        assert report.basis is not None
        assert report.x is None
        basics = (report.basis.columns == BASIC).sum() + (report.basis.rows == BASIC).sum()
        assert basics == program_.rows
        outcome = prove(program_)
        assert outcome.proved
        assert "repairs" not in outcome.effort


@pytest.mark.parametrize("slack", [0, 1])
def test_large_programs_that_presolve_decides(slack: int) -> None:
    n = SMALL_SIZE // 2 + 1
    # x_k >= k for all, the sum of all at most what that leaves, less 1 unless `slack`
    least = n * (n - 1) // 2
    lp = LinearProgram(
        np.concatenate([np.arange(n + 1), [2 * n]]),
        np.concatenate([np.arange(n), np.arange(n)]),
        np.ones(2 * n, dtype=np.int64),
        Bound(np.concatenate([np.arange(n), [0]]), np.array([True] * n + [False])),
        Bound(
            np.concatenate([np.zeros(n, np.int64), [least - 1 + slack]]),
            np.array([False] * n + [True]),
        ),
        Bound(np.zeros(n, np.int64), np.zeros(n, dtype=bool)),
        Bound(np.zeros(n, np.int64), np.zeros(n, dtype=bool)),
        1,
        np.ones(n, dtype=np.int64),
        np.zeros(n, dtype=bool),
    )
    outcome = prove(lp)
    assert outcome.proved
    assert outcome.status == ("optimal" if slack else "infeasible")
    assert outcome.value == (least if slack else None)


@pytest.mark.parametrize("stage", ["presolve", "solve"])
def test_ctrl_c_within_a_solve_gives_an_honest_report(stage: str) -> None:
    before = signal.getsignal(signal.SIGINT)
    pressed: list[str] = []

    def progress(doing: str, seconds: float, steps: int) -> None:
        if doing == stage and not pressed:
            pressed.append(doing)
            os.kill(os.getpid(), signal.SIGINT)

    outcome = prove(large(), watch=Watch(progress=progress))
    assert pressed
    assert (outcome.status, outcome.proved) == ("undecided", False)
    assert outcome.reason == "interrupted; run it again to go on"
    assert signal.getsignal(signal.SIGINT) is before


def test_ctrl_c_between_solves_gives_an_honest_report() -> None:
    class Pressed(Highs):
        def solve(self, *given: object, **named: object) -> None:  # type: ignore[override]
            raise KeyboardInterrupt

    outcome = prove(SMALL, engine=Pressed())  # type: ignore[arg-type]
    assert outcome.status == "undecided"
    assert outcome.reason == "interrupted; run it again to go on"


def test_solving_in_a_thread_leaves_signals_alone() -> None:
    found: list[str] = []
    thread = threading.Thread(
        target=lambda: found.append(HIGHS.solve(large(False), Watch()).status)
    )
    thread.start()
    thread.join()
    assert found == ["optimal"]


def test_watches() -> None:
    Watch().check()
    assert Watch().left == float("inf")
    with pytest.raises(TimeUp):
        Watch(limit=0.0).check()
    assert Watch(limit=100.0).within(5.0).left <= 5.0
    assert Watch(limit=1.0).within(5.0).left <= 1.0
    heard: list[str] = []
    Watch(progress=lambda doing, seconds, steps: heard.append(doing)).tell("work", 3)
    assert heard == ["work"]
    assert Interrupted.reason == "interrupted"
    with pytest.raises(UsageError, match="--time-limit: found nan; expected a number of seconds"):
        Watch(limit=float("nan"))


def test_floats_of_huge_and_tiny_numbers() -> None:
    huge = 10**400
    lp = program([[huge, -huge], [1, 1]], [0, 1], [0, None], [0, 0], [None, None], [huge, 2 * huge])
    program_in_floats = floats(lp)
    for values in (program_in_floats.data, program_in_floats.cost):
        assert np.isfinite(values).all()
        assert (np.abs(values) > 1e-3).all()
        assert (np.abs(values) < 1e6).all()
    assert load(quiet_highs(), program_in_floats)
    outcome = prove(lp)
    judge(lp, outcome)
    assert outcome.value == Fraction(3 * huge, 2)


def test_floats_are_the_program() -> None:
    lp = program(
        [[3, 0, 5], [0, 2**50, -7]],
        [6, None],
        [6, 2**49],
        [1, None, 0],
        [None, 9, 10**12],
        [4, 0, -1],
        "max",
        col_den=3,
    )
    made = floats(lp)
    for k in range(lp.nonzeros):
        row = 0 if k < 2 else 1
        scale = 2.0 ** int(made.row_exp[row] + made.col_exp[lp.indices[k]])
        assert made.data[k] == float(lp.data[k]) * scale
    objective = 2.0 ** (made.cost_exp + made.col_exp)
    np.testing.assert_array_equal(made.cost, -np.array([4.0, 0.0, -1.0]) * objective)
    np.testing.assert_array_equal(made.col_lo * 2.0**made.col_exp, [1 / 3, -np.inf, 0.0])
    np.testing.assert_array_equal(made.row_lo * 2.0**-made.row_exp, [6.0, -np.inf])
    np.testing.assert_array_equal(made.point(made.scaled(np.array([1.5, 2.0, 7.0]))), [1.5, 2, 7])
    multipliers = np.array([0.25, -3.0])
    np.testing.assert_array_equal(
        made.multipliers(made.scaled_multipliers(multipliers)), multipliers
    )
