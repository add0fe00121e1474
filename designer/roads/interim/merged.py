"""Options that are all one to a party count as one in its interim probabilities.

"The place goes to somebody else" is many options and one chance: where two options are worth
the same to every type of a party and cost the designer the same, q_i(k, a) is written for both
together. So a free place among n parties gives each two chances per type, not n + 1.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
import numpy.typing as npt

from designer.setting.setting import Chance, IntArray, Setting


@dataclass(frozen=True, eq=False)
class Merged:
    """The options of one party in classes.

    of     int64, shape (K,): the class of every option
    first  int64, shape (C,): the first option of every class
    """

    of: npt.NDArray[np.int64]
    first: npt.NDArray[np.int64]

    @property
    def size(self) -> int:
        """The number of classes, C."""
        return len(self.first)

    def sums(self, table: IntArray) -> IntArray:
        """Columns added up class by class: (T, K) to (T, C)."""
        if self.size == len(self.of):
            return table
        total: IntArray = np.zeros((len(table), self.size), dtype=table.dtype)
        np.add.at(total.T, self.of, table.T)
        return total


@lru_cache(maxsize=16)
def merged(setting: Setting, chances: tuple[Chance, ...] = ()) -> tuple[Merged, ...]:
    """Per party its options in classes; an option of which a chance is demanded is by itself."""
    public = list(zip(setting.outlay.tolist(), setting.worth.tolist(), strict=True))
    found = []
    for index, party in enumerate(setting.parties):
        alone = {chance.option for chance in chances if chance.party == index}
        columns = zip(map(tuple, party.value.T.tolist()), public, strict=True)
        place: dict[object, int] = {}
        of: list[int] = []
        first: list[int] = []
        for k, column in enumerate(columns):
            key = (column, k if k in alone else -1)
            if key not in place:
                place[key] = len(first)
                first.append(k)
            of.append(place[key])
        found.append(Merged(np.array(of, dtype=np.int64), np.array(first, dtype=np.int64)))
    return tuple(found)
