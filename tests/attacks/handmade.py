"""Proof documents worked out by hand, small enough to be followed with a pencil."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

Row = tuple[Mapping[int, int], int | None, int | None]
"""(coefficients by column, lower bound, upper bound)."""

Side = tuple[int | None, int | None]
"""Lower and upper bound of a column, in units of 1 / col_den."""


def vector(entries: Mapping[int, int], den: int = 1) -> dict[str, Any]:
    return {"den": den, "idx": sorted(entries), "num": [entries[k] for k in sorted(entries)]}


def bounds(sides: Sequence[int | None]) -> dict[str, Any]:
    placed = [(k, side) for k, side in enumerate(sides) if side is not None]
    return {"idx": [k for k, _ in placed], "num": [side for _, side in placed]}


def program(
    rows: Sequence[Row], columns: Sequence[Side], integer: Sequence[int] = (), col_den: int = 1
) -> dict[str, Any]:
    indptr, indices, data = [0], [], []
    for coefficients, _, _ in rows:
        indices += sorted(coefficients)
        data += [coefficients[j] for j in sorted(coefficients)]
        indptr.append(len(indices))
    return {
        "columns": len(columns),
        "rows": len(rows),
        "indptr": indptr,
        "indices": indices,
        "data": data,
        "row_lo": bounds([lo for _, lo, _ in rows]),
        "row_hi": bounds([hi for _, _, hi in rows]),
        "col_den": col_den,
        "col_lo": bounds([lo for lo, _ in columns]),
        "col_hi": bounds([hi for _, hi in columns]),
        "integer": list(integer),
        "names": {"columns": [["column", len(columns)]], "rows": [["row", len(rows)]]},
    }


def stage(
    goal: str,
    sense: str,
    size: tuple[int, int],
    cost: Mapping[int, int],
    den: int = 1,
    const: str = "0",
    **found: Any,
) -> dict[str, Any]:
    rows, columns = size
    return {
        "goal": goal,
        "sense": sense,
        "columns": columns,
        "rows": rows,
        "cost": {**vector(cost, den), "const": const},
        **found,
    }


def document(
    verdict: str, matrix: dict[str, Any], stages: list[dict[str, Any]], **parts: Any
) -> dict[str, Any]:
    return {
        "format": "designer.proof/1",
        "scenario": {"title": "By hand", "digest": "0" * 64},
        "terms": {"ic": "bayesian", "goal": ["any"]},
        "path": "full",
        "verdict": verdict,
        "program": matrix,
        "stages": stages,
        **parts,
    }


def sale() -> dict[str, Any]:
    """No sale works: buyer worth 1 or 5, seller 0 or 4, even odds, balance in every case.

    Columns: the price at (1,0), (1,4), (5,0), (5,4). Multiplied by 2, 1, 1, 2 and added up, the
    rows read 0 >= 1. (Textbook result: Myerson and Satterthwaite 1983, JET 29, on a 2 x 2 grid.)
    """
    rows: list[Row] = [
        ({0: -1, 1: -1}, -1, None),
        ({0: 1, 1: 1, 2: -1, 3: -1}, -5, None),
        ({0: 1, 1: -1, 2: 1, 3: -1}, 0, None),
        ({1: 1, 3: 1}, 4, None),
    ]
    free: list[Side] = [(None, None)] * 4
    return document(
        "impossible",
        program(rows, free),
        [stage("any", "min", (4, 4), {})],
        farkas=vector({0: 2, 1: 1, 2: 1, 3: 2}),
    )


def mixture() -> dict[str, Any]:
    """Most of 3x + 2y with x + y <= 4, x + 3y <= 6, 0 <= x <= 3, y >= 0: 11 at (3, 1).

    Twice the first row and once the bound on x: 3x + 2y <= 8 + 3.
    """
    rows: list[Row] = [({0: 1, 1: 1}, None, 4), ({0: 1, 1: 3}, None, 6)]
    return document(
        "possible",
        program(rows, [(0, 3), (0, None)]),
        [stage("revenue", "max", (2, 2), {0: 3, 1: 2}, value="11", dual=vector({0: -2}))],
        primal=vector({0: 3, 1: 1}),
    )


def diet() -> dict[str, Any]:
    """Least of x/2 + y/3 + 1 with 2x + y >= 4, x + 2y >= 5, 0 <= x <= 1/2, y >= 0.

    At x = 1/2, y = 3: 1/4 + 1 + 1 = 9/4. A third of the first row: x/2 + y/3 >= 4/3 - x/6.
    """
    rows: list[Row] = [({0: 2, 1: 1}, 4, None), ({0: 1, 1: 2}, 5, 40)]
    return document(
        "possible",
        program(rows, [(0, 1), (0, None)], col_den=2),
        [
            stage(
                "outside-money",
                "min",
                (2, 2),
                {0: 3, 1: 2},
                den=6,
                const="1",
                value="9/4",
                dual=vector({0: 1}, 3),
            )
        ],
        primal=vector({0: 1, 1: 6}, 2),
    )


def endless() -> dict[str, Any]:
    """Most of x - y with x - 2y <= 1, x and y >= 0: along (2, 1) there is no end."""
    return document(
        "unbounded",
        program([({0: 1, 1: -2}, None, 1)], [(0, None), (0, None)]),
        [stage("revenue", "max", (1, 2), {0: 1, 1: -1})],
        primal=vector({0: 1}),
        ray=vector({0: 2, 1: 1}),
    )


def two_goals() -> dict[str, Any]:
    """Most of (x + y) / 2 with x + y <= 2; then the smallest cap z on x and on y.

    Row 1 keeps x + y = 2, written as 2x + 2y = 4. Adding z - x >= 0, z - y >= 0: 2z >= 2.
    """
    rows: list[Row] = [
        ({0: 1, 1: 1}, None, 2),
        ({0: 2, 1: 2}, 4, 4),
        ({0: -1, 2: 1}, 0, None),
        ({1: -1, 2: 1}, 0, None),
    ]
    first = stage("welfare", "max", (1, 2), {0: 1, 1: 1}, den=2, value="1", dual=vector({0: -1}, 2))
    second = stage("swing", "min", (4, 3), {2: 1}, value="1", dual=vector({1: 1, 2: 2, 3: 2}, 4))
    return document(
        "possible",
        program(rows, [(0, None), (0, None), (None, None)]),
        [first, second],
        primal=vector({0: 1, 1: 1, 2: 1}),
    )


def first_bounded_then_endless() -> dict[str, Any]:
    """Most of x with x <= 3, pinned; then most of y, which nothing holds."""
    rows: list[Row] = [({0: 1}, None, 3), ({0: -1}, -3, -3), ({0: 1, 1: -1}, None, 5)]
    first = stage("floor", "max", (1, 1), {0: 1}, value="3", dual=vector({0: -1}))
    return document(
        "unbounded",
        program(rows, [(0, None), (None, None)]),
        [first, stage("revenue", "max", (3, 2), {1: 1})],
        primal=vector({0: 3, 1: -2}),
        ray=vector({1: 1}),
    )


def knapsack() -> dict[str, Any]:
    """Most of x + y with 2x + 2y <= 3, both 0 or 1: one of them, by cases.

    x = 0: y <= 1. x = 1 and y = 0: 1. x = 1 and y = 1: 4 <= 3 is absurd.
    """
    tree = [
        {"column": 0, "floor": 0, "down": 1, "up": 2},
        {"dual": vector({})},
        {"column": 1, "floor": 0, "down": 3, "up": 4},
        {"dual": vector({})},
        {"farkas": vector({0: -1})},
    ]
    return document(
        "possible",
        program([({0: 2, 1: 2}, None, 3)], [(0, 1), (0, 1)], integer=[0, 1]),
        [stage("welfare", "max", (1, 2), {0: 1, 1: 1}, value="1", tree=tree)],
        primal=vector({1: 1}),
    )


def odd() -> dict[str, Any]:
    """No whole x has 2x = 1, by cases: x <= 0 and x >= 1."""
    tree = [
        {"column": 0, "floor": 0, "down": 1, "up": 2},
        {"farkas": vector({0: 1})},
        {"farkas": vector({0: -1})},
    ]
    return document(
        "impossible",
        program([({0: 2}, 1, 1)], [(-5, 5)], integer=[0]),
        [stage("any", "min", (1, 1), {})],
        tree=tree,
    )


def gap() -> dict[str, Any]:
    """No whole x lies in [1/3, 2/3], by cases; either leaves column 0 without room."""
    tree = [
        {"column": 0, "floor": 0, "down": 1, "up": 2},
        {"empty": 0},
        {"empty": 0},
    ]
    return document(
        "impossible",
        program([], [(1, 2)], integer=[0], col_den=3),
        [stage("any", "min", (0, 1), {})],
        tree=tree,
    )


def unsettled() -> dict[str, Any]:
    """Whole x, 0 <= x <= 2: a table with x = 1, its optimality left open."""
    return document(
        "possible",
        program([({0: 1}, 0, 2)], [(None, None)], integer=[0]),
        [stage("revenue", "max", (1, 1), {0: 1}, value="1")],
        primal=vector({0: 1}),
    )


def nothing_asked() -> dict[str, Any]:
    """A goal that is constant, followed by another."""
    first = stage("any", "min", (1, 1), {}, const="2", value="2", dual=vector({}))
    second = stage("floor", "min", (1, 1), {0: 1}, value="1/2", dual=vector({0: 1}, 2))
    return document(
        "possible",
        program([({0: 2}, 1, None)], [(None, None)]),
        [first, second],
        primal=vector({0: 1}, 2),
    )


ALL = {
    "sale": sale,
    "mixture": mixture,
    "diet": diet,
    "endless": endless,
    "two goals": two_goals,
    "first bounded, then endless": first_bounded_then_endless,
    "knapsack": knapsack,
    "odd": odd,
    "gap": gap,
    "unsettled": unsettled,
    "nothing asked": nothing_asked,
}
