"""Exact counts with two options and few distinct sums, however many profiles there are.

The second option is taken where sum_i d_i(a_i) + d_0 > 0. With integers d_i of small range
the distribution of a sum is a short array, and parties are added one by one (a convolution
with few terms). What one type faces is the distribution of all others' sums: those before it
joined with those after it. Weights of any size are kept as residues to several primes.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from designer.engines.watch import Watch
from designer.roads.interim.additive import Additive, additive
from designer.roads.interim.rule import Counts, Rule
from designer.setting.setting import Setting

SPAN = 1 << 22
"""Longest array of sums."""

Ints = npt.NDArray[np.int64]


def span(setting: Setting, rule: Rule) -> int:
    """How many different sums there may be: the length of the longest array."""
    columns, _ = _steps(additive(rule))
    return 1 + sum(max(column) - min(column) for column in columns)


def _steps(index: Additive) -> tuple[list[list[int]], int]:
    """Every party's d_i in common steps, and what their sum must exceed in such steps."""
    columns = [[int(d) for d in table[:, 1]] for table in index.parties]
    step = math.gcd(*(d for column in columns for d in column)) or 1
    return [[d // step for d in column] for column in columns], -int(index.options[1]) // step


def work(setting: Setting, rule: Rule) -> float:
    """Seconds that a count takes, roughly; infinite where it cannot be done."""
    if len(setting.options) != 2:
        return math.inf
    length = span(setting, rule)
    if length > SPAN:
        return math.inf
    primes = 1 + setting.total_weight.bit_length() // 30
    return 1e-3 + 8e-9 * length * 3 * sum(setting.shape) * primes


def count(setting: Setting, rule: Rule, watch: Watch) -> Counts:
    """The exact counts of a rule, in one slice."""
    index = additive(rule)
    primes = _primes(setting.total_weight)
    columns, least = _steps(index)
    parts = [
        _Sums.of(column, party.weights)
        for column, party in zip(columns, setting.parties, strict=True)
    ]
    before = [_Sums.nothing(len(primes))]
    for i, part in enumerate(parts):
        watch.tell(f"adding the sums of {len(parts)} parties", i)
        before.append(before[-1].plus(part, primes))
    after = _Sums.nothing(len(primes))
    tables = []
    for i in reversed(range(len(parts))):
        watch.check()
        others = before[i]
        taken = [_above(others, after, least - d, primes) for d in columns[i]]
        table = np.zeros((setting.shape[i], 2), dtype=object)
        party = setting.parties[i]
        each = setting.total_weight // sum(party.weights)
        for a, weight in enumerate(party.weights):
            table[a] = [(each - taken[a]) * weight, taken[a] * weight]
        tables.append(table)
        after = after.plus(parts[i], primes)
    return Counts((tuple(reversed(tables)),))


@dataclass(frozen=True, eq=False)
class _Sums:
    """Weights of the sums least, least + 1, ...: residues, int, shape (primes, length).

    A single party is kept as its `terms`, (sum, weight) pairs, too.
    """

    least: int
    weights: Ints
    terms: tuple[tuple[int, int], ...] = ()

    @staticmethod
    def nothing(primes: int) -> _Sums:
        return _Sums(0, np.ones((primes, 1), dtype=np.int64))

    @staticmethod
    def of(column: list[int], weights: tuple[int, ...]) -> _Sums:
        merged: dict[int, int] = {}
        for d, weight in zip(column, weights, strict=True):
            merged[d] = merged.get(d, 0) + weight
        return _Sums(min(column), np.zeros((0, 0), dtype=np.int64), tuple(sorted(merged.items())))

    def plus(self, party: _Sums, primes: list[int]) -> _Sums:
        """The sums with one more party's terms."""
        reach = party.terms[-1][0] - party.terms[0][0]
        length = self.weights.shape[1]
        added = np.zeros((len(primes), length + reach), dtype=np.int64)
        for p, prime in enumerate(primes):
            for d, weight in party.terms:
                start = d - party.terms[0][0]
                part = added[p, start : start + length]
                part += self.weights[p] * (weight % prime) % prime
            added[p] %= prime
        return _Sums(self.least + party.least, added)


def _above(one: _Sums, two: _Sums, threshold: int, primes: list[int]) -> int:
    """The weight of the pairs whose sums exceed the threshold."""
    short, long = sorted((one, two), key=lambda part: part.weights.shape[1])
    length = long.weights.shape[1]
    # A sum s of the short part needs at least threshold + 1 - s from the long one.
    need = threshold + 1 - short.least - np.arange(short.weights.shape[1], dtype=np.int64)
    place = np.clip(need - long.least, 0, length)
    residues = []
    for p, prime in enumerate(primes):
        total = np.zeros(length + 1, dtype=np.int64)
        total[:-1] = np.cumsum(long.weights[p][::-1])[::-1] % prime
        products = short.weights[p] * total[place] % prime
        residues.append(int(products.sum()) % prime)
    return _joined(residues, primes)


def _primes(total: int) -> list[int]:
    """Primes below 2**31 whose product exceeds every weight."""
    found: list[int] = []
    candidate = 2**31 - 1
    while math.prod(found) <= total:
        if all(candidate % d for d in range(3, math.isqrt(candidate) + 1, 2)):
            found.append(candidate)
        candidate -= 2
    return found


def _joined(residues: list[int], primes: list[int]) -> int:
    """The number below the product of the primes with these residues (Garner's method)."""
    value, product = 0, 1
    for residue, prime in zip(residues, primes, strict=True):
        step = (residue - value) * pow(product, -1, prime) % prime
        value, product = value + product * step, product * prime
    return value
