"""Saves a set of files again and again, dying at one line after the other.

Run by test_files.py in a process of its own: for each n = 1, 2, … a child saves the new set
over the old one and kills itself (SIGKILL) when it reaches the n-th line of the saving module.
The parent then looks at what is there. Prints one JSON object of counts.

Arguments: the folder to work in, and the way ("exchange", "plan" or "fresh").
"""

from __future__ import annotations

import json
import os
import shutil
import signal
import sys
from pathlib import Path
from types import FrameType

from designer import files

OLD = {"a.csv": b"old a" * 1000, "b.json": b"old b", "gone.json": b"old only"}
NEW = {"a.csv": b"new a" * 2000, "b.json": b"new b", "c.txt": b"new only"}
OTHER = {"notes.txt": b"the user's own"}


def state(folder: Path) -> str:
    """Which set the folder holds: "old", "new", "nothing" or "mixed"."""
    if not folder.exists():
        return "nothing"
    found = {
        entry.name: entry.read_bytes()
        for entry in folder.iterdir()
        if not entry.name.startswith(".")
    }
    for name, content in OTHER.items():
        if found.pop(name, content) != content:
            return "mixed"
    if found == OLD:
        return "old"
    return "new" if found == NEW else "mixed"


def dying(line: int, folder: Path) -> None:
    """Save the new set; SIGKILL on reaching the given count of traced lines."""
    seen = 0

    def trace(frame: FrameType, event: str, arg: object) -> object:
        nonlocal seen
        if frame.f_code.co_filename != files.__file__:
            return None
        if event == "line":
            seen += 1
            if seen == line:
                os.kill(os.getpid(), signal.SIGKILL)
        return trace

    sys.settrace(trace)  # type: ignore[arg-type]
    files.write_all(folder, NEW, retire=OLD)


def main() -> None:
    """Die at every line in turn and count what was left."""
    base, way = Path(sys.argv[1]), sys.argv[2]
    folder = base / "out"
    counts = {"old": 0, "new": 0, "nothing": 0, "mixed": 0}
    recovered = dict(counts)
    lines = 0
    while True:
        lines += 1
        shutil.rmtree(base, ignore_errors=True)
        base.mkdir(parents=True)
        if way != "fresh":
            files.write_all(folder, OLD)
            for name, content in OTHER.items():
                (folder / name).write_bytes(content)
            if way == "plan":
                (folder / ".keep").mkdir()
        child = os.fork()
        if child == 0:
            dying(lines, folder)
            os._exit(0)
        _, status = os.waitpid(child, 0)
        counts[state(folder)] += 1
        if way != "fresh" and not (folder / "notes.txt").exists():
            raise SystemExit(f"the user's own file was lost at line {lines}")
        files.recover(folder)
        recovered[state(folder)] += 1
        files.write_all(folder, NEW, retire=OLD)
        left = [p.name for p in base.glob(".out*")] + [p.name for p in folder.glob(".saving*")]
        if state(folder) != "new" or left:
            raise SystemExit(f"line {lines}: after the next save {state(folder)}, left {left}")
        if os.WIFEXITED(status):
            break
    sys.stdout.write(json.dumps({"lines": lines, "counts": counts, "recovered": recovered}))


if __name__ == "__main__":
    main()
