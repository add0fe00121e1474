"""The road's own turnings, each forced: one multiplier, lazy lies, any lead party or none."""

from __future__ import annotations

import tracemalloc
from dataclasses import replace

import pytest
from hypothesis import assume, event, given
from hypothesis import settings as runs
from hypothesis import strategies as st

from designer.auditing import audit, judge
from designer.demands.plain import as_plain
from designer.demands.terms import Terms
from designer.engines.watch import Progress, Watch
from designer.posing import pose_terms
from designer.roads.interim import barrier, blocks, cube, road
from designer.roads.interim import lies as lazy
from designer.roads.interim.multiplier import sides
from designer.roads.interim.rule import Rule, welfare_index
from designer.setting.setting import Party, Setting, Type, integers
from tests.roads.interim_settings import in_order, invented, lines, questions


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
@given(lines(), st.data())
def test_goals_after_one_multiplier(question: tuple[Setting, Terms], data: st.DataObject) -> None:
    setting, terms = in_order(*question, data)
    assume(sides(setting, terms) is not None)
    agree(setting, terms)


@runs(max_examples=150, deadline=None)
@given(questions(max_parties=3), st.data())
def test_goals_in_order_with_late_lies(
    question: tuple[Setting, Terms], data: st.DataObject
) -> None:
    setting, terms = in_order(*question, data)
    lead = data.draw(st.sampled_from([None, *range(len(setting.parties))]))
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(lazy, "ALL_UP_TO", 0)
        patch.setattr(road, "lead_party", lambda setting: lead)
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


def pressed(after: str) -> Progress:
    """A listener that stands for somebody who presses Ctrl-C once something is being done."""

    def listener(doing: str, seconds: float, steps: int) -> None:
        if doing.startswith(after):
            raise KeyboardInterrupt

    return listener


@pytest.mark.parametrize(
    ("after", "parties", "size", "options"),
    [
        ("counting by halves", 9, 9, 3),
        ("counting every profile", 8, 6, 5),
        ("looking for prices", 8, 6, 3),
    ],
)
def test_ctrl_c_leaves_it_undecided(after: str, parties: int, size: int, options: int) -> None:
    setting = invented(parties, size, options, 1)
    terms = Terms(decision="randomized", goals=("floor",), ir="none", tidy="none")
    verdict = pose_terms(setting, terms, path="interim", progress=pressed(after))
    assert (verdict.status, verdict.proved) == ("undecided", False)
    assert verdict.reason == "interrupted; run it again to go on"


def test_ctrl_c_in_column_generation() -> None:
    terms = Terms(decision="randomized", goals=("floor",), ir="none", tidy="none")
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(road, "interior", lambda *asked: iter(()))
        verdict = pose_terms(
            invented(6, 5, 3, 1), terms, path="interim", progress=pressed("looking for better")
        )
    assert (verdict.status, verdict.proved) == ("undecided", False)


@runs(max_examples=150, deadline=None)
@given(questions(max_parties=3))
def test_column_generation_alone(question: tuple[Setting, Terms]) -> None:
    setting, terms = question
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(road, "interior", lambda *asked: iter(()))
        agree(setting, terms)


@runs(max_examples=150, deadline=None)
@given(questions(max_parties=3))
def test_profiles_left_out_of_the_interior_point(question: tuple[Setting, Terms]) -> None:
    """Whatever is left out, and however early: the exact pass afterwards sees it."""
    setting, terms = question
    assume(terms.decision == "randomized")
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(barrier, "LARGE", 0)
        patch.setattr(barrier, "OPEN", 1)
        patch.setattr(barrier, "CLEAR", 2.0)
        patch.setattr(cube, "FEW", 1)
        agree(setting, terms)


def test_a_point_that_is_near_enough_at_once_leaves_nothing_out() -> None:
    """Nothing is at stake: no step is taken, so none says how far prices may still move."""
    party = Party("Norhaven", (Type("t0"),), (1,), integers([[0, 0]], (1, 2)), integers([0]))
    zero = integers([0, 0])
    setting = Setting("Nothing", ("k0", "k1"), (party,), zero, zero, 1, digest="0" * 64)
    terms = Terms(decision="randomized", goals=("revenue",), ir="none", tidy="none")
    asked = replace(terms, trusted=frozenset({"Norhaven"}), balance="none")
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(barrier, "LARGE", 0)
        patch.setattr(barrier, "CLEAR", 2.0)
        verdict = pose_terms(setting, asked, path="interim")
    assert (verdict.status, verdict.proved) == ("unbounded", True)
    assert pose_terms(setting, asked, path="full").status == "unbounded"


def test_the_time_limit_leaves_it_undecided() -> None:
    setting = invented(9, 9, 4, 1)
    terms = Terms(decision="randomized", goals=("floor",), ir="none", tidy="none")
    verdict = pose_terms(setting, terms, path="interim", time_limit=0.3)
    assert (verdict.status, verdict.proved) == ("undecided", False)
    assert verdict.reason == "the time limit was reached; give it more time with --time-limit"


def test_progress_says_how_many_profiles_a_second() -> None:
    heard: list[str] = []
    verdict = pose_terms(
        invented(8, 6, 5, 1),
        Terms(goals=("revenue",), balance="none", tidy="none"),
        path="interim",
        progress=lambda doing, seconds, steps: heard.append(doing),
    )
    assert verdict.proved
    assert any(doing.endswith("profiles a second") for doing in heard)


def test_memory_stays_flat() -> None:
    """Ten times the profiles take no more memory: nothing of the size of all profiles is held."""
    peaks = []
    for parties in (8, 9):
        setting = invented(parties, 6, 3, 1)
        rule = Rule((welfare_index(setting),))
        tracemalloc.start()
        blocks.count(setting, rule, None, Watch())
        peaks.append(tracemalloc.get_traced_memory()[1])
        tracemalloc.stop()
    assert peaks[1] < 1.5 * peaks[0]
    assert peaks[1] < 64 * 2**20
