"""Exact counts where every option concerns at most one party, as when one item is assigned.

If party j's index differs only at its own option, the options' scores are independent: option
k's is a constant plus phi(theta_j). It is taken where it is the largest, so the weight is a
product of cumulative weights, one per other option: no pass over profiles, any number of
parties. Every product is exact.
"""

from __future__ import annotations

import math
import operator
from bisect import bisect_left, bisect_right
from dataclasses import dataclass
from itertools import accumulate

import numpy as np

from designer.engines.watch import Watch
from designer.roads.interim.additive import additive
from designer.roads.interim.rule import Counts, Rule
from designer.setting.setting import IntArray, Setting


@dataclass(frozen=True)
class _Option:
    """An option's score by type of the party it concerns (None: a constant one)."""

    party: int | None
    scores: tuple[int, ...]


def concerned(tables: tuple[IntArray, ...]) -> list[int | None] | None:
    """The party whose index each option concerns; None if some party's differs at two of them.

    A party's own option is where its row stands out from a common level.
    """
    options = tables[0].shape[1]
    owner: list[int | None] = [None] * options
    for party, table in enumerate(tables):
        level = table[:, 0]
        if options > 2 and not ((level == table[:, 1]).all() or (level == table[:, 2]).all()):
            level = table[:, 1]
        own = np.flatnonzero((table != level[:, None]).any(axis=0))
        if not len(own):
            continue
        if len(own) > 1 or owner[own[0]] is not None:
            return None
        owner[int(own[0])] = party
    return owner


def work(setting: Setting, rule: Rule) -> float:
    """Seconds that a count takes, roughly; infinite where it cannot be done."""
    if len(setting.options) < 3 or concerned(additive(rule).parties) is None:
        return math.inf
    return 1e-3 + 1e-6 * len(setting.options) * sum(setting.shape) * max(setting.shape)


def count(setting: Setting, rule: Rule, watch: Watch) -> Counts:
    """The exact counts of a rule, in one slice. Raises ValueError where options concern more."""
    index = additive(rule)
    owner = concerned(index.parties)
    if owner is None:
        raise ValueError("an option concerns more than one party")
    options = len(owner)
    scores = []
    for k, party in enumerate(owner):
        constant = int(index.options[k])
        if party is None:
            scores.append(_Option(None, (constant,)))
        else:
            table, other = index.parties[party], 0 if k else 1
            own = tuple(constant + int(row[k] - row[other]) for row in table)
            scores.append(_Option(party, own))
    weights = [[1] if part.party is None else _weights(setting, part.party) for part in scores]
    below = [_Cumulative.of(part.scores, own) for part, own in zip(scores, weights, strict=True)]
    named = {part.party for part in scores}
    silent = math.prod(sum(p.weights) for i, p in enumerate(setting.parties) if i not in named)
    tables = [np.zeros((size, options), dtype=object) for size in setting.shape]
    for k in range(options):
        watch.check()
        _take(setting, k, scores, weights, below, silent, tables)
    return Counts((tuple(tables),))


def _weights(setting: Setting, party: int) -> list[int]:
    return list(setting.parties[party].weights)


@dataclass(frozen=True)
class _Cumulative:
    """Scores in rising order and the weight up to each."""

    scores: list[int]
    weight: list[int]

    @staticmethod
    def of(scores: tuple[int, ...], weights: list[int]) -> _Cumulative:
        pairs = sorted(zip(scores, weights, strict=True))
        total, sums = 0, [0]
        for _, weight in pairs:
            total += weight
            sums.append(total)
        return _Cumulative([score for score, _ in pairs], sums)

    def beaten(self, score: int, strictly: bool) -> int:
        """The weight of the scores below `score`, or not above it."""
        find = bisect_left if strictly else bisect_right
        return self.weight[find(self.scores, score)]


def _take(
    setting: Setting,
    k: int,
    scores: list[_Option],
    weights: list[list[int]],
    below: list[_Cumulative],
    silent: int,
    tables: list[IntArray],
) -> None:
    """Where option k is taken: column k of every party's table."""
    others = [j for j in range(len(scores)) if j != k]
    silenced = [i for i in range(len(setting.parties)) if all(p.party != i for p in scores)]
    # Per type of k's own party: what each other option contributes, and all of them together.
    total = 0
    beaten = [(scores[j].party, j > k, scores[j].scores, weights[j]) for j in others]
    for score, weight in zip(scores[k].scores, weights[k], strict=True):
        row = [below[j].beaten(score, j < k) for j in others]
        rests = _without_each(row, weight * silent)
        product = rests[0] * row[0] if row else weight * silent
        total += product
        for rest, (party, equal, theirs, masses) in zip(rests, beaten, strict=True):
            if party is None or not rest:
                continue
            column = tables[party]
            for b, other in enumerate(theirs):
                if other < score or (equal and other == score):
                    column[b, k] += rest * masses[b]
    own = scores[k].party
    if own is not None:
        for a, score in enumerate(scores[k].scores):
            row = [below[j].beaten(score, j < k) for j in others]
            tables[own][a, k] = math.prod(row) * weights[k][a] * silent
    for i in silenced:
        whole = sum(setting.parties[i].weights)
        for b, weight in enumerate(setting.parties[i].weights):
            tables[i][b, k] = total // whole * weight


def _without_each(row: list[int], factor: int) -> list[int]:
    """The product of all entries but one, times a factor, for each."""
    before = list(accumulate(row, operator.mul, initial=factor))
    after = list(accumulate(reversed(row), operator.mul, initial=1))[::-1]
    return [one * two for one, two in zip(before[:-1], after[1:], strict=True)]
