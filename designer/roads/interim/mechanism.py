"""The answer of the interim road: a rule and payments that are computed when asked for.

With target(theta) the pot that is wanted at theta, D(theta) = target(theta) - sum_j m_j(theta_j)
and its main effects D_j(a) = E[D | theta_j = a] (E[D] = 0),

    t_i(theta) = m_i(theta_i) + (D(theta) - sum_j D_j(theta_j)) / n
                 + sum_{j != i} D_j(theta_j) / (n - 1)

has sum_i t_i = target at every profile and E[t_i | theta_i] = m_i(theta_i): balance in every
case at the price of balance on average (d'Aspremont & Gerard-Varet 1979, Arrow 1979, for the
expected-externality payments; the general lift is elementary and checked in the tests).
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np

from designer.proof.vector import Vector
from designer.roads.interim.draft import InterimDraft
from designer.roads.interim.rule import Index, Rule
from designer.setting.exact import number, text
from designer.setting.setting import IntArray, Setting, integers
from designer.table import Table

FORMAT = "designer.table/1"


@dataclass(frozen=True, eq=False)
class Mechanism:
    """A table on demand.

    mixture   per type of the lead party (once without one): (share, rule), shares summing to 1
    pays_on_average  m_i(a)
    effects   D_j(a), and the pot wanted over and above the outlay; None where the payments are
              the interim payments themselves (no balance in every case was asked)
    """

    setting: Setting
    lead: int | None
    mixture: tuple[tuple[tuple[Fraction, Rule], ...], ...]
    pays_on_average: tuple[tuple[Fraction, ...], ...]
    effects: tuple[tuple[Fraction, ...], ...] | None = None
    pot: Fraction = Fraction(0)

    def decides(self, types: Sequence[int]) -> tuple[Fraction, ...]:
        """x_k(theta) at one profile, given by type positions."""
        at = np.array([types], dtype=np.int64)
        chances = [Fraction(0)] * len(self.setting.options)
        for share, rule in self.mixture[0 if self.lead is None else types[self.lead]]:
            taken, den = rule.decides(self.setting, at)
            for k, part in enumerate(taken[0]):
                chances[k] += share * int(part) / den
        return tuple(chances)

    def pays(self, types: Sequence[int]) -> tuple[Fraction, ...]:
        """t_i(theta) at one profile, in money units."""
        own = [table[a] for table, a in zip(self.pays_on_average, types, strict=True)]
        if self.effects is None:
            return tuple(own)
        parties = len(own)
        outlay = sum(
            (
                chance * int(spent) / self.setting.grain
                for chance, spent in zip(self.decides(types), self.setting.outlay, strict=True)
            ),
            Fraction(0),
        )
        left = outlay + self.pot - sum(own)
        effects = [table[a] for table, a in zip(self.effects, types, strict=True)]
        total = sum(effects, Fraction(0))
        return tuple(
            mine + (left - total) / parties + (total - effect) / (parties - 1)
            for mine, effect in zip(own, effects, strict=True)
        )

    def table(self) -> Table:
        """Every profile, for settings small enough to hold."""
        setting = self.setting
        types = np.array(list(itertools.product(*map(range, setting.shape))), dtype=np.int64)
        chances, den = self._chances(types)
        rows = [*self.pays_on_average, *(self.effects or ())]
        common = math.lcm(
            self.pot.denominator, *(value.denominator for row in rows for value in row)
        )
        parties = len(self.pays_on_average)
        if self.effects is None:
            whole = self._at(types, self.pays_on_average, common)
            return Table(integers(chances), den, *_lowest(whole, common))
        # Everything over `unit`, so that the divisions by n and n - 1 come out whole.
        unit = math.lcm(common, den * setting.grain) * parties * (parties - 1)
        own = self._at(types, self.pays_on_average, unit)
        effects = self._at(types, self.effects, unit)
        outlay = setting.outlay.astype(object)
        spent: IntArray = (chances.astype(object) * outlay).sum(axis=1)
        left = spent * (unit // (den * setting.grain)) + int(self.pot * unit) - sum(own)
        total = sum(effects)
        whole = [
            mine + (left - total) // parties + (total - effect) // (parties - 1)
            for mine, effect in zip(own, effects, strict=True)
        ]
        return Table(integers(chances), den, *_lowest(whole, unit))

    def _at(
        self, types: IntArray, tables: tuple[tuple[Fraction, ...], ...], unit: int
    ) -> list[IntArray]:
        """Every party's amounts at the profiles, in units of 1/unit."""
        found = []
        for i, table in enumerate(tables):
            whole = np.array([int(value * unit) for value in table], dtype=object)
            found.append(whole[types[:, i]])
        return found

    def _chances(self, types: IntArray) -> tuple[IntArray, int]:
        dens = {share.denominator for mix in self.mixture for share, _ in mix}
        rule_den = self.setting.rule_den if self.setting.rule is not None else 1
        den = math.lcm(*dens) * rule_den
        chances = np.zeros((len(types), len(self.setting.options)), dtype=object)
        for g, mix in enumerate(self.mixture):
            here = np.arange(len(types))
            if self.lead is not None:
                here = np.flatnonzero(types[:, self.lead] == g)
            for share, rule in mix:
                taken, own = rule.decides(self.setting, types[here])
                chances[here] += taken.astype(object) * int(share * den / own)
        shared = math.gcd(den, int(np.gcd.reduce(chances, axis=None)))
        return chances // shared, den // shared

    def plain(self) -> dict[str, Any]:
        """As the JSON document that `--save` writes as table.json."""
        return {
            "format": FORMAT,
            "scenario": {"title": self.setting.title, "digest": self.setting.digest},
            "money": self.setting.money,
            "sign": "pays is paid BY the party; negative amounts are received",
            "lead": self.lead,
            "mixture": [
                [
                    {"share": text(share), "indices": [index.plain() for index in rule.indices]}
                    | ({"except": _except(rule)} if rule.exceptions else {})
                    for share, rule in mix
                ]
                for mix in self.mixture
            ],
            "pays_on_average": _texts(self.pays_on_average),
            "effects": None if self.effects is None else _texts(self.effects),
            "pot": text(self.pot),
        }


def of_point(
    setting: Setting,
    lead: int | None,
    mixture: tuple[tuple[tuple[Fraction, Rule], ...], ...],
    draft: InterimDraft,
    point: Vector,
    balanced: bool,
) -> Mechanism:
    """The mechanism whose interim payments and chances are those of a point of the master.

    balanced  with the pot at its expectation in every case
    """
    x = np.array(point.numerators(), dtype=object)
    pays = [
        x[draft.pays_columns[i]] if i in draft.pays_columns else np.zeros(size, dtype=object)
        for i, size in enumerate(setting.shape)
    ]
    average = _over(pays, point.den)
    if not balanced:
        return Mechanism(setting, lead, mixture, average)
    # From here on over point.den * grain * the product of the parties' total weights.
    outlay = setting.outlay.astype(object)
    total = setting.total_weight
    own = [row * (setting.grain * total) for row in pays]
    means, spent = [], []
    for i, party in enumerate(setting.parties):
        weights = np.array(party.weights, dtype=object)
        means.append(int((own[i] * weights).sum()) // sum(party.weights))
        columns, _ = draft.expected_decision(i)
        spent.append((x[columns] * outlay[draft.merged[i].first]).sum(axis=1) * total)
    first = setting.parties[0]
    expected = int((spent[0] * np.array(first.weights, dtype=object)).sum()) // sum(first.weights)
    everything = sum(means)
    pot, den = everything - expected, point.den * setting.grain * total
    effects = [
        cost + (pot - (everything - mean)) - mine
        for cost, mean, mine in zip(spent, means, own, strict=True)
    ]
    return Mechanism(setting, lead, mixture, average, _over(effects, den), Fraction(pot, den))


def _over(rows: list[IntArray], den: int) -> tuple[tuple[Fraction, ...], ...]:
    return tuple(tuple(Fraction(number, den) for number in row.tolist()) for row in rows)


def _lowest(rows: list[IntArray], den: int) -> tuple[IntArray, int]:
    """The rows over the least common denominator."""
    shared = den
    for row in rows:
        shared = math.gcd(shared, int(np.gcd.reduce(row)))
    return integers([row // shared for row in rows]), den // shared


def _texts(tables: tuple[tuple[Fraction, ...], ...]) -> list[list[str]]:
    return [[text(value) for value in table] for table in tables]


def from_plain(plain: dict[str, Any], setting: Setting) -> Mechanism:
    """The mechanism that `Mechanism.plain` wrote. Raises ValueError for anything else."""
    try:
        if plain["format"] != FORMAT:
            raise ValueError(f"the format is {plain['format']!r}, not {FORMAT!r}")
        mixture = tuple(
            tuple((number(part["share"]), _with_exceptions(part, setting)) for part in mix)
            for mix in plain["mixture"]
        )
        average = _numbers(plain["pays_on_average"], setting)
        effects = plain["effects"]
        lead = plain["lead"]
        if lead is not None and not 0 <= lead < len(setting.parties):
            raise ValueError("there is no such lead party")
        if len(mixture) != (1 if lead is None else setting.shape[lead]):
            raise ValueError("the mixture does not fit the lead party's types")
        if any(
            sum(share for share, _ in mix) != 1 or any(s < 0 for s, _ in mix) for mix in mixture
        ):
            raise ValueError("shares must be at least 0 and sum to 1")
        return Mechanism(
            setting,
            lead,
            mixture,
            average,
            None if effects is None else _numbers(effects, setting),
            number(plain["pot"]),
        )
    except (KeyError, TypeError, IndexError, AttributeError) as error:
        raise ValueError(f"not a table document: {error!r}") from None


def _with_exceptions(part: Any, setting: Setting) -> Rule:
    rule = _rule(part["indices"], setting)
    if "except" not in part:
        return rule
    return Rule(rule.indices, _exceptions(part["except"], setting, bool(rule.indices)))


def rules_to_plain(rules: Sequence[Rule]) -> tuple[list[Any], list[int]]:
    """Rules as `rules_from_plain` reads them, and where each of them stands there.

    Rules that differ in exceptions alone name one without exceptions, which is put first.
    """
    found: list[Any] = []
    plain: dict[int, int] = {}
    places = []
    for rule in rules:
        if id(rule.indices) not in plain:
            plain[id(rule.indices)] = len(found)
            found.append([index.plain() for index in rule.indices])
        like = plain[id(rule.indices)]
        if rule.exceptions:
            found.append({"like": like, "except": _except(rule)})
        places.append(len(found) - 1 if rule.exceptions else like)
    return found, places


def rules_from_plain(plain: Any, setting: Setting) -> list[Rule]:
    """Rules from lists of plain indices. Raises ValueError or TypeError for anything else."""
    found: list[Rule] = []
    for rule in plain:
        if isinstance(rule, dict):
            like = rule["like"]
            if type(like) is not int or not 0 <= like < len(found) or found[like].exceptions:
                raise ValueError("a rule is like none before it")
            indices = found[like].indices
            found.append(Rule(indices, _exceptions(rule["except"], setting, bool(indices))))
        else:
            found.append(_rule(rule, setting))
    return found


def _except(rule: Rule) -> list[list[int]]:
    """The exceptions of a rule: positions of types, then of the option."""
    return [[*types, option] for types, option in rule.exceptions]


def _exceptions(
    plain: Any, setting: Setting, indexed: bool
) -> tuple[tuple[tuple[int, ...], int], ...]:
    """Exceptions as `_except` wrote them. Raises ValueError or TypeError for anything else."""
    sizes = (*setting.shape, len(setting.options))
    rows = [tuple(row) for row in plain]
    for row in rows:
        whole = len(row) == len(sizes) and all(type(v) is int for v in row)
        if not whole or not all(0 <= v < size for v, size in zip(row, sizes, strict=True)):
            raise ValueError("an exception names no profile and option")
    if len({row[:-1] for row in rows}) != len(rows):
        raise ValueError("two exceptions at one profile")
    if rows and not indexed:
        raise ValueError("the given table has no exceptions")
    return tuple((row[:-1], row[-1]) for row in rows)


def _numbers(rows: Any, setting: Setting) -> tuple[tuple[Fraction, ...], ...]:
    tables = tuple(tuple(number(value) for value in row) for row in rows)
    if tuple(len(table) for table in tables) != setting.shape:
        raise ValueError("the tables do not fit the parties' types")
    return tables


def _rule(indices: Any, setting: Setting) -> Rule:
    found = []
    options = len(setting.options)
    for index in indices:
        tables = [
            np.array([[int(v) for v in row] for row in t], dtype=object) for t in index["parties"]
        ]
        row = np.array([int(v) for v in index["options"]], dtype=object)
        if [t.shape for t in tables] != [(n, options) for n in setting.shape] or len(
            row
        ) != options:
            raise ValueError("an index does not fit the parties' types")
        found.append(Index(tuple(tables), row))
    return Rule(tuple(found))
