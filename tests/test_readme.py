"""The README's Python example runs as printed, and its commands are real."""

from __future__ import annotations

import re
import shlex
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

from designer.cli import main

ROOT = Path(__file__).parent.parent
README = (ROOT / "README.md").read_text(encoding="utf-8")


def test_the_python_example_prints_what_it_says() -> None:
    code = re.search(r"```python\n(.*?)```", README, re.DOTALL)
    assert code is not None
    done = subprocess.run(
        [sys.executable, "-W", "error", "-c", code[1]],
        cwd=ROOT,
        capture_output=True,
        text=True,
        check=False,
    )
    assert done.stderr == ""
    lines = done.stdout.splitlines()
    promised = re.search(r"print\(verdict.status.*?#\s*(.*)", code[1])
    assert promised is not None
    assert lines[0] == promised[1]
    assert lines[-1] == "True True"


@pytest.mark.parametrize(
    "command", sorted(set(re.findall(r"^designer (\w+)", README, re.MULTILINE)))
)
def test_the_commands_exist(command: str) -> None:
    done = subprocess.run(
        [sys.executable, "-m", "designer", command, "--help"],
        cwd=ROOT,
        capture_output=True,
        text=True,
        check=False,
    )
    assert done.returncode == 0
    assert "Examples:" in done.stdout


def test_the_commands_run_one_after_the_other(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """Everything under 'What it does', as it stands there, in a folder of its own."""
    block = re.search(r"## What it does\n\n```sh\n(.*?)```", README, re.DOTALL)
    assert block is not None
    shutil.copytree(ROOT / "scenarios", tmp_path / "scenarios")
    monkeypatch.chdir(tmp_path)
    lines = block[1].replace("\\\n", " ").splitlines()
    assert len(lines) >= 8
    for line in lines:
        command, *words = shlex.split(line, comments=True)
        assert command == "designer"
        with pytest.raises(SystemExit) as stopped:
            main(words)
        assert stopped.value.code in (0, 1), (line, capsys.readouterr().err)
