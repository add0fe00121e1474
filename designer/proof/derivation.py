"""Why a mix of demands is impossible, as lines that anyone can add up.

A Farkas vector gives each row of the program a multiplier. Added up, the multiplied rows
read 0 >= positive. Here that sum is folded until it can be followed with a pencil: rows that
only define interim payments or probabilities vanish into the lines that use them; the
balance rows become one line when the prior weighs them (with independent types it always
does); the lottery rows become one line, too. The sum of the lines is checked again here.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from fractions import Fraction

from designer.program.labels import (
    Balances,
    Clause,
    Decides,
    ExpectedDecision,
    ExpectedPay,
    Label,
    Lottery,
    Pays,
    Share,
    Slice,
)
from designer.program.program import Program
from designer.proof.vector import Vector

STRUCTURE = (Lottery, ExpectedDecision, Decides, Slice, Share)
"""Rows and columns that only say that decisions are lotteries over the options allowed."""

Form = dict[int, Fraction]
"""Coefficients by column."""


@dataclass(frozen=True)
class Line:
    """One multiplied demand: multiplier * (sum of terms >= bound), multiplier > 0.

    label  the demand; None for the folded rows that make decisions lotteries
    terms  the demand's coefficients by column label, natural units
    folds  how many rows of the program this line stands for
    """

    multiplier: Fraction
    label: Label | None
    terms: tuple[tuple[Label, Fraction], ...]
    bound: Fraction
    folds: int = 1


@dataclass(frozen=True)
class Derivation:
    """Lines whose weighted sum reads 0 >= total, total > 0; multipliers are integers."""

    lines: tuple[Line, ...]
    total: Fraction


@dataclass
class _Item:
    """weight * (form >= bound), or = bound when the weight may have either sign."""

    label: Label
    weight: Fraction
    form: Form
    bound: Fraction


def derive(program: Program, farkas: Vector) -> Derivation:
    """The lines of an exact Farkas vector over the rows of the program's first stage.

    Raises ValueError if the multiplied rows do not add up to 0 >= positive.
    """
    items = [_row(program, row, number, farkas.den) for row, number in _entries(farkas)]
    items += _bounds(program, items)
    structure = [i for i in items if isinstance(i.label, STRUCTURE)]
    money = [i for i in items if isinstance(i.label, (Balances, ExpectedPay))]
    apart = {id(item) for item in (*structure, *money)}
    rest = [item for item in items if id(item) not in apart]
    balances = [i for i in money if isinstance(i.label, Balances)]
    form, bound = _sum(money)
    weight = abs(sum((i.weight for i in balances), Fraction(0)))
    lines: list[Line]
    if weight and not any(isinstance(program.column_axis.label(c), Pays) for c in form):
        lines = [_line(program, item) for item in rest]
        average = {column: value / weight for column, value in form.items()}
        item = _Item(Balances(), weight, average, bound / weight)
        lines.append(_line(program, item, len(balances)))
    else:
        defined: dict[Label, Form] = {
            i.label: i.form for i in money if isinstance(i.label, ExpectedPay)
        }
        lines = [_line(program, _spelled_out(program, i, defined)) for i in (*rest, *balances)]
    if structure:
        form, bound = _sum(structure)
        lines.append(_line(program, _Item(Lottery(()), Fraction(1), form, bound), len(structure)))
    return _checked(lines)


def _entries(vector: Vector) -> list[tuple[int, int]]:
    return list(zip(vector.idx, vector.num, strict=True))


def _row(program: Program, row: int, number: int, den: int) -> _Item:
    """A stored row back in natural units, with its natural multiplier."""
    whole = program.matrix
    num, div = program.row_scale
    back = Fraction(int(div[row]), int(num[row]))
    side = whole.row_lo if number > 0 else whole.row_hi
    span = range(int(whole.indptr[row]), int(whole.indptr[row + 1]))
    return _Item(
        program.row_axis.label(row),
        Fraction(number, den) / back,
        {int(whole.indices[k]): int(whole.data[k]) * back for k in span},
        int(side.num[row]) * back,
    )


def _bounds(program: Program, items: list[_Item]) -> list[_Item]:
    """The column bounds that cancel what the rows leave over."""
    whole, found = program.matrix, []
    left, _ = _sum(items)
    for column, value in left.items():
        side = whole.col_lo if value < 0 else whole.col_hi
        if not side.finite[column]:
            raise ValueError("the multiplied rows leave a free column")
        label = program.column_axis.label(column)
        if isinstance(label, Pays):
            key = "pays_at_least" if value < 0 else "pays_at_most"
            label = Clause("limit", key, label.party, label.at)
        bound = Fraction(int(side.num[column]), whole.col_den)
        found.append(_Item(label, -value, {column: Fraction(1)}, bound))
    return found


def _sum(items: list[_Item]) -> tuple[Form, Fraction]:
    form: Form = {}
    bound = Fraction(0)
    for item in items:
        bound += item.weight * item.bound
        for column, value in item.form.items():
            form[column] = form.get(column, Fraction(0)) + item.weight * value
    return {column: value for column, value in form.items() if value}, bound


def _spelled_out(program: Program, item: _Item, defined: dict[Label, Form]) -> _Item:
    """The item with interim payments written as the payments they average."""
    form: Form = dict(item.form)
    for column, value in item.form.items():
        meaning = defined.get(program.column_axis.label(column))
        if meaning is None:
            continue
        for inner, part in meaning.items():
            total = form.get(inner, Fraction(0)) - value / meaning[column] * part
            form[inner] = total
    return _Item(
        item.label, item.weight, {column: v for column, v in form.items() if v}, item.bound
    )


def _line(program: Program, item: _Item, folds: int = 1) -> Line:
    sign = 1 if item.weight > 0 else -1
    terms = tuple(
        (program.column_axis.label(column), sign * value)
        for column, value in sorted(item.form.items())
    )
    label = None if isinstance(item.label, Lottery) else item.label
    return Line(abs(item.weight), label, terms, sign * item.bound, folds)


def _checked(lines: list[Line]) -> Derivation:
    """The lines over whole multipliers, once their sum is seen to read 0 >= positive."""
    left: dict[Label, Fraction] = {}
    for line in lines:
        for label, value in line.terms:
            left[label] = left.get(label, Fraction(0)) + line.multiplier * value
    total = sum((line.multiplier * line.bound for line in lines), Fraction(0))
    if total <= 0 or any(left.values()):
        raise ValueError("the multiplied rows do not add up to 0 >= positive")
    up = math.lcm(*(line.multiplier.denominator for line in lines))
    down = math.gcd(*(int(line.multiplier * up) for line in lines))
    scale = Fraction(up, down)
    scaled = tuple(
        Line(line.multiplier * scale, line.label, line.terms, line.bound, line.folds)
        for line in lines
    )
    return Derivation(scaled, total * scale)
