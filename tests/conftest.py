"""What holds for the whole suite."""

from __future__ import annotations

import signal

# Shells start background jobs with Ctrl-C ignored, and every process below inherits that; the
# tests that press Ctrl-C must mean the same wherever the suite is started from.
signal.signal(signal.SIGINT, signal.default_int_handler)
