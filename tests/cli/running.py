"""Run commands of the command line, in this process or in one of their own."""

from __future__ import annotations

import subprocess
import sys
from dataclasses import dataclass
from pathlib import Path

import pytest

from designer.cli import main

ROOT = Path(__file__).parents[2]
SCENARIOS = ROOT / "scenarios"


@dataclass(frozen=True)
class Run:
    """How a command ended: exit code, standard output, standard error."""

    code: int
    out: str
    err: str


def run(capsys: pytest.CaptureFixture[str], *words: object) -> Run:
    """Run `designer WORDS` in this process."""
    capsys.readouterr()
    with pytest.raises(SystemExit) as stopped:
        main([str(word) for word in words])
    out, err = capsys.readouterr()
    code = stopped.value.code
    assert isinstance(code, int)
    return Run(code, out, err)


def spawn(*words: object, **env: str) -> Run:
    """Run `python -m designer WORDS` in a process of its own, at 80 columns, piped."""
    import os

    done = subprocess.run(
        [sys.executable, "-m", "designer", *map(str, words)],
        capture_output=True,
        text=True,
        encoding="utf-8",
        timeout=120,
        check=False,
        cwd=ROOT,
        env={**os.environ, "COLUMNS": "80", **env},
    )
    return Run(done.returncode, done.stdout, done.stderr)
