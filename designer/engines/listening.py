"""Progress reports and Ctrl-C while HiGHS runs."""

from __future__ import annotations

import signal
import threading
import time
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from types import FrameType
from typing import Any

from designer.engines.watch import Watch

EVERY = 0.2
"""Seconds between two progress reports."""


@dataclass
class Stop:
    """Why a running solve was told to stop."""

    interrupted: bool = False
    error: BaseException | None = None


@contextmanager
def listening(model: Any, watch: Watch, attached: bool) -> Iterator[Stop]:
    """Progress reports and Ctrl-C while HiGHS runs.

    HiGHS calls back between iterations. Ctrl-C only raises a flag there: an exception must
    not travel through compiled code.
    """
    stop = Stop()
    if not attached:
        yield stop
        return
    import highspy

    Kind = highspy.cb.HighsCallbackType

    last = time.monotonic()

    def called(kind: Any, message: str, said: Any, answer: Any, data: Any) -> None:
        nonlocal last
        if stop.interrupted or stop.error is not None:
            answer.user_interrupt = True
            return
        now = time.monotonic()
        if watch.progress is None or now - last < EVERY:
            return
        last = now
        try:
            steps = said.mip_node_count if kind == Kind.kCallbackMipInterrupt else 0
            watch.progress("solve", watch.seconds, max(steps, said.simplex_iteration_count))
        except BaseException as error:  # a listener's own failure is raised after the run
            stop.error = error
            answer.user_interrupt = True

    def pressed(number: int, frame: FrameType | None) -> None:
        stop.interrupted = True

    model.setCallback(called, None)
    for kind in (
        Kind.kCallbackSimplexInterrupt,
        Kind.kCallbackIpmInterrupt,
        Kind.kCallbackMipInterrupt,
    ):
        model.startCallback(kind)
    main = threading.current_thread() is threading.main_thread()
    before = signal.signal(signal.SIGINT, pressed) if main else None
    try:
        yield stop
    finally:
        if main:
            signal.signal(signal.SIGINT, before)
        model.setCallback(None, None)
    if isinstance(stop.error, KeyboardInterrupt):
        stop.interrupted = True
    elif stop.error is not None:
        raise stop.error
