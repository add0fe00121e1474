"""Writing a proof down, reading it back, and holding it against its scenario."""

from __future__ import annotations

import json
import subprocess
import sys
from fractions import Fraction
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from designer.demands.plain import as_plain
from designer.demands.terms import Demands
from designer.errors import ProofError
from designer.program.labels import Pays, TakesPart, Unknown
from designer.program.linear import Bound, LinearProgram
from designer.program.program import Axis, Block, Program, Stage
from designer.proof.compare import program_digest, rebuild, same_program
from designer.proof.document import (
    as_bytes,
    compose,
    load_document,
    parse_document,
    plain_tree,
    plain_vector,
)
from designer.proof.outcome import Branch, GoalResult, Leaf
from designer.proof.recheck import recheck
from designer.proof.vector import Vector
from designer.setting.scenario import parse_scenario
from designer.setting.setting import IntArray
from tests.attacks import handmade
from tests.attacks.handmade import endless, knapsack, mixture, odd, sale, two_goals
from tests.attacks.mutations import copied

SCENARIO = {"title": "By hand", "digest": "0" * 64}
TERMS = {"ic": "bayesian", "goal": ["any"]}
LEAST_REMEDY = "Save the proof again with `designer pose SCENARIO --save DIR`."


def assembled(written: dict[str, Any], dtype: type = np.int64) -> Program:
    """The labelled program of a document made by hand."""
    matrix = written["program"]

    def bound(name: str, size: int) -> Bound:
        num: IntArray = np.zeros(size, dtype=dtype)
        finite = np.zeros(size, dtype=bool)
        num[matrix[name]["idx"]] = matrix[name]["num"]
        finite[matrix[name]["idx"]] = True
        return Bound(num, finite)

    stages = []
    for stage in written["stages"]:
        cost = np.zeros(stage["columns"], dtype=dtype)
        cost[stage["cost"]["idx"]] = stage["cost"]["num"]
        stages.append(
            Stage(
                stage["goal"],
                stage["sense"],
                stage["columns"],
                stage["rows"],
                cost,
                stage["cost"]["den"],
                Fraction(stage["cost"]["const"]),
            )
        )
    rows, columns = matrix["rows"], matrix["columns"]
    integer = np.zeros(columns, dtype=bool)
    integer[matrix["integer"]] = True
    whole = LinearProgram(
        indptr=np.array(matrix["indptr"], dtype=np.int64),
        indices=np.array(matrix["indices"], dtype=np.int64),
        data=np.array(matrix["data"], dtype=dtype),
        row_lo=bound("row_lo", rows),
        row_hi=bound("row_hi", rows),
        col_lo=bound("col_lo", columns),
        col_hi=bound("col_hi", columns),
        col_den=matrix["col_den"],
        cost=np.zeros(columns, dtype=dtype),
        integer=integer,
    )
    ones = np.ones(rows, dtype=dtype)
    return Program(
        whole,
        tuple(stages),
        Axis((Block("column", columns, lambda j: Pays(f"party {j}", ())),)),
        Axis((Block("row", rows, lambda i: TakesPart(f"party {i}")),)),
        (ones, ones),
    )


def of(written: dict[str, Any], size: int) -> Vector:
    return Vector(written["den"], tuple(written["idx"]), tuple(written["num"]), size)


@pytest.mark.parametrize("dtype", [np.int64, object])
def test_a_possible_verdict_is_written_as_by_hand(dtype: type) -> None:
    for by_hand in (mixture(), two_goals()):
        program = assembled(by_hand, dtype)
        goals = [
            GoalResult(
                stage["goal"],
                Fraction(stage["value"]),
                True,
                dual=of(stage["dual"], stage["rows"]),
            )
            for stage in by_hand["stages"]
        ]
        primal = of(by_hand["primal"], program.matrix.columns)
        document = compose(
            program, verdict="possible", scenario=SCENARIO, terms=TERMS, goals=goals, primal=primal
        )
        assert document == by_hand
        assert parse_document(as_bytes(document)) == by_hand


def test_an_impossible_verdict_is_written_as_by_hand() -> None:
    by_hand = sale()
    document = compose(
        assembled(by_hand),
        verdict="impossible",
        scenario=SCENARIO,
        terms=TERMS,
        farkas=of(by_hand["farkas"], 4),
    )
    assert document == by_hand
    document = compose(
        assembled(odd()),
        verdict="impossible",
        scenario=SCENARIO,
        terms=TERMS,
        tree=Branch(
            0,
            0,
            Leaf("infeasible", Vector(1, (0,), (1,), 1)),
            Leaf("infeasible", Vector(1, (0,), (-1,), 1)),
        ),
    )
    assert document == odd()


def test_a_tree_becomes_a_list_of_nodes_with_the_root_first() -> None:
    zero, minus = Vector.zero(1), Vector(1, (0,), (-1,), 1)
    tree = Branch(
        0,
        0,
        Leaf("bound", zero),
        Branch(1, 0, Leaf("bound", zero), Leaf("infeasible", minus)),
    )
    assert plain_tree(tree, "dual") == knapsack()["stages"][0]["tree"]
    deep: Branch | Leaf = Leaf("bound", zero)
    for k in range(5000):  # no recursion
        deep = Branch(0, k, deep, Leaf("bound", zero))
    assert len(plain_tree(deep, "dual")) == 10_001


def test_an_unproved_goal_is_written_as_open() -> None:
    by_hand = mixture()
    goals = [GoalResult("revenue", Fraction(11), False, dual=of(by_hand["stages"][0]["dual"], 2))]
    document = compose(
        assembled(by_hand),
        verdict="possible",
        scenario=SCENARIO,
        terms=TERMS,
        goals=goals,
        primal=of(by_hand["primal"], 2),
    )
    assert recheck(document).open == ("revenue",)
    assert recheck(document).claims == (
        "the table meets all 2 rows, all bounds",
        "the table reaches 11 for revenue",
    )


def test_there_is_no_proof_without_a_verdict_or_a_value() -> None:
    program = assembled(mixture())
    with pytest.raises(ValueError, match="no proof to write for the verdict 'undecided'"):
        compose(program, verdict="undecided", scenario=SCENARIO, terms=TERMS)
    with pytest.raises(ValueError, match="the goal 'revenue' has no value"):
        compose(
            program,
            verdict="possible",
            scenario=SCENARIO,
            terms=TERMS,
            goals=[GoalResult("revenue", None, False)],
            primal=Vector.zero(2),
        )


def test_a_verdict_without_its_certificate_is_written_so_and_rejected() -> None:
    for verdict, primal in (("impossible", None), ("unbounded", Vector.zero(2))):
        document = compose(
            assembled(endless()), verdict=verdict, scenario=SCENARIO, terms=TERMS, primal=primal
        )
        assert not recheck(document).holds
    document["ray"] = endless()["ray"]
    assert recheck(document).holds
    again = compose(
        assembled(endless()),
        verdict="unbounded",
        scenario=SCENARIO,
        terms=TERMS,
        primal=Vector.zero(2),
        ray=of(endless()["ray"], 2),
    )
    assert again == document


def test_long_numbers_are_written_in_hexadecimal() -> None:
    """10^5000 has more digits than Python turns into decimal text."""
    big = 10**5000
    written = plain_vector(Vector(big + 1, (0, 2), (-big, 7), 3))
    assert written == {"den": hex(big + 1), "idx": [0, 2], "num": [hex(-big), 7]}
    assert json.loads(json.dumps(written)) == written


@pytest.mark.parametrize(
    ("raw", "found"),
    [
        (b"", "Expecting value at line 1, column 1"),
        (b"{", "Expecting property name enclosed in double quotes at line 1, column 2"),
        (b"\xff\xfe", "a byte that is not UTF-8 at position 0"),
        (b'{"a": 1, "a": 2}', "the key 'a' twice in one object"),
        (b"[NaN]", "NaN, which is no exact number"),
        (b"[-Infinity]", "-Infinity, which is no exact number"),
        (b"[" * 100_000, "objects or lists nested too deep"),
        (b"\xef\xbb\xbf{}", "Unexpected UTF-8 BOM (decode using utf-8-sig) at line 1, column 1"),
    ],
)
def test_a_file_that_is_no_document_is_an_input_error(
    raw: bytes, found: str, tmp_path: Path
) -> None:
    path = tmp_path / "proof.json"
    path.write_bytes(raw)
    with pytest.raises(ProofError) as caught:
        load_document(path)
    assert caught.value.exit_code == 2
    assert caught.value.source == str(path)
    assert caught.value.mistakes[0].found == found
    assert caught.value.mistakes[0].remedy == LEAST_REMEDY


def test_a_decimal_that_python_refuses_is_an_input_error() -> None:
    with pytest.raises(ProofError, match=r"more digits than FORMAT\.md writes in decimal"):
        parse_document(b"[" + b"7" * 5000 + b"]")


def test_a_long_key_is_cut() -> None:
    key = b'"' + b"a" * 5000 + b'"'
    with pytest.raises(ProofError, match="the key 'aaa") as caught:
        parse_document(b"{" + key + b": 1, " + key + b": 2}")
    assert len(str(caught.value)) < 400


def test_a_file_that_cannot_be_opened_is_an_input_error(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    with pytest.raises(ProofError, match="found No such file or directory"):
        load_document(tmp_path / "missing.json")
    with pytest.raises(ProofError, match="Is a directory"):
        load_document(tmp_path)
    with pytest.raises(ProofError, match="null"):
        load_document("proof\0.json")
    monkeypatch.setattr("designer.proof.document.MAX_BYTES", 3)
    (tmp_path / "large.json").write_bytes(b"[1]\n")
    with pytest.raises(ProofError, match="found a larger file; expected at most 3 bytes"):
        load_document(tmp_path / "large.json")


# -- the program of a document against another ---------------------------------------------


def test_the_same_program_has_no_differences_and_the_same_digest() -> None:
    for by_hand in (sale(), mixture(), two_goals(), knapsack()):
        assert same_program(by_hand, assembled(by_hand)) == []
        respelled = copied(by_hand)
        if respelled["program"]["data"]:
            respelled["program"]["data"][0] = hex(respelled["program"]["data"][0])
        respelled = dict(reversed(respelled.items()))
        assert same_program(respelled, assembled(by_hand)) == []
        assert program_digest(respelled) == program_digest(by_hand)


@pytest.mark.parametrize(
    ("path", "value", "difference"),
    [
        (("program", "data", 1), 2, "row 0, TakesPart(party='party 0', type=None, at=None), diff"),
        (("program", "row_lo", "num", 0), 5, "row 1, TakesPart(party='party 1', type=None, at="),
        (("program", "row_hi", "num", 0), 5, "row 0, TakesPart(party='party 0', type=None, at="),
        (("program", "col_lo", "num", 0), 1, "column 0, Pays(party='party 0', at=()), differs"),
        (("program", "integer"), [2], "column 2, Pays(party='party 2', at=()), differs"),
        (("stages", 0, "cost", "den"), 3, "goal 1, welfare, differs"),
        (("stages", 0, "cost", "const"), "1/7", "goal 1, welfare, differs"),
        (("stages", 1, "sense"), "max", "goal 2, swing, differs"),
        (("stages", 1, "goal"), "floor", "goal 2, swing, differs"),
        (("stages", 0, "rows"), 2, "goal 1, welfare, differs"),
    ],
)
def test_each_difference_is_named(path: tuple[Any, ...], value: Any, difference: str) -> None:
    document = two_goals()
    inner: Any = document
    for step in path[:-1]:
        inner = inner[step]
    inner[path[-1]] = value
    found = same_program(document, assembled(two_goals()))
    assert len(found) == 1
    assert found[0].startswith(difference)
    assert program_digest(document) != program_digest(two_goals())


def test_sizes_that_differ_are_named_first_and_long_lists_cut() -> None:
    assert same_program(sale(), assembled(two_goals())) == [
        "4 columns in the proof, 3 in the scenario",
        "1 goals in the proof, 2 in the scenario",
    ]
    moved = knapsack()
    moved["program"]["row_hi"]["num"] = [4]
    many = assembled(moved)
    assert len(same_program(knapsack(), many)) == 1
    changed = sale()
    changed["program"] |= {"col_den": 2, "col_lo": {"idx": [0], "num": [1]}}
    changed["program"]["row_lo"] = {"idx": [], "num": []}
    assert len(same_program(changed, assembled(sale()))) == 5
    seven = sale()
    seven["program"] = handmade.program([({0: 1}, 1, None)] * 7, [(None, None)])
    seven["stages"] = [handmade.stage("any", "min", (7, 1), {})]
    other = copied(seven)
    other["program"]["row_lo"]["num"] = [2] * 7
    found = same_program(other, assembled(seven))
    assert len(found) == 6
    assert found[-1] == "and 2 more rows"


def test_malformed_programs_are_input_errors() -> None:
    documents: list[Any] = [[], {}, {**sale(), "program": 3}, {**sale(), "stages": []}]
    for broken in documents:
        with pytest.raises(ProofError):
            same_program(broken, assembled(sale()))
        with pytest.raises(ProofError):
            program_digest(broken)


# -- the whole way -------------------------------------------------------------------------

CROSSING = """
title = "A ferry at the crossing"
[decisions]
options = ["run", "stop"]
[designer]
outlay = { run = 3 }
[[party]]
name  = "Aldmouth"
types = [1, 4]
prior = ["1/2", "1/2"]
value = { run = "type", stop = 0 }
[[party]]
name  = "Brill"
types = [0, 3]
prior = ["1/3", "2/3"]
value = { run = "type", stop = 0 }
"""


@pytest.mark.parametrize(
    ("goal", "balance", "status"),
    [
        ("welfare,revenue", "none", "possible"),
        ("outside-money", "ex-post", "possible"),
        ("any", "ex-post", "impossible"),
        ("revenue", "none", "unbounded"),
    ],
)
def test_a_posed_proof_holds_and_its_program_is_the_scenarios(
    goal: str, balance: str, status: str, tmp_path: Path
) -> None:
    from designer.posing import pose

    setting = parse_scenario(CROSSING)
    demands = Demands(goal=goal, balance=balance, ir="none" if status == "unbounded" else "interim")
    terms = demands.over(setting)
    verdict = pose(setting, demands)
    assert (verdict.status, verdict.proved) == (status, True)
    path = tmp_path / "proof.json"
    path.write_bytes(as_bytes(verdict.proof))
    document = load_document(path)
    assert document == verdict.proof
    assert recheck(document).holds
    assert verdict.proof["terms"] == as_plain(terms)
    program = rebuild(document, setting, terms)
    assert same_program(document, program) == []
    elsewhere = parse_scenario(CROSSING.replace("[1, 4]", "[1, 5]"))
    assert same_program(document, rebuild(document, elsewhere, demands.over(elsewhere)))


def test_rebuilding_refuses_goals_and_values_that_are_none() -> None:
    setting = parse_scenario(CROSSING)
    terms = Demands(goal="revenue", decision="randomized").over(setting)
    odd_goal = mixture()
    odd_goal["stages"][0]["goal"] = "fame"
    with pytest.raises(ProofError, match="the goal 'fame'"):
        rebuild(odd_goal, setting, terms)
    no_value = two_goals()
    no_value["stages"][0]["value"] = "1/0"
    with pytest.raises(ProofError, match="not a ratio"):
        rebuild(no_value, setting, terms)


BLOCKED = ("numpy", "highspy", "scipy", "pandas", "flint", "pulp", "rich", "typer")
ALONE = f"""
import sys

class Wall:
    def find_spec(self, name, path=None, target=None):
        if name.split(".")[0] in {BLOCKED!r}:
            raise ImportError(f"{{name}} is behind the wall")

sys.meta_path.insert(0, Wall())
for name in {BLOCKED!r}:
    try:
        __import__(name)
    except ImportError:
        continue
    raise SystemExit(f"{{name}} came through")
from designer.proof.document import load_document
from designer.proof.recheck import recheck
for path in sys.argv[1:]:
    print(recheck(load_document(path)).claims)
"""


def test_the_checker_runs_where_nothing_else_is_installed(tmp_path: Path) -> None:
    paths = []
    for name, document in {"sale": sale(), "goals": two_goals(), "knapsack": knapsack()}.items():
        path = tmp_path / f"{name}.json"
        path.write_bytes(as_bytes(document))
        paths.append(str(path))
    done = subprocess.run(
        [sys.executable, "-c", ALONE, *paths], capture_output=True, text=True, check=True
    )
    assert done.stdout.splitlines() == [
        str(recheck(document).claims) for document in (sale(), two_goals(), knapsack())
    ]
    assert done.stderr == ""


def test_labels_unknown_to_the_proof_do_not_matter() -> None:
    """A document names families only; labels come from the rebuilt program."""
    program = assembled(mixture())
    other = Program(
        program.matrix,
        program.stages,
        Axis((Block("unknown", 2, lambda _: Unknown("floor")),)),
        program.row_axis,
        program.row_scale,
    )
    assert same_program(mixture(), other) == []
