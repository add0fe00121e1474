"""Saving is all or nothing: killed anywhere, refused anywhere, nothing of the old is lost."""

from __future__ import annotations

import errno
import json
import os
import random
import signal
import subprocess
import sys
import time
from pathlib import Path
from typing import IO, Any

import pytest

from designer import files
from designer.errors import InputError
from tests.files.killed import NEW, OLD, state

HERE = Path(__file__).parent
linux = pytest.mark.skipif(sys.platform != "linux", reason="the exchange is a Linux call")


def die_at_every_line(base: Path, way: str) -> dict[str, Any]:
    done = subprocess.run(
        [sys.executable, str(HERE / "killed.py"), str(base), way],
        capture_output=True,
        text=True,
        timeout=300,
        check=False,
    )
    assert done.returncode == 0, done.stderr
    report: dict[str, Any] = json.loads(done.stdout)
    return report


@linux
def test_killed_at_every_line_an_exchange_leaves_old_or_new(tmp_path: Path) -> None:
    report = die_at_every_line(tmp_path / "x", "exchange")
    assert report["counts"]["mixed"] == 0
    assert report["counts"]["nothing"] == 0
    assert report["counts"]["old"] > 50
    assert report["counts"]["new"] > 1


@linux
def test_killed_at_every_line_a_first_save_leaves_nothing_or_everything(tmp_path: Path) -> None:
    report = die_at_every_line(tmp_path / "x", "fresh")
    assert report["counts"]["mixed"] == report["counts"]["old"] == 0
    assert report["counts"]["nothing"] > 50
    assert report["counts"]["new"] > 1


def test_killed_at_every_line_a_plan_is_carried_out_by_whoever_comes_next(tmp_path: Path) -> None:
    report = die_at_every_line(tmp_path / "x", "plan")
    assert report["recovered"]["mixed"] == report["recovered"]["nothing"] == 0
    assert report["recovered"]["old"] > 50
    assert report["recovered"]["new"] > 5


@linux
def test_killed_at_random_moments_a_busy_saver_leaves_one_whole_set(tmp_path: Path) -> None:
    """Untraced, from outside, in the middle of system calls: sets of one number each."""
    folder = tmp_path / "out"
    program = (
        "import sys\nfrom designer.files import write_all\nn = 0\nwhile True:\n"
        "    n += 1\n    text = str(n) * 3000\n"
        "    write_all(sys.argv[1], {f'{k}.csv': text for k in range(5)})\n"
        "    if n == 1: print('going', flush=True)\n"
    )
    dice = random.Random(5)  # noqa: S311 - moments to kill at, no secret
    for _ in range(25):
        saver = subprocess.Popen(
            [sys.executable, "-c", program, str(folder)], stdout=subprocess.PIPE
        )
        assert saver.stdout is not None
        assert saver.stdout.readline() == b"going\n"
        time.sleep(dice.random() * 0.05)
        saver.send_signal(signal.SIGKILL)
        saver.wait()
        saver.stdout.close()
        texts = {(folder / f"{k}.csv").read_text() for k in range(5)}
        assert len(texts) == 1
        text = texts.pop()
        assert text == text[: len(text) // 3000] * 3000
    files.write_all(folder, {f"{k}.csv": b"last" for k in range(5)})
    assert [entry.name for entry in tmp_path.iterdir()] == ["out"]


def test_everything_else_in_the_folder_stays(tmp_path: Path) -> None:
    folder = tmp_path / "out"
    folder.mkdir(mode=0o750)
    (folder / "notes.txt").write_text("mine")
    (folder / ".hidden").write_text("mine too")
    (folder / "link").symlink_to("notes.txt")
    files.write_all(folder, {"a.csv": b"1"})
    assert (folder / "notes.txt").read_text() == "mine"
    assert (folder / ".hidden").read_text() == "mine too"
    assert os.readlink(folder / "link") == "notes.txt"
    assert (folder / "a.csv").read_bytes() == b"1"
    assert folder.stat().st_mode & 0o777 == 0o750
    assert (folder / "notes.txt").stat().st_nlink == 1
    assert [entry.name for entry in tmp_path.iterdir()] == ["out"]


def test_a_folder_with_folders_in_it_is_saved_by_plan(tmp_path: Path) -> None:
    (tmp_path / "inner").mkdir()
    (tmp_path / "inner" / "deep.txt").write_text("mine")
    files.write_all(tmp_path, OLD)
    files.write_all(tmp_path, NEW, retire=OLD)
    assert (tmp_path / "inner" / "deep.txt").read_text() == "mine"
    assert {entry.name for entry in tmp_path.iterdir()} == {"inner", *NEW}


def test_the_working_directory_is_not_swapped_away(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    before = tmp_path.stat().st_ino
    files.write_all(".", OLD)
    assert state(tmp_path) == "old"
    assert tmp_path.stat().st_ino == before


def test_a_link_to_a_folder_stays_a_link(tmp_path: Path) -> None:
    (tmp_path / "real").mkdir()
    (tmp_path / "alias").symlink_to("real")
    files.write_all(tmp_path / "alias", NEW)
    assert (tmp_path / "alias").is_symlink()
    assert state(tmp_path / "real") == "new"


def test_an_exchange_the_system_refuses_falls_back_to_the_plan(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(files, "_exchange", lambda one, other: False)
    files.write_all(tmp_path / "out", OLD)
    files.write_all(tmp_path / "out", NEW, retire=OLD)
    assert state(tmp_path / "out") == "new"
    assert [entry.name for entry in tmp_path.iterdir()] == ["out"]


@pytest.mark.parametrize("way", ["exchange", "plan"])
@pytest.mark.parametrize(
    ("code", "words"),
    [(errno.ENOSPC, "Free some space"), (errno.EIO, "Choose another place")],
)
def test_a_disk_that_fills_up_loses_nothing(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, way: str, code: int, words: str
) -> None:
    folder = tmp_path / "out"
    files.write_all(folder, OLD)
    if way == "plan":
        monkeypatch.setattr(files, "_may_exchange", lambda place: False)

    def overflowing(file: IO[bytes]) -> None:
        file.write(b"part")
        raise OSError(code, os.strerror(code))

    with pytest.raises(InputError) as caught:
        files.write_all(folder, {"a.csv": b"new", "z.csv": overflowing}, retire=OLD)
    assert words in str(caught.value)
    assert caught.value.exit_code == 2
    assert state(folder) == "old"
    assert [entry.name for entry in tmp_path.iterdir()] == ["out"]
    assert {entry.name for entry in folder.iterdir()} == set(OLD)


@linux
def test_a_really_full_disk_is_explained() -> None:
    with pytest.raises(InputError, match="No space left"):
        files.write_atomic("/dev/full", b"x" * 100_000)


def test_an_interrupt_while_writing_loses_nothing(tmp_path: Path) -> None:
    files.write_all(tmp_path / "out", OLD)

    def interrupted(file: IO[bytes]) -> None:
        raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        files.write_all(tmp_path / "out", {"a.csv": b"new", "b.json": interrupted})
    assert state(tmp_path / "out") == "old"


def test_a_file_where_the_folder_should_be(tmp_path: Path) -> None:
    (tmp_path / "out").write_text("a file")
    with pytest.raises(InputError) as caught:
        files.write_all(tmp_path / "out", NEW)
    assert str(caught.value) == (
        f"1 mistake\n{str(tmp_path / 'out')!r}: found 'Not a directory' from the operating "
        "system; expected a place that can be written.\n"
        "    A file has the name of the folder: rename it, or choose another folder."
    )
    assert (tmp_path / "out").read_text() == "a file"
    with pytest.raises(InputError):
        files.write_all(tmp_path / "out" / "deeper", NEW)


def test_a_folder_where_a_file_should_be(tmp_path: Path) -> None:
    (tmp_path / "out" / "a.csv").mkdir(parents=True)
    (tmp_path / "out" / "b.json").write_text("old")
    with pytest.raises(InputError, match="A folder has the name of a file"):
        files.write_all(tmp_path / "out", NEW)
    assert (tmp_path / "out" / "b.json").read_text() == "old"
    assert {entry.name for entry in (tmp_path / "out").iterdir()} == {"a.csv", "b.json"}
    with pytest.raises(InputError, match="A folder has the name of a file"):
        files.write_atomic(tmp_path / "out" / "a.csv", b"1")


@pytest.mark.skipif(os.geteuid() == 0, reason="root may write anywhere")
def test_no_permission(tmp_path: Path) -> None:
    (tmp_path / "shut").mkdir(mode=0o500)
    with pytest.raises(InputError, match="Choose a folder you may write to"):
        files.write_all(tmp_path / "shut", NEW)
    with pytest.raises(InputError, match="Choose a folder you may write to"):
        files.write_all(tmp_path / "shut" / "out", NEW)
    (tmp_path / "shut").chmod(0o700)


@linux
def test_a_folder_even_root_cannot_make() -> None:
    with pytest.raises(InputError, match="from the operating system"):
        files.write_all("/proc/out", NEW)
    with pytest.raises(InputError, match="from the operating system"):
        files.write_atomic("/proc/out.csv", b"1")


def test_a_name_no_system_takes(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="zero character"):
        files.write_all("a\0b", NEW)
    with pytest.raises(InputError, match="shorter name"):
        files.write_all(tmp_path / ("x" * 300), NEW)
    for name in ("", "..", "a/b", ".hidden", "plan.json"):
        with pytest.raises(ValueError, match="not a plain file name"):
            files.write_all(tmp_path, {name: b""})


def test_one_file_is_replaced_whole_and_keeps_its_permissions(tmp_path: Path) -> None:
    path = tmp_path / "new" / "verdict.json"
    files.write_atomic(path, "first")
    path.chmod(0o640)
    files.write_atomic(path, lambda file: file.write(b"second"))
    assert path.read_text() == "second"
    assert path.stat().st_mode & 0o777 == 0o640

    def failing(file: IO[bytes]) -> None:
        file.write(b"thi")
        raise OSError(errno.ENOSPC, "No space left on device")

    with pytest.raises(InputError):
        files.write_atomic(path, failing)
    assert path.read_text() == "second"
    assert [entry.name for entry in path.parent.iterdir()] == ["verdict.json"]
    (path.parent / ".verdict.json.saving-0123abcd").write_text("a killed draft")
    files.write_atomic(path, "third")
    assert [entry.name for entry in path.parent.iterdir()] == ["verdict.json"]


def test_devices_are_written_to_not_replaced() -> None:
    files.write_atomic(os.devnull, b"gone")
    assert Path(os.devnull).is_char_device()


def test_a_running_save_is_left_alone(tmp_path: Path) -> None:
    seen: list[bool] = []

    def nosy(file: IO[bytes]) -> None:
        seen.append(files.recover(tmp_path))
        file.write(b"done")

    (tmp_path / "inner").mkdir()
    files.write_all(tmp_path, {"a.csv": nosy})
    assert seen == [False]
    assert (tmp_path / "a.csv").read_bytes() == b"done"
