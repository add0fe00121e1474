"""Where results cannot be written: full disks, closed streams, readers gone."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

from tests.cli.running import ROOT

FULL = Path("/dev/full")
TOLD = "stdout: found 'No space left on device' from the operating system"


def shell(script: str, **env: str) -> subprocess.CompletedProcess[str]:
    """Run a line of shell in which $DESIGNER stands for the command."""
    return subprocess.run(
        ["sh", "-c", script],
        capture_output=True,
        text=True,
        timeout=120,
        check=False,
        cwd=ROOT,
        env={**os.environ, "DESIGNER": f"{sys.executable} -m designer", **env},
    )


@pytest.mark.skipif(not FULL.exists(), reason="no device that is always full here")
@pytest.mark.parametrize(
    "words",
    [
        "pose scenarios/lock-sale.toml",
        "pose scenarios/lock-sale.toml --json",
        "recheck scenarios/lock-sale-proof.json",
        "--help",
    ],
)
def test_a_full_disk_is_said_and_no_verdict(words: str) -> None:
    ran = shell(f"$DESIGNER {words} > /dev/full")
    assert ran.returncode == 2
    assert TOLD in ran.stderr
    assert "Traceback" not in ran.stderr
    assert "bug" not in ran.stderr


@pytest.mark.skipif(not FULL.exists(), reason="no device that is always full here")
def test_nobody_left_to_tell() -> None:
    assert shell("$DESIGNER pose nowhere.toml --json > /dev/full 2> /dev/full").returncode == 2
    ran = shell("$DESIGNER pose nowhere.toml --json 2> /dev/full")
    assert ran.returncode == 2
    assert json.loads(ran.stdout)["kind"] == "input"


def test_streams_closed_from_the_start(tmp_path: Path) -> None:
    """Files opened later must not take the numbers of the missing streams."""
    folder = tmp_path / "out"
    ran = shell('$DESIGNER pose scenarios/reef.toml --save "$OUT" <&- >&- 2>&-', OUT=str(folder))
    assert ran.returncode == 0
    checked = shell(
        '$DESIGNER recheck "$OUT/proof.json" --scenario scenarios/reef.toml 2>&-', OUT=str(folder)
    )
    assert checked.returncode == 0
    assert checked.stdout.startswith("HOLDS.")
    assert shell("$DESIGNER pose scenarios/lock-sale.toml --progress >&- 2>&-").returncode == 1
