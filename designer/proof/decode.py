"""Turn a hostile JSON value into the typed parts of a proof document, or say what is wrong.

FORMAT.md beside this file is the rule book; section numbers below are its. Every type, index and
length is checked here, so that `recheck` can index without fear. Standard library only.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import compress, islice
from operator import ge
from typing import Any

BITS = 1 << 20
_DIGITS = r"(0x[0-9a-f]{1,262144}|[0-9]{1,4000})"
_HEX = re.compile(r"-?0x[0-9a-f]{1,262144}")
_RATIO = re.compile(rf"(-?){_DIGITS}(?:/{_DIGITS})?")
_TOP = ("format", "scenario", "terms", "path", "verdict", "program", "stages")
_SHAPE = ("columns", "rows", "indptr", "indices", "data", "col_den", "integer", "names")
_BOUNDS = ("row_lo", "row_hi", "col_lo", "col_hi")
_STAGE = ("goal", "sense", "columns", "rows", "cost")


class Fault(Exception):  # noqa: N818 — a fault of the document, not of the program
    """Something is wrong with the document; the message says what."""


def need(condition: bool, otherwise: str) -> None:
    """Raise a Fault unless the condition holds; an `assert` could be switched off."""
    if not condition:
        raise Fault(otherwise)


@dataclass(frozen=True)
class Vector:
    """Entry idx[k] is num[k] / den, all others 0; `words` of 64 bits hold the largest number."""

    den: int
    idx: Sequence[int]
    num: Sequence[int]
    words: int


@dataclass(frozen=True)
class Program:
    """Section 3; `bounds` maps positions to row_lo, row_hi, col_lo, col_hi in this order."""

    columns: int
    rows: int
    indptr: list[int]
    indices: list[int]
    data: list[int]
    col_den: int
    integer: frozenset[int]
    bounds: tuple[dict[int, int], ...]
    words: int


@dataclass(frozen=True)
class Stage:
    """Section 4; `sign` is 1 for min and -1 for max, `found` what is claimed of the stage."""

    goal: str
    sign: int
    columns: int
    rows: int
    cost: Vector
    const: tuple[int, int]
    found: dict[str, Any]


def keys(value: object, where: str, *required: str) -> dict[str, Any]:
    """An object with exactly these keys."""
    if not isinstance(value, dict):
        raise Fault(f"{where}: not an object")
    need(value.keys() == set(required), f"{where}: its keys must be {', '.join(required)}")
    return value


def count(value: object, where: str, stop: int | None = None) -> int:
    """A JSON integer, not negative and below `stop`; true and false are none."""
    if type(value) is not int or value < 0 or (stop is not None and value >= stop):
        raise Fault(f"{where}: not an index or count, or out of range")
    return value


def ratio(value: object, where: str) -> tuple[int, int]:
    """The numerator and the positive denominator of "p" or "p/q", as written."""
    match = _RATIO.fullmatch(value) if isinstance(value, str) else None
    parts = match.groups("1")[1:] if match else ("0", "0")
    top, bottom = (int(part, 16 if "x" in part else 10) for part in parts)
    if match is None or bottom == 0:
        raise Fault(f"{where}: not a ratio")
    return (-top if match[1] else top), bottom


def vector(value: object, size: int, where: str, *extra: str) -> Vector:
    """A vector of `size` entries; `extra` names keys that its object has besides."""
    entry = keys(value, where, "den", "idx", "num", *extra)
    den, (idx, num) = _integer(entry["den"], where), _sparse(entry, size, where)
    need(den > 0 and all(num), f"{where}: a denominator that is not positive, or a zero entry")
    return Vector(den, idx, num, _words(num, [den]))


def document(value: object) -> tuple[dict[str, Any], str]:
    """The outermost object and its verdict (section 2)."""
    if not isinstance(value, dict):
        raise Fault("the document: not an object")
    need(value.get("format") == "designer.proof/1", "the document: not designer.proof/1")
    reason, verdict = "tree" if "tree" in value else "farkas", value.get("verdict")
    parts = {"possible": ["primal"], "impossible": [reason], "unbounded": ["primal", "ray"]}
    if not isinstance(verdict, str) or verdict not in parts:
        raise Fault("the document: its verdict is not possible, impossible or unbounded")
    extra = ["reduction"] if "reduction" in value else []
    top = keys(value, "the document", *_TOP, *extra, *parts[verdict])
    need(isinstance(top.get("reduction", {}), dict), "reduction: not an object")
    texts = [top["path"], *keys(top["scenario"], "scenario", "title", "digest").values()]
    plain = isinstance(top["terms"], dict) and all(isinstance(text, str) for text in texts)
    need(plain, "the document: path, title and digest must be text, terms an object")
    return top, verdict


def program(value: object) -> Program:
    """The program (section 3)."""
    entry = keys(value, "program", *_SHAPE, *_BOUNDS)
    columns, rows = (count(entry[axis], f"program.{axis}") for axis in ("columns", "rows"))
    data = _integers(entry["data"], "program.data")
    indices = _counts(entry["indices"], "program.indices", columns)
    indptr = _counts(entry["indptr"], "program.indptr", len(data) + 1)
    ends = (indptr[0], indptr[-1], len(indptr), len(indices)) if indptr else ()
    fits = ends == (0, len(data), rows + 1, len(data)) and indptr == sorted(indptr)
    need(fits and all(data), "program: indptr, indices and data do not make rows")
    descents = compress(range(1, len(indices)), map(ge, indices, islice(indices, 1, None)))
    need(set(indptr).issuperset(descents), "program.indices: not ascending within a row")
    sides = []
    for name, size in zip(_BOUNDS, (rows, rows, columns, columns), strict=True):
        where = f"program.{name}"
        sides.append(_sparse(keys(entry[name], where, "idx", "num"), size, where))
    col_den = _integer(entry["col_den"], "program.col_den")
    integer = frozenset(_ascending(entry["integer"], "program.integer", columns))
    names = keys(entry["names"], "program.names", "columns", "rows")
    need(_covers(names["columns"], columns), "program.names: the columns do not add up")
    need(_covers(names["rows"], rows), "program.names: the rows do not add up")
    need(col_den > 0, "program.col_den: not positive")
    bounds = tuple(dict(zip(*side, strict=True)) for side in sides)
    words = _words(data, [col_den], *(num for _, num in sides))
    return Program(columns, rows, indptr, indices, data, col_den, integer, bounds, words)


def stages(value: object, whole: Program, verdict: str) -> list[Stage]:
    """The stages (section 4), each a prefix of the program that contains the one before."""
    if not isinstance(value, list) or not 1 <= len(value) <= 100:
        raise Fault("stages: not a list of 1 to 100 stages")
    read: list[Stage] = []
    columns = rows = 0
    for s, entry in enumerate(value):
        where, extra = f"stages[{s}]", []
        if verdict == "possible" or (verdict == "unbounded" and s < len(value) - 1):
            reasons = [k for k in ("dual", "tree") if isinstance(entry, dict) and k in entry]
            extra = ["value", *reasons[:1]]
        stage = keys(entry, where, *_STAGE, *extra)
        goal, sense, before, above = stage["goal"], stage["sense"], columns, rows
        if not isinstance(goal, str) or not goal.isprintable() or not 1 <= len(goal) <= 60:
            raise Fault(f"{where}.goal: not a short printable text")
        columns = count(stage["columns"], where, whole.columns + 1)
        rows = count(stage["rows"], where, whole.rows + 1)
        added = whole.indices[whole.indptr[above] : whole.indptr[rows]]
        nested = columns >= before and rows >= above and max(added, default=-1) < columns
        need(nested, f"{where}: not a prefix that contains the one before")
        need(sense in ("min", "max"), f"{where}.sense: neither min nor max")
        cost = vector(stage["cost"], columns, f"{where}.cost", "const")
        const = ratio(stage["cost"]["const"], f"{where}.cost.const")
        found = {key: stage[key] for key in extra}
        read.append(Stage(goal, 1 if sense == "min" else -1, columns, rows, cost, const, found))
    return read


def _counts(value: object, where: str, stop: int) -> list[int]:
    if not isinstance(value, list) or not set(map(type, value)) <= {int}:
        raise Fault(f"{where}: not a list of indices")
    need(not value or (min(value) >= 0 and max(value) < stop), f"{where}: an index out of range")
    return value


def _ascending(value: object, where: str, stop: int) -> list[int]:
    idx = _counts(value, where, stop)
    need(not any(map(ge, idx, islice(idx, 1, None))), f"{where}: not strictly ascending")
    return idx


def _integer(value: object, where: str) -> int:
    if isinstance(value, str) and _HEX.fullmatch(value):
        value = int(value, 16)
    if type(value) is not int or value.bit_length() > BITS:
        raise Fault(f"{where}: not an integer, or too large")
    return value


def _integers(value: object, where: str) -> list[int]:
    if not isinstance(value, list):
        raise Fault(f"{where}: not a list")
    if set(map(type, value)) <= {int} and _words(value) <= BITS // 64:
        return value
    return [_integer(entry, where) for entry in value]


def _sparse(entry: dict[str, Any], size: int, where: str) -> tuple[list[int], list[int]]:
    idx, num = _ascending(entry["idx"], where, size), _integers(entry["num"], where)
    need(len(idx) == len(num), f"{where}: idx and num of different lengths")
    return idx, num


def _words(*numbers: Sequence[int]) -> int:
    ends = (end for part in numbers if part for end in (min(part), max(part)))
    return 1 + max(map(int.bit_length, ends), default=0) // 64


def _covers(blocks: object, size: int) -> bool:
    """Whether the blocks are [text, count] pairs whose counts add up to the size."""
    if not isinstance(blocks, list) or any(not isinstance(b, list) or len(b) != 2 for b in blocks):
        return False
    texts = all(isinstance(block[0], str) for block in blocks)
    return texts and sum(count(block[1], "program.names") for block in blocks) == size
