"""Where leading indices, such as welfare, leave more than one option open.

Exact sums over half-profiles, added up a slab at a time: what is the best option is settled by
integers, whatever floats come after.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt

from designer.roads.interim.additive import Words, additive, settled, words
from designer.roads.interim.rule import Index, Rule
from designer.setting.setting import Setting

Mask = npt.NDArray[np.bool_]


class Leading:
    """The sums of indices that decide before all prices; profiles are outer with inner halves."""

    def __init__(self, setting: Setting, indices: Sequence[Index], cut: int) -> None:
        """Sum over the parties before `cut` and over the others."""
        index = additive(Rule(tuple(indices)))
        reach = 2 * index.reach + 2
        tables = [words(table, reach) for table in index.parties]
        options = words(index.options, reach)
        self.outer = _sums(tables[:cut], options)
        self.inner = _sums(tables[cut:], [np.zeros_like(limb) for limb in options])

    def open(self, first: int, rows: int) -> Mask:
        """Which options are best at some outer halves with all inner ones: (K, rows, inner)."""
        parts = zip(self.outer, self.inner, strict=True)
        sums = [high[:, first : first + rows, None] + low[:, None, :] for high, low in parts]
        best: Mask | None = None
        for limb in settled(sums):
            least = limb.min()
            level = limb if best is None else np.where(best, limb, least)
            top = level == level.max(axis=0)
            best = top if best is None else best & top
        if best is None:
            raise AssertionError("an integer has a limb")
        return best


def _sums(tables: Sequence[Words], start: Words) -> Words:
    """Limbs of the sums of one row per table, last table fastest: (K, half-profiles)."""
    found = [limb[:, None] for limb in start]
    for table in tables:
        found = [
            (total[:, :, None] + limb.T[:, None, :]).reshape(len(total), -1)
            for total, limb in zip(found, table, strict=True)
        ]
    return found
