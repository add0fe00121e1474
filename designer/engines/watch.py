"""Time, progress and Ctrl-C: what a long computation looks at between two steps."""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass, field
from math import isnan

from designer.errors import Mistake, UsageError

Progress = Callable[[str, float, int], None]
"""Called with what is being done, the seconds since the start and a step count."""


class Stopped(Exception):  # noqa: N818 - not an error: the caller asked for it
    """A computation that was told to stop; `reason` and `remedy` are for people."""

    reason = "stopped"
    remedy = "run it again to go on"


class TimeUp(Stopped):
    """The time limit was reached."""

    reason = "the time limit was reached"
    remedy = "give it more time with --time-limit"


class Interrupted(Stopped):
    """Somebody pressed Ctrl-C."""

    reason = "interrupted"


@dataclass(frozen=True)
class Watch:
    """A deadline and a listener, shared by every stage of one computation.

    limit     seconds from `start` after which work stops; None: no limit
    progress  called at most every 0.2 seconds while something is running
    start     seconds on the monotonic clock
    """

    limit: float | None = None
    progress: Progress | None = None
    start: float = field(default_factory=time.monotonic)

    def __post_init__(self) -> None:
        """Raise UsageError for a limit that is no number of seconds: it would never pass."""
        if self.limit is not None and isnan(self.limit):
            raise UsageError(
                [
                    Mistake(
                        "--time-limit",
                        repr(self.limit),
                        "a number of seconds",
                        "Leave it out to wait as long as it takes.",
                    )
                ]
            )

    @property
    def seconds(self) -> float:
        """Seconds since the start."""
        return time.monotonic() - self.start

    @property
    def left(self) -> float:
        """Seconds until the deadline, infinite without one, never below 0."""
        return float("inf") if self.limit is None else max(0.0, self.limit - self.seconds)

    def check(self) -> None:
        """Raise TimeUp once the deadline has passed."""
        if self.limit is not None and self.seconds >= self.limit:
            raise TimeUp

    def tell(self, doing: str, steps: int = 0) -> None:
        """Report progress if somebody listens, then `check`."""
        if self.progress is not None:
            self.progress(doing, self.seconds, steps)
        self.check()

    def within(self, seconds: float) -> Watch:
        """Return the same watch with at most `seconds` more from now."""
        limit = self.seconds + min(seconds, self.left)
        return Watch(limit, self.progress, self.start)
