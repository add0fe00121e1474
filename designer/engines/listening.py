"""Progress reports and Ctrl-C while HiGHS runs."""

from __future__ import annotations

import signal
import threading
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from types import FrameType
from typing import Any

from designer.engines.watch import Watch

EVERY = 0.2
"""Seconds between two progress reports."""


@dataclass
class Stop:
    """Why a running solve was told to stop; `left` once nobody waits for it any more."""

    interrupted: bool = False
    error: BaseException | None = None
    left: bool = False

    @property
    def asked(self) -> bool:
        """Whether the solve is to stop."""
        return self.interrupted or self.left or self.error is not None


@contextmanager
def listening(
    model: Any, watch: Watch, attached: bool, shown: Callable[[Any, bool], None] | None = None
) -> Iterator[Stop]:
    """Progress reports and Ctrl-C while HiGHS runs.

    HiGHS calls back between iterations. Ctrl-C only raises a flag there: an exception must
    not travel through compiled code. `shown` is given what HiGHS says at each node of a
    mixed-integer solve, and whether that comes with a better point.
    """
    stop = Stop()
    if not attached:
        yield stop
        return
    import highspy

    Kind = highspy.cb.HighsCallbackType

    of_mip = (Kind.kCallbackMipInterrupt, Kind.kCallbackMipImprovingSolution)
    last = time.monotonic()

    def called(kind: Any, message: str, said: Any, answer: Any, data: Any) -> None:
        nonlocal last
        if shown is not None and kind in of_mip:
            shown(said, kind == Kind.kCallbackMipImprovingSolution)
        if stop.asked:
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
    kinds = [
        Kind.kCallbackSimplexInterrupt,
        Kind.kCallbackIpmInterrupt,
        Kind.kCallbackMipInterrupt,
    ]
    if shown is not None:
        kinds.append(Kind.kCallbackMipImprovingSolution)
    for kind in kinds:
        model.startCallback(kind)
    main = threading.current_thread() is threading.main_thread()
    before = signal.signal(signal.SIGINT, pressed) if main else None
    try:
        yield stop
    finally:
        if main:
            signal.signal(signal.SIGINT, before)
        if not stop.left:
            model.setCallback(None, None)
    if isinstance(stop.error, KeyboardInterrupt):
        stop.interrupted = True
    elif stop.error is not None:
        raise stop.error
