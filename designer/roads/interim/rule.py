"""Decision rules described compactly, and the exact counts that are all the program sees.

A *lexicographic index rule* gives every party and type one integer per option, several times
over: at a profile the option with the largest sum of first indices is taken; ties go to the
second, and so on; what is still tied goes to the option listed first.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from designer.setting.setting import IntArray, Setting

Move = tuple[tuple[int, ...], int, int]
"""Positions of types, the option taken there before, and the one after."""


@dataclass(frozen=True, eq=False)
class Index:
    """One index: sum_i parties[i][a_i, k] + options[k]; all integers.

    parties  per party, int, shape (T_i, K);  options  int, shape (K,)
    """

    parties: tuple[IntArray, ...]
    options: IntArray

    def at(self, types: npt.NDArray[np.int64]) -> IntArray:
        """The index of every option at profiles given by type positions, int (R, K)."""
        total = np.broadcast_to(self.options, (len(types), len(self.options))).astype(object)
        for party, table in enumerate(self.parties):
            total = total + table[types[:, party]]
        return total

    def plain(self) -> dict[str, Any]:
        """As JSON-ready values."""
        return {
            "parties": [[[int(v) for v in row] for row in table] for table in self.parties],
            "options": [int(v) for v in self.options],
        }


@dataclass(frozen=True, eq=False)
class Rule:
    """A lexicographic index rule; with no index at all, the setting's given table.

    exceptions  (positions of types, position of the option taken there instead)
    """

    indices: tuple[Index, ...]
    exceptions: tuple[tuple[tuple[int, ...], int], ...] = ()

    def decides(self, setting: Setting, types: npt.NDArray[np.int64]) -> tuple[IntArray, int]:
        """What is taken at the listed profiles: numerators (R, K) over one denominator."""
        if not self.indices:
            if setting.rule is None:
                raise ValueError("the setting gives no decision rule")
            places = np.ravel_multi_index(tuple(types.T), setting.shape)
            return setting.rule[places], setting.rule_den
        best = np.ones((len(types), len(setting.options)), dtype=bool)
        for index in self.indices:
            score = index.at(types)
            top = np.where(best, score, score.min() - 1).max(axis=1, keepdims=True)
            best &= score == top
        chosen = best.argmax(axis=1)
        for at, option in self.exceptions:
            chosen[(types == np.array(at)).all(axis=1)] = option
        taken = np.zeros(best.shape, dtype=np.int64)
        taken[np.arange(len(types)), chosen] = 1
        return taken, 1


@dataclass(frozen=True, eq=False)
class Counts:
    """What a rule does, as exact weights: all that a master program needs to know of it.

    taken[g][i]  int, shape (T_i, K): the weight of the profiles with the lead party of type g
                 and party i of type a at which option k is taken, over `den`; without a lead
                 party there is one slice, of all profiles
    """

    taken: tuple[tuple[IntArray, ...], ...]
    den: int = 1

    def merged(self) -> Counts:
        """The same without a lead party."""
        whole = tuple(sum(parts[1:], parts[0]) for parts in zip(*self.taken, strict=True))
        return Counts((whole,), self.den)

    def totals(self) -> tuple[int, ...]:
        """The weight of the profiles at which each option is taken, over `den`."""
        return tuple(int(v) for v in self.merged().taken[0][0].sum(axis=0))

    def moved(self, setting: Setting, lead: int | None, moves: Iterable[Move]) -> Counts:
        """The same where at some profiles another option is taken: (types, from, to)."""
        found = list(self.taken)
        own: set[int] = set()
        for types, before, after in moves:
            g = 0 if lead is None else types[lead]
            if g not in own:
                own.add(g)
                found[g] = tuple(table.copy() for table in found[g])
            weight = self.den * math.prod(
                party.weights[a] for party, a in zip(setting.parties, types, strict=True)
            )
            for table, a in zip(found[g], types, strict=True):
                table[a, before] -= weight
                table[a, after] += weight
        return Counts(tuple(found), self.den)


@dataclass(frozen=True, eq=False)
class Listed:
    """A rule with its exact counts."""

    rule: Rule
    counts: Counts


def welfare_index(setting: Setting) -> Index:
    """The efficient rule's index: total worth net of outlay, in units of 1/grain."""
    return Index(tuple(party.value for party in setting.parties), setting.worth - setting.outlay)
