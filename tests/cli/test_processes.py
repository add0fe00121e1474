"""The command line in processes of its own: start-up, pipes, terminals, Ctrl-C."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
from pathlib import Path

import pytest

from designer.cli.output import Progress
from tests.cli.running import ROOT, SCENARIOS, spawn

HEAVY = ("pandas", "scipy", "pulp", "matplotlib", "flint", "jsonschema", "IPython")


@pytest.mark.parametrize(
    ("words", "absent"),
    [
        (("pose", "scenarios/breakwater.toml", "--json"), (*HEAVY, "rich")),
        (("pose", "scenarios/breakwater.toml", "--ir", "none"), HEAVY),
        (("audit", "scenarios/ropewalk.toml", "scenarios/ropewalk-draft.csv"), (*HEAVY, "highspy")),
        (("recheck", "scenarios/lock-sale-proof.json"), (*HEAVY, "numpy", "highspy")),
        (("--help",), (*HEAVY, "numpy", "highspy", "rich")),
    ],
)
def test_nothing_heavy_is_imported(words: tuple[str, ...], absent: tuple[str, ...]) -> None:
    code = (
        "import sys\n"
        "from designer.cli import main\n"
        "try:\n"
        f"    main({list(words)!r})\n"
        "except SystemExit:\n"
        "    print(sorted(sys.modules), file=sys.stderr)\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", code],
        capture_output=True,
        text=True,
        timeout=120,
        check=True,
        cwd=ROOT,
    )
    loaded = {name.strip("'[]") for name in done.stderr.splitlines()[-1].split(", ")}
    assert "designer.cli" in loaded
    assert not loaded & set(absent)


@pytest.mark.parametrize("engine", ["pulp:PULP_CBC_CMD", "pulp:HiGHS"])
def test_another_engine_in_a_fresh_process(engine: str) -> None:
    """HiGHS makes the corner of an engine without bases before it has solved anything."""
    done = spawn("pose", "scenarios/reef.toml", "--engine", engine, "--json")
    assert (done.code, done.err) == (0, "")
    verdict = json.loads(done.out)
    assert verdict["proved"]
    assert verdict["goal"]["value"] == "165/4"
    assert verdict["engine"].startswith(engine)


def test_the_recheck_runs_without_any_engine() -> None:
    code = (
        "import sys\n"
        "for name in ('numpy', 'scipy', 'highspy', 'flint', 'pulp', 'pandas'):\n"
        "    sys.modules[name] = None\n"
        "from designer.cli import main\n"
        "main(['recheck', 'scenarios/lock-sale-proof.json'])\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", code],
        capture_output=True,
        text=True,
        timeout=120,
        check=False,
        cwd=ROOT,
    )
    assert (done.returncode, done.stderr) == (0, "")
    assert done.stdout.startswith("HOLDS.")


@pytest.mark.parametrize(
    ("words", "code"),
    [
        (("pose", "scenarios/reef.toml"), 0),
        (("pose", "scenarios/lock-sale.toml"), 1),
        (("pose", "nowhere.toml"), 2),
        (("pose", "scenarios/reef.toml", "--time-limit", "0"), 3),
        (("pose", "scenarios/reef.toml", "--ir", "none"), 4),
    ],
)
def test_exit_codes_reach_the_shell(words: tuple[str, ...], code: int) -> None:
    found = spawn(*words)
    assert found.code == code
    assert "Traceback" not in found.err
    assert bool(found.out) == (code != 2)


@pytest.mark.parametrize("env", [{"NO_COLOR": "1"}, {"TERM": "dumb"}, {"FORCE_COLOR": ""}])
def test_piped_screens_carry_no_escapes_and_fit(env: dict[str, str]) -> None:
    found = spawn("pose", "scenarios/breakwater.toml", "--ir", "none", **env)
    assert "\x1b" not in found.out
    assert max(map(len, found.out.splitlines())) <= 80


def test_an_ascii_terminal_is_no_error() -> None:
    found = spawn("pose", "scenarios/lock-sale.toml", PYTHONIOENCODING="ascii")
    assert found.code == 1
    assert "\\u2265 -30" in found.out
    assert found.err == ""


def test_stdout_is_one_document_under_json() -> None:
    found = spawn("pose", "scenarios/dawn-berth.toml", "--json", "--decision", "deterministic")
    document = json.loads(found.out)
    assert document["verdict"] == "possible"
    assert found.code == 0
    assert "Copyright" not in found.err + found.out


@pytest.mark.skipif(os.name != "posix", reason="pipes as POSIX has them")
def test_a_reader_who_leaves_early_changes_nothing(tmp_path: Path) -> None:
    read, write = os.pipe()
    os.close(read)
    try:
        done = subprocess.run(
            [sys.executable, "-m", "designer", "pose", "scenarios/reef.toml", "--save", tmp_path],
            stdout=write,
            stderr=subprocess.PIPE,
            text=True,
            timeout=120,
            check=False,
            cwd=ROOT,
        )
    finally:
        os.close(write)
    assert done.returncode == 0
    assert "BrokenPipe" not in done.stderr
    assert "Traceback" not in done.stderr
    assert (tmp_path / "proof.json").exists()


LONG = """
title = "A long search"
decisions.options = ["build", "leave"]
designer.outlay = {{ build = 60 }}
{parties}
[demands]
decision = "deterministic"
ic = "dominant"
ir = "ex-post"
goal = "welfare"
"""


def long_scenario(folder: Path) -> Path:
    """Three parties of nine types, one sure decision for each of 729 cases: minutes of work."""
    types = list(range(1, 10))
    parties = "".join(
        f'[[party]]\nname = "P{i}"\ntypes = {types}\nweights = {types}\n'
        f'value = {{ build = "type ** 2 - {i} * type", leave = 0 }}\n'
        for i in range(3)
    )
    path = folder / "long.toml"
    path.write_text(LONG.format(parties=parties), encoding="utf-8")
    return path


@pytest.mark.skipif(os.name != "posix", reason="signals as POSIX has them")
def test_ctrl_c_ends_cleanly_and_honestly(tmp_path: Path) -> None:
    folder = tmp_path / "out"
    process = subprocess.Popen(
        [
            sys.executable,
            "-m",
            "designer",
            "pose",
            str(long_scenario(tmp_path)),
            "--progress",
            "--save",
            str(folder),
        ],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        cwd=ROOT,
    )
    assert process.stderr is not None
    first = process.stderr.readline()  # the first progress line: the search is under way
    process.send_signal(signal.SIGINT)
    out, err = process.communicate(timeout=120)
    assert " s" in first
    assert process.returncode == 3
    assert "UNDECIDED" in out + err
    assert "nterrupted" in out + err
    assert "Traceback" not in err
    assert not folder.exists()


@pytest.mark.skipif(os.name != "posix", reason="signals as POSIX has them")
def test_ctrl_c_while_modules_are_loaded() -> None:
    script = """
import os, signal, sys
awaited = sys.argv[1]
class Pressed:
    def find_spec(self, name, path=None, target=None):
        if name == awaited:
            os.kill(os.getpid(), signal.SIGINT)
sys.meta_path.insert(0, Pressed())
from designer.__main__ import main
sys.argv[1:] = ["pose", "scenarios/reef.toml", "--json"]
main()
"""
    for module in ("typer", "designer.cli.rules", "designer.engines.highs", "numpy", "highspy"):
        done = subprocess.run(
            [sys.executable, "-c", script, module],
            capture_output=True,
            text=True,
            timeout=120,
            check=False,
            cwd=ROOT,
        )
        assert done.returncode == 3, (module, done.stderr)
        assert done.stderr in ("", "UNDECIDED: interrupted before anything was decided.\n")
        told = json.loads(done.stdout)  # an error document, or an undecided verdict
        assert told.get("kind", told.get("reason", "")).startswith("interrupted")


def test_progress_keeps_to_stderr_and_is_wiped(capsys: pytest.CaptureFixture[str]) -> None:
    with Progress(None) as silent:  # captured: no terminal
        silent("solve", 9.0, 3)
    assert not silent.clock.is_alive()
    with Progress(True) as shown:
        shown.draw(3.2)
        shown("solve", 9.0, 1200)
        shown.draw(9.0)
    out, err = capsys.readouterr()
    assert out == ""
    assert err == "work: 3 s\nsolve: 9 s, step 1,200\n"
    with Progress(True) as written_over:
        written_over.terminal = True
        written_over("solve", 9.0, 1200)
        written_over.draw(9.0)
        written_over("prove", 9.6, 0)
        written_over.draw(9.6)
    err = capsys.readouterr().err
    assert err == "\rsolve: 9 s, step 1,200\rprove: 10 s           \r" + " " * 11 + "\r"


def test_completion_scripts_exist() -> None:
    found = spawn("--show-completion", "bash", _TYPER_COMPLETE_TEST_DISABLE_SHELL_DETECTION="1")
    assert found.code == 0
    assert "_DESIGNER_COMPLETE" in found.out


def test_words_are_completed() -> None:
    found = spawn(
        _DESIGNER_COMPLETE="complete_bash",
        COMP_WORDS="designer pose x.toml --ic b",
        COMP_CWORD="4",
    )
    assert "bayesian" in found.out.split()
    found = spawn(
        _DESIGNER_COMPLETE="complete_bash",
        COMP_WORDS="designer pose x.toml --goal welfare,sw",
        COMP_CWORD="4",
    )
    assert "welfare,swing" in found.out.split()


def test_the_shipped_scenarios_are_where_the_examples_say() -> None:
    for name in (
        "breakwater.toml",
        "dawn-berth.toml",
        "ropewalk-draft.csv",
        "lock-sale-proof.json",
    ):
        assert (SCENARIOS / name).is_file()
