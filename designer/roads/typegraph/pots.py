"""The pot at every profile, in blocks, without holding the whole table of payments."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from fractions import Fraction

import numpy as np

from designer.engines.watch import Watch
from designer.roads.typegraph.bases import Base
from designer.roads.typegraph.fibers import Fibers
from designer.setting.setting import IntArray

BLOCK = 1 << 17
"""Profiles of one block, about."""


def least_pot(works: Sequence[Fibers], bases: Sequence[Base], watch: Watch) -> tuple[Fraction, int]:
    """The least sum_i t_i(theta) - outlay over the profiles in scope, and the first place."""
    least: int | None = None
    place = 0
    for numbers, pot in _pots(works, bases, watch):
        here = int(pot.argmin())
        if least is None or int(pot[here]) < least:
            least, place = int(pot[here]), int(numbers[here])
    if least is None:
        raise AssertionError("some profile is in scope")
    return Fraction(least, works[0].den), place


def low_pots(
    works: Sequence[Fibers], bases: Sequence[Base], need: Fraction, most: int, watch: Watch
) -> list[int]:
    """The profiles in scope whose pots are smaller than needed, the lowest `most` of them."""
    found: list[tuple[int, int]] = []
    bar = math.ceil(need * works[0].den)
    for numbers, pot in _pots(works, bases, watch):
        low = np.flatnonzero((pot < bar).astype(bool))
        found += [(int(pot[j]), int(numbers[j])) for j in low]
        if len(found) > 4 * most:
            found = sorted(found)[:most]
    return [profile for _, profile in sorted(found)[:most]]


def _pots(
    works: Sequence[Fibers], bases: Sequence[Base], watch: Watch
) -> Iterator[tuple[IntArray, IntArray]]:
    """Profile numbers in scope and their pots, in units of 1 / den, block by block."""
    setting, decided = works[0].setting, works[0].decided
    shape, den = setting.shape, works[0].den
    outlay = (decided.palette.astype(object) @ setting.outlay.astype(object)) * (
        den // (setting.grain * decided.den)
    )
    dtype = np.int64 if max(work.reach for work in works) * (len(works) + 1) < 2**60 else object
    spent = outlay.astype(dtype)
    weights = setting.joint if setting.support_only and setting.joint is not None else None
    split, size = len(shape), 1
    while split > 1 and size * shape[split - 1] <= BLOCK:
        split -= 1
        size *= shape[split]
    inner = shape[split:]
    for block in range(math.prod(shape[:split])):
        start = block * size
        watch.tell(f"pots of {setting.profiles:,} profiles", start)
        outer: list[int] = []
        rest = block
        for n in reversed(shape[:split]):
            rest, a = divmod(rest, n)
            outer.insert(0, a)
        pot = -spent[decided.at[start : start + size]].reshape(inner)
        for i, (work, found) in enumerate(zip(works, bases, strict=True)):
            pot += _paid(work, found.pays.astype(dtype, copy=False), i, outer, inner, shape)
        flat = pot.ravel()
        if weights is not None:
            inside = np.flatnonzero(weights[start : start + size])
            if len(inside):
                yield inside + start, flat[inside]
        else:
            yield np.arange(start, start + size), flat


def _paid(
    work: Fibers,
    pays: IntArray,
    party: int,
    outer: list[int],
    inner: tuple[int, ...],
    shape: tuple[int, ...],
) -> IntArray:
    """t_i over the inner parties' types, the outer ones fixed."""
    split = len(outer)
    if party < split:
        others = [a for j, a in enumerate(outer) if j != party]
        sizes = [n for j, n in enumerate(shape[:split]) if j != party]
        head = 0
        for a, n in zip(others, sizes, strict=True):
            head = head * n + a
        size = math.prod(inner)
        found: IntArray = pays[work.of[head * size : (head + 1) * size], outer[party]]
        return found.reshape(inner)
    head = 0
    for a, n in zip(outer, shape[:split], strict=True):
        head = head * n + a
    rest = [n for j, n in enumerate(inner) if j != party - split]
    size = math.prod(rest)
    grid = pays[work.of[head * size : (head + 1) * size]].reshape(*rest, shape[party])
    return np.moveaxis(grid, -1, party - split)
