"""What a proof document claims, decided without its certificates and without the checker.

Fractions, dense rows and the rational simplex of the oracles; whole-number columns by trying
every value. Slow, and shares nothing with the package.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from fractions import Fraction
from itertools import product
from typing import Any

from tests.oracles.simplex import Row, maximise

CASES = 200
"""Most combinations of whole numbers that are tried."""


class TooLarge(Exception):  # noqa: N818
    """More whole-number cases than this oracle tries."""


@dataclass
class Prefix:
    """A stage's program as >= and = rows, bounds on columns included."""

    columns: int
    rows: list[Row]
    integer: dict[int, tuple[int, int]]
    cost: dict[int, Fraction]
    const: Fraction

    def best(self, fixed: list[Row]) -> tuple[str, Fraction | None]:
        """Status and optimum of sign * cost . x, over all whole-number cases."""
        found: Fraction | None = None
        for case in self._cases():
            status, value = maximise(self.cost, self.rows + fixed + case, self.columns)
            if status == "unbounded":
                return status, None
            if value is not None and (found is None or value > found):
                found = value
        return ("impossible", None) if found is None else ("possible", found)

    def _cases(self) -> Iterator[list[Row]]:
        size = 1
        for low, high in self.integer.values():
            size *= max(0, high - low + 1)
        if size > CASES:
            raise TooLarge
        ranges = [range(low, high + 1) for low, high in self.integer.values()]
        for values in product(*ranges):
            chosen = zip(self.integer, values, strict=True)
            yield [({j: Fraction(1)}, "=", Fraction(v)) for j, v in chosen]


def whole(written: object) -> int:
    """An integer in either spelling; AssertionError for anything else, true and false too."""
    if isinstance(written, str):
        return int(written, 16)
    assert type(written) is int
    return written


def ratio(written: str) -> Fraction:
    """A ratio in either spelling."""
    top, _, bottom = written.partition("/")
    return Fraction(int(top, 0), int(bottom or "1", 0))


def entries(vector: dict[str, Any]) -> dict[int, Fraction]:
    """The nonzero entries of a vector."""
    den = whole(vector["den"])
    pairs = zip(vector["idx"], vector["num"], strict=True)
    return {whole(j): Fraction(whole(number), den) for j, number in pairs}


def sides(written: dict[str, Any], den: int = 1) -> dict[int, Fraction]:
    """Bounds by position."""
    pairs = zip(written["idx"], written["num"], strict=True)
    return {whole(k): Fraction(whole(number), den) for k, number in pairs}


def prefix(document: dict[str, Any], s: int) -> Prefix:
    """Stage s, to be maximised (costs of `min` are negated)."""
    program, stage = document["program"], document["stages"][s]
    rows: list[Row] = []
    low, high = sides(program["row_lo"]), sides(program["row_hi"])
    for i in range(stage["rows"]):
        inside = range(program["indptr"][i], program["indptr"][i + 1])
        row = {program["indices"][k]: Fraction(whole(program["data"][k])) for k in inside}
        rows += _between(row, low.get(i), high.get(i))
    den = whole(program["col_den"])
    low, high = sides(program["col_lo"], den), sides(program["col_hi"], den)
    for j in range(stage["columns"]):
        rows += _between({j: Fraction(1)}, low.get(j), high.get(j))
    integer = {}
    for j in program["integer"]:
        if j < stage["columns"]:
            integer[j] = _range(j, rows)
    sign = 1 if stage["sense"] == "max" else -1
    cost = {j: sign * value for j, value in entries({**stage["cost"]}).items()}
    return Prefix(stage["columns"], rows, integer, cost, ratio(stage["cost"]["const"]))


def _between(row: dict[int, Fraction], low: Fraction | None, high: Fraction | None) -> list[Row]:
    found: list[Row] = []
    if low is not None:
        found.append((row, ">=", low))
    if high is not None:
        found.append(({j: -value for j, value in row.items()}, ">=", -high))
    return found


def _range(j: int, rows: list[Row]) -> tuple[int, int]:
    """The whole numbers that rows on column j alone leave it."""
    low: list[Fraction] = []
    high: list[Fraction] = []
    for row, _, bound in rows:
        if row.keys() == {j}:
            (low if row[j] > 0 else high).append(bound / row[j])
    if not low or not high:
        raise TooLarge
    return -((-max(low)) // 1), min(high) // 1


def is_true(document: dict[str, Any]) -> bool:
    """Whether what the document claims is so. Raises TooLarge when this oracle cannot tell.

    possible    the table keeps every bound; goals that are not left open have the stated
                optimum where the earlier goals keep their values
    impossible  the first stage has no table
    unbounded   as possible for the earlier goals, and the last has no optimum
    """
    verdict, stages = document["verdict"], document["stages"]
    if verdict == "impossible":
        return prefix(document, 0).best([])[0] == "impossible"
    point = entries(document["primal"])
    if not _keeps(document, point):
        return False
    fixed: list[Row] = []
    for s, stage in enumerate(stages):
        program = prefix(document, s)
        if verdict == "unbounded" and s == len(stages) - 1:
            return program.best(fixed)[0] == "unbounded"
        sign = 1 if stage["sense"] == "max" else -1
        level = sum((c * point.get(j, 0) for j, c in program.cost.items()), Fraction(0))
        if sign * level + program.const != ratio(stage["value"]):
            return False
        if ("dual" in stage or "tree" in stage) and program.best(fixed) != ("possible", level):
            return False
        fixed.append((program.cost, "=", level))
    return True


def _keeps(document: dict[str, Any], point: dict[int, Fraction]) -> bool:
    whole_program = {
        **document["stages"][-1],
        "rows": document["program"]["rows"],
        "columns": document["program"]["columns"],
        "cost": {"den": 1, "idx": [], "num": [], "const": "0"},
    }
    everything = prefix({**document, "stages": [whole_program]}, 0)
    for row, _, bound in everything.rows:
        if sum((value * point.get(j, 0) for j, value in row.items()), Fraction(0)) < bound:
            return False
    return all(point.get(j, Fraction(0)).denominator == 1 for j in document["program"]["integer"])
