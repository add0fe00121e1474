"""The pot at every profile, in blocks, without holding the whole table of payments."""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np

from designer.engines.watch import Watch
from designer.roads.typegraph.bases import Base
from designer.roads.typegraph.fibers import Fibers
from designer.setting.setting import IntArray

BLOCK = 1 << 17
"""Profiles of one block, about."""


def least_pot(works: list[Fibers], bases: list[Base], watch: Watch) -> tuple[Fraction, int]:
    """The least sum_i t_i(theta) - outlay over the profiles in scope, and the first place."""
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
    least: int | None = None
    place = 0
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
            if not len(inside):
                continue
            here = int(inside[flat[inside].argmin()])
        else:
            here = int(flat.argmin())
        if least is None or int(flat[here]) < least:
            least, place = int(flat[here]), start + here
    if least is None:
        raise AssertionError("some profile is in scope")
    return Fraction(least, den), place


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
