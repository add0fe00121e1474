"""The table on demand: what is decided and paid at representatives, and the way to them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np

from designer.program.linear import IndexArray
from designer.proof.vector import Vector
from designer.roads.full import decisions_of, lowest
from designer.roads.likeness import likeness as groups
from designer.roads.likeness.draft import LikenessDraft
from designer.roads.likeness.orbits import Orbits, count
from designer.roads.product import as_independent
from designer.setting.setting import IntArray, Setting, integers
from designer.table import Table

FORMAT = "designer.table/1"
BLOCK = 1 << 16
"""Profiles that are looked up at a time."""


@dataclass(frozen=True, eq=False)
class LikenessMechanism:
    """What the representatives of all profiles decide and pay.

    chances  int (R, K) over chances_den
    paid     int (R, n) over paid_den: who is in the place of party i at the representative pays
    """

    orbits: Orbits
    chances: IntArray
    chances_den: int
    paid: IntArray
    paid_den: int

    @property
    def setting(self) -> Setting:
        """Whose profiles they are."""
        return self.orbits.setting

    def at(self, profiles: IndexArray) -> tuple[IntArray, IntArray]:
        """Chances int (R, K) and payments int (R, n) at the listed profiles, over the same."""
        place, moved = self.orbits.to_first(profiles)
        chances = self.chances[place]
        if moved is not None:
            chances = np.take_along_axis(chances, moved, axis=1)
        parties = range(len(self.setting.parties))
        slots = [self.orbits.slot(i, profiles) for i in parties]
        return chances, np.stack([self.paid[place, slot] for slot in slots], axis=1)

    def decides(self, types: Sequence[int]) -> tuple[Fraction, ...]:
        """x_k(theta) at one profile, given by type positions."""
        chances, _ = self.at(self._numbers(types))
        return tuple(Fraction(int(part), self.chances_den) for part in chances[0])

    def pays(self, types: Sequence[int]) -> tuple[Fraction, ...]:
        """t_i(theta) at one profile, in money units."""
        _, paid = self.at(self._numbers(types))
        return tuple(Fraction(int(part), self.paid_den) for part in paid[0])

    def _numbers(self, types: Sequence[int]) -> IndexArray:
        return np.array([self.setting.profile_of(tuple(types))], dtype=self.orbits.dtype)

    def table(self) -> Table:
        """Every profile, for settings small enough to hold."""
        chances, paid = [], []
        for start in range(0, self.setting.profiles, BLOCK):
            stop = min(start + BLOCK, self.setting.profiles)
            one, two = self.at(np.arange(start, stop, dtype=np.int64))
            chances.append(one)
            paid.append(two.T)
        return Table(
            np.concatenate(chances),
            self.chances_den,
            np.concatenate(paid, axis=1),
            self.paid_den,
        )

    def plain(self) -> dict[str, Any]:
        """As the JSON document that `--save` writes as table.json."""
        return {
            "format": FORMAT,
            "kind": "likeness",
            "scenario": {"title": self.setting.title, "digest": self.setting.digest},
            "money": self.setting.money,
            "sign": "pays is paid BY the party; negative amounts are received",
            "order": "representatives: every group's types in rising order; by profile number",
            **self.orbits.likeness.plain(),
            "decides_den": self.chances_den,
            "decides": [[int(v) for v in row] for row in self.chances],
            "pays_den": self.paid_den,
            "pays": [[int(v) for v in row] for row in self.paid],
        }


def mechanism_of(draft: LikenessDraft, primal: Vector) -> LikenessMechanism:
    """The mechanism that a point of the program stands for."""
    columns = np.array(primal.numerators(), dtype=object)
    paid, paid_den = lowest(integers(columns[draft.payment_column]), primal.den)
    return LikenessMechanism(draft.orbits, *decisions_of(draft, primal), paid, paid_den)


def from_plain(plain: dict[str, Any], setting: Setting) -> LikenessMechanism:
    """The mechanism that `LikenessMechanism.plain` wrote. Raises ValueError for anything else."""
    try:
        if plain["format"] != FORMAT or plain["kind"] != "likeness":
            raise ValueError("not a table up to trades of places")
        setting = as_independent(setting) or setting
        found = groups.from_plain(plain, setting)
        rows = count(setting, found)
        if not len(plain["decides"]) == len(plain["pays"]) == rows:
            raise ValueError(f"there must be {rows:,} representatives")
        chances = _whole(plain["decides"], len(setting.options))
        paid = _whole(plain["pays"], len(setting.parties))
        dens = int(plain["decides_den"]), int(plain["pays_den"])
        if min(dens) < 1:
            raise ValueError("a denominator is not positive")
        return LikenessMechanism(Orbits(setting, found), chances, dens[0], paid, dens[1])
    except (KeyError, TypeError, IndexError, AttributeError) as error:
        raise ValueError(f"not a table document: {error!r}") from None


def _whole(rows: Any, width: int) -> IntArray:
    if any(len(row) != width or not all(type(v) is int for v in row) for row in rows):
        raise ValueError("a row of the table does not fit the scenario")
    return integers(rows, (len(rows), width))
