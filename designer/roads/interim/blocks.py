"""One exact pass over all profiles, in blocks: what a rule takes, and with what weight.

The sums of the inner parties' indices are kept as arrays of about 1e5 entries; the outer
parties' types only add offsets to them. Memory stays flat however many profiles there are,
and both cores work, each on its own types of the lead party.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterator
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from designer.engines.watch import Watch
from designer.roads.interim.rule import Counts, Index, Rule
from designer.setting.setting import IntArray, Setting

INNER = 1 << 17
"""Profiles of the inner parties held at once."""

ROOM = 2**62
LIMB = 40
"""Bits per limb where index sums do not fit 64 bits."""

Mask = npt.NDArray[np.bool_]


def count(setting: Setting, rule: Rule, lead: int, watch: Watch) -> Counts:
    """The exact counts of a rule, slice by slice of the lead party's types."""
    if not rule.indices:
        return _count_table(setting, lead)
    work = _Pass.plan(setting, rule, lead)
    sizes = range(setting.shape[lead])
    done = 0
    total = setting.profiles

    def one(g: int) -> tuple[IntArray, ...]:
        nonlocal done
        taken = work.slice(g, watch)
        done += total // setting.shape[lead]
        watch.tell(f"counting profiles of {total:,}", done)
        return taken

    if total < 4 * INNER:
        return Counts(tuple(one(g) for g in sizes))
    with ThreadPoolExecutor(max_workers=2) as pool:
        return Counts(tuple(pool.map(one, sizes)))


def combined(setting: Setting, rule: Rule) -> list[Index]:
    """The rule's indices as one additive integer index, split into limbs of int64 if it must be.

    A lexicographic pair becomes first * R + second with R above the range of the second.
    Limb l of a sum is the sum of limbs l; carries are settled when sums are compared.
    """
    tables = _tables(rule.indices[0])
    for index in rule.indices[1:]:
        lower = _tables(index)
        span = 2 * sum(int(abs(t).max()) for t in lower) + 1
        tables = [t * span + u for t, u in zip(tables, lower, strict=True)]
    shared = math.gcd(*(int(v) for t in tables for v in t.flat)) or 1
    tables = [t // shared for t in tables]
    limbs = []
    if sum(int(abs(t).max()) for t in tables) >= ROOM:
        while max(int(abs(t).max()) for t in tables) >= 1 << LIMB:
            limbs.append([t & ((1 << LIMB) - 1) for t in tables])
            tables = [t >> LIMB for t in tables]
    limbs.append(tables)
    return [
        Index(tuple(t.astype(np.int64) for t in limb[:-1]), limb[-1][0].astype(np.int64))
        for limb in reversed(limbs)
    ]


def _tables(index: Index) -> list[IntArray]:
    """Every party's table, then the options' row, relative to the first option."""
    return [
        _relative(np.asarray(t, dtype=object)) for t in (*index.parties, index.options[None, :])
    ]


def _relative(table: IntArray) -> IntArray:
    """The same choices from smaller numbers: only differences between options matter."""
    return table - table[:, :1]


@dataclass(frozen=True, eq=False)
class _Pass:
    """Everything that one slice needs, prepared once."""

    shape: tuple[int, ...]
    lead: int
    outer: tuple[int, ...]
    inner: tuple[int, ...]
    limbs: list[Index]
    weights: tuple[tuple[int, ...], ...]
    sums: list[list[npt.NDArray[np.int64]]]
    inner_weight: npt.NDArray[np.float64] | None
    even: int

    @staticmethod
    def plan(setting: Setting, rule: Rule, lead: int) -> _Pass:
        """Choose the inner parties and sum their indices."""
        others = [i for i in range(len(setting.shape)) if i != lead]
        inner: list[int] = []
        size = 1
        for index in sorted(others, key=lambda i: setting.shape[i]):
            if size * setting.shape[index] <= INNER:
                inner.append(index)
                size *= setting.shape[index]
        inner.sort()
        outer = tuple(i for i in others if i not in inner)
        limbs = combined(setting, rule)
        options = len(setting.options)
        sums = [
            [_outer_sum([limb.parties[i][:, k] for i in inner]) for k in range(options)]
            for limb in limbs
        ]
        weights = tuple(party.weights for party in setting.parties)
        product = np.ones(1, dtype=object)
        for i in inner:
            product = np.multiply.outer(product, np.array(weights[i], dtype=object)).ravel()
        first = int(product[0])
        even = first if all(int(w) == first for w in product) else 0
        if not even and int(product.sum()) >= 2**53:
            raise OverflowError("the weights of the inner parties exceed 53 bits")
        return _Pass(
            setting.shape,
            lead,
            outer,
            tuple(inner),
            limbs,
            weights,
            sums,
            None if even else product.astype(np.float64),
            even,
        )

    def slice(self, g: int, watch: Watch) -> tuple[IntArray, ...]:
        """The counts of every party where the lead party has type g."""
        options = len(self.limbs[0].options)
        size = len(self.sums[0][0])
        held = [np.zeros(size, dtype=np.int64 if self._fits() else object) for _ in range(options)]
        counts = [np.zeros((n, options), dtype=object) for n in self.shape]
        for step, (types, weight) in enumerate(self._outer()):
            if step % 64 == 0:
                watch.check()
            for k, mask in enumerate(self._taken(g, types)):
                held[k] += mask if weight == 1 else mask * weight
                total = self._weigh(mask) * weight
                for party, a in zip(self.outer, types, strict=True):
                    counts[party][a, k] += total
                counts[self.lead][g, k] += total
        inner_shape = tuple(self.shape[i] for i in self.inner)
        for k in range(options):
            grid = held[k].reshape(inner_shape)
            for place, party in enumerate(self.inner):
                counts[party][:, k] += self._marginal(grid, place)
        own = self.weights[self.lead][g]
        return tuple(table * own for table in counts)

    def _fits(self) -> bool:
        """Whether every weight of a slice fits 64 bits."""
        others = (i for i in range(len(self.shape)) if i != self.lead)
        return math.prod(sum(self.weights[i]) for i in others) < ROOM

    def _outer(self) -> Iterator[tuple[tuple[int, ...], int]]:
        for types in itertools.product(*(range(self.shape[i]) for i in self.outer)):
            weight = math.prod(self.weights[i][a] for i, a in zip(self.outer, types, strict=True))
            yield types, weight

    def _taken(self, g: int, types: tuple[int, ...]) -> Iterator[Mask]:
        """Per option, where in the inner block it is taken."""
        options = len(self.limbs[0].options)
        scores = []
        for limb, sums in zip(self.limbs, self.sums, strict=True):
            offset = limb.options + limb.parties[self.lead][g]
            for i, a in zip(self.outer, types, strict=True):
                offset = offset + limb.parties[i][a]
            scores.append([sums[k] + offset[k] for k in range(options)])
        left: Mask | None = None
        for k in range(options - 1):
            mask = left
            for other in range(k + 1, options):
                beats = _at_least(scores, k, other)
                mask = beats if mask is None else mask & beats
            # Ties went to the option listed first: what is taken is out of the running.
            if mask is None:
                raise AssertionError("a setting has at least one option")
            yield mask
            left = ~mask if left is None else left & ~mask
        yield np.ones(len(scores[0][0]), dtype=bool) if left is None else left

    def _weigh(self, mask: Mask) -> int:
        if self.even:
            return int(np.count_nonzero(mask)) * self.even
        weight = self.inner_weight
        if weight is None:
            raise AssertionError("uneven weights are always kept")
        return int((weight * mask).sum())  # no BLAS: its threads would fight ours

    def _marginal(self, grid: IntArray, place: int) -> IntArray:
        """Weights of one inner party's types in a block already weighed by the outer ones."""
        rest = np.ones(1, dtype=grid.dtype)
        for other, party in enumerate(self.inner):
            if other != place:
                own = np.array(self.weights[party], dtype=grid.dtype)
                rest = np.multiply.outer(rest, own).ravel()
        party = self.inner[place]
        rows = np.moveaxis(grid, place, 0).reshape(self.shape[party], -1)
        totals: IntArray = (rows @ rest).astype(object)
        return totals * np.array(self.weights[party], dtype=object)


def _outer_sum(tables: list[npt.NDArray[np.int64]]) -> npt.NDArray[np.int64]:
    """Sums of one entry per table, last table fastest."""
    total = np.zeros(1, dtype=np.int64)
    for table in tables:
        total = np.add.outer(total, table).ravel()
    return total


def _at_least(scores: list[list[npt.NDArray[np.int64]]], k: int, other: int) -> Mask:
    """Where option k scores at least as much as another; carries settled limb by limb."""
    carry: npt.NDArray[np.int64] | int = 0
    for limb in reversed(scores[1:]):
        carry = (limb[k] - limb[other] + carry) >> LIMB
    if len(scores) == 1:
        return np.asarray(scores[0][k] >= scores[0][other], dtype=bool)
    return np.asarray((scores[0][k] - scores[0][other] + carry) >= 0, dtype=bool)


def _count_table(setting: Setting, lead: int) -> Counts:
    """The counts of the given table."""
    rule = setting.rule
    if rule is None:
        raise ValueError("the setting gives no decision rule")
    weighed = rule.astype(object) * setting.weights.astype(object)[:, None]
    grid = weighed.reshape(*setting.shape, rule.shape[1])
    slices = []
    for g in range(setting.shape[lead]):
        part = np.take(grid, [g], axis=lead)
        tables = []
        for party, size in enumerate(setting.shape):
            axes = tuple(axis for axis in range(len(setting.shape)) if axis != party)
            table = part.sum(axis=axes)
            if party == lead:
                full = np.zeros((size, rule.shape[1]), dtype=object)
                full[g] = table[0]
                table = full
            tables.append(table)
        slices.append(tuple(tables))
    return Counts(tuple(slices), setting.rule_den)
