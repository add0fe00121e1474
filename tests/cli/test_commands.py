"""The commands as a user meets them: exit codes, streams, documents, saved files."""

from __future__ import annotations

import json
import shlex
import shutil
from pathlib import Path
from typing import Any

import pytest
import typer

from designer.cli import app
from tests.cli.running import ROOT, SCENARIOS, run

Capsys = pytest.CaptureFixture[str]
LOCK = SCENARIOS / "lock-sale.toml"
BERTH = SCENARIOS / "dawn-berth.toml"
BREAKWATER = SCENARIOS / "breakwater.toml"


def document(text: str) -> dict[str, Any]:
    found = json.loads(text)
    assert isinstance(found, dict)
    return found


# --- exit codes and streams -------------------------------------------------------------------


@pytest.mark.parametrize(
    ("words", "code", "verdict"),
    [
        ([BERTH], 0, "possible"),
        ([LOCK], 1, "impossible"),
        ([BREAKWATER, "--time-limit", "0"], 3, "undecided"),
        ([BERTH, "--ir", "none"], 4, "unbounded"),
    ],
)
def test_exit_codes_and_one_document(
    capsys: Capsys, words: list[object], code: int, verdict: str
) -> None:
    people = run(capsys, "pose", *words)
    assert people.code == code
    assert verdict.upper() in people.out
    assert people.err == ""
    program = run(capsys, "pose", *words, "--json")
    assert program.code == code
    found = document(program.out)
    assert found["verdict"] == verdict
    assert found["proved"] is (verdict != "undecided")
    assert {"format", "scenario", "demands", "verdict", "proved", "goal", "path", "seconds"} <= set(
        found
    )
    assert found["files"] == {}
    silent = run(capsys, "pose", *words, "--quiet")
    assert (silent.code, silent.out, silent.err) == (code, "", "")


def test_overrides_reach_the_demands(capsys: Capsys) -> None:
    words = (
        "--decision randomized --ic dominant --ir ex-ante --balance ex-ante --budget no-deficit "
        "--goal welfare,swing --subsidy 1/3 --slack 0.5 --tidy none --even-handed --compel Suth"
    )
    found = run(capsys, "pose", BREAKWATER, *shlex.split(words), "--json")
    assert found.code == 0
    demands = document(found.out)["demands"]
    assert demands == {
        "decision": "randomized",
        "ic": "dominant",
        "ir": "ex-ante",
        "balance": "ex-ante",
        "budget": "no-deficit",
        "goal": ["welfare", "swing"],
        "subsidy": "1/3",
        "slack": "1/2",
        "tidy": "none",
        "even_handed": True,
        "compelled": ["Suth"],
    }


def test_compelling_adds_to_the_scenario_s_own(capsys: Capsys, tmp_path: Path) -> None:
    text = BREAKWATER.read_text(encoding="utf-8")
    own = tmp_path / "own.toml"
    own.write_text(
        text.replace('name    = "Norhaven"', 'name = "Norhaven"\ncompelled = true'),
        encoding="utf-8",
    )
    found = run(capsys, "pose", own, "--compel", "Suth", "--compel", "Eastmole", "--json")
    assert document(found.out)["demands"]["compelled"] == ["Eastmole", "Norhaven", "Suth"]
    assert found.code == 0  # nobody is asked, so something is possible


def test_negative_amounts_are_values_not_options(capsys: Capsys) -> None:
    found = run(capsys, "pose", BERTH, "--subsidy", "-50", "--json")
    assert document(found.out)["demands"]["subsidy"] == "-50"


# --- mistakes ---------------------------------------------------------------------------------


def test_all_mistakes_at_once_in_words(capsys: Capsys) -> None:
    found = run(capsys, "pose", LOCK, "--ir", "maybe", "--goal", "fame", "--subsidy", "a lot")
    assert found.code == 2
    assert found.out == ""
    assert found.err.splitlines()[0] == "3 mistakes"
    assert (
        "demands.ir: found 'maybe'; expected one of none, ex-ante, interim, ex-post." in found.err
    )


@pytest.mark.parametrize(
    ("words", "kind", "says"),
    [
        (["pose", LOCK, "--goal", "fame"], "input", "demands.goal: found 'fame'"),
        (["pose", "nowhere.toml"], "input", "nowhere.toml: 1 mistake"),
        (["pose", LOCK, "--engine", "zip"], "input", "--engine: found 'zip'"),
        (["pose", LOCK, "--compel", "Bob"], "input", "demands.compelled: found 'Bob'"),
        (["pose", LOCK, "--frob"], "usage", "No such option: --frob"),
        (["pose", LOCK, "--rows", "some"], "usage", "--rows"),
        (["pose", LOCK, "--rows", "-1"], "usage", "--rows"),
        (["pose"], "usage", "SCENARIO"),
        (["audit", LOCK, "nowhere.csv"], "input", "nowhere.csv: 1 mistake"),
        (["audit", LOCK, LOCK, "--tolerance", "-1"], "input", "--tolerance: found '-1'"),
        (["recheck", "nowhere.json"], "input", "nowhere.json: 1 mistake"),
        (["recheck", LOCK], "input", "lock-sale.toml: 1 mistake"),
    ],
)
def test_bad_input_is_said_the_same_to_people_and_programs(
    capsys: Capsys, words: list[object], kind: str, says: str
) -> None:
    people = run(capsys, *words)
    assert people.code == 2
    assert people.out == ""
    assert says in people.err
    assert "Traceback" not in people.err
    program = run(capsys, *words, "--json")
    assert program.code == 2
    found = document(program.out)
    assert (found["format"], found["kind"], found["exit_code"]) == ("designer.error/1", kind, 2)
    assert says in found["message"]
    assert found["message"] in program.err
    assert bool(found["mistakes"]) == (kind == "input")


def test_an_unknown_command_and_none_at_all(capsys: Capsys) -> None:
    unknown = run(capsys, "frob")
    assert (unknown.code, unknown.out) == (2, "")
    assert "No such command 'frob'" in unknown.err
    none = run(capsys)
    assert (none.code, none.out) == (2, "")
    assert "Usage: designer" in none.err


def test_a_bug_of_ours_is_one_line(capsys: Capsys, monkeypatch: pytest.MonkeyPatch) -> None:
    def broken(*args: object, **options: object) -> None:
        raise RuntimeError("the roof is\nleaking")

    monkeypatch.setattr("designer.posing.pose", broken)
    found = run(capsys, "pose", LOCK)
    assert (found.code, found.out) == (70, "")
    assert found.err.count("\n") == 1
    assert found.err.startswith(
        "A bug of ours, and we are sorry: RuntimeError: the roof is leaking"
    )
    assert "report it" in found.err
    program = run(capsys, "pose", LOCK, "--json")
    assert program.code == 70
    assert document(program.out)["kind"] == "bug"
    monkeypatch.setenv("DESIGNER_TRACEBACK", "1")
    assert "Traceback (most recent call last)" in run(capsys, "pose", LOCK).err


def while_loading() -> ImportError:
    """What compiled modules make of a Ctrl-C that comes while they load."""
    error = ImportError("initialization failed")
    error.__cause__ = KeyboardInterrupt()
    return error


@pytest.mark.parametrize(
    ("error", "kind"),
    [
        (KeyboardInterrupt(), "interrupted"),
        (while_loading(), "interrupted"),
        (MemoryError(), "memory"),
    ],
)
def test_an_early_end_is_undecided(
    capsys: Capsys,
    monkeypatch: pytest.MonkeyPatch,
    tmp_path: Path,
    error: BaseException,
    kind: str,
) -> None:
    def stopped(*args: object, **options: object) -> None:
        raise error

    monkeypatch.setattr("designer.posing.pose", stopped)
    found = run(capsys, "pose", LOCK, "--save", tmp_path / "out")
    assert (found.code, found.out) == (3, "")
    assert found.err.startswith("UNDECIDED: ")
    assert not (tmp_path / "out").exists()
    assert document(run(capsys, "pose", LOCK, "--json").out)["kind"] == kind


# --- saving -----------------------------------------------------------------------------------

EVERYTHING = {"transfers.csv", "interim.csv", "datapackage.json", "verdict.json", "proof.json"}


def names(folder: Path) -> set[str]:
    return {path.name for path in folder.iterdir()}


def test_saved_files_are_complete_and_hold(capsys: Capsys, tmp_path: Path) -> None:
    folder = tmp_path / "out"
    found = run(capsys, "pose", BERTH, "--save", folder, "--json")
    assert names(folder) == EVERYTHING
    assert f"Saved in {folder}" in found.err
    said = document(found.out)
    assert {Path(path).name for path in said["files"].values()} == EVERYTHING
    assert all(Path(path).is_file() for path in said["files"].values())
    assert document((folder / "verdict.json").read_text(encoding="utf-8")) == said
    package = document((folder / "datapackage.json").read_text(encoding="utf-8"))
    assert {resource["path"] for resource in package["resources"]} >= {
        "transfers.csv",
        "interim.csv",
    }
    audited = run(capsys, "audit", BERTH, folder / "transfers.csv")
    assert audited.code == 0
    assert audited.out.splitlines().count("HOLDS.") == 1
    rechecked = run(capsys, "recheck", folder / "proof.json", "--scenario", BERTH)
    assert rechecked.code == 0
    assert "rebuilt from the scenario" in rechecked.out


def test_an_impossible_verdict_takes_away_the_tables_of_an_earlier_one(
    capsys: Capsys, tmp_path: Path
) -> None:
    folder = tmp_path / "out"
    assert run(capsys, "pose", LOCK, "--ir", "none", "--save", folder).code == 0
    (folder / "notes.txt").write_text("mine", encoding="utf-8")
    assert names(folder) == EVERYTHING | {"notes.txt"}
    assert run(capsys, "pose", LOCK, "--save", folder).code == 1
    assert names(folder) == {"verdict.json", "proof.json", "notes.txt"}
    assert run(capsys, "pose", LOCK, "--save", folder, "--time-limit", "0").code == 3
    assert names(folder) == {"verdict.json", "notes.txt"}
    said = document((folder / "verdict.json").read_text(encoding="utf-8"))
    assert (said["verdict"], list(said["files"])) == ("undecided", ["verdict"])


def test_an_interrupted_search_leaves_the_folder_alone(
    capsys: Capsys, monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    folder = tmp_path / "out"
    run(capsys, "pose", LOCK, "--ir", "none", "--save", folder)
    before = {path.name: path.read_bytes() for path in folder.iterdir()}

    def interrupted(*args: object, **options: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr("designer.proof.prove.settle", interrupted)
    found = run(capsys, "pose", LOCK, "--ir", "none", "--save", folder)
    assert found.code == 3
    assert "Why: interrupted" in found.out
    assert "is left as it was" in found.err
    assert {path.name: path.read_bytes() for path in folder.iterdir()} == before


def test_a_folder_that_cannot_be_written_is_bad_input(capsys: Capsys, tmp_path: Path) -> None:
    blocked = tmp_path / "file"
    blocked.write_text("", encoding="utf-8")
    found = run(capsys, "pose", LOCK, "--save", blocked)
    assert found.code == 2
    assert "a place that can be written" in found.err


@pytest.mark.parametrize("ending", ["mps", "lp"])
def test_export_names_rows_by_what_they_say(capsys: Capsys, tmp_path: Path, ending: str) -> None:
    path = tmp_path / f"program.{ending}"
    found = run(capsys, "pose", LOCK, "--export", path)
    assert found.code == 1
    assert found.err == f"Program written to {path}.\n"
    text = path.read_text(encoding="utf-8")
    for name in ("Honest_Guild_60_20", "TakesPart_Mill_50", "Pays_Guild_20_50", "Balances_20_10"):
        assert name in text
    wrong = run(capsys, "pose", LOCK, "--export", tmp_path / "program.txt")
    assert wrong.code == 2
    assert "--export" in wrong.err


# --- audit and recheck ------------------------------------------------------------------------


def test_audit_of_a_drafted_table(capsys: Capsys) -> None:
    draft = SCENARIOS / "ropewalk-draft.csv"
    scenario = SCENARIOS / "ropewalk.toml"
    broken = run(capsys, "audit", scenario, draft)
    assert broken.code == 1
    assert "DOES NOT HOLD." in broken.out
    assert run(capsys, "audit", scenario, draft, "--ic", "none").code == 0
    assert run(capsys, "audit", scenario, draft, "--slack", "80/3").code == 0
    assert run(capsys, "audit", scenario, draft, "--slack", "26.66").code == 1
    assert run(capsys, "audit", scenario, draft, "--tolerance", "27").code == 0
    assert run(capsys, "audit", scenario, draft, "--slack", "27", "--subsidy", "1").code == 1
    found = document(run(capsys, "audit", scenario, draft, "--json").out)
    assert found["format"] == "designer.audit/1"
    assert (found["satisfied"], found["failing"]) == (False, ["ic-bayesian"])
    assert found["asked"]["ic"] == "bayesian"


def test_audit_says_under_which_demands_a_table_was_made(capsys: Capsys, tmp_path: Path) -> None:
    folder = tmp_path / "out"
    words = ["--decision", "randomized", "--ic", "dominant", "--ir", "ex-post"]
    words += ["--budget", "no-deficit", "--goal", "welfare"]
    assert run(capsys, "pose", BREAKWATER, *words, "--save", folder).code == 0
    found = run(capsys, "audit", BREAKWATER, folder / "transfers.csv")
    assert found.code == 1
    assert "Broken: efficient decisions." in found.out
    options = found.err.strip().partition("hold it to them with ")[2]
    assert options == "--decision randomized --ic dominant --ir ex-post --budget no-deficit"
    again = run(capsys, "audit", BREAKWATER, folder / "transfers.csv", *options.split())
    assert (again.code, again.err) == (0, "")
    (folder / "verdict.json").write_text("{", encoding="utf-8")
    assert run(capsys, "audit", BREAKWATER, folder / "transfers.csv").err == ""


def test_audit_asks_for_alike_treatment(capsys: Capsys, tmp_path: Path) -> None:
    """Norhaven and Suth have equal data; a crown more from one of them tells them apart."""
    folder = tmp_path / "out"
    words = ["--ic", "none", "--ir", "none", "--balance", "none", "--goal", "any"]
    assert run(capsys, "pose", BREAKWATER, *words, "--save", folder).code == 0
    table = folder / "transfers.csv"
    assert run(capsys, "audit", BREAKWATER, table, *words[:-2], "--even-handed").code == 0
    lines = table.read_text(encoding="utf-8").splitlines(keepends=True)
    header, cells = lines[0].strip().split(","), lines[2].strip().split(",")
    place = header.index("pays:Norhaven")
    assert cells[place] == "0"
    cells[place], cells[-1] = "1", "1"
    lines[2] = ",".join(cells) + "\n"
    table.write_text("".join(lines), encoding="utf-8")
    assert run(capsys, "audit", BREAKWATER, table, *words[:-2]).code == 0
    found = run(capsys, "audit", BREAKWATER, table, *words[:-2], "--even-handed")
    assert found.code == 1
    assert "parties with equal data alike" in found.out


def test_audit_takes_the_outside_money_that_a_goal_left_open(
    capsys: Capsys, tmp_path: Path
) -> None:
    text = LOCK.read_text(encoding="utf-8").replace('"any"', '"outside-money"')
    scenario = tmp_path / "open.toml"
    scenario.write_text(text, encoding="utf-8")
    folder = tmp_path / "out"
    assert run(capsys, "pose", scenario, "--save", folder).code == 0
    found = run(capsys, "audit", scenario, folder / "transfers.csv")
    assert found.code == 0
    assert "Outside money: 5/2 = 2.5 crowns." in found.out
    assert run(capsys, "audit", scenario, folder / "transfers.csv", "--subsidy", "2").code == 1


def test_outside_money_counts_only_cases_that_can_occur(capsys: Capsys, tmp_path: Path) -> None:
    """Off the support the pot may be anything: it is no outside money that is needed."""
    scenario = tmp_path / "support.toml"
    scenario.write_text(
        """
title = "Two crews who see the same"
profiles = "support"
decisions.options = ["go", "stay", "survey"]
designer.outlay = { go = 3, survey = 9 }
party = [
  { name = "Ann", types = [1, 5], value = { go = "type", stay = 2, survey = 0 } },
  { name = "Ben", types = [1, 5], value = { go = "type", stay = 0, survey = 0 } },
]
joint = [
  { at = { Ann = 1, Ben = 1 }, weight = 1 },
  { at = { Ann = 5, Ben = 5 }, weight = 1 },
]
rule = [
  { at = { Ann = 1, Ben = 1 }, take = "stay" },
  { at = { Ann = 5, Ben = 5 }, take = "go" },
  { take = "survey" },
]
[limits]
pays_at_most = 1
[demands]
decision = "table"
goal = "outside-money"
""",
        encoding="utf-8",
    )
    folder = tmp_path / "out"
    posed = run(capsys, "pose", scenario, "--save", folder)
    assert posed.code == 0
    assert "The least outside money needed is 1 money units." in posed.out
    assert "-1 money units in every case that can occur." in posed.out
    found = run(capsys, "audit", scenario, folder / "transfers.csv")
    assert (found.code, found.err) == (0, "")
    assert "Outside money: 1 money units." in found.out


def test_recheck_of_the_shipped_proof(capsys: Capsys, tmp_path: Path) -> None:
    proof = SCENARIOS / "lock-sale-proof.json"
    assert run(capsys, "recheck", proof, "--scenario", LOCK).code == 0
    other = run(capsys, "recheck", proof, "--scenario", BREAKWATER)
    assert other.code == 1
    assert "which is not this scenario's" in other.out
    stated = document(proof.read_text(encoding="utf-8"))
    stated["farkas"]["num"][0] += 1
    forged = tmp_path / "forged.json"
    forged.write_text(json.dumps(stated), encoding="utf-8")
    found = run(capsys, "recheck", forged, "--json")
    assert found.code == 1
    said = document(found.out)
    assert (said["format"], said["holds"]) == ("designer.recheck/1", False)
    assert said["faults"]
    assert said["compared"] is False


# --- help -------------------------------------------------------------------------------------

COMMANDS = sorted(typer.main.get_command(app).commands)  # type: ignore[attr-defined]


def examples(capsys: Capsys, command: str) -> list[str]:
    """The last lines of a command's help."""
    text = run(capsys, command, "--help").out
    lines = text.rstrip().splitlines()
    start = max(k for k, line in enumerate(lines) if line.strip() == "Examples:")
    return [line.strip() for line in lines[start + 1 :]]


@pytest.mark.parametrize("command", COMMANDS)
def test_every_command_s_help_ends_with_two_examples(capsys: Capsys, command: str) -> None:
    found = run(capsys, command, "-h")
    assert found.code == 0
    assert found.err == ""
    lines = examples(capsys, command)
    assert len(lines) == 2
    assert all(line.startswith("designer ") for line in lines)


@pytest.mark.parametrize("command", ["pose", "audit", "recheck"])
@pytest.mark.parametrize("number", [0, 1])
def test_the_examples_run(
    capsys: Capsys,
    monkeypatch: pytest.MonkeyPatch,
    tmp_path: Path,
    command: str,
    number: int,
) -> None:
    shutil.copytree(ROOT / "scenarios", tmp_path / "scenarios")
    monkeypatch.chdir(tmp_path)
    words = shlex.split(examples(capsys, command)[number])[1:]
    assert words[0] == command
    found = run(capsys, *words)
    assert found.code == 0
    assert found.out


def test_the_root_help_lists_commands_and_exit_codes(capsys: Capsys) -> None:
    found = run(capsys, "--help")
    assert found.code == 0
    for word in ("pose", "audit", "recheck", "--install-completion", "--show-completion"):
        assert word in found.out
    assert "Exit codes: 0 possible or holds" in found.out
    assert run(capsys, "--version").out.startswith("designer ")


def test_lines_of_a_help_page_fit(capsys: Capsys, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("COLUMNS", "80")
    for command in ("pose", "audit", "recheck"):
        text = run(capsys, command, "--help").out
        body = text.partition("Examples:")[0]
        assert max(map(len, body.splitlines())) <= 80
