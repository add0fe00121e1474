"""The likeness road against the plain road, the audit, the plain checker, and attacks."""

from __future__ import annotations

import copy
import json
import math
from dataclasses import replace
from fractions import Fraction
from typing import Any

import numpy as np
import pytest
from hypothesis import HealthCheck, assume, given, settings

from designer import Demands, parse_scenario, pose
from designer.auditing import audit
from designer.demands.terms import Terms
from designer.posing import pose_terms
from designer.proof.recheck import recheck
from designer.rebuilding import rebuild
from designer.roads.likeness.check import check
from designer.roads.likeness.likeness import Likeness, likeness
from designer.roads.likeness.mechanism import LikenessMechanism, from_plain
from designer.roads.likeness.orbits import Orbits, count
from designer.roads.likeness.road import ByLikeness
from designer.roads.likeness.standing import standings
from designer.setting.setting import Setting
from tests.roads.brought_home import assert_on_demand
from tests.roads.likeness_settings import designs, spread
from tests.roads.likeness_settings import settings as alike_settings

Design = tuple[Setting, Terms]
ROAD = ByLikeness()
SLOW = [HealthCheck.too_slow, HealthCheck.filter_too_much]


@settings(max_examples=200, deadline=None, derandomize=True, suppress_health_check=SLOW)
@given(designs())
def test_the_same_exact_answer_as_the_plain_road(design: Design) -> None:
    setting, terms = design
    assume(ROAD.applies(setting, terms) is None)
    ours = pose_terms(setting, terms, path="likeness")
    plain = pose_terms(setting, terms, path="full")
    assert ours.proved, (ours.status, ours.reason)
    assert (ours.status, ours.goal_values) == (plain.status, plain.goal_values)
    document = json.loads(json.dumps(ours.proof))
    assert recheck(document).holds
    assert recheck(document).reduced
    assert rebuild(setting, document) == []


@settings(max_examples=100, deadline=None, derandomize=True, suppress_health_check=SLOW)
@given(designs())
def test_tables_pass_the_audit(design: Design) -> None:
    setting, terms = design
    assume(ROAD.applies(setting, terms) is None and not terms.trusted)
    verdict = pose_terms(setting, terms, path="likeness")
    assume(verdict.status == "possible")
    assert verdict.table is not None
    found = audit(
        setting,
        verdict.table,
        subsidy=verdict.subsidy,
        slack=terms.slack,
        shortfall=terms.shortfall,
        compelled=terms.compelled,
        limits=terms.limits,
        side=terms.side,
    )
    words = {f"ic-{terms.ic}", f"ir-{terms.ir}", f"balance-{terms.balance}-{terms.budget}"}
    words |= {name for name in found.worst if name.startswith(("limit", "side"))}
    judged = {name: finding for name, finding in found.worst.items() if name in words}
    assert judged or (terms.ic, terms.ir, terms.balance) == ("none", "none", "none")
    assert [name for name, finding in judged.items() if not finding.holds] == []


@settings(max_examples=150, deadline=None, derandomize=True, suppress_health_check=SLOW)
@given(designs(lists=False))
def test_proofs_spread_over_all_profiles_are_proofs_about_the_full_program(
    design: Design,
) -> None:
    setting, terms = design
    assume(ROAD.applies(setting, terms) is None)
    verdict = pose_terms(setting, terms, path="likeness")
    assume(verdict.status in ("possible", "impossible"))
    document = spread(setting, terms, verdict)
    finding = recheck(document)
    assert finding.holds, finding.faults
    assert not finding.reduced


@settings(max_examples=100, deadline=None, derandomize=True, suppress_health_check=SLOW)
@given(designs())
def test_payments_on_demand_are_the_table_and_survive_their_file(design: Design) -> None:
    setting, terms = design
    assume(ROAD.applies(setting, terms) is None)
    verdict = pose_terms(setting, terms, path="likeness")
    assume(verdict.status == "possible")
    assert isinstance(verdict.mechanism, LikenessMechanism)
    assert verdict.table is not None
    back = from_plain(json.loads(json.dumps(verdict.mechanism.plain())), setting)
    assert_on_demand(setting, verdict, back)
    assert verdict.audit is not None
    assert standings(verdict.mechanism) == verdict.audit.standings


@settings(max_examples=60, deadline=None, derandomize=True, suppress_health_check=SLOW)
@given(designs(lists=False))
def test_even_handed_tables_are_found_without_asking(design: Design) -> None:
    """Its tables pass the demand that alike parties be treated alike (anonymity)."""
    setting, terms = design
    assume(not terms.even_handed and ROAD.applies(setting, terms) is None)
    fair = replace(terms, even_handed=True)
    assume(ROAD.applies(setting, fair) is None)
    ours = pose_terms(setting, terms, path="likeness")
    plain = pose_terms(setting, fair, path="full")
    assert (ours.status, ours.goal_value) == (plain.status, plain.goal_value)


# -- orbits ------------------------------------------------------------------------------------


@settings(max_examples=100, deadline=None, derandomize=True)
@given(alike_settings())
def test_representatives_carry_all_the_weight(setting: Setting) -> None:
    found = likeness(setting, Terms())
    assume(isinstance(found, Likeness))
    assert isinstance(found, Likeness)
    orbits = Orbits(setting, found)
    everywhere = np.arange(setting.profiles, dtype=np.int64)
    place, _ = orbits.to_first(everywhere)
    assert len(orbits.profiles) == count(setting, found) == len(set(place.tolist()))
    weight = [0] * len(orbits.profiles)
    for theta, r in enumerate(place):
        weight[int(r)] += int(setting.weights[theta])
    assert weight == orbits.weights.tolist()
    for index in range(len(setting.parties)):
        fiber, beliefs = orbits.fiber(index), orbits.beliefs(index)
        own = np.array(setting.parties[index].weights)
        assert int(beliefs.sum()) * int(own.sum()) == setting.total_weight
        assert np.array_equal(orbits.types(fiber[:, 0])[:, index], np.arange(len(own)))


# -- sizes that only trades of places reach ---------------------------------------------------

FARMS = """
title = "A shared weir"
[decisions]
options = ["build", "leave"]
[designer]
outlay = {{ build = {outlay} }}
"""


def farms(members: int, size: int, outlay: int) -> Setting:
    text = FARMS.format(outlay=outlay)
    for i in range(members):
        text += f"""
[[party]]
name = "Farm {i + 1}"
types = {list(range(size))}
weights = {[1] * size}
value = {{ build = "type", leave = 0 }}
"""
    return parse_scenario(text)


def test_eight_parties_of_five_types_with_dominant_honesty() -> None:
    """390,625 profiles, 495 up to trades; the unanimity bound of dominant no-deficit designs.

    With a free rule, dominant honesty, participation in every case and no deficit, building only
    when all report the most and sharing the outlay evenly is one such table: a lower bound.
    """
    setting = farms(8, 5, 16)
    verdict = pose(
        setting,
        Demands(
            decision="randomized",
            ic="dominant",
            ir="ex-post",
            balance="ex-post",
            budget="no-deficit",
            goal="welfare",
        ),
        path="likeness",
        time_limit=120,
    )
    assert verdict.proved
    assert verdict.status == "possible"
    assert verdict.goal_value is not None
    assert verdict.goal_value >= verdict_of_unanimity(8, 5, 16)
    pays = verdict.pays(["4"] * 8)
    assert len(set(pays)) == 1


def verdict_of_unanimity(members: int, size: int, outlay: int) -> Any:
    """Expected welfare of building when everyone's worth covers an even share."""
    share = Fraction(outlay, members)
    worths = [v for v in range(size) if v >= share]
    chance = Fraction(len(worths), size) ** members
    return chance * (members * Fraction(sum(worths), len(worths)) - outlay)


def test_more_representatives_than_fit_are_declined() -> None:
    assert ROAD.applies(farms(20, 10, 60), Demands().over(farms(20, 10, 60))) is not None


def test_a_hundred_parties_whose_profiles_no_word_can_number() -> None:
    """2^100 profiles, 101 up to trades.

    An outlay of 100 is covered only where all hundred report 1, and only by an even share each.
    """
    setting = farms(100, 2, 100)
    assert setting.profiles == 2**100
    asked = Demands(ic="dominant", ir="ex-post", balance="ex-post", budget="no-deficit")
    verdict = pose(setting, asked, path="likeness")
    assert verdict.proved
    assert verdict.status == "possible"
    assert verdict.pays(["1"] * 100) in ((Fraction(1),) * 100, (Fraction(0),) * 100)
    assert rebuild(setting, verdict.proof) == []


# -- attacks -----------------------------------------------------------------------------------


def proof_of(demands: Demands) -> tuple[Setting, dict[str, Any]]:
    setting = farms(3, 3, 4)
    verdict = pose(setting, demands, path="likeness")
    assert verdict.proved
    assert check(setting, verdict.proof) == []
    return setting, copy.deepcopy(verdict.proof)


DOMINANT = Demands(ic="dominant", ir="ex-post", balance="ex-post", budget="no-deficit", tidy="none")


@pytest.mark.parametrize(
    "spoil",
    [
        lambda d: d["reduction"].update(alike=[]),
        lambda d: d["reduction"].pop("alike"),
        lambda d: d["program"]["data"].__setitem__(0, 7),
        lambda d: d["terms"].update(ir="none"),
        lambda d: d["terms"].update(compelled=["Farm 2"]),
        lambda d: d["terms"].update(trusted=["Farm 1"]),
        lambda d: d["terms"].update(decision="deterministic"),
    ],
)
def test_spoiled_reductions_are_rejected(spoil: Any) -> None:
    setting, document = proof_of(DOMINANT)
    spoil(document)
    assert check(setting, document) != []


def test_a_proof_about_others_is_rejected() -> None:
    """Where one farm's worths differ, the two that are left alike are not all three."""
    _, document = proof_of(DOMINANT)
    assert rebuild(farms(3, 3, 5), document) != []


def test_tables_that_make_no_sense_are_rejected() -> None:
    setting = farms(3, 3, 4)
    verdict = pose(setting, Demands(ir="none"), path="likeness")
    assert verdict.mechanism is not None
    plain = verdict.mechanism.plain()
    assert from_plain(plain, setting).pays([0, 1, 2]) == verdict.mechanism.pays([0, 1, 2])
    for key, wrong in (
        ("groups", [[0, 1]]),
        ("groups", [[0, 1, 2, 2]]),
        ("moves", [[0, 1, [0, 0]], [1, 2, [0, 1]]]),
        ("moves", []),
        ("pays", plain["pays"][1:]),
        ("decides", [["1", 0]] * len(plain["decides"])),
        ("pays_den", 0),
        ("kind", "interim"),
    ):
        with pytest.raises(ValueError, match=r"."):
            from_plain({**plain, key: wrong}, setting)


def test_counts_of_representatives() -> None:
    """C(m + T - 1, m) multisets of m out of T: eight alike parties of ten types, 24,310."""
    setting = farms(8, 10, 40)
    found = likeness(setting, Terms())
    assert isinstance(found, Likeness)
    assert count(setting, found) == math.comb(17, 8) == 24_310
