"""Ties on the type-graph road that are settled by lotteries: the answer, its proof, attacks."""

from __future__ import annotations

import copy
import json
from dataclasses import replace
from typing import Any

import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from benchmarks.invented import general
from designer import Demands, parse_scenario, pose
from designer.demands.plain import as_plain
from designer.engines.highs import HIGHS
from designer.engines.watch import Watch
from designer.posing import pose_terms
from designer.program.program import Program
from designer.proof.compare import same_program
from designer.proof.outcome import Outcome
from designer.proof.recheck import recheck
from designer.proof.vector import Vector
from designer.rebuilding import rebuild
from designer.roads.product import as_independent
from designer.roads.settled import Settled, build
from designer.roads.typegraph import walk
from designer.roads.typegraph.bases import Base, base
from designer.roads.typegraph.check import check
from designer.roads.typegraph.decided import Decided, decide
from designer.roads.typegraph.fibers import fibers
from designer.roads.typegraph.listing import rule_of
from designer.roads.typegraph.mechanism import GraphMechanism, from_plain
from designer.roads.typegraph.mixing import Mixing, Mixture, uncovered
from designer.roads.typegraph.standing import standings
from designer.setting.setting import Setting
from tests.roads.brought_home import assert_honest_and_balanced, assert_on_demand
from tests.roads.test_typegraph import CASES, POTS, TYPES, Design, both, project, proof_of
from tests.roads.typegraph_settings import lifted, torn_designs


@settings(max_examples=200, deadline=None, derandomize=True)
@given(torn_designs(), st.sampled_from((0, 1, 3)))
def test_lotteries_at_ties_are_settled_without_the_plain_road(design: Design, first: int) -> None:
    """Many profiles are tied; `first`: how often choices are changed before lotteries come."""
    setting, _ = design
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(walk, "FIRST", first)
        ours, plain = both(design)
    assert ours.path == "type-graph", ours.reason
    assert ours.proved, (ours.status, ours.reason)
    assert (ours.status, ours.goal_value) == (plain.status, plain.goal_value)
    document = json.loads(json.dumps(ours.proof))
    assert recheck(document).holds
    assert rebuild(setting, document) == []
    opened = "cuts" in document["reduction"]
    assert opened or first > 0 or not len(decide_of(setting).tied)


def decide_of(setting: Setting) -> Decided:
    return decide(as_independent(setting) or setting, "efficient", Watch())


@settings(max_examples=100, deadline=None, derandomize=True)
@given(torn_designs())
def test_tables_with_lotteries_pass_the_audit_and_survive_their_file(design: Design) -> None:
    setting, terms = design
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(walk, "FIRST", 0)
        verdict = pose_terms(setting, terms, path="type-graph")
    assume(verdict.status == "possible" and "cuts" in verdict.proof["reduction"])
    assert verdict.table is not None
    assert isinstance(verdict.mechanism, GraphMechanism)
    back = from_plain(json.loads(json.dumps(verdict.mechanism.plain())), setting)
    assert_on_demand(setting, verdict, back)
    assert verdict.audit is not None
    assert standings(verdict.mechanism) == verdict.audit.standings
    if terms.trusted:
        return
    assert_honest_and_balanced(setting, terms, verdict)


@settings(max_examples=100, deadline=None, derandomize=True)
@given(torn_designs(most_profiles=9))
def test_cuts_are_proofs_about_the_full_program(design: Design) -> None:
    setting, terms = design
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(walk, "FIRST", 0)
        verdict = pose_terms(setting, terms, path="type-graph")
    assume(verdict.status in ("possible", "impossible") and "cuts" in verdict.proof["reduction"])
    document = lifted(setting, terms, verdict)
    finding = recheck(document)
    assert finding.holds, finding.faults
    from designer.demands.formulate import Formulation

    program = Formulation(setting, terms).pose(terms.goals[0])
    assert same_program(document, program) == []


SITES = general(
    4,
    6,
    2,
    8,
    {
        "decision": "efficient",
        "ic": "dominant",
        "ir": "ex-post",
        "balance": "ex-ante",
        "goal": "outside-money",
        "tidy": "none",
    },
)["scenario.toml"]


def test_the_best_answer_needs_lotteries_at_ties() -> None:
    """Four parties, 1,296 profiles, many of them tied; the plain road is the judge."""
    setting = parse_scenario(SITES)
    ours = pose(setting, path="type-graph")
    plain = pose(setting, path="full")
    assert (ours.path, ours.proved, plain.proved) == ("type-graph", True, True)
    assert ours.goal_value == plain.goal_value
    assert isinstance(ours.mechanism, GraphMechanism)
    decided = ours.mechanism.decided
    assert any(0 < int(part) < decided.den for part in decided.palette.flat)


def test_the_plain_road_does_not_take_over_where_it_would_not_stop() -> None:
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(walk, "uncovered", lambda *_: "they were not looked for")
        patch.setattr(walk, "PLAIN_UP_TO", 1_000)
        verdict = pose(parse_scenario(SITES), path="type-graph")
    assert (verdict.path, verdict.status, verdict.proved) == ("type-graph", "undecided", False)
    assert "they were not looked for" in verdict.reason
    assert "7,776 columns: take --path full" in verdict.reason


def test_many_ties_are_given_up_with_their_number() -> None:
    setting = parse_scenario(SITES)
    terms = CASES.over(setting)
    decided = decide_of(setting)
    assert uncovered(setting, terms, decided) is None
    assert uncovered(setting, terms, decided, limit=10) == "64 profiles are tied, more than 10"


# -- attacks ----------------------------------------------------------------------------


def stubborn_lotteries(design: Design) -> Settled | None:
    """What the road brings home if it takes the first paths listed for all that bind."""
    setting, terms = design

    def accept(self: Mixing, program: Program, outcome: Outcome, primal: Vector) -> Mixture | None:
        decided = rule_of(program, self.opened, primal)
        works = [fibers(self.setting, self.terms, decided, i) for i in range(len(self.listed))]
        bases = [base(work, self.watch) for work in works]
        assert all(isinstance(found, Base) for found in bases)
        parts = self._parts(ordered=True)
        known = tuple(found for found in bases if isinstance(found, Base))
        return Mixture(program, outcome, self.opened, parts, (), decided, tuple(works), known)

    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(walk, "FIRST", 0)
        patch.setattr(Mixing, "_led", lambda self, program: False)
        patch.setattr(Mixing, "_first", lambda self, choices: [])
        patch.setattr(Mixing, "_home", accept)
        settled = walk.Walk(
            as_independent(setting) or setting, setting, terms, HIGHS, Watch()
        ).walk()
    return settled if settled.reduction and "cuts" in settled.reduction else None


@settings(max_examples=200, deadline=None, derandomize=True)
@given(torn_designs())
def test_no_lotteries_pass_the_check_unless_they_are_best(design: Design) -> None:
    setting, terms = design
    settled = stubborn_lotteries(design)
    assume(settled is not None)
    assert settled is not None
    document = build(setting, as_plain(terms), settled)
    assert recheck(document).holds
    plain = pose_terms(setting, terms, path="full")
    right = (settled.status, settled.goals[0].value) == (plain.status, plain.goal_value)
    assert right or check(setting, document) != []


def test_a_flawless_proof_with_too_few_paths_is_rejected() -> None:
    setting = parse_scenario(SITES)
    settled = stubborn_lotteries((setting, CASES.over(setting)))
    assert settled is not None
    document = build(setting, as_plain(CASES.over(setting)), settled)
    assert recheck(document).holds
    assert "cannot be made to pay" in check(setting, document)[0]


def proof_with_cuts(demands: Demands) -> tuple[Setting, dict[str, Any]]:
    text = SITES if demands.ir == "ex-post" else general(3, 6, 2, 8, {})["scenario.toml"]
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(walk, "FIRST", 0)
        return proof_of(demands, text)


def first_bound(reduction: dict[str, Any]) -> dict[str, Any]:
    found: dict[str, Any] = next(
        party for party in reduction["cuts"] if isinstance(party, list) and party
    )[0]
    return found


def first_lies(reduction: dict[str, Any]) -> dict[str, Any]:
    found: dict[str, Any] = next(party for party in reduction["cuts"] if isinstance(party, dict))
    return found


def loop(reduction: dict[str, Any]) -> None:
    trees = first_bound(reduction)["trees"]
    trees[:] = [[1, 0, *tree[2:]] for tree in trees]


def alone(reduction: dict[str, Any]) -> None:
    trees = reduction["parties"][0]["trees"]
    trees[:] = [list(range(len(tree))) for tree in trees]


def one_tree(reduction: dict[str, Any]) -> None:
    found = first_bound(reduction)
    found["bundles"] = [[0] * len(bundle) for bundle in found["bundles"]]


def one_even(reduction: dict[str, Any]) -> None:
    found = first_bound(reduction)
    found["even"] = [[0, sum(count for _, count in found["even"])]]


@pytest.mark.parametrize(
    ("demands", "spoil", "says"),
    [
        (CASES, lambda r: r["cuts"].pop(), "does not fit the parties"),
        (CASES, lambda r: r["cuts"].append([]), "does not fit the parties"),
        (CASES, lambda r: r["cuts"][0].clear(), "differ"),
        (CASES, lambda r: first_bound(r).update(root=0), "do not end where participation"),
        (CASES, lambda r: first_bound(r).update(root="zero"), "the trees have no root"),
        (CASES, lambda r: first_bound(r)["bundles"].__setitem__(0, []), "have no paths"),
        (CASES, lambda r: first_bound(r)["bundles"][0].pop(), "differ"),
        (CASES, lambda r: first_bound(r).update(torn=[[0, 1]]), "the runs do not fit"),
        (CASES, loop, "circles"),
        (CASES, one_tree, "differs"),
        (CASES, one_even, "differs"),
        (CASES, alone, "gains by a lie"),
        (CASES, lambda r: r["parties"].pop(), "does not fit the parties"),
        (CASES, lambda r: r["parties"].__setitem__(0, None), "cannot be read"),
        (CASES, lambda r: r.pop("parties"), "cannot be read"),
        (TYPES, lambda r: first_bound(r).update(root="own"), "do not end where participation"),
        (TYPES, lambda r: first_bound(r).update(root=5), "do not all start at one type"),
        (TYPES, lambda r: first_lies(r)["lies"][0].pop(), "differ"),
        (TYPES, lambda r: first_lies(r)["lies"][0].append([2, 2]), "a lie is the truth"),
        (TYPES, lambda r: first_lies(r)["lies"][0].append([0, 99]), "names what is not there"),
        (TYPES, lambda r: first_lies(r)["of"].append([0, 9999]), "more graphs"),
    ],
)
def test_spoiled_cuts_are_rejected(demands: Demands, spoil: Any, says: str) -> None:
    setting, document = proof_with_cuts(demands)
    spoil(document["reduction"])
    faults = check(setting, document)
    assert faults
    assert says in " ".join(faults) or (says == "differ" and "in the proof" in faults[0]), faults


def test_cuts_for_other_terms_are_rejected() -> None:
    setting, document = proof_with_cuts(CASES)
    for key, value in (("ir", "interim"), ("ir", "none"), ("slack", "1"), ("budget", "no-deficit")):
        other = copy.deepcopy(document)
        other["terms"][key] = value
        assert check(setting, other) != [], key
    document["terms"].update(balance="ex-post", budget="no-deficit")
    assert "single pots" in check(setting, document)[0]


def a_pot(reduction: dict[str, Any]) -> list[Any]:
    found: list[Any] = next(pot for pot in reduction["pots"] if any(len(p) > 1 for p in pot[1]))
    return found


def cut_short(reduction: dict[str, Any]) -> None:
    path = next(path for path in a_pot(reduction)[1] if len(path) > 1)
    path.pop()


def turned(reduction: dict[str, Any]) -> None:
    path = next(path for path in a_pot(reduction)[1] if len(path) > 1)
    path.reverse()


@pytest.mark.parametrize(
    ("spoil", "says"),
    [
        (lambda r: r["pots"].pop(), "differ"),
        (lambda r: r.pop("pots"), "differ"),
        (lambda r: a_pot(r).__setitem__(0, 99999), "names what is not there"),
        (lambda r: a_pot(r)[1].pop(), "does not fit the parties"),
        (lambda r: a_pot(r)[1][0].append(a_pot(r)[1][0][0]), "does not begin at its own type"),
        (turned, "does not begin at its own type"),
        (cut_short, "differs"),
    ],
)
def test_spoiled_pots_are_rejected(spoil: Any, says: str) -> None:
    setting = project(3, 5, 6)
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(walk, "FIRST", 0)
        verdict = pose(setting, replace(POTS, goal="revenue", subsidy=5), path="type-graph")
    assert (verdict.path, verdict.status) == ("type-graph", "impossible")
    document = copy.deepcopy(verdict.proof)
    assert check(setting, document) == []
    spoil(document["reduction"])
    faults = check(setting, document)
    assert faults
    assert says in " ".join(faults) or (says == "differ" and "in the proof" in faults[0]), faults
