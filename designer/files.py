"""Files written whole: a kill at any moment leaves the old ones or the new ones.

One file: written beside its place under a hidden name, synced, then renamed over it.

A set of files in a folder, by the first of two ways that the folder allows:

exchange   The complete new folder is prepared as a hidden sibling: the new files, and hard
           links to whatever else lives in the old one. One system call then exchanges the
           two (Linux, renameat2), or renames the sibling into place where there was no
           folder yet. Nobody can ever see a mixture.
plan       Where the exchange cannot be had (another system, a mount point, a folder with
           folders inside, our own working directory, a parent one may not write to) the new
           files are prepared in a hidden folder inside, a plan is written, and each file is
           renamed into place. A kill in the middle of the renames leaves the plan behind,
           and whoever opens the folder next with `recover` carries it out to the end.
"""

from __future__ import annotations

import contextlib
import ctypes
import errno
import json
import os
import secrets
import shutil
import stat
import sys
from collections.abc import Callable, Collection, Iterator, Mapping
from pathlib import Path
from typing import IO

from designer.errors import InputError, Mistake

Content = bytes | str | Callable[[IO[bytes]], object]
"""Bytes, text (written as UTF-8), or a function that writes into the open binary file."""

_HIDDEN = ".saving-"
_PLAN = "plan.json"
_NO_EXCHANGE = (
    errno.ENOSYS,
    errno.EINVAL,
    errno.EXDEV,
    errno.EBUSY,
    errno.EPERM,
    errno.EACCES,
    errno.EOPNOTSUPP,
)


def write_atomic(path: str | os.PathLike[str], content: Content) -> None:
    """Write one file whole; an existing file keeps its permissions and is replaced at once.

    Devices and pipes (such as /dev/stdout) are simply written to. Raises InputError when the
    file cannot be written; whatever was there before is then untouched.
    """
    with _explained(path):
        target = Path(os.path.realpath(path))
        if target.is_dir():
            raise IsADirectoryError(errno.EISDIR, os.strerror(errno.EISDIR))
        if target.exists() and not target.is_file():
            with target.open("wb") as file:
                _pour(content, file)
            return
        target.parent.mkdir(parents=True, exist_ok=True)
        _sweep_siblings(target, set())
        draft = target.with_name(f".{target.name}{_HIDDEN}{secrets.token_hex(4)}")
        draft.touch(exist_ok=False)
        with _locked(draft):
            try:
                _write(draft, content, like=target)
                os.replace(draft, target)
            finally:
                draft.unlink(missing_ok=True)
        _sync(target.parent)


def write_all(
    folder: str | os.PathLike[str],
    files: Mapping[str, Content],
    *,
    retire: Collection[str] = (),
) -> None:
    """Write a set of files into a folder, all of them or none; see the module docstring.

    `retire` names files of an earlier set that go when this one comes (those also in `files`
    are simply replaced). Everything else in the folder stays as it is. Raises InputError when
    the folder cannot be written; the old files are then untouched. A writing function may be
    called a second time when the first way turns out to be closed.
    """
    for name in (*files, *retire):
        if not name or name != os.path.basename(name) or name.startswith(".") or name == _PLAN:
            raise ValueError(f"not a plain file name: {name!r}")
    with _explained(folder):
        place = Path(os.path.realpath(folder))
        if place.exists() and not place.is_dir():
            raise NotADirectoryError(errno.ENOTDIR, os.strerror(errno.ENOTDIR))
        place.parent.mkdir(parents=True, exist_ok=True)
        known = {*files, *retire}
        _sweep_siblings(place, known)
        if place.is_dir():
            recover(place)
            _refuse_folders(place, known)
        if not (_may_exchange(place) and _by_exchange(place, files, known)):
            place.mkdir(exist_ok=True)
            _by_plan(place, files, known)


def recover(folder: str | os.PathLike[str]) -> bool:
    """Finish (or clear away) what a killed save left in a folder; whether it changed a file.

    A prepared set with its plan written is carried out; one without is removed. A save that
    is still running is left alone, and so is a folder one may not write to.
    """
    changed = False
    with contextlib.suppress(OSError, ValueError, KeyError, TypeError):  # some damaged plan
        for stage in sorted(Path(folder).glob(f"{_HIDDEN}*")):
            with _locked(stage) as free:
                if free:
                    changed = _carry_out(Path(folder), stage) or changed
    return changed


# --- one exchange -----------------------------------------------------------------------------


def _may_exchange(place: Path) -> bool:
    """Whether swapping the whole folder is possible and disturbs nobody."""
    if not sys.platform.startswith("linux"):
        return False
    if not os.access(place.parent, os.W_OK | os.X_OK):
        return False
    if not place.exists():
        return True
    # A shell standing in the folder would be left standing in a deleted one.
    here = os.path.realpath(os.getcwd())
    if here == str(place) or here.startswith(f"{place}{os.sep}"):
        return False
    if os.path.ismount(place) or place.stat().st_uid != os.geteuid():
        return False
    with os.scandir(place) as entries:
        return all(not entry.is_dir(follow_symlinks=False) for entry in entries)


def _by_exchange(place: Path, files: Mapping[str, Content], known: set[str]) -> bool:
    """Prepare the new folder as a sibling and swap; False when the system will not do it."""
    stage = place.with_name(f".{place.name}{_HIDDEN}{secrets.token_hex(4)}")
    stage.mkdir()
    with _locked(stage):
        try:
            for name, content in files.items():
                _write(stage / name, content, like=place / name)
            if not place.exists():
                _sync(stage)
                try:
                    os.rename(stage, place)
                except OSError as problem:
                    if problem.errno not in (errno.ENOTEMPTY, errno.EEXIST):
                        raise
                else:
                    _sync(place.parent)
                    return True
            if not _mirror(place, stage, known):
                return False
            _sync(stage)
            if not _exchange(stage, place):
                return False
            _sync(place.parent)
            _rescue(stage, place, known)
            return True
        finally:
            _clear(stage, known)


def _mirror(place: Path, stage: Path, known: set[str]) -> bool:
    """Give the new folder the old one's permissions and links to its other files."""
    try:
        shutil.copystat(place, stage)
        if stage.stat().st_gid != place.stat().st_gid:
            os.chown(stage, -1, place.stat().st_gid)
        for entry in list(os.scandir(place)):
            if entry.name not in known:
                os.link(entry.path, stage / entry.name, follow_symlinks=False)
    except OSError:
        return False  # links or ownership are not to be had here: the plan needs neither
    return True


def _rescue(old: Path, new: Path, known: set[str]) -> None:
    """Carry over what somebody else put into the old folder while the new one was prepared."""
    for entry in list(os.scandir(old)):
        if entry.name in known:
            continue
        twin = new / entry.name
        there = os.stat(twin, follow_symlinks=False).st_ino if os.path.lexists(twin) else None
        if there != entry.inode():
            os.replace(entry.path, twin)


def _exchange(one: Path, other: Path) -> bool:
    """Swap two paths in one step (renameat2 with RENAME_EXCHANGE); False where unsupported."""
    call = getattr(ctypes.CDLL(None, use_errno=True), "renameat2", None)
    if call is None:
        return False
    at_cwd, exchange = -100, 2
    if call(at_cwd, os.fsencode(one), at_cwd, os.fsencode(other), exchange) == 0:
        return True
    code = ctypes.get_errno()
    if code in _NO_EXCHANGE:
        return False
    raise OSError(code, os.strerror(code))


def _sweep_siblings(place: Path, known: set[str]) -> None:
    """Remove hidden siblings that killed saves of this file or folder left behind."""
    with contextlib.suppress(OSError):
        for stage in place.parent.glob(f".{_glob_safe(place.name)}{_HIDDEN}*"):
            with _locked(stage) as free:
                if free and stage.is_dir():
                    _clear(stage, known)
                elif free:
                    stage.unlink(missing_ok=True)


def _clear(stage: Path, known: set[str]) -> None:
    """Remove a prepared or outlived folder: our own names, and second links. Nothing else.

    Anything that exists only here is somebody's work, so it stays, and the folder with it.
    """
    with contextlib.suppress(OSError):
        for entry in list(os.scandir(stage)):
            if entry.name in known or entry.stat(follow_symlinks=False).st_nlink > 1:
                os.unlink(entry.path)
        stage.rmdir()


# --- one plan ---------------------------------------------------------------------------------


def _by_plan(place: Path, files: Mapping[str, Content], known: set[str]) -> None:
    stage = place / f"{_HIDDEN}{secrets.token_hex(4)}"
    stage.mkdir()
    with _locked(stage):
        try:
            for name, content in files.items():
                _write(stage / name, content, like=place / name)
            retire = sorted(known - set(files))
            plan = json.dumps({"files": sorted(files), "retire": retire}).encode()
            _write(stage / f"{_PLAN}.draft", plan)
            _sync(stage)
            os.replace(stage / f"{_PLAN}.draft", stage / _PLAN)
            _sync(stage)
        except BaseException:
            shutil.rmtree(stage, ignore_errors=True)
            raise
        # From here on there is no way back: recover() would go forward too.
        _carry_out(place, stage)


def _carry_out(place: Path, stage: Path) -> bool:
    """Rename every prepared file into place, then remove what is left of the preparation."""
    plan = stage / _PLAN
    if not plan.exists():
        shutil.rmtree(stage, ignore_errors=True)
        return False
    steps = json.loads(plan.read_bytes())
    for name in steps["files"]:
        with contextlib.suppress(FileNotFoundError):  # moved before the kill
            os.replace(stage / os.path.basename(name), place / os.path.basename(name))
    for name in steps["retire"]:
        (place / os.path.basename(name)).unlink(missing_ok=True)
    _sync(place)
    plan.unlink()
    shutil.rmtree(stage, ignore_errors=True)
    return True


# --- small steps ------------------------------------------------------------------------------


def _write(path: Path, content: Content, like: Path | None = None) -> None:
    with path.open("wb") as file:
        _pour(content, file)
        file.flush()
        os.fsync(file.fileno())
    if like is not None and like.is_file():
        path.chmod(stat.S_IMODE(like.stat().st_mode))


def _pour(content: Content, file: IO[bytes]) -> None:
    if callable(content):
        content(file)
    else:
        file.write(content.encode() if isinstance(content, str) else content)


def _sync(folder: Path) -> None:
    """Make the names in a folder durable, where the system lets folders be synced."""
    with contextlib.suppress(OSError):
        handle = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)


@contextlib.contextmanager
def _locked(folder: Path) -> Iterator[bool]:
    """Hold a folder against other savers; yields False when one of them holds it already."""
    try:
        import fcntl
    except ImportError:  # no such locks on this system: savers are told apart by name only
        yield True
        return
    try:
        handle = os.open(folder, os.O_RDONLY)
    except FileNotFoundError:  # its owner finished a moment ago
        yield False
        return
    try:
        try:
            fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
        except OSError:
            yield False
        else:
            yield True
    finally:
        os.close(handle)


def _refuse_folders(place: Path, known: Collection[str]) -> None:
    for name in sorted(known):
        if (place / name).is_dir():
            raise IsADirectoryError(errno.EISDIR, os.strerror(errno.EISDIR), str(place / name))


def _glob_safe(name: str) -> str:
    return "".join(f"[{letter}]" if letter in "*?[" else letter for letter in name)


_REMEDIES = {
    errno.EACCES: "Choose a folder you may write to, or change its permissions.",
    errno.EPERM: "Choose a folder you may write to, or change its permissions.",
    errno.EROFS: "Choose a folder on a disk that can be written.",
    errno.ENOSPC: "Free some space or choose another disk; nothing was changed.",
    errno.EDQUOT: "Free some of your quota or choose another disk; nothing was changed.",
    errno.EFBIG: "The file would be larger than allowed here; nothing was changed.",
    errno.EISDIR: "A folder has the name of a file to be written: choose another place.",
    errno.ENOTDIR: "A file has the name of the folder: rename it, or choose another folder.",
    errno.EEXIST: "A file has the name of a folder on the way: choose another place.",
    errno.ENAMETOOLONG: "Choose a shorter name.",
}


@contextlib.contextmanager
def _explained(path: str | os.PathLike[str]) -> Iterator[None]:
    """Turn what the operating system refuses into a mistake its reader can act on."""
    try:
        if "\0" in os.fspath(path):
            raise OSError(errno.EINVAL, "a zero character in the name")
        yield
    except OSError as problem:
        remedy = _REMEDIES.get(problem.errno or 0, "Choose another place.")
        raise InputError(
            [
                Mistake(
                    repr(os.fspath(path)),
                    f"'{problem.strerror or problem}' from the operating system",
                    "a place that can be written",
                    remedy,
                )
            ]
        ) from problem
