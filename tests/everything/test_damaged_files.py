"""Commands on damaged files: no traceback, an exit code of 0 to 4, one document under --json."""

from __future__ import annotations

import json
import random
from pathlib import Path

import pytest

from tests.cli.running import run
from tests.everything import DEEP
from tests.setting.test_fuzz import SEEDS, spoil

ROUNDS = 2_000 if DEEP else 120
OPTIONS = (
    *(("--goal", word) for word in ("any", "floor,swing", "blend", "x", "")),
    *(("--decision", word) for word in ("table", "randomized", "deterministic")),
    *(("--rows", word) for word in ("0", "1", "1000000000")),
)
TOLERANCES = ("0", "1/100", "1e9", "1e999999999", "x", "-1", "nan")
Capsys = pytest.CaptureFixture[str]


def hold(capsys: Capsys, words: list[object], as_json: bool) -> int:
    """Run a command and look at how it ended."""
    done = run(capsys, *words, *(["--json"] if as_json else []))
    assert done.code in range(5), (words, done.err)
    assert "Traceback" not in done.out + done.err
    if as_json:
        assert json.loads(done.out)["format"].startswith("designer.")
    elif done.code == 2:
        assert done.out == ""
    assert done.out or done.err
    return done.code


def damaged(folder: Path, text: str, name: str, chance: random.Random) -> Path:
    """A file with a few random damages."""
    path = folder / name
    path.write_bytes(spoil(text, chance))
    return path


def test_pose(capsys: Capsys, tmp_path: Path) -> None:
    chance = random.Random(1)  # noqa: S311  repeatable damage, no secret
    codes = set()
    for _ in range(ROUNDS):
        path = damaged(tmp_path, chance.choice(SEEDS), "scenario.toml", chance)
        words: list[object] = ["pose", path, "--time-limit", "5"]
        if chance.random() < 0.5:
            words += chance.choice(OPTIONS)
        codes.add(hold(capsys, words, chance.random() < 0.5))
    assert {0, 1, 2} <= codes


@pytest.fixture
def saved(capsys: Capsys, tmp_path: Path) -> list[tuple[Path, Path]]:
    """Scenarios, each with a folder of what was saved for it."""
    found = []
    for k, text in enumerate(SEEDS):
        scenario, folder = tmp_path / f"{k}.toml", tmp_path / str(k)
        scenario.write_text(text, encoding="utf-8")
        words = ["--ir", "none", "--balance", "none", "--goal", "any", "--save", folder]
        assert run(capsys, "pose", scenario, *words).code == 0
        found.append((scenario, folder))
    return found


def test_audit(capsys: Capsys, tmp_path: Path, saved: list[tuple[Path, Path]]) -> None:
    chance = random.Random(2)  # noqa: S311  repeatable damage, no secret
    codes = set()
    for _ in range(ROUNDS):
        scenario, folder = chance.choice(saved)
        text = (folder / "transfers.csv").read_text("utf-8")
        words: list[object] = ["audit", scenario, damaged(tmp_path, text, "table.csv", chance)]
        if chance.random() < 0.3:
            words += ["--tolerance", chance.choice(TOLERANCES)]
        codes.add(hold(capsys, words, chance.random() < 0.5))
    assert {1, 2} <= codes


def test_recheck(capsys: Capsys, tmp_path: Path, saved: list[tuple[Path, Path]]) -> None:
    chance = random.Random(3)  # noqa: S311  repeatable damage, no secret
    codes = set()
    for _ in range(ROUNDS):
        scenario, folder = chance.choice(saved)
        text = (folder / "proof.json").read_text("utf-8")
        words: list[object] = ["recheck", damaged(tmp_path, text, "proof.json", chance)]
        if chance.random() < 0.5:
            words += ["--scenario", scenario]
        codes.add(hold(capsys, words, chance.random() < 0.5))
    assert {1, 2} <= codes
