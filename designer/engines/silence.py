"""Keeps compiled libraries from writing on stdout, which carries our JSON."""

from __future__ import annotations

import ctypes
import os
import sys
from collections.abc import Iterator
from contextlib import contextmanager, suppress


@contextmanager
def silent_stdout() -> Iterator[None]:
    """Send everything written to file descriptor 1 to nowhere, C buffers included.

    Python's own pending output is written first. Where descriptor 1 is closed or cannot be
    copied, nothing is done: there is then nothing to keep clean either.
    """
    with suppress(OSError, ValueError, AttributeError):
        sys.stdout.flush()
    try:
        kept = os.dup(1)
    except OSError:
        yield
        return
    nowhere = os.open(os.devnull, os.O_WRONLY)
    try:
        _flush()
        os.dup2(nowhere, 1)
        try:
            yield
        finally:
            with suppress(OSError, ValueError, AttributeError):
                sys.stdout.flush()
            _flush()
            os.dup2(kept, 1)
    finally:
        os.close(nowhere)
        os.close(kept)


def _flush() -> None:
    """Flush C's stdio: what it holds back would reach the real stdout later."""
    with suppress(OSError, AttributeError, TypeError):
        ctypes.CDLL(None).fflush(None)
