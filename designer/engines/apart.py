"""HiGHS in a thread of its own, which is left behind where it does not stop when told.

In a mixed-integer solve HiGHS looks up from its work only now and then: measured, 20 seconds
may pass between Ctrl-C or the time limit and its return. The caller waits `PATIENCE` seconds;
then the best table seen so far is the answer, and the thread ends by itself when HiGHS next
looks up.
"""

from __future__ import annotations

import threading
import time
from dataclasses import dataclass, field
from math import inf
from typing import Any

import numpy as np

from designer.engines.listening import Stop
from designer.engines.report import FloatArray
from designer.engines.watch import Watch

PATIENCE = 1.5
"""Seconds HiGHS gets to stop of itself."""
GLANCE = 0.05
"""Seconds between two looks at the clock."""


@dataclass
class Best:
    """What a mixed-integer solve has shown so far: its best point and its bound (min sense)."""

    x: FloatArray | None = None
    bound: float = -inf
    value: float = field(default=inf)

    def see(self, said: Any, improved: bool) -> None:
        """Take what a callback says; called from the thread that solves."""
        self.bound = max(self.bound, float(said.mip_dual_bound))
        if improved and float(said.objective_function_value) < self.value:
            self.value = float(said.objective_function_value)
            self.x = np.array(said.mip_solution, dtype=np.float64)


def run_apart(model: Any, watch: Watch, stop: Stop) -> bool:
    """Run the model; False if it was left behind and must not be touched any more."""
    thread = threading.Thread(target=model.run, name="HiGHS")
    thread.start()
    told: float | None = None
    while thread.is_alive():
        thread.join(GLANCE)
        if told is None and (stop.asked or watch.left <= 0):
            told = time.monotonic()
        if told is not None and time.monotonic() - told > PATIENCE and thread.is_alive():
            stop.left = True
            return False
    return True
