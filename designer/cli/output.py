"""Where a command's words go: results to stdout, all else to stderr, errors in four parts."""

from __future__ import annotations

import contextlib
import functools
import io
import json
import os
import sys
import threading
import time
import traceback
from collections.abc import Callable, Mapping, Sequence
from typing import IO, TYPE_CHECKING, Any, TypeVar

import typer

from designer.errors import DesignerError, InputError, Mistake

if TYPE_CHECKING:
    from rich.console import Console

    from designer.views.page import Page

WIDEST = 100
"""Columns beyond which lines get hard to read."""
PATIENCE = 2.0
"""Seconds of work after which progress is shown."""
TICK = 0.5
"""Seconds between two looks of a progress line that is written over."""
EVERY = 5.0
"""Seconds between two progress lines where they cannot be written over."""

POSSIBLE, IMPOSSIBLE, BAD_INPUT, UNDECIDED, UNBOUNDED, BUG = 0, 1, 2, 3, 4, 70

Command = TypeVar("Command", bound=Callable[..., None])


class Output:
    """One command's way out; `json` sends everything meant for people to stderr."""

    def __init__(self, *, json: bool = False, to_stderr: bool = False, quiet: bool = False) -> None:
        """Choose the streams; `quiet` leaves out what is meant for people, errors apart."""
        self.json = json
        self.quiet = quiet
        self.people: IO[str] | None = sys.stderr if json or to_stderr else sys.stdout

    def page(self, page: Page) -> None:
        """Print a screen for people."""
        if self.quiet or self.people is None:
            return
        from designer.views.page import printed

        write(self.people, printed(page, console(self.people)))

    def line(self, text: str) -> None:
        """Print one plain line for people."""
        if not self.quiet:
            write(self.people, f"{text}\n")

    def note(self, text: str) -> None:
        """Print a remark beside the result, always on stderr."""
        if not self.quiet:
            write(sys.stderr, f"{text}\n")

    def document(self, document: Mapping[str, Any]) -> None:
        """Print the JSON document, alone on stdout."""
        text = json.dumps(document, indent=2, ensure_ascii=False, allow_nan=False)
        write(sys.stdout, f"{text}\n")


def console(stream: IO[str]) -> Console:
    """A console that guesses nothing into the text, no wider than is good to read."""
    from rich.console import Console

    found = Console(file=stream, highlight=False, markup=False, emoji=False, legacy_windows=False)
    if found.width > WIDEST:
        found.width = WIDEST
    return found


def write(stream: IO[str] | None, text: str) -> None:
    """Write and flush; a reader who has gone away is no error, and stays gone.

    Raises InputError where the results cannot be written: a full disk behind stdout. Where
    stderr cannot be written there is nobody left to tell. `stream` is None where it was
    closed before we were started.
    """
    if stream is None:
        return
    try:
        if isinstance(stream, io.TextIOWrapper):  # some terminals cannot show every letter
            stream.reconfigure(errors="backslashreplace")
        stream.write(text)
        stream.flush()
    except OSError as error:
        with contextlib.suppress(OSError, ValueError):  # later writes and the last flush succeed
            nowhere = os.open(os.devnull, os.O_WRONLY)
            os.dup2(nowhere, stream.fileno())
            os.close(nowhere)
        if not isinstance(error, BrokenPipeError) and stream is not sys.stderr:
            raise InputError([_refused(error, "stdout")]) from error


def _refused(error: OSError, place: str) -> Mistake:
    return Mistake(
        place,
        f"'{error.strerror or error}' from the operating system",
        "a place that can be read and written",
        "Free some space there, or choose another place.",
    )


def open_streams() -> None:
    """Give stdin, stdout and stderr a number each, even if we were started without them.

    A file opened later would otherwise take the number of stdout, and be written over.
    """
    for number in range(3):
        try:
            os.fstat(number)
        except OSError:
            os.open(os.devnull, os.O_RDWR)  # takes the lowest number that is free


# --- errors -----------------------------------------------------------------------------------


def command(function: Command) -> Command:
    """Let a command end in exit codes only, whatever happens in it.

    The command's parameter `json`, where it has one, decides where errors are said.
    """

    @functools.wraps(function)
    def guarded(*args: Any, **options: Any) -> None:
        try:
            function(*args, **options)
        except typer.Exit:
            raise
        except BaseException as error:
            if isinstance(error, SystemExit):
                raise
            raise typer.Exit(stop_for(error, bool(options.get("json")))) from None

    return guarded  # type: ignore[return-value]


def stop_for(error: BaseException, as_json: bool) -> int:
    """Say what went wrong and choose the exit code.

    Under --json stdout carries an error document (format designer.error/1) and stderr the
    same in words.
    """
    kind, code, message, mistakes = _described(error)
    if as_json:
        from designer.views.documents import error_document

        Output(json=True).document(error_document(kind, code, message, mistakes))
    write(sys.stderr, f"{_printable(message)}\n")
    if code == BUG and os.environ.get("DESIGNER_TRACEBACK") == "1":
        write(sys.stderr, "".join(traceback.format_exception(error)))
    return code


def _described(error: BaseException) -> tuple[str, int, str, Sequence[Mistake]]:
    if isinstance(error, InputError):
        return "input", error.exit_code, error.report(), error.mistakes
    if isinstance(error, typer.Abort) or _cut_short(error):
        return "interrupted", UNDECIDED, "UNDECIDED: interrupted before anything was decided.", ()
    if isinstance(error, MemoryError):
        text = "UNDECIDED: this machine's memory is too small for the problem; use fewer types."
        return "memory", UNDECIDED, text, ()
    if isinstance(error, OSError) and error.errno is not None:  # the place, not the program
        told = InputError([_refused(error, str(error.filename or "stdout"))])
        return "input", BAD_INPUT, told.report(), told.mistakes
    if hasattr(error, "format_message") and not isinstance(error, DesignerError):
        return "usage", BAD_INPUT, _usage(error), ()
    what = f"{type(error).__name__}: {error}".replace("\n", " ")[:200]
    text = (
        f"A bug of ours, and we are sorry: {what}. Please report it with the command and the "
        "scenario; DESIGNER_TRACEBACK=1 shows where it happened."
    )
    return "bug", BUG, text, ()


def _cut_short(error: BaseException | None) -> bool:
    """Whether Ctrl-C is behind it: compiled modules make an ImportError of one while they load."""
    for _ in range(20):
        if error is None or isinstance(error, KeyboardInterrupt):
            break
        error = error.__cause__ or error.__context__
    return isinstance(error, KeyboardInterrupt)


def _usage(error: Any) -> str:
    """The option parser's complaint, with the way to help."""
    message = str(error.format_message())
    context = getattr(error, "ctx", None)
    if context is None:
        return message
    return f"{message}\n`{context.command_path} --help` lists what can be asked."


def _printable(text: str) -> str:
    return "".join(c if c.isprintable() or c == "\n" else "?" for c in text)


# --- progress ---------------------------------------------------------------------------------


class Progress:
    """A progress line on stderr, once work has lasted `PATIENCE` seconds.

    wanted  True: also where stderr is no terminal, a line every few seconds; False: never;
            None: on a terminal only

    Used as the `progress` of `pose`; `close`, or the end of a with block, wipes the line. The
    line has a clock of its own, as an engine may be silent for long.
    """

    def __init__(self, wanted: bool | None) -> None:
        """Look at stderr once."""
        self.stream = sys.stderr
        told = self.stream is not None  # it may have been closed before we were started
        self.terminal = told and self.stream.isatty() and os.environ.get("TERM") != "dumb"
        self.shown = told and (wanted if wanted is not None else self.terminal)
        self.start = time.monotonic()
        self.doing, self.steps = "work", 0
        self.width = 0
        self.over = threading.Event()
        self.clock = threading.Thread(target=self._tick, daemon=True)
        if self.shown:
            self.clock.start()

    def __enter__(self) -> Progress:
        """Enter a with block that closes the line."""
        return self

    def __exit__(self, *_: object) -> None:
        """Close the line."""
        self.close()

    def close(self) -> None:
        """Stop the clock and wipe the line."""
        self.over.set()
        if self.shown:
            self.clock.join()
        if self.width:
            write(self.stream, f"\r{' ' * self.width}\r")
            self.width = 0

    def __call__(self, doing: str, seconds: float, steps: int) -> None:
        """Take note of what is being done and how far it is."""
        self.doing, self.steps = doing, steps

    def say(self, text: str) -> None:
        """Write a line that stays, above the progress line."""
        blank = f"\r{' ' * self.width}\r" if self.width else ""
        self.width = 0
        write(self.stream, f"{blank}{text}\n")

    def _tick(self) -> None:
        wait = PATIENCE
        while not self.over.wait(wait):
            wait = TICK if self.terminal else EVERY
            self.draw(time.monotonic() - self.start)

    def draw(self, seconds: float) -> None:
        """Write the line: what is being done, for how long, how far it is."""
        text = f"{self.doing}: {seconds:.0f} s" + (f", step {self.steps:,}" if self.steps else "")
        if self.terminal:
            blank = " " * max(0, self.width - len(text))
            self.width = len(text)
            write(self.stream, f"\r{text}{blank}")
        else:
            write(self.stream, f"{text}\n")
