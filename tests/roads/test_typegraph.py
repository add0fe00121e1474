"""The type-graph road against the plain road, the audit, the plain checker, and attacks."""

from __future__ import annotations

import copy
import json
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from hypothesis import HealthCheck, assume, given, settings
from hypothesis import strategies as st

from benchmarks.invented import general
from designer import Demands, parse_scenario, pose
from designer.auditing import audit
from designer.demands.plain import as_plain
from designer.demands.terms import Terms
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
from designer.roads.registry import choose
from designer.roads.settled import Settled, build
from designer.roads.typegraph import walk
from designer.roads.typegraph.bases import Base, base
from designer.roads.typegraph.check import check
from designer.roads.typegraph.decided import Decided, decide
from designer.roads.typegraph.fibers import fibers
from designer.roads.typegraph.listing import rule_of
from designer.roads.typegraph.mechanism import GraphMechanism, from_plain
from designer.roads.typegraph.mixing import Mixing, Mixture
from designer.roads.typegraph.road import TypeGraph
from designer.roads.typegraph.standing import standings
from designer.setting.setting import Setting
from designer.verdict import Verdict
from tests.roads.typegraph_settings import designs, lifted, torn_designs

Design = tuple[Setting, Terms]


def both(design: Design) -> tuple[Verdict, Verdict]:
    """The design by this road, and by the plain one."""
    setting, terms = design
    return (
        pose_terms(setting, terms, path="type-graph"),
        pose_terms(setting, terms, path="full"),
    )


@settings(max_examples=300, deadline=None, derandomize=True)
@given(designs())
def test_the_same_exact_answer_as_the_plain_road(design: Design) -> None:
    ours, plain = both(design)
    assert ours.proved, (ours.status, ours.reason)
    assert (ours.status, ours.goal_value) == (plain.status, plain.goal_value)
    if ours.path == "type-graph":
        document = json.loads(json.dumps(ours.proof))
        assert recheck(document).holds
        assert rebuild(design[0], document) == []


@settings(max_examples=150, deadline=None, derandomize=True)
@given(designs())
def test_tables_pass_the_audit(design: Design) -> None:
    setting, terms = design
    verdict = pose_terms(setting, terms, path="type-graph")
    assume(verdict.status == "possible" and not terms.trusted)
    assert verdict.table is not None
    found = audit(
        setting,
        verdict.table,
        subsidy=verdict.subsidy,
        slack=terms.slack,
        shortfall=terms.shortfall,
        compelled=terms.compelled,
    )
    words = {"ic-dominant", f"ir-{terms.ir}", f"balance-{terms.balance}-{terms.budget}"}
    judged = {name: finding for name, finding in found.worst.items() if name in words}
    assert "ic-dominant" in judged
    assert [name for name, finding in judged.items() if not finding.holds] == []


@settings(max_examples=150, deadline=None, derandomize=True)
@given(designs(most_profiles=9, bounded=True))
def test_compact_proofs_are_proofs_about_the_full_program(design: Design) -> None:
    setting, terms = design
    verdict = pose_terms(setting, terms, path="type-graph")
    assume(verdict.path == "type-graph" and verdict.status in ("possible", "impossible"))
    document = lifted(setting, terms, verdict)
    finding = recheck(document)
    assert finding.holds, finding.faults
    from designer.demands.formulate import Formulation

    program = Formulation(setting, terms).pose(terms.goals[0])
    assert same_program(document, program) == []


@settings(max_examples=100, deadline=None, derandomize=True)
@given(designs())
def test_payments_on_demand_are_the_table_and_survive_their_file(design: Design) -> None:
    setting, terms = design
    verdict = pose_terms(setting, terms, path="type-graph")
    assume(verdict.mechanism is not None and verdict.table is not None)
    assert verdict.mechanism is not None
    assert verdict.table is not None
    back = from_plain(json.loads(json.dumps(verdict.mechanism.plain())), setting)
    for profile in range(setting.profiles):
        types = setting.types_at(profile)
        pays = tuple(verdict.table.payment(i, profile) for i in range(len(types)))
        chances = tuple(verdict.table.chance(profile, k) for k in range(len(setting.options)))
        assert verdict.mechanism.pays(types) == pays == back.pays(types)
        assert verdict.mechanism.decides(types) == chances == back.decides(types)
    assert isinstance(verdict.mechanism, GraphMechanism)
    assert verdict.audit is not None
    assert standings(verdict.mechanism) == verdict.audit.standings


# -- ties --------------------------------------------------------------------------------


def stubborn(design: Design, picks: list[int]) -> Settled | None:
    """What the road brings home if it takes some choices for the best and asks no further."""
    setting, terms = design
    own = as_independent(setting) or setting
    decided = decide(own, "efficient", Watch()).choosing(np.array(picks))
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(walk, "better", lambda decided, priced: decided.choices)
        return walk.Walk(own, setting, terms, HIGHS, Watch()).attempt(decided).settled


@settings(
    max_examples=200,
    deadline=None,
    derandomize=True,
    suppress_health_check=[HealthCheck.filter_too_much],  # many settings have no ties
)
@given(designs(decision="efficient", bounded=True), st.randoms(use_true_random=False))
def test_no_choice_at_ties_passes_the_check_unless_it_is_best(design: Design, draw: Any) -> None:
    setting, terms = design
    torn = decide(as_independent(setting) or setting, "efficient", Watch()).torn
    assume(len(torn) > 0)
    settled = stubborn(design, [draw.choice(np.flatnonzero(row).tolist()) for row in torn])
    assume(settled is not None)
    assert settled is not None
    document = build(setting, as_plain(terms), settled)
    assert recheck(document).holds
    plain = pose_terms(setting, terms, path="full")
    right = (settled.status, settled.goals[0].value) == (plain.status, plain.goal_value)
    assert right or check(setting, document) != []


TIED = """
title = "A tie"
[decisions]
options = ["build", "leave"]
[designer]
outlay = { build = 60 }
[[party]]
name = "Norhaven"
types = [0, 20, 40, 60]
weights = [1, 1, 1, 1]
value = { build = "type", leave = 0 }
[[party]]
name = "Suth"
types = [0, 20, 40, 60]
weights = [1, 1, 1, 1]
value = { build = "type", leave = 0 }
"""


def test_ties_are_settled_by_their_prices() -> None:
    """Building where worths just cover the cost only adds rents: the first choice is undone."""
    demands = Demands(
        ic="dominant", ir="ex-post", balance="ex-ante", goal="outside-money", tidy="none"
    )
    ours = pose(parse_scenario(TIED), demands, path="type-graph")
    plain = pose(parse_scenario(TIED), demands, path="full")
    assert ours.path == "type-graph"
    assert ours.proved
    assert ours.goal_value == plain.goal_value
    assert ours.proof["reduction"]["ties"] == [[1, 4]]  # leave, at all four ties


def test_a_flawless_proof_of_a_worse_choice_is_rejected() -> None:
    setting = parse_scenario(TIED)
    terms = CASES.over(setting)
    settled = stubborn((setting, terms), [0, 0, 0, 0])
    assert settled is not None
    document = build(setting, as_plain(terms), settled)
    assert recheck(document).holds
    assert check(setting, document) == ["another choice at a tied profile may do better"]


# -- lotteries at ties -------------------------------------------------------------------


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
    for profile in range(setting.profiles):
        types = setting.types_at(profile)
        pays = tuple(verdict.table.payment(i, profile) for i in range(len(types)))
        chances = tuple(verdict.table.chance(profile, k) for k in range(len(setting.options)))
        assert verdict.mechanism.pays(types) == pays == back.pays(types)
        assert verdict.mechanism.decides(types) == chances == back.decides(types)
    assert verdict.audit is not None
    assert standings(verdict.mechanism) == verdict.audit.standings
    if terms.trusted:
        return
    found = audit(
        setting,
        verdict.table,
        subsidy=verdict.subsidy,
        slack=terms.slack,
        shortfall=terms.shortfall,
        compelled=terms.compelled,
    )
    words = {"ic-dominant", f"ir-{terms.ir}", f"balance-{terms.balance}-{terms.budget}"}
    judged = {name: finding for name, finding in found.worst.items() if name in words}
    assert "ic-dominant" in judged
    assert [name for name, finding in judged.items() if not finding.holds] == []


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


# -- attacks -----------------------------------------------------------------------------


def proof_of(demands: Demands, text: str = TIED) -> tuple[Setting, dict[str, Any]]:
    setting = parse_scenario(text)
    verdict = pose(setting, demands, path="type-graph")
    assert verdict.path == "type-graph"
    assert verdict.proved
    assert check(setting, verdict.proof) == []
    return setting, copy.deepcopy(verdict.proof)


CASES = Demands(ic="dominant", ir="ex-post", balance="ex-ante", goal="outside-money", tidy="none")
TYPES = replace(CASES, ir="interim")
POTS = replace(CASES, balance="ex-post", budget="no-deficit")


@pytest.mark.parametrize(
    ("demands", "spoil", "says"),
    [
        (CASES, lambda r: r.update(ties=[[0, 4]]), "differs"),
        (CASES, lambda r: r.update(ties=[[0, 1], [1, 3]]), "differs"),
        (CASES, lambda r: r.update(ties=[[1, 3]]), "the runs do not fit"),
        (CASES, lambda r: r.update(ties=[[7, 4]]), "cannot be read"),
        (CASES, lambda r: r.pop("parties"), "cannot be read"),
        (CASES, lambda r: r["parties"].pop(), "does not fit the parties"),
        (CASES, lambda r: r["parties"][0].update(root="zero"), "do not end where participation"),
        (CASES, lambda r: r["parties"][0].update(root=0), "do not end where participation"),
        (CASES, lambda r: r["parties"][0].update(of=[[0, 1]]), "the runs do not fit"),
        (TYPES, lambda r: r["parties"][0].update(root="own"), "do not end where participation"),
        (TYPES, lambda r: r["parties"][0].update(root=3), "do not all start at one type"),
        (POTS, lambda r: r["rows"]["lies"].pop(), "differ"),
        (POTS, lambda r: r["rows"]["pots"].append(0), "differ"),
        (POTS, lambda r: r["rows"].update(pots=[99]), "names what is not there"),
        (POTS, lambda r: r.pop("rows"), "no rows are listed"),
    ],
)
def test_spoiled_reductions_are_rejected(demands: Demands, spoil: Any, says: str) -> None:
    setting, document = proof_of(demands)
    spoil(document["reduction"])
    faults = check(setting, document)
    assert faults
    assert says in " ".join(faults) or (says == "differ" and "in the proof" in faults[0]), faults


def test_trees_that_loop_or_pay_too_much_are_rejected() -> None:
    setting, document = proof_of(CASES)
    party = document["reduction"]["parties"][0]
    for tree in party["trees"]:
        looped = copy.deepcopy(document)
        place = looped["reduction"]["parties"][0]["trees"]
        place[:] = [[1, 0, *tree[2:]] for _ in place]
        assert "circles" in check(setting, looped)[0]
    rooted = copy.deepcopy(document)
    place = rooted["reduction"]["parties"][0]["trees"]
    place[:] = [[0, 1, 2, 3] for _ in place]  # everyone at its own room: nobody is honest
    assert "gains by a lie" in check(setting, rooted)[0]


def test_a_proof_of_other_terms_is_rejected() -> None:
    setting, document = proof_of(CASES)
    document["terms"]["ir"] = "interim"
    assert check(setting, document) != []
    _, document = proof_of(POTS)
    document["terms"]["balance"] = "ex-ante"
    assert check(setting, document) != []
    _, document = proof_of(CASES)
    document["terms"]["ic"] = "bayesian"
    assert "does not apply" in check(setting, document)[0]


def test_a_program_with_a_tighter_bound_is_rejected() -> None:
    setting, document = proof_of(CASES)
    row = document["program"]["row_lo"]
    row["num"] = [int(n) + 1 for n in row["num"]]
    assert check(setting, document) != []


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


# -- chains of lies ----------------------------------------------------------------------

REVERSED = """
title = "A ferry for the least eager"
[decisions]
options = ["sail", "stay"]
[[party]]
name = "Norhaven"
types = [1, 2, 3]
weights = [1, 1, 1]
value = { sail = "type", stay = 0 }
[[rule]]
at = { Norhaven = 1 }
take = "sail"
[[rule]]
take = "stay"
"""


def test_a_rule_that_serves_the_least_eager_is_refuted_by_a_chain_of_lies() -> None:
    """Monotonicity (R. Myerson 1981, lemma 2): serving a low type and not a high one fails."""
    demands = Demands(decision="table", ic="dominant", ir="none", balance="none", tidy="none")
    verdict = pose(parse_scenario(REVERSED), demands, path="type-graph")
    assert (verdict.status, verdict.proved, verdict.path) == ("impossible", True, "type-graph")
    assert verdict.derivation is not None
    labels = [line.label for line in verdict.derivation.lines]
    chain = {(label.true, label.told) for label in labels}  # type: ignore[union-attr]
    assert chain in ({("1", "2"), ("2", "1")}, {("1", "3"), ("3", "1")})
    assert verdict.derivation.total in (1, 2)


def test_a_shortage_is_refuted_by_the_paths_into_one_pot() -> None:
    demands = replace(POTS, goal="any", subsidy=0)
    verdict = pose(parse_scenario(TIED), demands, path="type-graph")
    assert (verdict.status, verdict.proved) == ("impossible", True)
    assert verdict.derivation is not None
    assert verdict.derivation.total > 0


# -- published and closed forms ----------------------------------------------------------


def project(parties: int, types: int, cost: int) -> Setting:
    lines = ['title = "A project"', 'decisions.options = ["build", "leave"]']
    lines.append(f"[designer]\noutlay = {{ build = {cost} }}")
    for i in range(parties):
        lines += ["[[party]]", f'name = "P{i}"', f"types = {list(range(types))}"]
        lines.append(f"weights = {[1] * types}")
        lines += ['value = { build = "type", leave = 0 }']
    return parse_scenario("\n".join(lines))


def test_pivotal_payments_are_the_least_subsidy_per_case() -> None:
    """Dominant honesty, participation in every case: each pays its threshold (E. Clarke 1971).

    A builder pays at most the least report with which the project is still built, given the
    others', so the least outside money is max over built profiles of cost - sum of thresholds.
    Ties go to 'leave' where that raises thresholds; both ways are tried here by brute force.
    """
    parties, types, cost = 3, 5, 6
    setting = project(parties, types, cost)
    verdict = pose(setting, POTS, path="type-graph")
    assert verdict.proved
    assert verdict.path == "type-graph"
    worst = 0
    for profile in range(setting.profiles):
        reports = setting.types_at(profile)
        total = sum(reports)
        if total > cost:  # at a tie the project may be left, and then costs nothing
            pays = sum(max(0, cost + 1 - (total - a)) for a in reports)
            worst = max(worst, cost - pays)
    assert verdict.goal_value == worst


def test_a_million_profiles_are_decided_and_proved() -> None:
    setting = project(6, 10, 27)
    verdict = pose(setting, TYPES)
    assert (verdict.path, verdict.status, verdict.proved) == ("type-graph", "possible", True)
    assert verdict.table is None
    assert verdict.mechanism is not None
    types = (3, 9, 2, 7, 7, 4)
    assert len(verdict.pays([str(a) for a in types])) == 6
    assert len(verdict.standings) == 60
    assert all(standing.gain >= 0 for standing in verdict.standings)


# -- where it goes -----------------------------------------------------------------------


@pytest.mark.parametrize(
    ("demands", "reason"),
    [
        (Demands(ic="bayesian"), "honesty is not asked whatever the others report"),
        (replace(CASES, decision="randomized"), "the decision is left open"),
        (replace(CASES, balance="ex-post"), "balances exactly in every case"),
        (replace(CASES, goal="swing"), "single payments"),
        (replace(CASES, goal="revenue,welfare"), "several goals"),
        (replace(CASES, tidy="swing"), "tidy"),
        (replace(POTS, goal="parties"), "not served best by the largest payments"),
        (replace(POTS, ir="interim"), "participation is not"),
        (replace(POTS, compelled=frozenset({"Suth"})), "compelled party"),
    ],
)
def test_what_it_declines(demands: Demands, reason: str) -> None:
    setting = parse_scenario(TIED)
    why = TypeGraph().applies(setting, demands.over(setting))
    assert why is not None
    assert reason in why


def test_small_settings_stay_on_the_plain_road() -> None:
    setting = parse_scenario(TIED)
    terms = replace(CASES, tidy=None).over(setting)
    assert choose(setting, terms).road.name == "full"
