"""The interim road gives the plain road's verdict and value, and a table that passes the audit."""

from __future__ import annotations

import itertools
import json
from dataclasses import replace
from fractions import Fraction
from typing import Any

import numpy as np
import pytest
from hypothesis import event, given
from hypothesis import settings as runs
from hypothesis import strategies as st

from designer.auditing import audit, judge
from designer.demands.plain import as_plain
from designer.demands.plain import from_plain as terms_of
from designer.demands.terms import Terms
from designer.posing import pose_terms
from designer.proof.document import as_bytes, parse_document
from designer.proof.recheck import recheck
from designer.rebuilding import rebuild
from designer.roads.interim.mechanism import from_plain
from designer.roads.interim.road import Interim
from designer.setting.setting import Setting
from designer.verdict import Verdict
from tests.published.corpus import Query, queries, setting_of
from tests.roads.interim_settings import in_order, questions, settings


def both(setting: Setting, terms: Terms) -> tuple[Verdict, Verdict]:
    return (
        pose_terms(setting, terms, path="interim"),
        pose_terms(setting, terms, path="full"),
    )


@runs(max_examples=300, deadline=None)
@given(questions())
def test_same_verdict_and_value_as_the_plain_road(question: tuple[Setting, Terms]) -> None:
    setting, terms = question
    assert Interim().applies(setting, terms) is None
    ours, plain = both(setting, terms)
    event(plain.status)
    assert plain.proved
    assert (ours.status, ours.proved, ours.reason) == (plain.status, True, "")
    assert ours.goal_values == plain.goal_values


@runs(max_examples=150, deadline=None)
@given(questions(max_parties=3), st.data())
def test_goals_in_order(question: tuple[Setting, Terms], data: st.DataObject) -> None:
    setting, terms = in_order(*question, data)
    ours, plain = both(setting, terms)
    event(plain.status)
    assert plain.proved
    assert (ours.status, ours.proved, ours.reason) == (plain.status, True, "")
    assert ours.goal_values == plain.goal_values
    document: Any = parse_document(as_bytes(ours.proof))
    assert recheck(document).holds
    assert rebuild(setting, document) == []


@runs(max_examples=150, deadline=None)
@given(questions(max_parties=3))
def test_tables_pass_the_audit(question: tuple[Setting, Terms]) -> None:
    setting, terms = question[0], replace(question[1], trusted=frozenset())
    verdict = pose_terms(setting, terms, path="interim")
    event(verdict.status)
    if verdict.status != "possible":
        assert verdict.table is None
        return
    assert verdict.table is not None
    found = audit(
        setting,
        verdict.table,
        subsidy=verdict.subsidy,
        slack=terms.slack,
        shortfall=terms.shortfall,
        compelled=terms.compelled,
        side=terms.side,
    )
    assert judge(found, as_plain(terms)) == []


@runs(max_examples=100, deadline=None)
@given(questions(max_parties=3))
def test_payments_on_demand_are_the_table(question: tuple[Setting, Terms]) -> None:
    setting, terms = question
    verdict = pose_terms(setting, terms, path="interim")
    if verdict.status != "possible":
        return
    mechanism, table = verdict.mechanism, verdict.table
    assert mechanism is not None
    assert table is not None
    text = json.dumps(mechanism.plain())
    again = from_plain(json.loads(text), setting)
    assert json.dumps(again.plain()) == text
    for place, types in enumerate(itertools.product(*map(range, setting.shape))):
        pays = tuple(table.payment(i, place) for i in range(len(types)))
        labels = setting.labels_at(place)
        assert verdict.pays(labels) == pays == again.pays(types)
        chances = tuple(table.chance(place, k) for k in range(len(setting.options)))
        assert mechanism.decides(types) == chances == again.decides(types)


def ours_to_answer() -> list[Query]:
    """The published questions that the road takes."""
    return [
        query
        for query in queries()
        if Interim().applies(
            setting_of(query.instance), query.demands.over(setting_of(query.instance))
        )
        is None
    ]


@pytest.mark.parametrize("query", ours_to_answer(), ids=lambda query: query.name)
def test_published_answers(query: Query) -> None:
    setting = setting_of(query.instance)
    terms = query.demands.over(setting)
    verdict = pose_terms(setting, terms, path="interim")
    assert (verdict.status, verdict.proved) == (query.verdict, True)
    assert query.value in (None, verdict.goal_value)


@runs(max_examples=60, deadline=None)
@given(settings(min_parties=2, max_parties=3), st.data())
def test_joint_priors_that_are_products(setting: Setting, data: st.DataObject) -> None:
    """A product written as a joint table counts as independent; one moved weight does not."""
    joint = replace(setting, joint=setting.weights * 3)
    terms = Terms(goals=("welfare",), decision="randomized", tidy="none")
    ours, plain = both(joint, terms)
    assert (ours.status, ours.proved) == (plain.status, True)
    assert ours.goal_value == plain.goal_value
    if min(sorted(setting.shape)[-2:]) < 2:
        return
    moved = np.array(joint.joint)
    moved[data.draw(st.integers(0, len(moved) - 1))] += 1
    weights = moved.reshape(setting.shape)
    parties = tuple(
        replace(
            party,
            weights=tuple(
                int(w) for w in weights.sum(axis=tuple(j for j in range(weights.ndim) if j != i))
            ),
        )
        for i, party in enumerate(setting.parties)
    )
    tied = replace(setting, joint=moved, parties=parties)
    assert Interim().applies(tied, terms) == "the types are correlated"


# -- attacks on the reduced document -----------------------------------------------------


def mutate(document: dict[str, Any], data: st.DataObject) -> str:
    """Change one thing; what it was."""
    reduction = document["reduction"]
    ways = ["share", "drop", "number", "lead", "value", "verdict", "coefficient", "term", "slice"]
    ways += ["dual"] * 3 + ["exception", "like"]
    way: str = data.draw(st.sampled_from(ways))
    shares, rules = reduction["shares"], reduction["rules"]
    stage = data.draw(st.sampled_from(document["stages"]))
    step = data.draw(st.sampled_from((-1, 1)))
    if way == "share" and shares:
        place = data.draw(st.integers(0, len(shares) - 1))
        shares[place][1] = data.draw(st.integers(0, max(0, len(rules) - 1)))
    elif way == "slice" and shares:
        place = data.draw(st.integers(0, len(shares) - 1))
        shares[place][0] += step
    elif way == "drop" and shares:
        shares.pop(data.draw(st.integers(0, len(shares) - 1)))
    elif way == "exception" and any(isinstance(rule, dict) for rule in rules):
        rule = data.draw(st.sampled_from([rule for rule in rules if isinstance(rule, dict)]))
        row = data.draw(st.sampled_from(rule["except"]))
        row[data.draw(st.integers(0, len(row) - 1))] += step
    elif way == "like" and any(isinstance(rule, dict) for rule in rules):
        rule = data.draw(st.sampled_from([rule for rule in rules if isinstance(rule, dict)]))
        rule["like"] += data.draw(st.integers(-2, 2))
    elif way == "number" and rules and rules[0]:
        lists: list[Any] = [rule for rule in rules if isinstance(rule, list)]
        indices: list[Any] = data.draw(st.sampled_from(lists))
        tables = data.draw(st.sampled_from(indices))["parties"]
        row = data.draw(st.sampled_from(data.draw(st.sampled_from(tables))))
        row[data.draw(st.integers(0, len(row) - 1))] += step * data.draw(st.integers(1, 50))
    elif way == "lead":
        lead = reduction["lead"]
        reduction["lead"] = step if lead is None else lead + step
    elif way == "value" and "value" in stage:
        stage["value"] = str(Fraction(stage["value"]) + step)
    elif way == "verdict":
        document["verdict"] = "possible" if document["verdict"] != "possible" else "impossible"
    elif way == "coefficient" and document["program"]["data"]:
        numbers = document["program"]["data"]
        numbers[data.draw(st.integers(0, len(numbers) - 1))] += step
    elif way == "term":
        document["terms"]["ir"] = data.draw(st.sampled_from(("none", "ex-ante", "interim")))
        document["terms"]["balance"] = data.draw(st.sampled_from(("none", "ex-ante", "ex-post")))
    else:
        vector = document.get("farkas") or stage.get("dual") or document["primal"]
        if vector["num"]:
            place = data.draw(st.integers(0, len(vector["num"]) - 1))
            vector["num"][place] += step * data.draw(st.integers(1, 5))
            if not vector["num"][place]:
                vector["num"][place] = 1
    return way


@runs(max_examples=150, deadline=None)
@given(questions(max_parties=3), st.data())
def test_changed_documents_are_refused_or_true(
    question: tuple[Setting, Terms], data: st.DataObject
) -> None:
    setting, terms = question
    if data.draw(st.booleans()):
        setting, terms = in_order(setting, terms, data)
    verdict = pose_terms(setting, terms, path="interim")
    document: Any = parse_document(as_bytes(verdict.proof))
    assert recheck(document).holds
    assert rebuild(setting, document) == []
    event(mutate(document, data))
    if not recheck(document).holds or rebuild(setting, document):
        event("refused")
        return
    truth = pose_terms(setting, terms_of(document["terms"], setting), path="full")
    assert document["verdict"] == truth.status
    if truth.status == "possible":
        told = {stage["goal"]: stage["value"] for stage in document["stages"]}
        assert told == {name: str(value) for name, value in truth.goal_values.items()}
