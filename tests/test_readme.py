"""The README's Python example runs as printed, and its commands are real."""

from __future__ import annotations

import re
import subprocess
import sys
from pathlib import Path

import pytest

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
