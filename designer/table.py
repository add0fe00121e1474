"""A payment table: what is decided and who pays what at every profile, exactly."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import TYPE_CHECKING, Any, Protocol

import numpy as np

from designer.setting.setting import IntArray, Setting

if TYPE_CHECKING:
    import pandas as pd

SAFE = 2**60
"""Whole numbers below this can be added, and compared with a sentinel, inside int64."""


@dataclass(frozen=True, eq=False)
class Table:
    """A decision rule and a transfer rule over all N profiles, exact.

    decides  int, shape (N, K); the probability of option k at profile theta is
             decides[theta, k] / decides_den
    pays     int, shape (n, N); t_i(theta) = pays[i, theta] / pays_den in money units,
             paid BY party i (convention 1)
    """

    decides: IntArray
    decides_den: int
    pays: IntArray
    pays_den: int

    @classmethod
    def of(
        cls,
        decides: Sequence[Sequence[Fraction | int]],
        pays: Sequence[Sequence[Fraction | int]],
    ) -> Table:
        """Put together chances x_k(theta), a row per profile, and payments, a row per party.

        >>> Table.of([[1, 0], [Fraction(1, 2), Fraction(1, 2)]], [[3, Fraction(1, 3)]]).pays_den
        3
        """
        chances, chances_den = _over_one(decides)
        amounts, amounts_den = _over_one(pays)
        return cls(chances, chances_den, amounts, amounts_den)

    def payment(self, party: int, profile: int) -> Fraction:
        """t_i(theta)."""
        return Fraction(int(self.pays[party, profile]), self.pays_den)

    def chance(self, profile: int, option: int) -> Fraction:
        """x_k(theta)."""
        return Fraction(int(self.decides[profile, option]), self.decides_den)


def pot(table: Table, setting: Setting) -> tuple[IntArray, int]:
    """Add up every profile's pot, sum_i t_i(theta) - sum_k x_k(theta) outlay(k).

    Returns int, shape (N,), and the denominator under it: money units, positive = money left
    over (convention 1).
    """
    den = math.lcm(table.pays_den, table.decides_den * setting.grain)
    per_pay = den // table.pays_den
    per_cost = den // (table.decides_den * setting.grain)
    parties, options = len(table.pays), len(setting.options)
    bound = parties * largest(table.pays) * per_pay
    bound += options * largest(table.decides) * (largest(setting.outlay) + 1) * per_cost
    bound = max(bound, per_pay)
    pays, decides = held(table.pays, bound), held(table.decides, bound)
    total: IntArray = pays.sum(axis=0) * per_pay
    for k, cost in enumerate(setting.outlay):
        if cost:
            total = total - decides[:, k] * (int(cost) * per_cost)
    return total, den


def columns(setting: Setting) -> list[str]:
    """Name the columns of transfers.csv.

    `type:NAME` per party, `probability`, `decides:OPTION` per option, `pays:NAME` per party,
    `pot`.
    """
    names = [party.name for party in setting.parties]
    return [
        *(f"type:{name}" for name in names),
        "probability",
        *(f"decides:{option}" for option in setting.options),
        *(f"pays:{name}" for name in names),
        "pot",
    ]


def rows(setting: Setting, table: Table) -> list[list[str | Fraction]]:
    """Give the rows of transfers.csv, one per profile, numbers as Fractions.

    Meant for tables of a size one can look at.
    """
    pots, den = pot(table, setting)
    parties, options = range(len(setting.parties)), range(len(setting.options))
    return [
        [
            *setting.labels_at(profile),
            setting.probability(profile),
            *(table.chance(profile, k) for k in options),
            *(table.payment(i, profile) for i in parties),
            Fraction(int(pots[profile]), den),
        ]
        for profile in range(setting.profiles)
    ]


def frame(table: Table, setting: Setting) -> pd.DataFrame:
    """Show the table as a pandas frame of Fractions, with the columns of transfers.csv."""
    import pandas as pd

    return pd.DataFrame(rows(setting, table), columns=columns(setting))


def largest(array: IntArray) -> int:
    """Find the largest absolute entry, 0 in an empty array, as a Python int."""
    if array.size == 0:
        return 0
    return max(abs(int(array.max())), abs(int(array.min())))


def held(array: IntArray, bound: int) -> IntArray:
    """Hold the array as int64 when everything made of it stays below `bound` < 2**60.

    Python ints otherwise, slower and of any size.
    """
    if bound < SAFE:
        return array.astype(np.int64, copy=False)
    return array.astype(object, copy=False)


def whole(values: Sequence[int]) -> IntArray:
    """Lay integers out flat: int64 when all of them fit, Python ints otherwise."""
    try:
        return np.array(values, dtype=np.int64)
    except OverflowError:
        return np.array(values, dtype=object)


def _over_one(rows: Sequence[Sequence[Fraction | int]]) -> tuple[IntArray, int]:
    den = math.lcm(*{value.denominator for row in rows for value in row})
    flat = whole([value.numerator * (den // value.denominator) for row in rows for value in row])
    return flat.reshape(len(rows), -1), den


class OnDemand(Protocol):
    """A table that is computed profile by profile; types are positions, one per party."""

    def decides(self, types: Sequence[int]) -> tuple[Fraction, ...]:
        """x_k(theta)."""

    def pays(self, types: Sequence[int]) -> tuple[Fraction, ...]:
        """t_i(theta), money units, paid BY party i."""

    def table(self) -> Table:
        """Every profile at once, for settings small enough to hold."""

    def plain(self) -> dict[str, Any]:
        """The JSON document from which the table follows, format designer.table/1."""
