"""One party's view of a table: its own type first, everyone else's report second.

Every array of this module is exact. Money is in units of 1/den, with one denominator for
worths and payments together; `bound` limits every sum the audit makes of them, so that int64
is used exactly where no sum can leave it.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property

import numpy as np

from designer.auditing.welfare import around
from designer.setting.setting import IntArray, Setting
from designer.table import SAFE, Table, held, largest, whole


@dataclass(frozen=True, eq=False)
class View:
    """What party i sees; a, b its own types, o what the others report, k the options.

    odds     int, (T, O) or (1, O): P(o | a) = odds[a, o] / given[a]; one row when the
             party's type tells it nothing about the others
    given    the denominators, a Python int per type
    chosen   int, (T, O, K): x_k when i says b and the others o, times decides_den
    pays     int, (T, O): t_i when i says b and the others o, money in 1/den
    value    int, (T, O, K) or (T, 1, K): worth times den / decides_den when the truth is (a, o)
    outside  int, (T, O) or (T, 1): money in 1/den
    """

    setting: Setting
    index: int
    odds: IntArray
    given: tuple[int, ...]
    chosen: IntArray
    pays: IntArray
    value: IntArray
    outside: IntArray
    den: int
    bound: int

    @property
    def types(self) -> int:
        """How many types the party has."""
        return int(self.pays.shape[0])

    @property
    def others(self) -> int:
        """How many reports the others can make together."""
        return int(self.pays.shape[1])

    @cached_property
    def truthful(self) -> IntArray:
        """Worth less payment when everyone is honest, at every profile: (T, O)."""
        return self.worth(self.chosen) - self.pays

    def worth(self, chosen: IntArray) -> IntArray:
        """sum_k chosen[a, o, k] value[a, o, k], with one lottery per cell: (T, O)."""
        total: IntArray = chosen[..., 0] * self.value[..., 0]
        for k in range(1, chosen.shape[-1]):
            total = total + chosen[..., k] * self.value[..., k]
        return total

    def mean(self, cells: IntArray) -> list[Fraction]:
        """E[cells | a] for each own type a, cells in money units of 1/den: (T, O) or (T, 1)."""
        top = (largest(cells) + 1) * max(self.given)
        odds, cells = held(self.odds, top), held(cells, top)
        if cells.shape[1] == 1:
            return [Fraction(int(cell), self.den) for cell in cells[:, 0]]
        sums = (odds * cells).sum(axis=1)
        return [
            Fraction(int(total), given * self.den)
            for total, given in zip(sums, self.given, strict=True)
        ]

    def profile(self, own: int, others: int) -> int:
        """Number the profile of an own type beside a report of the others."""
        _, size, after = around(self.setting, self.index)
        high, low = divmod(others, after)
        return (high * size + own) * after + low

    def at(self, own: int, others: int) -> dict[str, str]:
        """Label that profile: type by party."""
        return labels(self.setting, self.profile(own, others))


def labels(setting: Setting, profile: int) -> dict[str, str]:
    """Type labels by party at a profile number."""
    names = (party.name for party in setting.parties)
    return dict(zip(names, setting.labels_at(profile), strict=True))


def see(setting: Setting, table: Table, index: int) -> View:
    """Lay a table out as one party sees it."""
    party = setting.parties[index]
    den = math.lcm(table.pays_den, table.decides_den * setting.grain)
    per_pay = den // table.pays_den
    per_value = den // (table.decides_den * setting.grain)
    per_outside = den // setting.grain

    most_pay = largest(table.pays[index]) * per_pay
    most_worth = largest(table.decides) * largest(party.value) * per_value * len(setting.options)
    bound = 2 * (most_pay + most_worth) + largest(party.outside) * per_outside
    # The lies' sentinel (see honesty.py) lies above every utility and must fit as well.
    parts = (largest(table.decides), largest(party.value), largest(party.outside))
    bound = 8 * max(bound, per_pay, per_value, per_outside, *parts)

    odds, given = _odds(setting, index)
    chosen = _own_first(setting, index, held(table.decides, bound))
    pays = _own_first(setting, index, held(table.pays[index], bound))
    value, outside = held(party.value, bound), held(party.outside, bound)
    value = _own_first(setting, index, value) if party.depends else value[:, None, :]
    outside = _own_first(setting, index, outside) if party.outside_depends else outside[:, None]
    return View(
        setting=setting,
        index=index,
        odds=odds,
        given=given,
        chosen=chosen,
        pays=pays * per_pay,
        value=value * per_value,
        outside=outside * per_outside,
        den=den,
        bound=bound,
    )


def _own_first(setting: Setting, index: int, data: IntArray) -> IntArray:
    """(N, …) over profiles as (T, O, …): own type first, the others' report second."""
    before, size, after = around(setting, index)
    rest = data.shape[1:]
    split = data.reshape(before, size, after, *rest)
    return np.moveaxis(split, 1, 0).reshape(size, before * after, *rest)


def _odds(setting: Setting, index: int) -> tuple[IntArray, tuple[int, ...]]:
    """Weigh the others' reports given each own type, and their sums."""
    if setting.joint is not None:
        odds = _own_first(setting, index, setting.joint)
        total = setting.total_weight
        odds = held(odds, total)
        return odds, tuple(int(given) for given in odds.sum(axis=1))
    total = math.prod(sum(p.weights) for j, p in enumerate(setting.parties) if j != index)
    product = whole([1]) if total < SAFE else whole([1]).astype(object)
    for j, party in enumerate(setting.parties):
        if j != index:
            weights = held(whole(party.weights), total)
            product = np.multiply.outer(product, weights).reshape(-1)
    return product[None, :], (total,) * setting.parties[index].size
