"""Prices that treat alike parties alike, so that the rules they ask for can be counted together.

Parties of equal data may trade places in the master program: its rows and columns stay, since
every listed rule takes the same at the types of each. So the average of a dual over all such
exchanges is a dual of the same value. Only the rows that define q_i(k, a) need care: an
expectation over decisions is written in the first party's q alone, though any party's would do.
Their multipliers are set anew from the others, so that the reduced cost of every q is 0.
"""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction
from functools import lru_cache
from typing import Any

import numpy as np
import numpy.typing as npt

from designer.demands.terms import Terms
from designer.program.program import Program
from designer.proof.outcome import Outcome
from designer.proof.vector import Vector
from designer.roads.interim.draft import Lies
from designer.setting.setting import Setting

Groups = tuple[tuple[int, ...], ...]
"""Positions of parties alike, two or more together; a party may be in none."""


@lru_cache(maxsize=8)
def alike_parties(setting: Setting, terms: Terms, lead: int | None) -> Groups:
    """The parties that nothing in the setting and the terms tells apart; a lead party is apart.

    Equal worths, option by option, equal weights and outside options; and the same asked of
    each in the same order.
    """
    groups: dict[tuple[Any, ...], list[int]] = {}
    blend: dict[str, Fraction] = {}
    for name, weight in terms.blend:
        blend[name] = blend.get(name, Fraction(0)) + weight
    for index, party in enumerate(setting.parties):
        if index == lead:
            continue
        asked = tuple(
            (chance.type, chance.option, chance.at_least, chance.at_most)
            for chance in terms.side.chances
            if chance.party == index
        )
        key = (
            party.weights,
            tuple(map(tuple, party.value.tolist())),
            tuple(party.outside.tolist()),
            party.name in terms.compelled,
            party.name in terms.trusted,
            blend.get(party.name, Fraction(0)),
            asked,
        )
        groups.setdefault(key, []).append(index)
    return tuple(tuple(group) for group in groups.values() if len(group) > 1)


def even_tables(
    groups: Groups, tables: tuple[npt.NDArray[np.float64], ...]
) -> tuple[npt.NDArray[np.float64], ...]:
    """One table per party, those of alike parties replaced by their mean."""
    even = list(tables)
    for group in groups:
        mean = np.mean([tables[i] for i in group], axis=0)
        for i in group:
            even[i] = mean
    return tuple(even)


def even_lies(groups: Groups, lies: Lies) -> Lies:
    """Every lie that one of several alike parties tells, for each of them."""
    even = list(lies)
    for group in groups:
        told = tuple(sorted({pair for i in group for pair in lies[i]}))
        for i in group:
            even[i] = told
    return tuple(even)


def even_outcome(
    setting: Setting, terms: Terms, lead: int | None, program: Program, outcome: Outcome
) -> Outcome:
    """The outcome with the multipliers of alike parties averaged; as it was if nobody is."""
    groups = alike_parties(setting, terms, lead)
    if not groups:
        return outcome
    names = tuple(tuple(setting.parties[i].name for i in group) for group in groups)
    if outcome.dual is not None:
        outcome = replace(outcome, dual=_even(names, program, outcome.dual, True))
    if outcome.farkas is not None:
        outcome = replace(outcome, farkas=_even(names, program, outcome.farkas, False))
    return outcome


def _even(
    names: tuple[tuple[str, ...], ...], program: Program, dual: Vector, priced: bool
) -> Vector:
    """The averaged dual; `priced`: of an optimum, so that columns have their costs."""
    num, den = program.row_scale
    natural = {
        row: value * int(num[row]) / int(den[row]) for row, value in dual.fractions().items()
    }
    starts = _starts(program)
    for group in names:
        runs = [starts.get(name, []) for name in group]
        if any([size for _, size in run] != [size for _, size in runs[0]] for run in runs):
            continue  # rows that do not match: these multipliers stay as they are
        for blocks in zip(*runs, strict=True):
            count = blocks[0][1]
            for offset in range(count):
                rows = [start + offset for start, _ in blocks]
                total = sum((natural.get(row, Fraction(0)) for row in rows), Fraction(0))
                for row in rows:
                    natural[row] = total / len(rows)
    stored = {row: value * int(den[row]) / int(num[row]) for row, value in natural.items() if value}
    return Vector.of(_defined(program, stored, priced), dual.size)


def _starts(program: Program) -> dict[str, list[tuple[int, int]]]:
    """Per party the runs of rows about it, (first, count), but those that define its q."""
    found: dict[str, list[tuple[int, int]]] = {}
    place = 0
    for block in program.row_axis.blocks:
        name = getattr(block.label(0), "party", None)
        if name is not None and block.family != "expected decision":
            found.setdefault(name, []).append((place, block.count))
        place += block.count
    return found


def _defined(program: Program, dual: dict[int, Fraction], priced: bool) -> dict[int, Fraction]:
    """The dual with the multipliers of the defining rows such that every q costs nothing."""
    matrix = program.stage(0)
    row, column = (
        axis.start("expected decision") for axis in (program.row_axis, program.column_axis)
    )
    count = sum(
        block.count for block in program.row_axis.blocks if block.family == "expected decision"
    )
    left = [Fraction(0)] * count
    if priced:
        sign = -1 if matrix.sense == "max" else 1
        left = [
            Fraction(sign * int(c), matrix.cost_den) for c in matrix.cost[column : column + count]
        ]
    for place, value in dual.items():
        if row <= place < row + count:
            continue
        span = slice(int(matrix.indptr[place]), int(matrix.indptr[place + 1]))
        for j, number in zip(matrix.indices[span], matrix.data[span], strict=True):
            if column <= j < column + count:
                left[int(j) - column] -= value * int(number)
    even = {place: value for place, value in dual.items() if not row <= place < row + count}
    for j, rest in enumerate(left):
        if rest:
            span = slice(int(matrix.indptr[row + j]), int(matrix.indptr[row + j + 1]))
            own = int(matrix.data[span][matrix.indices[span] == column + j][0])
            even[row + j] = rest / own
    return even
