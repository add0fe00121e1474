"""Identical units, one to a party: which decision serves whom, and what a unit is worth.

A setting has this shape when every party's worth is the same positive-or-zero s_i(a) at some
decisions ('served') and 0 at the others, and the sets of parties served are, among others, all
those of the largest size m. The parties then bid for m units that are alike.
"""

from __future__ import annotations

import itertools
import math
from dataclasses import dataclass

import numpy as np

from designer.ruling.amounts import Amounts, stacked
from designer.ruling.kinds import Refusal
from designer.ruling.profiles import by_profile
from designer.setting.setting import IntArray, Setting

MOST_SETS = 20_000


@dataclass(frozen=True, eq=False)
class Units:
    """m identical units: worth[i] by type, and the first decision serving each set."""

    count: int
    worth: tuple[Amounts, ...]
    serving: dict[frozenset[int], int]


def units(setting: Setting) -> Units | Refusal:
    """Recognise identical units; a Refusal where the setting has another shape."""
    served = np.zeros((len(setting.parties), len(setting.options)), dtype=bool)
    worths = []
    for i, party in enumerate(setting.parties):
        value = party.value
        busy = (value != 0).any(axis=0)
        if not busy.any():
            return _refuse(f"{party.name}, whose worth is 0 at every decision")
        unit = value[:, int(busy.argmax())]
        if (unit < 0).any() or (value[:, busy] != unit[:, None]).any():
            return _refuse(f"{party.name}, whose worth is not simply with or without a unit")
        served[i] = busy
        worths.append(Amounts(unit, setting.grain))
    serving: dict[frozenset[int], int] = {}
    for k in range(len(setting.options)):
        serving.setdefault(frozenset(np.flatnonzero(served[:, k]).tolist()), k)
    count = max(len(group) for group in serving)
    n = len(setting.parties)
    if math.comb(n, count) > MOST_SETS or any(
        frozenset(group) not in serving for group in itertools.combinations(range(n), count)
    ):
        return _refuse(f"decisions that do not let every {count} of the parties be served")
    return Units(count, tuple(worths), serving)


def _refuse(found: str) -> Refusal:
    return Refusal(
        "one item or identical units, at most one to a party",
        found,
        "Use cavallo-rebate, which takes any decisions, or ask `designer pose`.",
    )


def alike(setting: Setting) -> Refusal | None:
    """Check that the setting is one of identical units."""
    found = units(setting)
    return found if isinstance(found, Refusal) else None


def recognised(setting: Setting) -> Units:
    """Give the units of a setting that is known to have them."""
    found = units(setting)
    if isinstance(found, Refusal):
        raise ValueError(str(found))
    return found


def bids(setting: Setting, found: Units) -> tuple[IntArray, int]:
    """Worth of a unit to each party at every profile: int (n, N), and the denominator."""
    return stacked([by_profile(setting, i, worth) for i, worth in enumerate(found.worth)])
