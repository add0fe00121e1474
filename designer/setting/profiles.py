"""Profile numbers: row-major over the parties' types, the last party fastest."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any, cast

import numpy as np

from designer.setting.setting import IntArray

MOST = 5_000_000
"""Most profiles for which a table over profiles (joint prior, rule, interdependent worths) is
held in memory; settings of independent priors and private worths have no such limit."""


def shown(count: int) -> str:
    """A number of profiles, readable whatever its size.

    >>> shown(1234567), shown(10**5000)
    ('1,234,567', 'about 10**5000')
    """
    return f"{count:,}" if count < 10**15 else f"about 10**{round(math.log10(count))}"


def strides(shape: Sequence[int]) -> tuple[int, ...]:
    """stride_i with profile number = sum_i a_i * stride_i.

    >>> strides((2, 3, 4))
    (12, 4, 1)
    """
    steps = [1] * len(shape)
    for i in range(len(shape) - 2, -1, -1):
        steps[i] = steps[i + 1] * shape[i + 1]
    return tuple(steps)


def positions(profile: int, shape: Sequence[int]) -> tuple[int, ...]:
    """The type position of each party at a profile number.

    >>> positions(23, (2, 3, 4))
    (1, 2, 3)
    """
    found = []
    for size in reversed(shape):
        profile, position = divmod(profile, size)
        found.append(position)
    return tuple(reversed(found))


def wide(shape: Sequence[int]) -> tuple[int, ...]:
    """The parties with two types or more.

    Arrays over profiles get an axis for these only, so that numpy's limit of 64 axes is never
    met: at most `MOST` profiles leave at most 22 of them.
    """
    return tuple(i for i, size in enumerate(shape) if size > 1)


def spread(compact: IntArray, axes: Sequence[int], shape: Sequence[int]) -> IntArray:
    """Entries over some parties' types, repeated over everyone else's: (N,).

    compact  int, shape (T_j for j in axes), `axes` increasing
    shape    (T_1, ..., T_n)

    >>> spread(np.array([1, 2]), (0,), (2, 3)).tolist()
    [1, 1, 1, 2, 2, 2]
    """
    seen = compact.reshape([shape[i] if i in axes else 1 for i in wide(shape)])
    full: IntArray = np.broadcast_to(cast(Any, seen), [shape[i] for i in wide(shape)])
    return full.reshape(math.prod(shape))


def narrow(compact: IntArray, axes: Sequence[int]) -> tuple[IntArray, tuple[int, ...]]:
    """Drop the axes along which nothing changes: (compact, axes) in their shortest form.

    >>> narrow(np.array([[1, 1], [2, 2]]), (0, 1))[1]
    (0,)
    """
    kept: list[int] = []
    for axis in axes:
        at = len(kept)
        first = compact.take([0], axis=at)
        if bool(np.all(compact == first)):
            compact = first.reshape(compact.shape[:at] + compact.shape[at + 1 :])
        else:
            kept.append(axis)
    return compact, tuple(kept)
