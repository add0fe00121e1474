"""Work in pieces on both cores: progress from the main thread, and a prompt end when stopped."""

from __future__ import annotations

import threading
import time
from collections.abc import Callable, Iterator
from concurrent.futures import ThreadPoolExecutor, wait
from contextlib import contextmanager
from dataclasses import dataclass, field
from functools import cache
from typing import TYPE_CHECKING, TypeVar

from designer.engines.watch import Interrupted, Watch

if TYPE_CHECKING:
    from threadpoolctl import ThreadpoolController

Result = TypeVar("Result")
CORES = 2
EVERY = 0.2
"""Seconds between two looks at the clock while others work."""


@dataclass(frozen=True)
class _Guard(Watch):
    """A watch for workers: they stop when the main thread does, and tell nobody."""

    stopped: threading.Event = field(default_factory=threading.Event)

    def check(self) -> None:
        """Raise once the deadline has passed or the main thread has stopped."""
        if self.stopped.is_set():
            raise Interrupted
        super().check()


@contextmanager
def one_blas_thread() -> Iterator[None]:
    """Products of small matrices on one core.

    Where others are busy, waiting for a second thread takes many times longer than the work.
    """
    with _blas().limit(limits=1, user_api="blas"):
        yield


@cache
def _blas() -> ThreadpoolController:
    """The linear algebra libraries that are loaded; scipy brings its own."""
    import scipy.linalg  # noqa: F401
    from threadpoolctl import ThreadpoolController

    return ThreadpoolController()


def on_cores(
    piece: Callable[[int, Watch], Result], pieces: int, watch: Watch, doing: str, each: int
) -> list[Result]:
    """The results of all pieces, in order; `each` is how many profiles a piece stands for.

    numpy lets go of the interpreter's lock, so threads are enough.
    """
    since = time.monotonic()
    guard = _Guard(watch.limit, None, watch.start)
    pool = ThreadPoolExecutor(max_workers=CORES)
    try:
        futures = [pool.submit(piece, number, guard) for number in range(pieces)]
        left = set(futures)
        while left:
            finished, left = wait(left, timeout=EVERY)
            for future in finished:
                future.result()
            done = (pieces - len(left)) * each
            rate = done / max(time.monotonic() - since, 1e-9)
            watch.tell(f"{doing}, {rate:.1e} profiles a second", done)
        return [future.result() for future in futures]
    finally:
        guard.stopped.set()
        pool.shutdown(wait=True, cancel_futures=True)
