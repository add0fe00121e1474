"""Small benchmark problems: every way gives the same answer, and wrong ones are noticed."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest

from benchmarks import report
from benchmarks.__main__ import main
from benchmarks.child import LONG, peak_mib, write
from benchmarks.measure import Measured, Series, measure
from benchmarks.registry import PROBLEMS, Problem, problem
from benchmarks.targets import Target, targets
from benchmarks.ways import WAYS, Run
from designer import read_scenario

SMALL = [one for one in PROBLEMS if one.small]


def series(way: str, *seconds: float, over: float | None = None) -> Series:
    sizes = {"rows": 12_000, "columns": 1, "nonzeros": 1}
    parts = {"formulate": seconds[0] / 2} if seconds else {}
    road = "full" if way == "full" else "shortcut"
    runs = [Run(s, "possible", 2.0, "2", True, road, parts, sizes) for s in seconds]
    return Series(way, runs, [40.0 for _ in seconds], over)


def measured(**changes: float) -> Measured:
    """A problem with invented timings."""
    return Measured(
        problem("floor-3x15"),
        {
            "ours": series("ours", 1.0, 2.0, 3.0),
            "full": series("full", changes.get("full", 4.0)),
            "textbook": series("textbook", over=60.0),
            "highs": series("highs", changes.get("highs", 4.0)),
        },
    )


def test_names_are_unique_and_ways_known() -> None:
    names = [one.name for one in PROBLEMS]
    assert len(set(names)) == len(names)
    assert {way for one in PROBLEMS for way in one.ways} <= {*WAYS, "shell"}
    assert any(one.smoke for one in PROBLEMS)
    assert all(one.small for one in PROBLEMS if one.smoke)


@pytest.mark.parametrize("one", PROBLEMS, ids=lambda one: one.name)
def test_files_are_the_same_every_time(one: Problem) -> None:
    assert one.files() == one.files()


@pytest.mark.parametrize("one", SMALL, ids=lambda one: one.name)
def test_every_way_gives_the_same_answer(one: Problem, tmp_path: Path) -> None:
    path = write(one.files(), tmp_path)
    assert read_scenario(path).digest == read_scenario(path).digest
    found = Measured(one, {})
    for way in one.ways:
        if way in ("shell", "recheck"):  # timed from outside; the command has its own tests
            continue
        found.series[way] = Series(way, [WAYS[way](path)])
    assert found.faults == []
    if "ours" in found.series:
        assert found.series["ours"].runs[0].proved


def test_a_measuring_process_reports_back() -> None:
    one = replace(problem("second-4"), ways=("ours", "linprog"))
    found = measure(one, rounds=1, budget=60.0, once=True, tell=lambda _: None)
    assert found.faults == []
    assert found.ratio("linprog") is not None
    assert all((kept.peak or 0) > 10 for kept in found.series.values())


def test_a_way_that_outlives_its_budget_is_stopped() -> None:
    one = replace(problem("floor-3x15"), ways=("textbook",))
    found = measure(one, rounds=2, budget=-LONG, once=True, tell=lambda _: None)
    assert found.series["textbook"].over == -LONG
    assert found.series["textbook"].runs == []


def test_a_way_that_fails_is_a_fault() -> None:
    one = replace(problem("second-4"), ways=("no such way",))
    found = measure(one, rounds=1, budget=60.0, once=True, tell=lambda _: None)
    assert found.faults == ["second-4, no such way: KeyError: 'no such way'"]


def test_a_wrong_answer_is_a_fault() -> None:
    found = measured()
    assert found.faults == []
    found.series["highs"].runs[0] = Run(1.0, "possible", 2.001)
    found.series["linprog"] = Series("linprog", [Run(1.0, "impossible")])
    assert found.faults == [
        "floor-3x15, highs: 2.001, ours is 2.0",
        "floor-3x15, linprog: impossible, not possible",
    ]


def test_ratios() -> None:
    found = measured()
    assert found.ratio("highs") == (2.0, 4.0, False)
    assert found.ratio("textbook") == (30.0, 60.0, True)
    assert found.ratio("linprog") is None


def test_targets_are_read_off_the_run() -> None:
    assert targets([measured()], []) == [
        Target("floor-3x15: full program, faster than the textbook", "≥ 15×", "> 15×", True),
        Target(
            "floor-3x15: full program, formulate + prove over HiGHS alone", "< 0.5", "0.50", False
        ),
        Target("floor-3x15: shortcut, no slower than full", "≥ 1×", "2.00× (4.00×)", True),
    ]
    assert targets([measured(highs=5.0)], [])[1].met
    assert not targets([measured(full=0.5)], [])[2].met


def test_the_report_says_what_was_stopped_and_what_is_wrong() -> None:
    text = report.document([measured()], [], [], ["a fault"])
    assert "| > 60 " in text
    assert "> 30× (> 60×)" in text
    assert "- a fault" in text
    assert "All ways gave the same answers" not in text


def test_peak_memory_is_that_of_a_python_process() -> None:
    assert 10 < peak_mib() < 8192


def test_listing_and_unknown_names(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["--list"]) == 0
    assert "floor-3x15" in capsys.readouterr().out
    assert main(["--only", "nothing-of-that-name"]) == 2


def test_a_turn_that_does_not_fit_is_left_out() -> None:
    one = replace(problem("second-4"), ways=("ours",))
    found = measure(one, rounds=1, budget=60.0, once=True, tell=lambda _: None, until=0.0)
    assert found.faults == []
    assert found.series["ours"].runs == []
    assert "not measured" in report.compared([found])
    assert "(`--within`): second-4, ours." in report.document([found], [], [], [])


@pytest.mark.parametrize("met", [True, False])
def test_a_stopped_way_can_meet_a_target(met: bool) -> None:
    ours = series("ours", 0.01 if met else 1.0)
    found = Measured(problem("whole-3x25"), {"ours": ours, "highs": series("highs", over=20.0)})
    told = "> 2e+03×" if met else "> 20×"
    assert targets([found], []) == [
        Target("whole-3x25: ours, faster than highs", "≥ 300×", told, met)
    ]


def test_an_answer_in_time_counts_only_if_proved() -> None:
    ours = series("ours", 0.5)
    found = Measured(problem("money-8x9"), {"ours": ours})
    says = "money-8x9: ours, answered and proved"
    assert targets([found], []) == [Target(says, "≤ 1 s, ≤ 1 GiB", "0.50 s, 40 MiB", True)]
    ours.runs[0] = replace(ours.runs[0], proved=False)
    assert not targets([found], [])[0].met
