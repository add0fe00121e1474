"""A party's type graphs: one per profile of the others, equal ones counted once.

What a party can gain by a lie depends on the others only through what is decided for each of
its reports: with independent types and private worths, others' profiles with the same row of
decisions have the same graph and are one *class* whose probability is their sum. Otherwise
every profile of the others is a class of its own.

    cost[g, a, b]   what honesty lets type a pay more than type b:
                    worth(a told a) - worth(a told b) + slack
    room[g, a]      what participation lets type a pay: worth(a told a) - outside + shortfall

all in units of 1 / den, den a multiple of the setting's grain.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from designer.demands.terms import Terms
from designer.roads.typegraph.decided import Decided, Indices, Mask
from designer.setting.setting import IntArray, Setting

ENTRIES = 1 << 18
"""Entries of one block of costs, which stay in cache."""
ROOM = 2**58


@dataclass(frozen=True, eq=False)
class Lengths:
    """The graphs of consecutive classes.

    cost (B, T, T), room (B, T), worth (B, T): of honest reports, before payment
    sinks (B, T): the weight of class and type;  scope bool (B, T), None: everywhere
    """

    cost: IntArray
    room: IntArray
    worth: IntArray
    sinks: IntArray
    scope: Mask | None


@dataclass(frozen=True, eq=False)
class Fibers:
    """The classes of one party's graphs.

    rows   int, shape (G, T): what is decided for each report, by place in the palette
    of     int, shape (R,): the class of each of the others' profiles
    mass   int, shape (G,): the weight of the class (1 where weights differ by own type)
    only   int, shape (G,): the others' profiles that the classes stand for; None: all of them
    """

    setting: Setting
    terms: Terms
    decided: Decided
    party: int
    rows: IntArray
    of: Indices
    mass: IntArray
    merged: bool
    only: Indices | None = None

    @property
    def classes(self) -> int:
        """G."""
        return len(self.rows)

    @property
    def types(self) -> int:
        """T."""
        return int(self.rows.shape[1])

    @cached_property
    def den(self) -> int:
        """The common denominator of every party's payments."""
        return common(self.setting, self.terms, self.decided)

    @cached_property
    def reach(self) -> int:
        """More than any sum of costs along a path."""
        setting, terms, scale = self.setting, self.terms, self.den // self.setting.grain
        largest = 1
        for party in setting.parties:
            for array in (party.value, party.outside):
                largest = max(largest, int(abs(array).max()))
        allowed = abs(int(terms.slack * self.den)) + abs(int(terms.shortfall * self.den))
        return (2 * largest * scale + allowed + 1) * (self.types + 3)

    @cached_property
    def dtype(self) -> np.dtype[np.int64] | np.dtype[np.object_]:
        """int64 where every path fits, Python integers otherwise."""
        return np.dtype(np.int64) if self.reach < ROOM else np.dtype(object)

    @property
    def far(self) -> int:
        """The length of a path that does not exist: beyond `reach`, yet addable thrice."""
        return 2**60 if self.dtype == np.dtype(np.int64) else 4 * self.reach

    @cached_property
    def total(self) -> int:
        """The weight that all sinks add up to."""
        return self.setting.total_weight

    @cached_property
    def own(self) -> IntArray:
        """Weights of the party's types, int (T,), where classes have a mass of their own."""
        return np.array(self.setting.parties[self.party].weights, dtype=object)

    @cached_property
    def apart(self) -> Indices:
        """Others' profiles by own type as profile numbers, int (R, T); for classes unmerged."""
        grid = np.arange(self.setting.profiles, dtype=np.int64).reshape(self.setting.shape)
        every = np.ascontiguousarray(np.moveaxis(grid, self.party, -1)).reshape(-1, self.types)
        return every if self.only is None else every[self.only]

    @cached_property
    def _values(self) -> IntArray:
        """A private worth by type and lottery, int (T, P), in units of 1 / den."""
        party, decided = self.setting.parties[self.party], self.decided
        scale = self.den // (self.setting.grain * decided.den)
        table: IntArray = (
            party.value.astype(self.dtype) @ decided.palette.T.astype(self.dtype)
        ) * scale
        return table

    @cached_property
    def leaning(self) -> Fibers | None:
        """The same classes under a rule that leans towards the other choices at ties."""
        if self.decided.mixed or not len(self.decided.tied):
            return None
        return replace(self, decided=self.decided.leaning(4 * self.reach))

    def blocks(self) -> Iterator[tuple[int, Lengths]]:
        """All classes, block by block: the first class, and the graphs."""
        size = max(1, ENTRIES // self.types**2)
        for start in range(0, self.classes, size):
            yield start, self.lengths(start, min(start + size, self.classes))

    def worths(self, start: int, stop: int) -> IntArray:
        """Worth by class, true type and told type, (B, T, T), in units of 1 / den."""
        party = self.setting.parties[self.party]
        rows = self.rows[start:stop]
        if not party.depends:
            return np.ascontiguousarray(np.moveaxis(self._values[:, rows], 0, 1))
        scale = self.den // (self.setting.grain * self.decided.den)
        value = party.value.astype(self.dtype)[self.apart[start:stop]]
        taken = self.decided.palette.astype(self.dtype)[rows]
        found: IntArray = np.matmul(value, taken.transpose(0, 2, 1)) * scale
        return found

    def outsides(self, start: int, stop: int) -> IntArray:
        """The outside option by class and type, (B, T), in units of 1 / den."""
        party = self.setting.parties[self.party]
        outside: IntArray = party.outside.astype(self.dtype) * (self.den // self.setting.grain)
        if party.outside_depends:
            return outside[self.apart[start:stop]]
        return np.broadcast_to(outside, (stop - start, self.types))

    def lengths(self, start: int, stop: int) -> Lengths:
        """The graphs of the classes start <= g < stop."""
        setting, terms = self.setting, self.terms
        worth = self.worths(start, stop)
        diagonal = np.arange(self.types)
        honest = worth[:, diagonal, diagonal]
        cost = honest[:, :, None] - worth + int(terms.slack * self.den)
        if setting.parties[self.party].name in terms.trusted:
            cost[:] = self.far * 2
        cost[:, diagonal, diagonal] = 0
        room = honest - self.outsides(start, stop) + int(terms.shortfall * self.den)
        sinks = self.sinks(start, stop)
        scope = None
        if setting.support_only and setting.joint is not None:
            scope = (sinks != 0).astype(bool)
            cost[~scope] = self.far * 2
            cost[:, diagonal, diagonal] = 0
        return Lengths(cost, room, honest, sinks, scope)

    def sinks(self, start: int, stop: int) -> IntArray:
        """The weight of each class and type, (B, T): Python ints unless they surely fit."""
        if self.setting.joint is not None:
            joint: IntArray = self.setting.joint[self.apart[start:stop]]
            return joint
        held = np.int64 if self.total < ROOM else object
        mass, own = self.mass[start:stop].astype(held), self.own.astype(held)
        product: IntArray = mass[:, None] * own[None, :]
        return product

    def sum(self, sinks: IntArray, amounts: IntArray, largest: int | None = None) -> int:
        """Sum of weight * amount, exact."""
        most = self.reach if largest is None else largest
        if self.total * most < ROOM * 8:
            return int((sinks * amounts).sum())
        return int((sinks.astype(object) * amounts).sum())

    def shared(self, start: int, stop: int, amounts: IntArray) -> list[int]:
        """Sum over classes of mass * amount, by type; exact."""
        mass = self.mass[start:stop, None]
        if self.total * self.reach < ROOM * 8:
            return [int(v) for v in (mass * amounts).sum(axis=0)]
        return [int(v) for v in (mass.astype(object) * amounts).sum(axis=0)]


def common(setting: Setting, terms: Terms, decided: Decided) -> int:
    """The denominator under which every worth of a lottery and every allowance is whole."""
    return math.lcm(
        setting.grain * decided.den, terms.slack.denominator, terms.shortfall.denominator
    )


def fibers(setting: Setting, terms: Terms, decided: Decided, party: int) -> Fibers:
    """The classes of a party's graphs under a settled rule."""
    own = setting.parties[party]
    grid = decided.at.reshape(setting.shape)
    rows = np.ascontiguousarray(np.moveaxis(grid, party, -1)).reshape(-1, own.size)
    merged = setting.joint is None and not own.depends and not own.outside_depends
    if merged:
        first, of = _distinct(rows, len(decided.palette))
        mass = _gathered(others_weights(setting, party), of, len(first))
        return Fibers(setting, terms, decided, party, rows[first], of, mass, True)
    size = len(rows)
    of = np.arange(size, dtype=np.int64)
    mass = (
        np.ones(size, dtype=np.int64)
        if setting.joint is not None
        else others_weights(setting, party)
    )
    return Fibers(setting, terms, decided, party, rows, of, mass, False)


def _distinct(rows: IntArray, palette: int) -> tuple[Indices, Indices]:
    """The first of each kind of row, and the kind of each row."""
    types = rows.shape[1]
    if palette**types < 2**62:
        key: IntArray = np.zeros(len(rows), dtype=np.int64)
        for a in range(types):
            key = key * palette + rows[:, a]
    else:
        key = rows.view(np.dtype((np.void, rows.itemsize * types))).ravel()
    _, first, of = np.unique(key, return_index=True, return_inverse=True)
    return first.astype(np.int64), of.astype(np.int64)


def others_weights(setting: Setting, party: int) -> IntArray:
    """The weight of each of the others' profiles, (R,); independent types only."""
    total = setting.total_weight // sum(setting.parties[party].weights)
    dtype = np.int64 if total < ROOM else object
    product = np.ones(1, dtype=dtype)
    for other, each in enumerate(setting.parties):
        if other != party:
            product = np.multiply.outer(product, np.array(each.weights, dtype=dtype)).ravel()
    return product


def _gathered(weights: IntArray, of: Indices, classes: int) -> IntArray:
    """The weight of each class."""
    mass = np.zeros(classes, dtype=weights.dtype)
    np.add.at(mass, of, weights)
    return mass
