"""PuLP in processes of its own, kept for the next question.

Engines hear neither Ctrl-C nor the time limit in time, start processes of their own, leave
files behind and may crash: all that ends with the process and its folder.
"""

from __future__ import annotations

import atexit
import contextlib
import json
import os
import shutil
import signal
import subprocess
import sys
import tempfile
import threading
from pathlib import Path
from typing import Any

from designer.engines.watch import Watch

PATIENCE = 3.0
"""Seconds an engine gets beyond the time limit to say what it has."""
GLANCE = 0.2
"""Seconds between two looks at the clock."""
CHILD = Path(__file__).with_name("pulp_child.py")


def ask(asked: dict[str, Any], watch: Watch) -> dict[str, Any] | None:
    """What PuLP answers, see `pulp_child`; None if the time limit ended it."""
    child = _idle.pop() if _idle else _Child()
    told: dict[str, Any] | None = None
    try:
        told = child.ask(asked, watch)
    finally:
        if told is None or "failed" in told:
            child.end()
        else:
            _idle.append(child)
    return told


class _Child:
    """One process, in a session and a folder of its own."""

    def __init__(self) -> None:
        self.folder = tempfile.mkdtemp(prefix="designer-")
        self.process = subprocess.Popen(
            [sys.executable, "-P", str(CHILD)],
            stdin=subprocess.PIPE,
            stdout=subprocess.PIPE,
            stderr=subprocess.DEVNULL,
            cwd=self.folder,
            env={
                **os.environ,
                **dict.fromkeys(("TMPDIR", "TEMP", "TMP"), self.folder),
                "PYTHONPATH": os.pathsep.join(os.path.abspath(place) for place in sys.path),
            },
            start_new_session=True,
        )

    def ask(self, asked: dict[str, Any], watch: Watch) -> dict[str, Any] | None:
        answers: list[bytes] = []
        talk = threading.Thread(target=self._talk, args=(asked, answers), daemon=True)
        talk.start()
        while True:
            talk.join(GLANCE)
            if not talk.is_alive():
                break
            if watch.progress is not None:
                watch.progress("solve", watch.seconds, 0)
            if watch.limit is not None and watch.seconds > watch.limit + PATIENCE:
                return None
        if not answers or not answers[0].endswith(b"\n"):
            with contextlib.suppress(subprocess.TimeoutExpired):
                self.process.wait(PATIENCE)
            return {"failed": f"the engine's process ended with code {self.process.returncode}"}
        found: dict[str, Any] = json.loads(answers[0])
        return found

    def _talk(self, asked: dict[str, Any], answers: list[bytes]) -> None:
        """Ask and listen; how it ends where the process does is told from its silence."""
        with contextlib.suppress(OSError, ValueError):
            if self.process.stdin is not None and self.process.stdout is not None:
                self.process.stdin.write(json.dumps(asked).encode() + b"\n")
                self.process.stdin.flush()
                answers.append(self.process.stdout.readline())

    def end(self) -> None:
        """End the process with all it has started, and take its folder away."""
        with contextlib.suppress(ProcessLookupError, PermissionError):
            if hasattr(os, "killpg"):
                os.killpg(self.process.pid, signal.SIGKILL)
            else:
                self.process.kill()
        self.process.wait()
        for stream in (self.process.stdin, self.process.stdout):
            if stream is not None:
                with contextlib.suppress(OSError):
                    stream.close()
        shutil.rmtree(self.folder, ignore_errors=True)


_idle: list[_Child] = []
"""Processes that wait for the next question; they end when we do."""


@atexit.register
def _end_all() -> None:
    while _idle:
        _idle.pop().end()
