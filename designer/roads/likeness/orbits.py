"""Profiles up to trades of places: one representative each, and the way there.

The representative of a profile has the types of every group in rising order. A multiset of
types is one representative: C(m + T - 1, m) of them for m alike parties of T types, against T^m
profiles.
"""

from __future__ import annotations

import itertools
import math
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np

from designer.program.linear import BoolArray, IndexArray
from designer.roads.likeness.likeness import Likeness
from designer.roads.multisets import multisets
from designer.setting.profiles import strides
from designer.setting.setting import IntArray, Setting

WORDS = 2**62
"""Profile numbers below this are held in int64."""


class Orbits:
    """The representatives of a setting's profiles under the trades of a likeness."""

    def __init__(self, setting: Setting, likeness: Likeness) -> None:
        """Nothing is laid out before it is asked."""
        self.setting, self.likeness = setting, likeness
        # profile numbers are Python integers where they pass 64 bits
        self.dtype = np.dtype(np.int64 if setting.profiles < WORDS else object)
        self.strides: IndexArray = np.array(strides(setting.shape), dtype=self.dtype)
        self._words = _words(setting.shape)
        self._asked: list[tuple[IndexArray, tuple[IndexArray, IndexArray | None]]] = []
        self.options = len(setting.options)

    # -- the representatives ---------------------------------------------------------------

    @cached_property
    def _every(self) -> tuple[IndexArray, IntArray]:
        numbers, weights = self._spread(self.likeness.groups)
        order = np.argsort(numbers)
        return numbers[order], weights[order]

    @property
    def profiles(self) -> IndexArray:
        """The numbers of the representatives, rising, int (R,)."""
        return self._every[0]

    @property
    def weights(self) -> IntArray:
        """The weight of all profiles that each stands for, int (R,)."""
        return self._every[1]

    @cached_property
    def first_slot(self) -> BoolArray:
        """Whether a representative's party is the first of its group with its type, (R, n)."""
        types = self.types(self.profiles)
        first = np.ones(types.shape, dtype=bool)
        for i, j in self.likeness.steps:
            first[:, j] = types[:, j] != types[:, i]
        return first

    @cached_property
    def kinds(self) -> IndexArray:
        """Per representative and option, the first option it can trade places with, (R, K).

        Trades of equal types leave the representative as it is, and may move options.
        """
        own = np.arange(self.options, dtype=np.int64)
        kinds = np.tile(own, (len(self.profiles), 1))
        if self.likeness.still:
            return kinds
        before = None
        while before is None or not np.array_equal(before, kinds):
            before = kinds.copy()
            for i, j in self.likeness.steps:
                same = ~self.first_slot[:, j]
                there = kinds[same]
                kinds[same] = np.minimum(there, there[:, self.likeness.moves[i, j]])
        return kinds

    # -- from any profile ------------------------------------------------------------------

    def types(self, profiles: IndexArray) -> IndexArray:
        """Type positions at the listed profiles, int (R, n)."""
        found = np.empty((len(profiles), len(self.setting.shape)), dtype=np.int64)
        rest = profiles
        for word in self._words:
            part = (rest % word.size).astype(np.int64) if len(self._words) > 1 else rest
            rest = rest // word.size if len(self._words) > 1 else rest
            found[:, word.parties] = part[:, None] // word.strides % word.shape
        return found

    def numbers(self, types: IndexArray) -> IndexArray:
        """Profile numbers of rows of type positions, int (R,)."""
        total: IndexArray = np.zeros(len(types), dtype=self.dtype)
        for word in reversed(self._words):
            total = total * word.size + types[:, word.parties] @ word.strides
        return total

    def to_first(self, profiles: IndexArray) -> tuple[IndexArray, IndexArray | None]:
        """The place of each profile's representative in `profiles`, and where options go.

        x_k(theta) = x_moved[k](representative); None where no option ever moves.
        """
        for known, found in self._asked:
            if known is profiles:
                return found
        found = self._found(profiles)
        # payments and chances ask for the same lists, truths and lies in turn
        self._asked = [*self._asked[-1:], (profiles, found)]
        return found

    def _found(self, profiles: IndexArray) -> tuple[IndexArray, IndexArray | None]:
        types = self.types(profiles)
        moved = None
        if self.likeness.still:
            for group in self.likeness.groups:
                types[:, group] = np.sort(types[:, group], axis=1)
        else:
            moved = np.tile(np.arange(self.options, dtype=np.int64), (len(profiles), 1))
            for group in self.likeness.groups:
                self._ordered(types, moved, group)
        return np.searchsorted(self.profiles, self.numbers(types)), moved

    def _ordered(self, types: IndexArray, moved: IndexArray, group: tuple[int, ...]) -> None:
        """Sort a group's types by trades of neighbours, and carry the options along."""
        for last in range(len(group) - 1, 0, -1):
            for i, j in itertools.pairwise(group[: last + 1]):
                at = np.flatnonzero(types[:, i] > types[:, j])
                types[at, i], types[at, j] = types[at, j], types[at, i]
                moved[at] = self.likeness.moves[i, j][moved[at]]

    def slot(self, party: int, profiles: IndexArray) -> IndexArray:
        """The party that takes a party's place at the representative, int (R,).

        Where several of its group have its type, the first of them.
        """
        group = np.array(self.likeness.group_of(party), dtype=np.int64)
        types = self.types(profiles)
        lower = (types[:, group] < types[:, [party]]).sum(axis=1)
        found: IndexArray = group[lower]
        return found

    # -- seen by one party -----------------------------------------------------------------

    def fiber(self, party: int) -> IndexArray:
        """A party's profiles by own type and the others' types up to trades, int (T_i, M)."""
        others, _ = self._others(party)
        own = np.arange(self.setting.shape[party]).astype(self.dtype) * self.strides[party]
        found: IndexArray = own[:, None] + others
        return found

    def beliefs(self, party: int) -> IntArray:
        """The weights of the others' types up to trades, int (M,)."""
        return self._others(party)[1]

    def _others(self, party: int) -> tuple[IndexArray, IntArray]:
        groups = [tuple(i for i in group if i != party) for group in self.likeness.groups]
        return self._spread([group for group in groups if group])

    def _spread(self, groups: Any) -> tuple[IndexArray, IntArray]:
        """Numbers and weights of all choices of a multiset of types per group."""
        numbers: IndexArray = np.zeros(1, dtype=self.dtype)
        weights: IntArray = np.ones(1, dtype=object)
        for group in groups:
            counts, own = multisets(len(group), self.setting.parties[group[0]].weights)
            # from how many have each type to the types in rising order
            kinds = np.tile(np.arange(counts.shape[1]), len(counts))
            types = np.repeat(kinds, counts.ravel()).reshape(len(counts), len(group))
            numbers = np.add.outer(numbers, types @ self.strides[list(group)]).ravel()
            weights = np.multiply.outer(weights, own.astype(object)).ravel()
        return numbers, weights


@dataclass(frozen=True, eq=False)
class _Word:
    """Consecutive parties whose part of a profile number fits a word: its range, and strides."""

    parties: slice
    size: int
    shape: IndexArray
    strides: IndexArray


def _words(shape: tuple[int, ...]) -> tuple[_Word, ...]:
    """The parties in words, the last first: Python integers are only split and put together."""
    found = []
    stop = len(shape)
    while stop:
        start, size = stop, 1
        while start and (start == stop or size * shape[start - 1] < WORDS):
            start -= 1
            size *= shape[start]
        own = shape[start:stop]
        found.append(
            _Word(
                slice(start, stop),
                size,
                np.array(own, dtype=np.int64),
                np.array(strides(own), dtype=np.int64),
            )
        )
        stop = start
    return tuple(found)


def count(setting: Setting, likeness: Likeness) -> int:
    """How many representatives there are."""
    return math.prod(
        math.comb(len(group) + setting.shape[group[0]] - 1, len(group)) for group in likeness.groups
    )
