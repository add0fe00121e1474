"""The checker: what each proof by hand shows, and the exact fault of each broken rule."""

from __future__ import annotations

import ast
import sys
from collections.abc import Callable
from contextlib import suppress
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import designer.proof.decode
import designer.proof.recheck
from designer.proof.recheck import Finding, recheck
from tests.attacks import handmade
from tests.attacks.handmade import (
    ALL,
    diet,
    endless,
    first_bounded_then_endless,
    gap,
    knapsack,
    mixture,
    nothing_asked,
    odd,
    program,
    sale,
    stage,
    two_goals,
    unsettled,
    vector,
)
from tests.attacks.mutations import copied, places
from tests.attacks.truth import TooLarge, is_true

CLAIMS = {
    "sale": ("no table meets the first 4 rows and all bounds",),
    "mixture": (
        "the table meets all 2 rows, all bounds",
        "no table does better than 11 for revenue",
    ),
    "diet": (
        "the table meets all 2 rows, all bounds",
        "no table does better than 9/4 for outside-money",
    ),
    "endless": (
        "the table meets all 1 rows, all bounds",
        "revenue improves without end along the ray",
    ),
    "two goals": (
        "the table meets all 4 rows, all bounds",
        "no table does better than 1 for welfare",
        "no table among those with welfare = 1 does better than 1 for swing",
    ),
    "first bounded, then endless": (
        "the table meets all 3 rows, all bounds",
        "no table does better than 3 for floor",
        "revenue improves without end along the ray among those with floor = 3",
    ),
    "knapsack": (
        "the table meets all 1 rows, all bounds and its 2 whole-number columns",
        "no table does better than 1 for welfare",
    ),
    "odd": ("no table meets the first 1 rows and all bounds, in each of 2 cases",),
    "gap": ("no table meets the first 0 rows and all bounds, in each of 2 cases",),
    "unsettled": (
        "the table meets all 1 rows, all bounds and its 1 whole-number columns",
        "the table reaches 1 for revenue",
    ),
    "nothing asked": (
        "the table meets all 1 rows, all bounds",
        "no table does better than 1/2 for floor",
    ),
}


@pytest.mark.parametrize("name", ALL)
def test_proofs_by_hand_hold(name: str) -> None:
    document = ALL[name]()
    assert recheck(document) == Finding(
        True,
        document["verdict"],
        CLAIMS[name],
        (),
        ("revenue",) if name == "unsettled" else (),
    )


Edit = Callable[[dict[str, Any]], object]
BASES: dict[str, Callable[[], dict[str, Any]]] = {
    "sale": sale,
    "mixture": mixture,
    "diet": diet,
    "endless": endless,
    "goals": two_goals,
    "then endless": first_bounded_then_endless,
    "knapsack": knapsack,
    "odd": odd,
    "gap": gap,
    "unsettled": unsettled,
    "nothing": nothing_asked,
}


def put(*path: Any) -> Edit:
    """Set the place named by all but the last argument to the last one."""

    def edit(document: dict[str, Any]) -> None:
        inner: Any = document
        for step in path[:-2]:
            inner = inner[step]
        inner[path[-2]] = path[-1]

    return edit


def drop(*path: Any) -> Edit:
    def edit(document: dict[str, Any]) -> None:
        inner: Any = document
        for step in path[:-1]:
            inner = inner[step]
        del inner[path[-1]]

    return edit


def both(*edits: Edit) -> Edit:
    def edit(document: dict[str, Any]) -> None:
        for one in edits:
            one(document)

    return edit


DUAL = ("stages", 0, "dual")
TREE = ("stages", 0, "tree")
VECTOR = "its keys must be den, idx, num"

# (base, edit, the exact fault)
FORM: list[tuple[str, Edit, str]] = [
    ("sale", put("format", "designer.proof/2"), "the document: not designer.proof/1"),
    (
        "sale",
        put("verdict", "undecided"),
        "the document: its verdict is not possible, impossible or unbounded",
    ),
    (
        "sale",
        put("verdict", ["possible"]),
        "the document: its verdict is not possible, impossible or unbounded",
    ),
    (
        "sale",
        put("more", 1),
        "the document: its keys must be format, scenario, terms, path, verdict, program, stages,"
        " farkas",
    ),
    (
        "sale",
        put("terms", []),
        "the document: path, title and digest must be text, terms an object",
    ),
    ("sale", put("path", 3), "the document: path, title and digest must be text, terms an object"),
    (
        "sale",
        put("scenario", "title", None),
        "the document: path, title and digest must be text, terms an object",
    ),
    ("sale", put("scenario", []), "scenario: not an object"),
    ("sale", put("program", None), "program: not an object"),
    ("sale", put("program", "columns", True), "program.columns: not an index or count, or out of"),
    ("sale", put("program", "rows", -1), "program.rows: not an index or count, or out of range"),
    ("sale", put("program", "data", {}), "program.data: not a list"),
    ("sale", put("program", "data", 0, "+0x1"), "program.data: not an integer, or too large"),
    ("sale", put("program", "data", 0, 1.0), "program.data: not an integer, or too large"),
    ("sale", put("program", "data", 0, True), "program.data: not an integer, or too large"),
    ("sale", put("program", "data", 0, 1 << (1 << 20)), "program.data: not an integer, or too"),
    (
        "sale",
        put("program", "data", 0, 0),
        "program: indptr, indices and data do not make rows",
    ),
    ("sale", put("program", "indices", 0, 4), "program.indices: an index out of range"),
    ("sale", put("program", "indices", 0, -1), "program.indices: an index out of range"),
    ("sale", put("program", "indices", 0, False), "program.indices: not a list of indices"),
    ("sale", put("program", "indices", "0"), "program.indices: not a list of indices"),
    ("sale", put("program", "indices", 1, 0), "program.indices: not ascending within a row"),
    ("sale", put("program", "indptr", []), "program: indptr, indices and data do not make rows"),
    ("sale", put("program", "indptr", 1, 13), "program.indptr: an index out of range"),
    ("sale", put("program", "indptr", 1, 7), "program: indptr, indices and data do not make rows"),
    ("sale", put("program", "indptr", 0, 1), "program: indptr, indices and data do not make rows"),
    ("sale", put("program", "indptr", 4, 11), "program: indptr, indices and data do not make rows"),
    ("sale", put("program", "rows", 5), "program: indptr, indices and data do not make rows"),
    ("sale", drop("program", "indices", 11), "program: indptr, indices and data do not make rows"),
    ("sale", put("program", "row_lo", "idx", 0, 1), "program.row_lo: not strictly ascending"),
    ("sale", put("program", "row_lo", "idx", 3, 4), "program.row_lo: an index out of range"),
    ("sale", drop("program", "row_lo", "num", 3), "program.row_lo: idx and num of different"),
    ("sale", put("program", "row_lo", "den", 1), "program.row_lo: its keys must be idx, num"),
    ("sale", put("program", "col_den", 0), "program.col_den: not positive"),
    ("gap", put("program", "col_den", -3), "program.col_den: not positive"),
    ("sale", put("program", "integer", [0, 0]), "program.integer: not strictly ascending"),
    ("sale", put("program", "names", []), "program.names: not an object"),
    ("sale", put("program", "names", "columns", 0, 1, 3), "program.names: the columns do not add"),
    ("sale", put("program", "names", "rows", 0, 0, 3), "program.names: the rows do not add up"),
    ("sale", put("program", "names", "rows", {}), "program.names: the rows do not add up"),
    ("sale", put("program", "names", "rows", [4]), "program.names: the rows do not add up"),
    ("sale", put("program", "names", "rows", [["r"]]), "program.names: the rows do not add up"),
    (
        "sale",
        put("program", "names", "rows", 0, 1, -4),
        "program.names: not an index or count, or out of range",
    ),
    ("sale", put("stages", []), "stages: not a list of 1 to 100 stages"),
    ("sale", put("stages", {}), "stages: not a list of 1 to 100 stages"),
    ("mixture", put("stages", 0, None), "stages[0]: not an object"),
    (
        "sale",
        put("stages", 0, "value", "0"),
        "stages[0]: its keys must be goal, sense, columns, rows, cost",
    ),
    (
        "mixture",
        put("stages", 0, "tree", []),
        "stages[0]: its keys must be goal, sense, columns, rows, cost, value, dual",
    ),
    ("mixture", put("stages", 0, "goal", ""), "stages[0].goal: not a short printable text"),
    ("mixture", put("stages", 0, "goal", "x\x1b[2J"), "stages[0].goal: not a short printable text"),
    ("mixture", put("stages", 0, "goal", "x" * 61), "stages[0].goal: not a short printable text"),
    ("mixture", put("stages", 0, "goal", 1), "stages[0].goal: not a short printable text"),
    ("mixture", put("stages", 0, "sense", "least"), "stages[0].sense: neither min nor max"),
    ("mixture", put("stages", 0, "columns", 3), "stages[0]: not an index or count, or out of"),
    ("mixture", put("stages", 0, "rows", 3), "stages[0]: not an index or count, or out of range"),
    (
        "mixture",
        both(put("stages", 0, "columns", 1), put("stages", 0, "cost", "idx", [0])),
        "stages[0]: not a prefix that contains the one before",
    ),
    ("goals", put("stages", 1, "columns", 1), "stages[1]: not a prefix that contains the one"),
    (
        "nothing",
        both(
            put("stages", 1, "columns", 0),
            put("stages", 1, "cost", {**vector({}), "const": "0"}),
        ),
        "stages[1]: not a prefix that contains the one before",
    ),
    ("goals", put("stages", 1, "rows", 0), "stages[1]: not a prefix that contains the one before"),
    ("mixture", put("stages", 0, "cost", "const", 0), "stages[0].cost.const: not a ratio"),
    ("mixture", put("stages", 0, "cost", "const", "1/0"), "stages[0].cost.const: not a ratio"),
    ("mixture", put("stages", 0, "cost", "const", "1/-2"), "stages[0].cost.const: not a ratio"),
    ("mixture", put("stages", 0, "cost", "const", " 1"), "stages[0].cost.const: not a ratio"),
    ("mixture", put("stages", 0, "cost", "const", "1\n"), "stages[0].cost.const: not a ratio"),
    ("mixture", put("stages", 0, "cost", "idx", 1, 2), "stages[0].cost: an index out of range"),
    (
        "mixture",
        drop("stages", 0, "cost", "const"),
        "stages[0].cost: its keys must be den, idx, num, const",
    ),
    ("mixture", put("primal", "den", 0), "primal: a denominator that is not positive, or a zero"),
    ("mixture", put("primal", "den", -1), "primal: a denominator that is not positive, or a zero"),
    ("mixture", put("primal", "num", 0, 0), "primal: a denominator that is not positive, or a z"),
    ("mixture", put("primal", "idx", [0]), "primal: idx and num of different lengths"),
    ("mixture", put("primal", {}), f"primal: {VECTOR}"),
]

SENSE: list[tuple[str, Edit, str]] = [
    ("mixture", put("primal", vector({0: 3, 1: 2})), "primal: row 0 is not kept"),
    ("diet", put("primal", vector({0: 1, 1: 2}, 2)), "primal: row 0 is not kept"),
    ("diet", put("primal", vector({1: 21})), "primal: row 1 is not kept"),
    ("mixture", put("primal", vector({0: 4})), "primal: a bound of column 0 is not kept"),
    ("mixture", put("primal", vector({1: -1})), "primal: a bound of column 1 is not kept"),
    ("diet", put("primal", vector({0: 2, 1: 6}, 2)), "primal: a bound of column 0 is not kept"),
    (
        "knapsack",
        put("primal", vector({0: 1, 1: 1}, 2)),
        "primal: a whole-number column is not whole",
    ),
    (
        "mixture",
        put("stages", 0, "value", "12"),
        "stages[0]: the goal at primal is not the stated value",
    ),
    ("mixture", put("stages", 0, "value", 11), "stages[0].value: not a ratio"),
    (
        "mixture",
        both(put("primal", vector({0: 3})), put("stages", 0, "value", "9")),
        "stages[0] node 0: the dual leaves room for something better",
    ),
    (
        "mixture",
        put(*DUAL, vector({0: 2})),
        "stages[0] node 0: row 0 lacks the bound that its multiplier uses",
    ),
    (
        "diet",
        put(*DUAL, vector({0: -1}, 3)),
        "stages[0] node 0: row 0 lacks the bound that its multiplier uses",
    ),
    (
        "mixture",
        put(*DUAL, vector({0: -1})),
        "stages[0] node 0: column 1 lacks the bound that its reduced cost uses",
    ),
    (
        "unsettled",
        put(*DUAL, vector({})),
        "stages[0] node 0: column 0 lacks the bound that its reduced cost uses",
    ),
    (
        "mixture",
        put(*DUAL, vector({0: -5}, 2)),
        "stages[0] node 0: the dual leaves room for something better",
    ),
    (
        "mixture",
        put("stages", 0, "sense", "min"),
        "stages[0] node 0: the dual leaves room for something better",
    ),
    ("mixture", put(*DUAL, vector({2: 1})), "stages[0] node 0: an index out of range"),
    ("mixture", put(*DUAL, None), "stages[0] node 0: not an object"),
    (
        "goals",
        put("stages", 0, "cost", "num", [2, 3]),
        "stages[0]: the goal at primal is not the stated value",
    ),
    ("then endless", put("ray", vector({0: 1})), "ray: row 0 is not kept"),
    (
        "then endless",
        both(
            put("program", "row_lo", {"idx": [], "num": []}),
            put("ray", vector({0: -1, 1: 1})),
            put("program", "col_lo", {"idx": [], "num": []}),
            put("program", "data", 1, 1),
            put("program", "row_hi", {"idx": [0, 2], "num": [3, 5]}),
        ),
        "ray: it changes the goal floor",
    ),
    ("endless", put("ray", vector({0: 3, 1: 1})), "ray: row 0 is not kept"),
    ("endless", put("ray", vector({0: -1})), "ray: a bound of column 0 is not kept"),
    ("endless", put("ray", vector({1: 1})), "ray: it does not improve the goal"),
    ("endless", put("ray", vector({})), "ray: it does not improve the goal"),
    ("endless", put("stages", 0, "sense", "min"), "ray: it does not improve the goal"),
    ("endless", put("ray", vector({2: 1})), "ray: an index out of range"),
    (
        "sale",
        put("farkas", vector({0: 1, 1: 1, 2: 1, 3: 1})),
        "impossible node 0: column 0 lacks the bound that its reduced cost uses",
    ),
    (
        "sale",
        put("farkas", vector({})),
        "impossible node 0: the derivation does not end in 0 >= a positive number",
    ),
    (
        "sale",
        put("program", "row_lo", "num", 3, 3),
        "impossible node 0: the derivation does not end in 0 >= a positive number",
    ),
    (
        "sale",
        put("farkas", vector({0: -2, 1: -1, 2: -1, 3: -2})),
        "impossible node 0: row 0 lacks the bound that its multiplier uses",
    ),
    ("odd", put("tree", []), "impossible: a tree needs at least one node"),
    ("odd", put("tree", {}), "impossible: a tree needs at least one node"),
    ("odd", put("tree", 0, None), "impossible node 0: not an object"),
    (
        "odd",
        put("tree", 0, {}),
        "impossible node 0: its keys must be column, floor, down, up",
    ),
    (
        "odd",
        put("tree", 0, "column", 1),
        "impossible node 0: not an index or count, or out of range",
    ),
    (
        "odd",
        put("program", "integer", []),
        "impossible node 0: a branch needs a whole-number column and a 63-bit floor",
    ),
    (
        "odd",
        put("tree", 0, "floor", 0.0),
        "impossible node 0: a branch needs a whole-number column and a 63-bit floor",
    ),
    (
        "odd",
        put("tree", 0, "floor", 1 << 63),
        "impossible node 0: a branch needs a whole-number column and a 63-bit floor",
    ),
    ("odd", put("tree", 0, "up", 1), "impossible node 0: a node with two parents"),
    ("odd", put("tree", 0, "up", 0), "impossible node 0: a node with two parents"),
    ("odd", put("tree", 0, "up", 3), "impossible node 0: not an index or count, or out of range"),
    (
        "odd",
        put("tree", 0, "floor", 1),
        "impossible node 1: the derivation does not end in 0 >= a positive number",
    ),
    (
        "odd",
        put("tree", 0, "floor", -1),
        "impossible node 2: the derivation does not end in 0 >= a positive number",
    ),
    (
        "odd",
        put("tree", 1, {"dual": vector({0: 1})}),
        "impossible node 1: no reason of this kind is valid here",
    ),
    (
        "odd",
        put("tree", 1, {"because": vector({0: 1})}),
        "impossible node 1: no reason of this kind is valid here",
    ),
    ("odd", put("tree", 1, {"empty": 0}), "impossible node 1: the bounds of column 0 leave room"),
    (
        "unsettled",
        put("stages", 0, "tree", [{"empty": 0}]),
        "stages[0] node 0: the bounds of column 0 leave room",
    ),
    (
        "gap",
        put("program", "col_lo", {"idx": [], "num": []}),
        "impossible node 1: the bounds of column 0 leave room",
    ),
    (
        "gap",
        put("program", "col_hi", {"idx": [], "num": []}),
        "impossible node 2: the bounds of column 0 leave room",
    ),
    (
        "gap",
        put("program", "col_lo", "num", 0, 0),  # x <= 0 leaves 0 itself
        "impossible node 1: the bounds of column 0 leave room",
    ),
    ("gap", put("tree", 1, "empty", 1), "impossible node 1: not an index or count, or out of"),
    ("odd", lambda d: d["tree"].append({"empty": 0}), "impossible: a node without a parent"),
    (
        "knapsack",
        put(*TREE, 1, {"dual": vector({0: -1}, 4)}),
        "stages[0] node 1: the dual leaves room for something better",
    ),
    (
        "knapsack",
        put(*TREE, [{"dual": vector({0: -1}, 2)}]),
        "stages[0] node 0: the dual leaves room for something better",
    ),
]


@pytest.mark.parametrize(("base", "edit", "fault"), FORM + SENSE)
def test_each_broken_rule_has_its_fault(base: str, edit: Edit, fault: str) -> None:
    document = BASES[base]()
    edit(document)
    finding = recheck(document)
    assert not finding.holds
    assert finding.claims == ()
    assert finding.open == ()
    assert len(finding.faults) == 1
    assert finding.faults[0].startswith(fault)


def test_the_bounds_of_one_branch_do_not_leak_into_the_next() -> None:
    """x_0 <= 0 holds on one side only; after it, column 0 has its own bounds again."""
    document = knapsack()
    tree = document["stages"][0]["tree"]
    tree[0] |= {"down": 2, "up": 1}  # the same leaves on the wrong sides
    assert not recheck(document).holds
    deep = knapsack()
    deep["stages"][0]["tree"] = [
        {"column": 0, "floor": 0, "down": 1, "up": 2},
        {"column": 0, "floor": -1, "down": 3, "up": 4},
        {"column": 1, "floor": 0, "down": 5, "up": 6},
        {"empty": 0},
        {"dual": vector({})},
        {"dual": vector({})},
        {"farkas": vector({0: -1})},
    ]
    assert recheck(deep).holds
    deep["stages"][0]["tree"][6] = {"empty": 0}
    assert recheck(deep).faults == ("stages[0] node 6: the bounds of column 0 leave room",)


def test_a_wider_branch_cannot_widen_the_program() -> None:
    """x_0 <= 7 in a branch leaves x_0 <= 1 as it was."""
    document = knapsack()
    document["stages"][0]["tree"] = [
        {"column": 0, "floor": 7, "down": 1, "up": 2},
        {"dual": vector({0: -1}, 2)},
        {"empty": 0},
    ]
    assert recheck(document).faults == (
        "stages[0] node 1: the dual leaves room for something better",
    )
    document["program"]["row_hi"]["num"] = [2]
    assert recheck(document).holds


def test_numbers_may_be_hexadecimal_and_ratios_unreduced() -> None:
    document = two_goals()
    document["program"]["data"][2] = "0x2"
    document["program"]["row_lo"]["num"][0] = "0x4"
    document["primal"] = {"den": "0x2", "idx": [0, 1, 2], "num": [2, "0x2", 2]}
    document["stages"][0]["value"] = "0x4/4"
    assert recheck(document).claims[1] == "no table does better than 0x4/4 for welfare"
    document["primal"]["num"][1] = "-0x2"
    assert not recheck(document).holds


def test_numbers_beyond_the_decimal_limit() -> None:
    """Scaling a proof by 2^20000, more than 6,000 digits, changes nothing."""
    document = mixture()
    big = 1 << 20_000
    document["primal"] = {"den": hex(big), "idx": [0, 1], "num": [hex(3 * big), hex(big)]}
    document["stages"][0]["dual"] = {"den": hex(big), "idx": [0], "num": [hex(-2 * big)]}
    document["stages"][0]["value"] = f"{hex(11 * big)}/{hex(big)}"
    finding = recheck(document)
    assert finding.claims[1] == "no table does better than the stated value for revenue"
    document["primal"]["num"][1] = hex(big + 1)
    assert recheck(document).faults == ("primal: row 0 is not kept",)


def test_work_is_limited() -> None:
    refused = "the document asks for more arithmetic than the checker allows"
    for name, build in ALL.items():
        if name != "gap":  # no arithmetic at all
            assert recheck(build(), limit=0).faults == (refused,)
        assert recheck(build(), limit=10**4).holds


def test_one_dense_row_under_many_leaves_is_refused_quickly() -> None:
    """A small document that asks for 5e9 products: counted before they are formed."""
    wide, leaves = 50_000, 100_000
    row = dict.fromkeys(range(1, wide), 1)
    tree: list[dict[str, Any]] = []
    for k in range(leaves):
        tree += [{"column": 0, "floor": -k, "down": 2 * k + 2, "up": 2 * k + 1}]
        tree += [{"farkas": vector({0: 1})}]
    tree.append({"farkas": vector({0: 1})})
    matrix = program([(row, 1, None)], [(None, None)] + [(0, 0)] * (wide - 1), integer=[0])
    document = handmade.document(
        "impossible", matrix, [stage("any", "min", (1, wide), {})], tree=tree
    )
    finding = recheck(document, limit=10**7)
    assert finding.faults == ("the document asks for more arithmetic than the checker allows",)


def test_a_hundred_stages_and_no_more() -> None:
    document = nothing_asked()
    first = document["stages"][0]
    document["stages"] = [copied(first) for _ in range(100)]
    assert recheck(document).holds
    document["stages"].append(copied(first))
    assert recheck(document).faults == ("stages: not a list of 1 to 100 stages",)


def test_columns_beyond_any_memory_cost_nothing() -> None:
    document = mixture()
    document["program"]["columns"] = 10**15
    document["program"]["names"]["columns"] = [["column", 10**15]]
    document["stages"][0]["columns"] = 10**15
    assert recheck(document).holds


JSON = st.recursive(
    st.none()
    | st.booleans()
    | st.integers()
    | st.floats()
    | st.text(max_size=5)
    | st.sampled_from(["0x1", "-0x2", "1/2", "min", "max", "possible", "impossible", "unbounded"]),
    lambda inner: (
        st.lists(inner, max_size=4)
        | st.dictionaries(
            st.sampled_from(["den", "idx", "num", "dual", "column", "floor", "down", "up", "tree"])
            | st.text(max_size=3),
            inner,
            max_size=5,
        )
    ),
    max_leaves=12,
)


@given(JSON)
def test_any_json_value_is_judged_not_raised(value: Any) -> None:
    assert not recheck(value).holds


@settings(max_examples=400)
@given(st.sampled_from(sorted(ALL)), st.randoms(use_true_random=False), JSON)
def test_any_json_value_inside_a_proof_is_judged_not_raised(
    name: str, dice: Any, value: Any
) -> None:
    document = ALL[name]()
    container, key = dice.choice(places(document))
    container[key] = value
    finding = recheck(document)
    assert finding.holds == (not finding.faults)
    if finding.holds:
        with suppress(TooLarge):
            assert is_true(document)


def test_deep_nesting_is_judged_not_raised() -> None:
    deep: Any = []
    for _ in range(100_000):
        deep = [deep]
    for k in range(len(places(knapsack()))):
        document = knapsack()
        terms = document["terms"]
        container, key = places(document)[k]
        container[key] = deep
        # Terms are for people; whatever they hold, the arithmetic is the same.
        assert recheck(document).holds == (container is terms or container is terms["goal"])


def test_the_checker_imports_the_standard_library_only() -> None:
    own = {"designer.proof", "designer.proof.decode"}
    for module in (designer.proof.recheck, designer.proof.decode):
        assert module.__file__ is not None
        for node in ast.walk(ast.parse(Path(module.__file__).read_text("utf-8"))):
            names = []
            if isinstance(node, ast.Import):
                names = [alias.name for alias in node.names]
            elif isinstance(node, ast.ImportFrom):
                assert node.level == 0
                names = [str(node.module)]
            for name in names:
                assert name in own or name.split(".")[0] in sys.stdlib_module_names


@pytest.mark.parametrize("module", [designer.proof.recheck, designer.proof.decode])
def test_the_checker_can_be_read_in_one_sitting(module: Any) -> None:
    assert len(Path(module.__file__).read_text("utf-8").splitlines()) <= 300
