"""The table on demand: a rule, classes of others' profiles, and payments by class and type."""

from __future__ import annotations

import itertools
import math
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np

from designer.demands.terms import Terms
from designer.engines.watch import Watch
from designer.roads.product import as_independent
from designer.roads.typegraph.decided import Decided, decide
from designer.roads.typegraph.fibers import Fibers, fibers
from designer.setting.exact import number, text
from designer.setting.profiles import strides
from designer.setting.setting import IntArray, Setting, integers
from designer.table import Table

FORMAT = "designer.table/1"


@dataclass(frozen=True, eq=False)
class GraphMechanism:
    """t_i(theta) = pays_i[class of theta_-i, theta_i] / den + shift_i.

    works  per party its classes      pays  per party (G, T), whole or Fractions
    """

    setting: Setting
    decided: Decided
    works: tuple[Fibers, ...]
    pays_by_class: tuple[IntArray, ...]
    den: int
    shifts: tuple[Fraction, ...]

    def decides(self, types: Sequence[int]) -> tuple[Fraction, ...]:
        """x_k(theta) at one profile, given by type positions."""
        row = self.decided.palette[self.decided.at[self.setting.profile_of(tuple(types))]]
        return tuple(Fraction(int(part), self.decided.den) for part in row)

    def pays(self, types: Sequence[int]) -> tuple[Fraction, ...]:
        """t_i(theta) at one profile, in money units."""
        profile = self.setting.profile_of(tuple(types))
        found = []
        for i, (work, pays, a) in enumerate(
            zip(self.works, self.pays_by_class, types, strict=True)
        ):
            step = strides(self.setting.shape)[i]
            other = profile // (step * work.types) * step + profile % step
            value = pays[work.of[other], a]
            held = value if isinstance(value, Fraction) else int(value)
            found.append(Fraction(held) / self.den + self.shifts[i])
        return tuple(found)

    def table(self) -> Table:
        """Every profile, for settings small enough to hold."""
        setting, decided = self.setting, self.decided
        dens = {shift.denominator for shift in self.shifts}
        dens |= {v.denominator for pays in self.pays_by_class for v in _fractions(pays)}
        common = math.lcm(self.den, *(self.den * d for d in dens))
        tables = []
        for pays, shift in zip(self.pays_by_class, self.shifts, strict=True):
            scale, more = common // self.den, shift * common
            # Python integers or fractions, of any size.
            tables.append([[int(v * scale + more) for v in row] for row in pays.tolist()])
        shared = math.gcd(common, *(v for whole in tables for row in whole for v in row))
        rows = []
        for i, (work, whole) in enumerate(zip(self.works, tables, strict=True)):
            others = [n for j, n in enumerate(setting.shape) if j != i]
            held = integers([[v // shared for v in row] for row in whole])
            grid = held[work.of].reshape(*others, work.types)
            rows.append(np.moveaxis(grid, -1, i).ravel())
        chances = integers(decided.palette)[decided.at]
        return Table(chances, decided.den, np.stack(rows), common // shared)

    def plain(self) -> dict[str, Any]:
        """As the JSON document that `--save` writes as table.json."""
        return {
            "format": FORMAT,
            "kind": "type-graph",
            "scenario": {"title": self.setting.title, "digest": self.setting.digest},
            "money": self.setting.money,
            "sign": "pays is paid BY the party; negative amounts are received",
            "decision": self.works[0].terms.decision,
            **plain_ties(self.decided),
            "den": self.den,
            "pays": [[[text(Fraction(v)) for v in row] for row in p] for p in self._lists()],
            "shifts": [text(shift) for shift in self.shifts],
        }

    def _lists(self) -> list[list[list[Any]]]:
        return [pays.tolist() for pays in self.pays_by_class]


def _fractions(pays: IntArray) -> list[Fraction]:
    if pays.dtype != np.dtype(object):
        return []
    return [v for v in pays.flat if isinstance(v, Fraction)]


def from_plain(plain: dict[str, Any], setting: Setting) -> GraphMechanism:
    """The mechanism that `GraphMechanism.plain` wrote. Raises ValueError for anything else."""
    try:
        if plain["format"] != FORMAT or plain["kind"] != "type-graph":
            raise ValueError("not a table of type graphs")
        terms = Terms(decision=str(plain["decision"]))
        if terms.decision not in ("efficient", "table"):
            raise ValueError("the decision must be 'efficient' or 'table'")
        setting = as_independent(setting) or setting
        decided = decide(setting, terms.decision, Watch())
        decided = read_ties(plain, decided)
        works = tuple(fibers(setting, terms, decided, i) for i in range(len(setting.parties)))
        pays = tuple(
            np.array([[number(v) for v in row] for row in table], dtype=object)
            for table in plain["pays"]
        )
        shifts = tuple(number(shift) for shift in plain["shifts"])
        if [p.shape for p in pays] != [w.rows.shape for w in works] or len(shifts) != len(works):
            raise ValueError("the payments do not fit the parties' types")
        return GraphMechanism(setting, decided, works, pays, int(plain["den"]), shifts)
    except (KeyError, TypeError, IndexError, AttributeError) as error:
        raise ValueError(f"not a table document: {error!r}") from None


def plain_ties(decided: Decided) -> dict[str, Any]:
    """What is taken at tied profiles: `ties`, or `lotteries` where some are no sure choices.

    Readers that know `ties` alone find none of it, and refuse.
    """
    if not decided.mixed:
        return {"ties": runs(decided.choices)}
    taken = decided.palette[decided.at[decided.tied]]
    found: dict[tuple[int, ...], int] = {}
    of = [found.setdefault(tuple(int(v) for v in row), len(found)) for row in taken.tolist()]
    return {
        "lotteries": {
            "den": text(Fraction(decided.den)),
            "rows": [[text(Fraction(v)) for v in row] for row in found],
            "of": runs(np.array(of, dtype=np.int64)),
        }
    }


def read_ties(plain: dict[str, Any], decided: Decided) -> Decided:
    """The rule with what `plain_ties` wrote. Raises ValueError or TypeError otherwise."""
    if "lotteries" not in plain:
        return decided.choosing(unrolled(plain["ties"], len(decided.tied)))
    given = plain["lotteries"]
    den = number(given["den"])
    rows = [[number(v) for v in row] for row in given["rows"]]
    if den.denominator != 1 or any(v.denominator != 1 for row in rows for v in row):
        raise ValueError("a lottery is written in whole parts")
    lotteries = np.array([[int(v) for v in row] for row in rows], dtype=object)
    return decided.mixing(lotteries, int(den), unrolled(given["of"], len(decided.tied)))


def runs(values: IntArray) -> list[list[int]]:
    """Equal neighbours as [value, count]."""
    listed = values.tolist()
    return [[int(v), len(list(group))] for v, group in itertools.groupby(listed)]


def unrolled(pairs: Any, size: int) -> IntArray:
    """The values behind `runs`. Raises ValueError unless there are `size` of them."""
    found: list[int] = []
    for value, count in pairs:
        if not (isinstance(value, int) and isinstance(count, int)):
            raise TypeError("a run is two integers")
        if value < 0 or count < 1 or len(found) + count > size:
            raise ValueError("the runs do not fit")
        found += [value] * count
    if len(found) != size:
        raise ValueError("the runs do not fit")
    return np.array(found, dtype=np.int64)
