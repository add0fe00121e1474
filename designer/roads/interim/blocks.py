"""One exact pass over all profiles, in blocks: what a rule takes, and with what weight.

The inner parties' differences between two options are kept as arrays of about 1e5 entries;
the outer parties' types only move the thresholds they are compared with. Memory stays flat
however many profiles there are, and both cores work, each on its own types of one party.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from designer.engines.watch import Watch
from designer.roads.interim.additive import Additive, additive, settled, words
from designer.roads.interim.cores import on_cores
from designer.roads.interim.rule import Counts, Rule
from designer.setting.setting import IntArray, Setting

INNER = 1 << 17
"""Profiles of the inner parties held at once."""

ROOM = 2**62

Mask = npt.NDArray[np.bool_]
Ints = npt.NDArray[Any]


def work(setting: Setting) -> float:
    """Seconds that a pass takes, roughly."""
    options = len(setting.options)
    even = all(len(set(party.weights)) == 1 for party in setting.parties)
    each = 4e-10 * options * (options - 1) / 2 + (3e-10 if even else 2e-9) * options
    return 1e-3 + setting.profiles * each


def count(setting: Setting, rule: Rule, lead: int | None, watch: Watch) -> Counts:
    """The exact counts of a rule, slice by slice of the lead party's types (None: one slice)."""
    if not rule.indices:
        return _count_table(setting, lead)
    shape = setting.shape
    own = shape.index(max(shape)) if lead is None else lead
    plan = _Pass.plan(setting, additive(rule), own)
    if setting.profiles < 4 * INNER:
        counts = Counts(tuple(plan.slice(g, watch) for g in range(shape[own])))
    else:
        each = setting.profiles // shape[own]
        counts = Counts(
            tuple(on_cores(plan.slice, shape[own], watch, "counting every profile", each))
        )
    return counts.merged() if lead is None else counts


@dataclass(frozen=True, eq=False)
class _Pass:
    """Everything that one slice needs, prepared once.

    differences  per pair of options (k, other), k < other: the inner parties' sums of
                 index_k - index_other, as limbs, or in one short word where they fit
    """

    shape: tuple[int, ...]
    lead: int
    outer: tuple[int, ...]
    inner: tuple[int, ...]
    index: Additive
    reach: int
    weights: tuple[tuple[int, ...], ...]
    differences: dict[tuple[int, int], list[Ints]]
    inner_weight: IntArray | None
    inner_total: int
    even: int

    @staticmethod
    def plan(setting: Setting, index: Additive, lead: int) -> _Pass:
        """Choose the inner parties and sum their indices."""
        others = [i for i in range(len(setting.shape)) if i != lead]
        inner: list[int] = []
        size = 1
        for party in sorted(others, key=lambda i: setting.shape[i]):
            if size * setting.shape[party] <= INNER:
                inner.append(party)
                size *= setting.shape[party]
        inner.sort()
        reach = 4 * index.reach + 4
        short = next((word for word in (np.int16, np.int32) if reach < np.iinfo(word).max), None)
        differences = {}
        for k, other in itertools.combinations(range(len(setting.options)), 2):
            parts = [
                words(index.parties[i][:, k] - index.parties[i][:, other], reach) for i in inner
            ]
            zero = words(np.zeros(1, dtype=object), reach)
            limbs = settled(
                [_outer_sum([part[limb] for part in parts]) for limb in range(len(zero))]
            )
            differences[k, other] = limbs if short is None else [limbs[0].astype(short)]
        weights = tuple(party.weights for party in setting.parties)
        product: Ints = np.ones(1, dtype=object)
        for i in inner:
            product = np.multiply.outer(product, np.array(weights[i], dtype=object)).ravel()
        first, total = int(product[0]), int(product.sum())
        even = first if all(int(w) == first for w in product) else 0
        return _Pass(
            setting.shape,
            lead,
            tuple(i for i in others if i not in inner),
            tuple(inner),
            index,
            reach,
            weights,
            differences,
            None if even else product.astype(np.int64 if total < ROOM else object),
            total,
            even,
        )

    def slice(self, g: int, watch: Watch) -> tuple[IntArray, ...]:
        """The counts of every party where the lead party has type g."""
        options = len(self.index.options)
        size = math.prod(self.shape[i] for i in self.inner)
        kind = self._kind()
        held = [np.zeros(size, dtype=kind) for _ in range(options - 1)]
        counts = [np.zeros((n, options), dtype=object) for n in self.shape]
        for step, (types, weight) in enumerate(self._outer()):
            if step % 64 == 0:
                watch.check()
            left = self.inner_total
            for k, mask in enumerate(self._taken(g, types)):
                held[k] += mask if weight == 1 else np.multiply(mask, weight, dtype=kind)
                weighed = self._weigh(mask)
                left -= weighed
                self._add(counts, g, types, k, weighed * weight)
            self._add(counts, g, types, options - 1, left * weight)
        grids = [part.reshape([self.shape[i] for i in self.inner]) for part in held]
        spent = math.prod(sum(self.weights[i]) for i in self.outer) * self.inner_total
        for place, party in enumerate(self.inner):
            for k, grid in enumerate(grids):
                counts[party][:, k] += self._marginal(grid, place)
            each = spent // sum(self.weights[party])
            for a, own in enumerate(self.weights[party]):
                counts[party][a, -1] = each * own - sum(counts[party][a, :-1])
        own = self.weights[self.lead][g]
        return tuple(table * own for table in counts)

    def _add(
        self, counts: list[IntArray], g: int, types: tuple[int, ...], k: int, weight: int
    ) -> None:
        counts[self.lead][g, k] += weight
        for party, a in zip(self.outer, types, strict=True):
            counts[party][a, k] += weight

    def _kind(self) -> type[np.generic]:
        """The word that holds the outer weights at one inner profile."""
        total = math.prod(sum(self.weights[i]) for i in self.outer)
        for word in (np.uint16, np.uint32, np.int64):
            if total < np.iinfo(word).max // 2:
                return word
        return np.object_

    def _outer(self) -> Iterator[tuple[tuple[int, ...], int]]:
        for types in itertools.product(*(range(self.shape[i]) for i in self.outer)):
            weight = math.prod(self.weights[i][a] for i, a in zip(self.outer, types, strict=True))
            yield types, weight

    def _taken(self, g: int, types: tuple[int, ...]) -> Iterator[Mask]:
        """Per option but the last, where in the inner block it is taken."""
        row = self.index.options + self.index.parties[self.lead][g]
        for i, a in zip(self.outer, types, strict=True):
            row = row + self.index.parties[i][a]
        options = len(row)
        left: Mask | None = None
        for k in range(options - 1):
            mask = left
            for other in range(k + 1, options):
                beats = self._at_least(k, other, int(row[other] - row[k]))
                mask = beats if mask is None else mask & beats
            # Ties went to the option listed first: what is taken is out of the running.
            if mask is None:
                raise AssertionError("there is an option after k")
            yield mask
            if k < options - 2:
                left = ~mask if left is None else left & ~mask

    def _at_least(self, k: int, other: int, threshold: int) -> Mask:
        """Where index_k - index_other reaches a threshold; limbs decide in order."""
        limbs = self.differences[k, other]
        if len(limbs) == 1:
            return np.asarray(limbs[0] >= limbs[0].dtype.type(threshold))
        wanted = [
            int(w[0]) for w in settled(words(np.array([threshold], dtype=object), self.reach))
        ]
        last = len(limbs) - 1
        mask: Mask = np.asarray(limbs[last] >= wanted[last])
        for limb in reversed(range(last)):
            above = limbs[limb] > wanted[limb]
            mask = above | ((limbs[limb] == wanted[limb]) & mask)
        return mask

    def _weigh(self, mask: Mask) -> int:
        if self.inner_weight is None:
            return int(np.count_nonzero(mask)) * self.even
        return int(self.inner_weight[mask].sum()) if mask.any() else 0

    def _marginal(self, grid: Ints, place: int) -> IntArray:
        """Weights of one inner party's types in a block already weighed by the outer ones."""
        total = self.inner_total * math.prod(sum(self.weights[i]) for i in self.outer)
        whole: Ints = grid.astype(np.int64 if total < ROOM else object)
        if self.inner_weight is not None:
            whole = whole * self.inner_weight.reshape(grid.shape)
        axes = tuple(axis for axis in range(grid.ndim) if axis != place)
        rows: IntArray = np.asarray(whole.sum(axis=axes)).astype(object)
        return rows * (self.even or 1)


def _outer_sum(tables: list[npt.NDArray[np.int64]]) -> npt.NDArray[np.int64]:
    """Sums of one entry per table, last table fastest."""
    total = np.zeros(1, dtype=np.int64)
    for table in tables:
        total = np.add.outer(total, table).ravel()
    return total


def _count_table(setting: Setting, lead: int | None) -> Counts:
    """The counts of the given table."""
    rule = setting.rule
    if rule is None:
        raise ValueError("the setting gives no decision rule")
    weighed = rule.astype(object) * setting.weights.astype(object)[:, None]
    grid = weighed.reshape(*setting.shape, rule.shape[1])
    slices = []
    for g in [None] if lead is None else range(setting.shape[lead]):
        part = grid if g is None or lead is None else np.take(grid, [g], axis=lead)
        tables = []
        for party, size in enumerate(setting.shape):
            axes = tuple(axis for axis in range(len(setting.shape)) if axis != party)
            table = part.sum(axis=axes)
            if g is not None and party == lead:
                full = np.zeros((size, rule.shape[1]), dtype=object)
                full[g] = table[0]
                table = full
            tables.append(table)
        slices.append(tuple(tables))
    return Counts(tuple(slices), setting.rule_den)
