"""Evaluates an expression at every type it mentions at once, exactly.

An `Amounts` holds integers over one denominator, over the axes of the parties mentioned, so
that `type + 0.3 * types.Suth` costs T_i * T_s additions whatever the number of profiles.
Branches of if-else, and the later parts of `and` / `or`, count only where they are taken:
`10 / type if type > 0 else 0` divides by no zero.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any, cast

import numpy as np
import numpy.typing as npt

from designer.setting import profiles
from designer.setting.expression import (
    Absolute,
    Arithmetic,
    Choice,
    Comparison,
    ExpressionError,
    Extreme,
    Logic,
    Negate,
    Not,
    Number,
    Test,
    TypeOf,
    Worth,
    references,
    shorten,
)
from designer.setting.reading import MAX_BITS
from designer.setting.setting import IntArray, Type

MAX_POWER = 1000

_WIDE = 2**62
"""int64 entries stay below this in absolute value, so that one sum cannot overflow."""

BoolArray = npt.NDArray[np.bool_]


@dataclass(frozen=True, eq=False)
class Amounts:
    """num / den at each position of the types of `axes` (party positions, increasing)."""

    axes: tuple[int, ...]
    num: IntArray
    den: int


def constant(value: Fraction | int) -> Amounts:
    """One amount, whatever the types."""
    return Amounts((), _fit(np.array(value.numerator, dtype=object)), value.denominator)


def collect(values: Sequence[Fraction], axes: tuple[int, ...], shape: tuple[int, ...]) -> Amounts:
    """Amounts from exact numbers in row-major order over the types of `axes`."""
    num, den = _common(values)
    return Amounts(axes, num.reshape(shape), den)


def evaluate(tree: Worth, types: Sequence[Sequence[Type]], names: Sequence[str]) -> Amounts:
    """The worth at every combination of the types mentioned.

    types  each party's types; names  each party's name, for messages.
    Raises ExpressionError where a type taken has no number or no such field, at a division
    by zero, at a power out of bounds and when numbers grow beyond `MAX_BITS`.
    """
    axes = tuple(sorted(references(tree)))
    shape = tuple(len(types[axis]) for axis in axes)
    if len(axes) > 60 or math.prod(shape) > profiles.MOST:
        raise ExpressionError(
            f"an expression over {profiles.shown(math.prod(shape))} combinations of types",
            f"at most {profiles.MOST:,}, over at most 60 parties",
            "Mention fewer parties or use coarser types.",
        )
    run = _Run(axes, shape or (1,), types, names)
    num, den = run.worth(tree, np.ones(run.unit, dtype=bool))
    full: IntArray = np.broadcast_to(cast(Any, num), run.shape)
    return Amounts(axes, _fit(full.reshape(shape)), den)


Ratio = tuple[IntArray, int]


def common_multiple(numbers: Iterable[int]) -> int:
    """The least common multiple, positive; ExpressionError beyond `MAX_BITS` binary digits."""
    common = 1
    for each in set(numbers):
        common = math.lcm(common, each)
        if common.bit_length() > MAX_BITS:
            raise ExpressionError(
                f"amounts whose common denominator has more than {MAX_BITS:,} binary digits",
                "amounts with common denominators",
                "Round them to a common unit.",
            )
    return common


class _Run:
    """One evaluation: the axes, and the numbers of the types along them."""

    def __init__(
        self,
        axes: tuple[int, ...],
        shape: tuple[int, ...],
        types: Sequence[Sequence[Type]],
        names: Sequence[str],
    ) -> None:
        self.axes = axes
        self.shape = shape
        self.unit = (1,) * len(shape)  # at least one axis: numpy turns 0-d arrays into scalars
        self.types = types
        self.names = names

    def worth(self, tree: Worth, active: BoolArray) -> Ratio:
        """num, den of a worth; `active` marks where it is taken, and faults count."""
        match tree:
            case Number():
                return _scalar(tree.value, self.unit)
            case TypeOf():
                return self.lookup(tree, active)
            case Negate():
                num, den = self.worth(tree.part, active)
                return -num, den
            case Absolute():
                num, den = self.worth(tree.part, active)
                return np.abs(num), den
            case Extreme():
                pick = np.maximum if tree.largest else np.minimum
                return self.fold(pick, [self.worth(part, active) for part in tree.parts])
            case Choice():
                test = self.test(tree.test, active)
                yes = self.worth(tree.yes, active & test)
                no = self.worth(tree.no, active & ~test)
                first, second, den = _together(yes, no)
                return np.where(test, first, second), den
            case Arithmetic():
                left, right = self.worth(tree.left, active), self.worth(tree.right, active)
                return _bounded(self.arithmetic(tree, left, right, active), tree.text)

    def test(self, tree: Test, active: BoolArray) -> BoolArray:
        """Where a condition holds (meaningless outside `active`)."""
        match tree:
            case Not():
                return ~self.test(tree.part, active)
            case Comparison():
                parts = [self.worth(part, active) for part in tree.parts]
                holds = np.ones(self.unit, dtype=bool)
                for op, left, right in zip(tree.ops, parts, parts[1:], strict=False):
                    first, second, _ = _together(left, right)
                    holds = holds & np.asarray(_COMPARE[op](first, second), dtype=bool)
                return holds
            case Logic():
                result = np.full(self.unit, tree.every)
                for part in tree.parts:
                    undecided = active & (result if tree.every else ~result)
                    holds = self.test(part, undecided)
                    result = result & holds if tree.every else result | holds
                return result

    def lookup(self, tree: TypeOf, active: BoolArray) -> Ratio:
        axis = self.axes.index(tree.party)
        found = [
            kind.number if tree.field is None else kind.fields.get(tree.field)
            for kind in self.types[tree.party]
        ]
        along = list(self.unit)
        along[axis] = len(found)
        missing = np.array([value is None for value in found], dtype=bool).reshape(along)
        what = "no number" if tree.field is None else f"no field '{tree.field}'"
        where = self.first(missing & active)
        if where is not None:
            kind = self.types[tree.party][where[axis]]
            raise ExpressionError(
                f"a type of {self.names[tree.party]}, {kind.label!r}, that has {what}",
                "a number behind every type the expression mentions",
                'Write the type as a table: { name = "keen", number = 3 }, or use its fields.'
                if tree.field is None
                else "Give that type the field, or test for it first.",
            )
        num, den = _common([value if value is not None else Fraction(0) for value in found])
        return num.reshape(along), den

    def fold(self, pick: Callable[..., Any], parts: list[Ratio]) -> Ratio:
        num, den = parts[0]
        for part in parts[1:]:
            first, second, den = _together((num, den), part)
            num = pick(first, second)
        return num, den

    def arithmetic(self, tree: Arithmetic, left: Ratio, right: Ratio, active: BoolArray) -> Ratio:
        match tree.op:
            case "+" | "-":
                first, second, den = _together(left, right)
                return (first + second if tree.op == "+" else first - second), den
            case "*":
                (a, p), (b, q) = left, right
                first, second = _room(a, b, _top(a) * _top(b))
                return first * second, p * q
            case "/":
                self.no_zero(right[0] == 0, active, tree)
                safe = np.where(right[0] == 0, 1, right[0])
                return _divide(left, (safe, right[1]))
            case _:
                return self.power(tree, left, right, active)

    def power(self, tree: Arithmetic, left: Ratio, right: Ratio, active: BoolArray) -> Ratio:
        (base, p), (exponent, q) = left, right
        exponent = exponent.astype(object)  # q may be too wide for int64
        off = np.asarray(exponent % q != 0, dtype=bool) | (np.abs(exponent) > MAX_POWER * q)
        where = self.first(off & active)
        if where is not None:
            raise ExpressionError(
                f"{shorten(tree.text)}, whose exponent{self.at(where)} is no integer within "
                f"{MAX_POWER:,}",
                f"an integer power from -{MAX_POWER:,} to {MAX_POWER:,}",
                "Roots and huge powers are not exact worths: give a list of worths instead.",
            )
        whole = np.where(off, 0, exponent // q)
        self.no_zero((base == 0) & (whole < 0), active, tree)
        reach = max(_top(base).bit_length(), p.bit_length()) * _top(whole)
        if reach > MAX_BITS:
            raise _too_large(tree.text)
        pairs = np.broadcast_arrays(base, whole)
        known: dict[tuple[int, int], Fraction] = {}
        values = []
        for pair in zip(pairs[0].ravel().tolist(), pairs[1].ravel().tolist(), strict=True):
            if pair not in known:
                low, high = pair
                known[pair] = Fraction(0) if low == 0 > high else Fraction(low, p) ** high
            values.append(known[pair])
        num, den = _common(values)
        return num.reshape(pairs[0].shape), den

    def no_zero(self, zero: BoolArray, active: BoolArray, tree: Arithmetic) -> None:
        where = self.first(np.asarray(zero, dtype=bool) & active)
        if where is not None:
            raise ExpressionError(
                f"{shorten(tree.text)}, a division by zero{self.at(where)}",
                "a divisor that is never zero",
                "Guard it: … / x if x != 0 else 0.",
            )

    def first(self, mask: BoolArray) -> tuple[int, ...] | None:
        """The first position where a mask holds, over the full axes."""
        if not mask.any():
            return None
        full = np.broadcast_to(mask, self.shape)
        return tuple(int(step) for step in np.unravel_index(int(full.argmax()), self.shape))

    def at(self, where: tuple[int, ...]) -> str:
        """The types at a position, in words."""
        named = [
            f"{self.names[axis]} = {self.types[axis][step].label}"
            for axis, step in zip(self.axes, where, strict=False)
        ]
        return f" at {', '.join(named)}" if named else ""


_COMPARE: dict[str, Callable[[Any, Any], Any]] = {
    "<": np.less,
    "<=": np.less_equal,
    ">": np.greater,
    ">=": np.greater_equal,
    "==": np.equal,
    "!=": np.not_equal,
}


def _scalar(value: Fraction, unit: tuple[int, ...]) -> Ratio:
    return _fit(np.array(value.numerator, dtype=object).reshape(unit)), value.denominator


def _common(values: Sequence[Fraction]) -> Ratio:
    """Exact numbers as integers over their least common denominator, one axis."""
    den = common_multiple(value.denominator for value in values)
    num = np.empty(len(values), dtype=object)
    num[:] = [value.numerator * (den // value.denominator) for value in values]
    return _fit(num), den


def _divide(left: Ratio, right: Ratio) -> Ratio:
    (a, p), (b, q) = left, right
    # (a/p) / (b/q) = a*q*(L/b) / (p*L), L the least common multiple of the divisors.
    common = common_multiple(b.ravel().tolist())
    inverse = common // b.astype(object) * q
    return a.astype(object) * inverse, p * common


def _together(left: Ratio, right: Ratio) -> tuple[IntArray, IntArray, int]:
    """Both over one denominator, in a dtype in which their sum cannot overflow."""
    (a, p), (b, q) = left, right
    den = math.lcm(p, q)
    up, down = den // p, den // q
    first, second = _room(a, b, max(_top(a) * up, up) + max(_top(b) * down, down))
    return first * up, second * down, den


def _room(a: IntArray, b: IntArray, bound: int) -> tuple[IntArray, IntArray]:
    if bound < _WIDE and a.dtype != object and b.dtype != object:
        return a, b
    return a.astype(object), b.astype(object)


def _top(num: IntArray) -> int:
    """The largest absolute entry."""
    return int(np.abs(np.ravel(num)).max())


def _fit(num: IntArray) -> IntArray:
    """int64 where every entry leaves room for a sum, Python ints otherwise."""
    if num.dtype == object and _top(num) < _WIDE:
        return num.astype(np.int64)
    return num


def _bounded(ratio: Ratio, text: str) -> Ratio:
    """In lowest terms and of bearable size."""
    num, den = ratio
    if den > 1:
        shared = math.gcd(den, int(np.gcd.reduce(num, axis=None)))
        if shared > 1:
            num = (num if shared < _WIDE else num.astype(object)) // shared
            den //= shared
    if den.bit_length() > MAX_BITS or _top(num).bit_length() > MAX_BITS:
        raise _too_large(text)
    return _fit(num), den


def _too_large(text: str) -> ExpressionError:
    return ExpressionError(
        f"{shorten(text)}, which grows beyond {MAX_BITS:,} binary digits",
        "worths of a bearable size",
        "Choose a larger unit of money, or round.",
    )
