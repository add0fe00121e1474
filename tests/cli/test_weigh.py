"""`designer weigh` as a user meets it."""

from __future__ import annotations

import csv
import json
import os
import signal
import subprocess
import sys
import time
from fractions import Fraction
from pathlib import Path

import pytest

from designer.cli import weigh as command
from designer.views import figure
from designer.weighing.tradeoff import PARTS
from tests.cli.running import ROOT, SCENARIOS, run
from tests.published.families import midpoints, trade

Capsys = pytest.CaptureFixture[str]
LOCK = SCENARIOS / "lock-sale.toml"
BERTH = SCENARIOS / "dawn-berth.toml"


@pytest.mark.parametrize(
    ("words", "code", "verdict"),
    [
        ([BERTH], 0, "possible"),
        ([LOCK], 1, "impossible"),
        ([LOCK, "--decision", "randomized"], 0, "possible"),
        ([LOCK, "--time-limit", "0"], 3, "undecided"),
    ],
)
def test_exit_codes_and_one_document(
    capsys: Capsys, words: list[object], code: int, verdict: str
) -> None:
    people = run(capsys, "weigh", *words)
    assert people.code == code
    assert verdict.upper() in people.out
    assert people.err == ""
    program = run(capsys, "weigh", *words, "--json")
    assert program.code == code
    found = json.loads(program.out)
    assert (found["format"], found["verdict"]) == ("designer.tradeoff/1", verdict)
    assert found["complete"] is (verdict != "undecided")
    silent = run(capsys, "weigh", *words, "--quiet")
    assert (silent.code, silent.out, silent.err) == (code, "", "")


def test_the_options_of_pose_change_what_is_weighed(capsys: Capsys) -> None:
    found = json.loads(
        run(capsys, "weigh", LOCK, "--subsidy", "1", "--only", "prices", "--json").out
    )
    (money, *_) = found["ways_out"]
    assert (money["amount"], money["asked"], money["becomes"]) == ("3/2", "1", "5/2")
    assert found["frontiers"] == []
    compelled = run(capsys, "weigh", LOCK, "--compel", "Mill", "--only", "collisions")
    assert compelled.code == 0


def test_usage_errors(capsys: Capsys) -> None:
    for words in (["--only", "prizes"], ["--ic", "perfect"], ["--engine", "pulp:NOSUCH"]):
        wrong = run(capsys, "weigh", LOCK, *words)
        assert wrong.code == 2, words
        assert wrong.out == ""
        assert words[1].removeprefix("pulp:") in wrong.err
    assert run(capsys, "weigh", "no-such-file.toml").code == 2


def test_parts_offered_are_the_parts_there_are() -> None:
    assert command.PARTS == PARTS
    assert command._parts("l") == ["ledger", "ladders"]


def test_saved_files(capsys: Capsys, tmp_path: Path) -> None:
    pytest.importorskip("matplotlib")
    out = tmp_path / "out"
    done = run(capsys, "weigh", LOCK, "--save", out, "--no-plots")
    assert done.code == 1
    assert "can be had" not in done.out
    assert "Saved in" in done.err
    names = {path.name for path in out.iterdir()}
    pairs = ("money-shortfall", "money-welfare", "shortfall-welfare", "lies-money")
    assert names == {
        "tradeoff.json",
        "ways-out.csv",
        "datapackage.json",
        "corners-money-shortfall-welfare.csv",
        *(f"frontier-{pair}.{kind}" for pair in pairs for kind in ("csv", "png", "svg")),
    }
    document = json.loads((out / "tradeoff.json").read_text(encoding="utf-8"))
    assert set(document["files"]) == names
    with (out / "ways-out.csv").open(encoding="utf-8") as file:
        rows = list(csv.DictReader(file))
    assert (rows[0]["relax"], Fraction(rows[0]["amount"])) == ("outside-money", Fraction(5, 2))
    # A later page takes away what it does not have.
    assert run(capsys, "weigh", BERTH, "--save", out).code == 0
    assert {path.name for path in out.iterdir()} == {"tradeoff.json"}


def test_without_matplotlib_the_rest_is_saved(
    capsys: Capsys, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(figure, "installed", lambda: False)
    done = run(capsys, "weigh", LOCK, "--save", tmp_path / "out")
    assert done.code == 1
    assert "matplotlib is not installed" in done.err
    kinds = {path.suffix for path in (tmp_path / "out").iterdir()}
    assert kinds == {".csv", ".json"}


def big_scenario(folder: Path, size: int) -> Path:
    """Uniform trade on midpoints, in units that make the types whole."""
    data = trade(midpoints(size))
    buyer, seller = (
        ", ".join(str(int(Fraction(kind) * 2 * size)) for kind in agent["types"])
        for agent in data["agents"]
    )
    weights = ", ".join(["1"] * size)
    text = f"""
title = "A long line of types"
money = "crowns"
[decisions]
options = ["keep", "sell"]
[[party]]
name = "Buyer"
types = [{buyer}]
weights = [{weights}]
value = {{ keep = 0, sell = "type" }}
[[party]]
name = "Seller"
types = [{seller}]
weights = [{weights}]
value = {{ keep = 0, sell = "-type" }}
"""
    path = folder / "long.toml"
    path.write_text(text, encoding="utf-8")
    return path


@pytest.mark.skipif(sys.platform == "win32", reason="signals of POSIX")
def test_ctrl_c_shows_and_saves_what_was_found(tmp_path: Path) -> None:
    """The prices appear on stderr as they are found; then Ctrl-C; the page says INCOMPLETE."""
    scenario = big_scenario(tmp_path, 60)
    out = tmp_path / "out"
    process = subprocess.Popen(
        [
            sys.executable,
            "-m",
            "designer",
            "weigh",
            str(scenario),
            "--progress",
            "--save",
            str(out),
        ],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        encoding="utf-8",
        cwd=ROOT,
        env={**os.environ, "COLUMNS": "80"},
    )
    assert process.stderr is not None
    seen = ""
    deadline = time.monotonic() + 90
    while "outside money:" not in seen and time.monotonic() < deadline:
        seen += process.stderr.readline()
    process.send_signal(signal.SIGINT)
    page, rest = process.communicate(timeout=90)
    assert "impossible, proved" in seen
    assert process.returncode == 1, rest
    text = " ".join(page.split())
    assert "INCOMPLETE: it was interrupted" in text
    document = json.loads((out / "tradeoff.json").read_text(encoding="utf-8"))
    assert document["complete"] is False
    assert document["reasons"] == {"page": "interrupted"}
    assert document["ways_out"][0]["relax"] == "outside-money"


def test_a_time_limit_keeps_what_was_found(capsys: Capsys, tmp_path: Path) -> None:
    done = run(capsys, "weigh", big_scenario(tmp_path, 60), "--time-limit", "4", "--json")
    found = json.loads(done.out)
    assert found["complete"] is False
    assert found["reasons"]["page"] == "the time limit was reached"
    assert done.code in (1, 3)
    assert (done.code == 1) is (found["verdict"] == "impossible")
