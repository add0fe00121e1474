"""Exact counts where like units are assigned: options are sets of parties, one unit each at most.

Where every set of l to m parties is an option, and a party's index asks only whether it is
served, an option's score is the sum of x_i(a_i) over the parties it serves. The best serves those
with the largest x: all that are positive, but at least l and at most m. So a set S of m is
taken where the least x in it exceeds the largest outside it, and 0 (if l < m): a sum over the
least one's types of products of cumulative weights, exact, whatever the number of profiles.

Ties go to the option listed first. Where the options stand in a usual order, that is the same as
a last, additive index e_i by which no two sets are tied: x_i * R + e_i, with R large.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from functools import lru_cache
from itertools import pairwise

import numpy as np

from designer.engines.watch import Watch
from designer.roads.interim.additive import Additive, additive
from designer.roads.interim.rule import Counts, Rule
from designer.setting.setting import IntArray, Setting


@dataclass(frozen=True)
class Family:
    """Which sets of parties the options serve: all of `least` to `most` of them.

    parties  those whose worths ask whether they are served; the others do not care
    served   per option, the positions in `parties` that it serves
    order    e_i per position: sums over the sets fall strictly in the order of the options
    """

    parties: tuple[int, ...]
    served: tuple[tuple[int, ...], ...]
    least: int
    most: int
    order: tuple[int, ...]


@lru_cache(maxsize=8)
def family(setting: Setting) -> Family | None:
    """The sets that the options serve, or None where they are not all sets of some sizes."""
    patterns: dict[int, tuple[bool, ...]] = {}
    for index, party in enumerate(setting.parties):
        columns = list(map(tuple, party.value.T.tolist()))
        kinds = set(columns)
        if len(kinds) > 2:
            return None
        if len(kinds) == 2:
            patterns[index] = tuple(column != columns[0] for column in columns)
    if not patterns:
        return None
    served = _turned(np.array(list(patterns.values()), dtype=bool))
    sets = [tuple(int(i) for i in np.flatnonzero(column)) for column in served.T]
    sizes = sorted({len(own) for own in sets})
    least, most = sizes[0], sizes[-1]
    every = sum(math.comb(len(patterns), size) for size in range(least, most + 1))
    if len(set(sets)) < len(sets) or len(sets) != every:
        return None
    order = _order(len(patterns), sets)
    if order is None:
        return None
    return Family(tuple(patterns), tuple(sets), least, most, order)


def _turned(apart: IntArray) -> IntArray:
    """Per party and option whether it is served, from whether the option differs from the first.

    Of all sets of l to m parties each party is in equally many, and two parties are together in
    fewer than if they were drawn apart: so rows are turned over until that is so.
    """
    options = apart.shape[1]
    count = apart.sum(axis=1)
    turned = np.where((2 * count > options)[:, None], ~apart, apart)
    if (2 * count == options).all():
        together = (turned & turned[0]).sum(axis=1)
        together[0] = 0
        turned = np.where((4 * together > options)[:, None], ~turned, turned)
    served: IntArray = turned
    return served


def _order(parties: int, sets: list[tuple[int, ...]]) -> tuple[int, ...] | None:
    """An additive index that falls strictly in the order of the sets, if a usual one does."""
    rising = [1 << i for i in range(parties)]
    for base in (rising, rising[::-1]):
        for sign in (1, -1):
            for size in (0, 1 << parties, -1 << parties):
                order = tuple(sign * each + size for each in base)
                sums = [sum(order[i] for i in own) for own in sets]
                if all(one > two for one, two in pairwise(sums)):
                    return order
    return None


def levels(found: Family, options: list[int]) -> list[int] | None:
    """c_i with options[S] = base + sum_{i in S} c_i for every set, or None where there are none."""
    level = _levels(found, options)
    return level if level is not None and _sums(found, level, options) == options else None


def additive_again(setting: Setting, options: IntArray) -> IntArray:
    """Additive scores of the options near some that rounding may have spoilt, where they should be.

    As they are where options are no sets of parties, or outlay and worth are not additive.
    """
    found = family(setting)
    if found is None or levels(found, [int(v) for v in setting.worth - setting.outlay]) is None:
        return options
    plain = [int(v) for v in options]
    level = _levels(found, plain)
    return options if level is None else np.array(_sums(found, level, plain), dtype=object)


def _sums(found: Family, level: list[int], options: list[int]) -> list[int]:
    """The scores that some levels give, with the right one for the set they start from."""
    first = _smallest(found)
    start = options[found.served.index(first)] - sum(level[i] for i in first)
    return [start + sum(level[i] for i in own) for own in found.served]


def _levels(found: Family, options: list[int]) -> list[int] | None:
    """c_i from one set and those that differ from it by one party, or one for another."""
    place = {own: k for k, own in enumerate(found.served)}
    first = _smallest(found)
    base = options[place[first]]

    def at(*moved: tuple[int, bool]) -> int:
        own = set(first)
        for i, into in moved:
            own = own | {i} if into else own - {i}
        return options[place[tuple(sorted(own))]] - base

    outside = [i for i in range(len(found.parties)) if i not in first]
    level = [0] * len(found.parties)
    if not outside:
        return None  # every party is always served: nothing to decide
    if found.least < found.most:
        for i in outside:
            level[i] = at((i, True))
    elif first:  # only differences matter; the first party outside has 0
        for i in outside[1:]:
            swapped = at((first[0], False), (outside[0], True))
            level[i] = at((first[0], False), (i, True)) - swapped
    for i in first:
        level[i] = level[outside[0]] - at((i, False), (outside[0], True))
    return level


def _smallest(found: Family) -> tuple[int, ...]:
    return min(found.served, key=len)


def work(setting: Setting, rule: Rule) -> float:
    """Seconds that a count takes, roughly; infinite where it cannot be done."""
    found = family(setting)
    if found is None or _scores(setting, additive(rule), found, 1) is None:
        return math.inf
    size = max(setting.shape)
    return 1e-3 + 4e-7 * len(found.served) * max(found.most, 1) * size * len(found.parties) * 3


def count(setting: Setting, rule: Rule, watch: Watch, last: bool = False) -> Counts:
    """The exact counts of a rule, in one slice; `last`: ties go to the option listed last.

    Raises ValueError where options are no sets of parties with additive scores.
    """
    found, index = family(setting), additive(rule)
    scores = None if found is None else _scores(setting, index, found, -1 if last else 1)
    if found is None or scores is None:
        raise ValueError("options are not all sets of parties with additive scores")
    tables = [np.zeros((size, len(found.served)), dtype=object) for size in setting.shape]
    if not scores:
        best = [int(v) for v in index.options]
        top = [k for k, v in enumerate(best) if v == max(best)][-1 if last else 0]
        _everywhere(setting, tables, top, setting.total_weight, range(len(tables)))
        return Counts((tuple(tables),))
    weights = [list(setting.parties[i].weights) for i in found.parties]
    idle = [i for i in range(len(tables)) if i not in found.parties]
    silent = math.prod(sum(setting.parties[i].weights) for i in idle)
    up = _Ranked.of(scores, weights)
    down = _Ranked.of([[-x for x in row] for row in scores], weights)
    for k, own in enumerate(found.served):
        watch.check()
        rest = tuple(i for i in range(len(scores)) if i not in own)
        total = 0
        for i, masses in enumerate(_taken(found, up, down, own, rest)):
            total = sum(masses)
            for a, mass in enumerate(masses):
                tables[found.parties[i]][a, k] = mass * silent
        _everywhere(setting, tables, k, total * silent, idle)
    return Counts((tuple(tables),))


def _everywhere(
    setting: Setting, tables: list[IntArray], k: int, total: int, parties: Iterable[int]
) -> None:
    """An option that is taken whatever the types of some parties."""
    for i in parties:
        own = setting.parties[i].weights
        each = total // sum(own)
        tables[i][:, k] = [each * weight for weight in own]


def _scores(setting: Setting, index: Additive, found: Family, sign: int) -> list[list[int]] | None:
    """x_i(a) * R + sign * e_i; an empty list where no party matters; None where not additive."""
    own: list[list[int]] = []
    sets = np.zeros((len(found.parties), len(found.served)), dtype=bool)
    for k, served in enumerate(found.served):
        sets[list(served), k] = True
    idle = set(range(len(setting.parties))) - set(found.parties)
    if any(index.parties[i].any() for i in idle):
        return None
    if not any(index.parties[i].any() for i in found.parties):
        return []
    # Tables are 0 at the first option: where it serves a party, they tell of not being served.
    for position, party in enumerate(found.parties):
        table, served = index.parties[party], sets[position]
        inside, outside = table[:, served], table[:, ~served]
        if (inside != inside[:, :1]).any() or (outside != outside[:, :1]).any():
            return None
        own.append([int(x) - int(y) for x, y in zip(inside[:, 0], outside[:, 0], strict=True)])
    level = levels(found, [int(v) for v in index.options])
    if level is None:
        return None
    large = 2 * sum(map(abs, found.order)) + 1
    return [
        [(x + c) * large + sign * e for x in row]
        for row, c, e in zip(own, level, found.order, strict=True)
    ]


@dataclass(frozen=True)
class _Ranked:
    """Scores with the weights on either side of each.

    places  all (score, party, type) in rising order
    below   per party, the weight of its types below each of `places`
    above   the same above
    start   how many of `places` have a score of at most 0
    rank    per party and type its position in `places`
    """

    places: list[tuple[int, int, int]]
    below: list[list[int]]
    above: list[list[int]]
    start: int
    rank: list[list[int]]
    weights: list[list[int]]

    @staticmethod
    def of(scores: list[list[int]], weights: list[list[int]]) -> _Ranked:
        """Sort once; a party's own equal scores are never on either side of one another."""
        places = sorted((x, i, a) for i, row in enumerate(scores) for a, x in enumerate(row))
        below: list[list[int]] = [[] for _ in scores]
        above: list[list[int]] = [[] for _ in scores]
        rank = [[0] * len(row) for row in scores]
        for place, (_, i, a) in enumerate(places):
            rank[i][a] = place
        for i in range(len(scores)):
            left, whole = 0, sum(weights[i])
            for _, j, a in places:
                own = weights[i][a] if j == i else 0
                below[i].append(left)
                left += own
                above[i].append(whole - left)
        start = sum(place[0] <= 0 for place in places)
        return _Ranked(places, below, above, start, rank, weights)


def _taken(
    found: Family, up: _Ranked, down: _Ranked, own: tuple[int, ...], rest: tuple[int, ...]
) -> list[list[int]]:
    """Per party and type the weight of the profiles at which exactly `own` are served."""
    size, count = len(own), len(own) + len(rest)
    if found.least < size < found.most or not own or not rest:
        # Everyone's sign alone decides, or nothing does.
        signs = found.least < found.most
        ends = [
            [
                weight if not signs or (up.rank[i][a] >= up.start) == (i in own) else 0
                for a, weight in enumerate(up.weights[i])
            ]
            for i in range(count)
        ]
        if (not own and not found.most) or (not rest and found.least == size):
            ends = up.weights
        return _products(ends)
    if size == found.most:
        return _least(up, own, rest, up.start if size > found.least else 0)
    return _least(down, rest, own, down.start)


def _products(ends: list[list[int]]) -> list[list[int]]:
    rests = _without_each([sum(row) for row in ends])
    return [[each * rest for each in row] for row, rest in zip(ends, rests, strict=True)]


def _least(
    ranked: _Ranked, own: tuple[int, ...], rest: tuple[int, ...], start: int
) -> list[list[int]]:
    """The weights where all of `own` score more than all of `rest`, and from `start` on.

    A sum over who of `own` scores least, and how much: place by place in rising order.
    """
    count = len(own) + len(rest)
    table = [[0] * len(row) for row in ranked.weights]
    inside = set(own)
    # Up to each place: what the least one being there leaves to each other party.
    sums: list[list[tuple[int, int]]] = [[] for _ in range(count)]
    totals = [0] * count
    for place in range(start, len(ranked.places)):
        _, i, a = ranked.places[place]
        if i not in inside:
            continue
        row = [
            ranked.weights[i][a]
            if j == i
            else (ranked.above[j][place] if j in inside else ranked.below[j][place])
            for j in range(count)
        ]
        if sum(each == 0 for each in row) > 1:
            continue
        for j, left in enumerate(_without_each(row)):
            if j == i:
                table[i][a] += left * row[i]
            elif left:
                totals[j] += left
                sums[j].append((place, totals[j]))
    for j, steps in enumerate(sums):
        marks = iter(_steps(steps, sorted((rank, b) for b, rank in enumerate(ranked.rank[j]))))
        for b, before in marks:
            reached = before if j in inside else totals[j] - before
            table[j][b] += reached * ranked.weights[j][b]
    return table


def _steps(steps: list[tuple[int, int]], ranks: list[tuple[int, int]]) -> Iterator[tuple[int, int]]:
    """Per type, by rising rank, the running total of the steps before it."""
    at, total = 0, 0
    for rank, b in ranks:
        while at < len(steps) and steps[at][0] < rank:
            total = steps[at][1]
            at += 1
        yield b, total


def _without_each(row: list[int]) -> list[int]:
    """The product of all entries but one, for each."""
    before, after = [1], [1]
    for one, two in zip(row[:-1], row[:0:-1], strict=True):
        before.append(before[-1] * one)
        after.append(after[-1] * two)
    return [one * two for one, two in zip(before, reversed(after), strict=True)]
