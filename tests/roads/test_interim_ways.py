"""The road's own turnings, each forced: one multiplier, lazy lies, any lead party or none."""

from __future__ import annotations

import pytest
from hypothesis import assume, event, given
from hypothesis import settings as runs
from hypothesis import strategies as st

from designer.auditing import audit, judge
from designer.demands.plain import as_plain
from designer.demands.terms import Terms
from designer.posing import pose_terms
from designer.roads.interim import lies as lazy
from designer.roads.interim import road
from designer.roads.interim.multiplier import sides
from designer.setting.setting import Setting
from tests.roads.interim_settings import lines, questions


def agree(setting: Setting, terms: Terms) -> None:
    """The interim road's answer is the plain one's, and its table passes the audit."""
    ours = pose_terms(setting, terms, path="interim")
    plain = pose_terms(setting, terms, path="full")
    event(plain.status)
    assert plain.proved
    assert (ours.status, ours.proved, ours.reason) == (plain.status, True, "")
    assert ours.goal_values == plain.goal_values
    if ours.table is None or terms.trusted:
        return
    found = audit(
        setting,
        ours.table,
        subsidy=ours.subsidy,
        slack=terms.slack,
        shortfall=terms.shortfall,
        compelled=terms.compelled,
        side=terms.side,
    )
    assert judge(found, as_plain(terms)) == []


@runs(max_examples=400, deadline=None)
@given(lines())
def test_one_multiplier(question: tuple[Setting, Terms]) -> None:
    setting, terms = question
    assume(sides(setting, terms) is not None)
    agree(setting, terms)


@runs(max_examples=150, deadline=None)
@given(lines())
def test_lines_without_the_multiplier(question: tuple[Setting, Terms]) -> None:
    setting, terms = question
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(road, "sides", lambda setting, terms: None)
        agree(setting, terms)


@runs(max_examples=200, deadline=None)
@given(st.one_of(lines(), questions(max_parties=3)))
def test_lies_written_when_they_are_told(question: tuple[Setting, Terms]) -> None:
    setting, terms = question
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(lazy, "ALL_UP_TO", 0)
        agree(setting, terms)


@runs(max_examples=200, deadline=None)
@given(questions(max_parties=3), st.data())
def test_any_lead_party_or_none(question: tuple[Setting, Terms], data: st.DataObject) -> None:
    setting, terms = question
    lead = data.draw(st.sampled_from([None, *range(len(setting.parties))]))
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(road, "lead_party", lambda setting: lead)
        agree(setting, terms)
