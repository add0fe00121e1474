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

from designer import Demands, parse_scenario, pose
from designer.demands.plain import as_plain
from designer.demands.terms import Terms
from designer.engines.highs import HIGHS
from designer.engines.watch import Watch
from designer.posing import pose_terms
from designer.proof.compare import same_program
from designer.proof.recheck import recheck
from designer.rebuilding import rebuild
from designer.roads.product import as_independent
from designer.roads.registry import choose
from designer.roads.settled import Settled, build
from designer.roads.typegraph import walk
from designer.roads.typegraph.check import check
from designer.roads.typegraph.decided import decide
from designer.roads.typegraph.mechanism import GraphMechanism, from_plain
from designer.roads.typegraph.road import TypeGraph
from designer.roads.typegraph.standing import standings
from designer.setting.setting import Setting
from designer.verdict import Verdict
from tests.roads.brought_home import assert_honest_and_balanced, assert_on_demand
from tests.roads.typegraph_settings import designs, lifted

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
    assert_honest_and_balanced(setting, terms, verdict)


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
    assert_on_demand(setting, verdict, back)
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


def test_a_trusted_party_pays_nothing_where_nobody_is() -> None:
    """Off the support nothing is asked of it and no lie of its own leads there."""
    one = parse_scenario(TIED)
    setting = replace(one, joint=np.eye(4, dtype=np.int64).ravel(), support_only=True)
    terms = replace(CASES, ir="none", goal="any", balance="none").over(setting)
    verdict = pose_terms(setting, replace(terms, trusted=frozenset({"Suth"})), path="type-graph")
    assert verdict.path == "type-graph"
    assert verdict.table is not None
    off = [p for p in range(setting.profiles) if not setting.probability(p)]
    assert {verdict.table.payment(1, p) for p in off} == {0}
    assert isinstance(verdict.mechanism, GraphMechanism)
    assert verdict.audit is not None
    assert standings(verdict.mechanism) == verdict.audit.standings
