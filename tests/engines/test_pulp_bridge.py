"""Any engine PuLP finds: its word is a hint, the exact proof decides.

PuLP 3.3.2 brings CBC along; HiGHS is found through highspy.
"""

from __future__ import annotations

import os
import subprocess
import sys
import time
import warnings
from pathlib import Path

import numpy as np
import pytest

from designer.engines import pulp_process
from designer.engines.floats import floats
from designer.engines.pulp_bridge import PulpEngine, as_dict, available, bridge
from designer.engines.report import Basis, Report
from designer.engines.watch import Watch
from designer.errors import UsageError
from designer.program.linear import LinearProgram
from designer.proof.prove import prove
from tests.engines.interim import interim_program
from tests.engines.programs import judge, program

CBC = next((name for name in available() if "CBC" in name or "COIN" in name), "PULP_CBC_CMD")
ENGINES = ["HiGHS", CBC]
TRADE = interim_program([[10, 25, 40], [5, 30, 45]], [[1, 2, 1], [3, 1, 2]], 50)
WHOLE = program(
    [[5, 4, 3], [2, 3, 1]], [None, 2], [16, None], [0] * 3, [5] * 3, [7, 5, 3], "max",
    integer=[True, True, False],
)  # fmt: skip


@pytest.mark.parametrize("name", ENGINES)
@pytest.mark.parametrize("lp", [TRADE, WHOLE], ids=["trade", "whole"])
def test_optima_agree_and_are_proved(name: str, lp: LinearProgram) -> None:
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        outcome = prove(lp, engine=bridge(name))
    judge(lp, outcome)
    assert outcome.value == prove(lp).value
    assert outcome.engine == f"pulp:{name}"
    assert outcome.reason == ""


@pytest.mark.parametrize("name", ENGINES)
def test_impossible_and_unbounded(name: str) -> None:
    empty = program([[1, 1]], [5], [None], [0, 0], [2, 2], [1, 0])
    outcome = prove(empty, engine=bridge(name))
    judge(empty, outcome)
    assert outcome.status == "infeasible"
    endless = program([[1, -1]], [0], [2], [None, None], [None, None], [1, 1])
    outcome = prove(endless, engine=bridge(name))
    judge(endless, outcome)
    assert outcome.status == "unbounded"


@pytest.mark.parametrize("name", ENGINES)
def test_ranged_rows_and_columns_nobody_mentions(name: str) -> None:
    lp = program([[1, 0, 2]], [1], [4], [0, 2, 0], [3, 6, 3], [1, 0, -1])
    outcome = prove(lp, engine=bridge(name))
    judge(lp, outcome)
    assert outcome.value == -2


def test_a_wrong_optimum_is_named() -> None:
    class Lazy:
        name = "lazy"

        def solve(
            self,
            lp: LinearProgram,
            watch: Watch,
            *,
            basis: Basis | None = None,
            tolerance: float | None = None,
        ) -> Report:
            return Report("optimal", self.name, np.array([3.0, 4.0]))

    lp = program([[1, 1]], [2], [None], [0, 0], [9, 9], [1, 1])
    outcome = prove(lp, engine=Lazy())
    judge(lp, outcome)
    assert outcome.value == 2
    assert outcome.reason == "lazy stopped at 7; the proved optimum is 2"


def test_boxes_grow_until_something_fits() -> None:
    # everything feasible lies beyond the first box of 2**20
    lp = program([[1, -3], [0, 1]], [1, 10**7], [None, None], [None, None], [None, None], [1, 1])
    report = bridge(CBC).solve(lp, Watch())
    assert report.status == "optimal"
    assert report.x is not None
    np.testing.assert_allclose(report.x, [3 * 10**7 + 1, 10**7], rtol=1e-6)
    judge(lp, prove(lp, engine=bridge(CBC)))


def test_the_dictionary_of_a_program() -> None:
    lp = program([[1, 2], [3, 0]], [1, None], [4, None], [0, None], [1, None], [0, 1])
    made = as_dict(floats(lp), box=8.0)
    assert [row["name"] for row in made["constraints"]] == ["r0_2", "r0_0"]
    assert [(v["lowBound"], v["upBound"]) for v in made["variables"]] == [(0.0, 1.0), (-8.0, 8.0)]
    assert made["objective"]["coefficients"] == [{"name": "x1", "value": 1.0}]


def test_names_are_found_whatever_their_capitals() -> None:
    assert bridge("highs").solver == "HiGHS"


def test_an_engine_that_is_not_there() -> None:
    with pytest.raises(UsageError) as caught:
        bridge("NO_SUCH")
    mistake = caught.value.mistakes[0]
    assert mistake.place == "--engine"
    assert mistake.found == "'pulp:NO_SUCH'"
    assert mistake.expected == f"an engine that PuLP finds here: {', '.join(available())}"


def test_no_time_left() -> None:
    assert bridge("HiGHS").solve(TRADE, Watch(limit=0.0)).status == "time-limit"
    assert prove(TRADE, engine=bridge("HiGHS"), watch=Watch(limit=0.0)).status == "undecided"


DEAF = """
import json, os, subprocess, sys, time
note = json.loads(sys.stdin.readline())["solver"]
other = subprocess.Popen([sys.executable, "-c", "import time; time.sleep(600)"])
with open(note, "w") as written:
    written.write(f"{os.getpid()} {other.pid} {os.getcwd()}")
time.sleep(600)
"""


def running(number: str) -> bool:
    """Whether a process is more than the entry of a dead one that nobody has waited for."""
    done = subprocess.run(
        ["ps", "-o", "stat=", "-p", number], capture_output=True, text=True, check=False
    )
    return bool(done.stdout.strip()) and not done.stdout.strip().startswith("Z")


@pytest.mark.skipif(os.name != "posix", reason="processes as POSIX has them")
@pytest.mark.parametrize("why", ["limit", "ctrl-c"])
def test_an_engine_that_does_not_stop_is_ended_with_all_it_started(
    why: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    child, note = tmp_path / "deaf.py", tmp_path / "note"
    child.write_text(DEAF, encoding="utf-8")
    monkeypatch.setattr(pulp_process, "CHILD", child)
    monkeypatch.setattr(pulp_process, "_idle", [])
    monkeypatch.setattr(pulp_process, "PATIENCE", 0.0)

    def progress(doing: str, seconds: float, steps: int) -> None:
        if why == "ctrl-c" and note.exists() and note.read_text(encoding="utf-8"):
            raise KeyboardInterrupt

    engine = PulpEngine(str(note))
    if why == "limit":
        assert engine.solve(TRADE, Watch(limit=3.0)).status == "time-limit"
    else:
        with pytest.raises(KeyboardInterrupt):
            engine.solve(TRADE, Watch(progress=progress))
    one, two, folder = note.read_text(encoding="utf-8").split()
    assert not Path(folder).exists()
    for _ in range(100):
        if not (running(one) or running(two)):
            return
        time.sleep(0.05)  # the system ends processes in its own time
    raise AssertionError("the engine's processes go on")


def test_one_process_answers_again_and_goes_when_we_do(tmp_path: Path) -> None:
    script = """
from tests.engines.test_pulp_bridge import *
for _ in range(3):
    assert bridge("HiGHS").solve(TRADE, Watch()).status == "optimal"
(child,) = pulp_process._idle
print(child.process.pid, child.folder, flush=True)
os._exit(0)  # as the command line does
"""
    ran = subprocess.run(
        [sys.executable, "-c", script], capture_output=True, text=True, check=False
    )
    assert ran.returncode == 0, ran.stderr
    number, folder = ran.stdout.split()
    for _ in range(100):
        if not running(number):
            break
        time.sleep(0.05)
    assert not running(number)
    assert not Path(folder).exists()


def test_an_engine_that_crashes_is_no_crash_of_ours(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    child = tmp_path / "crash.py"
    child.write_text("import os; os._exit(17)", encoding="utf-8")
    monkeypatch.setattr(pulp_process, "CHILD", child)
    monkeypatch.setattr(pulp_process, "_idle", [])
    outcome = prove(TRADE, engine=PulpEngine("crash"))
    judge(TRADE, outcome)
    assert outcome.value == prove(TRADE).value
    report = PulpEngine("crash").solve(TRADE, Watch())
    assert (report.status, report.message) == ("failed", "the engine's process ended with code 17")


def test_nothing_is_printed_on_stdout() -> None:
    script = (
        "from tests.engines.test_pulp_bridge import *\n"
        "for name in ENGINES:\n"
        "    assert prove(TRADE, engine=bridge(name)).proved\n"
    )
    ran = subprocess.run(
        [sys.executable, "-c", script], capture_output=True, text=True, check=False
    )
    assert ran.returncode == 0, ran.stderr
    assert ran.stdout == ""
