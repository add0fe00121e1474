"""The master program: interim quantities, and shares of the rules found so far."""

from __future__ import annotations

import math
from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from designer.demands.formulate import Formulation, amounts_of
from designer.demands.terms import Terms
from designer.engines.report import Report
from designer.engines.watch import Watch
from designer.program.program import Program
from designer.roads.interim.blocks import count
from designer.roads.interim.draft import InterimDraft
from designer.roads.interim.rule import Counts, Index, Rule, welfare_index
from designer.setting.setting import IntArray, Setting

PRECISION = 1 << 40
"""Float duals become integer indices of about this size: a rule must be exact to be listed."""


@dataclass(frozen=True, eq=False)
class Listed:
    """A rule with its exact counts."""

    rule: Rule
    counts: Counts


Column = tuple[int, int]
"""(type of the lead party, position in the list of rules)."""


@dataclass(frozen=True, eq=False)
class Prices:
    """What a dual says of decisions: an index per party and type, and a price per slice.

    A rule that takes the counts `taken` in slice g improves when
    sum_i index_i . taken_i > slices[g], all over `den`.
    """

    parties: tuple[IntArray, ...]
    slices: tuple[Fraction, ...]
    den: int = 1

    def worth(self, counts: Counts, g: int) -> Fraction:
        """The index sum of a rule in one slice."""
        total = 0
        for table, taken in zip(self.parties, counts.taken[g], strict=True):
            total += int((table.astype(object) * taken).sum())
        return Fraction(total, self.den * counts.den)


class Master:
    """The growing list of rules, and the programs over them."""

    def __init__(self, setting: Setting, terms: Terms, lead: int, watch: Watch) -> None:
        """Start without rules."""
        self.setting, self.terms, self.lead, self.watch = setting, terms, lead, watch
        self.listed: list[Listed] = []
        self.columns: list[Column] = []

    def first(self) -> tuple[Index, ...]:
        """The indices that every rule must start with: welfare where efficiency is demanded."""
        return (welfare_index(self.setting),) if self.terms.decision == "efficient" else ()

    def add(self, rule: Rule) -> Counts:
        """List a rule for every slice."""
        counts = count(self.setting, rule, self.lead, self.watch)
        self.listed.append(Listed(rule, counts))
        place = len(self.listed) - 1
        self.columns += [(g, place) for g in range(self.setting.shape[self.lead])]
        return counts

    def formulation(self, columns: list[Column] | None = None) -> Formulation:
        """The demands over the listed columns; no goal yet."""
        chosen = self.columns if columns is None else columns
        draft = InterimDraft(
            self.setting,
            self.terms.decision,
            amounts_of(self.terms),
            lead=self.lead,
            columns=tuple((g, self.listed[r].counts) for g, r in chosen),
        )
        return Formulation(self.setting, self.terms, draft=draft)

    def program(self, goal: str, columns: list[Column] | None = None) -> Program:
        """The program of one goal over the listed columns."""
        return self.formulation(columns).pose(goal)


def exact_prices(
    setting: Setting, lead: int, program: Program, dual: dict[int, Fraction]
) -> Prices:
    """The index that exact multipliers of the minimising form give to every decision."""
    tables, slices = _read(setting, lead, program, dual)
    den = math.lcm(*(v.denominator for table in tables for row in table for v in row))
    whole = tuple(
        np.array([[int(v * den) for v in row] for row in table], dtype=object) for table in tables
    )
    return Prices(whole, tuple(slices), den)


def rough_prices(setting: Setting, lead: int, program: Program, report: Report) -> Prices | None:
    """The same from an engine's floats, rounded to integers: good enough to look for rules."""
    if report.y is None:
        return None
    values = {
        int(row): Fraction(float(report.y[row]) / program.stages[-1].cost_den)
        for row in np.flatnonzero(report.y)
    }
    tables, slices = _read(setting, lead, program, values)
    top = max((abs(v) for table in tables for row in table for v in row), default=Fraction(0))
    if not top:
        return None
    scale = Fraction(PRECISION) / top
    whole = tuple(
        np.array([[round(v * scale) for v in row] for row in table], dtype=object)
        for table in tables
    )
    return Prices(whole, tuple(s * scale for s in slices), 1)


def _read(
    setting: Setting, lead: int, program: Program, dual: dict[int, Fraction]
) -> tuple[list[list[list[Fraction]]], list[Fraction]]:
    """Natural multipliers: q_i(k, a) is defined with weight(theta_i = a) in the denominator."""
    options, total = len(setting.options), setting.total_weight
    num, den = program.row_scale
    start = program.row_axis.start("slice")
    slices = [
        -dual.get(start + g, Fraction(0)) * int(num[start + g]) / int(den[start + g])
        for g in range(setting.shape[lead])
    ]
    tables = []
    place = start + setting.shape[lead]
    for party in setting.parties:
        own_total = sum(party.weights)
        table = []
        for own in party.weights:
            weight = Fraction(total // own_total * own)
            row = []
            for _ in range(options):
                natural = dual.get(place, Fraction(0)) * int(num[place]) / int(den[place])
                row.append(natural / weight)
                place += 1
            table.append(row)
        tables.append(table)
    return tables, slices


def rule_for(setting: Setting, first: tuple[Index, ...], prices: Prices) -> Rule:
    """The rule that is best at some prices."""
    zero = np.zeros(len(setting.options), dtype=object)
    return Rule((*first, Index(prices.parties, zero)))
