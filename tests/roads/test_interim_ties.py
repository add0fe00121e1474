"""Efficient rules whose ties the goal settles: an interior point over the tied profiles alone."""

from __future__ import annotations

import itertools
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from hypothesis import assume, event, given
from hypothesis import settings as runs
from hypothesis import strategies as st

from designer.demands.terms import Terms
from designer.engines.watch import Watch
from designer.posing import pose_terms
from designer.proof.document import as_bytes, parse_document
from designer.proof.recheck import recheck
from designer.rebuilding import rebuild
from designer.roads.interim import check, cube, road
from designer.roads.interim.leading import Leading, Mask
from designer.roads.interim.master import Master
from designer.setting.setting import Setting, integers
from tests.roads.interim_settings import invented, lines, questions, rules, settings
from tests.roads.test_interim import mutate
from tests.roads.test_interim_ways import agree


@runs(max_examples=200, deadline=None)
@given(settings(), st.data())
def test_open_options_are_those_that_no_index_closes(setting: Setting, data: st.DataObject) -> None:
    rule = data.draw(rules(setting, big=True))
    shape = setting.shape
    cut = data.draw(st.integers(0, len(shape) - 1))
    leading = Leading(setting, rule.indices, cut)
    inner = int(np.prod(shape[cut:]))
    outer = setting.profiles // inner
    rows = data.draw(st.integers(1, outer))
    parts = [leading.open(first, rows) for first in range(0, outer, rows)]
    told = np.concatenate(parts, axis=1).reshape(len(setting.options), -1).T
    for row, types in zip(told, itertools.product(*map(range, shape)), strict=True):
        best = set(range(len(setting.options)))
        for index in rule.indices:
            score = dict(enumerate(index.at(np.array([types]))[0]))
            best = {k for k in best if score[k] == max(score[other] for other in best)}
        assert set(np.flatnonzero(row)) == best


@runs(max_examples=300, deadline=None)
@given(st.one_of(lines(), questions(max_parties=3)), st.data())
def test_ties_with_and_without_order(question: tuple[Setting, Terms], data: st.DataObject) -> None:
    """Held in slabs, one by one in pieces, or too many to hold: the plain road's answer."""
    setting, terms = question
    assume(len(setting.options) > 1)
    terms = replace(terms, decision="efficient")
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(road, "sides", lambda setting, terms: None)
        way = data.draw(st.sampled_from(("slabs", "pieces", "neither")))
        event(way)
        if way == "slabs":
            patch.setattr(cube, "FEW", 10**9)
        else:
            patch.setattr(cube, "FEW", 0)
            patch.setattr(cube, "PIECE", 2)
            patch.setattr(cube, "SLAB", 1)
        if way == "neither":
            patch.setattr(cube, "SCATTERED", 0)
            patch.setattr(cube, "CELLS", 0)
        agree(setting, terms)


def coarse(seed: int) -> Setting:
    """Three parties with eight types and worths 0 to 2: two profiles in three are tied."""
    setting = invented(3, 8, 3, seed)
    rng = np.random.default_rng(seed)
    parties = tuple(
        replace(party, value=integers(rng.integers(0, 3, (party.size, 3))))
        for party in setting.parties
    )
    return replace(setting, parties=parties)


ASKED = Terms(
    decision="efficient", balance="ex-ante", budget="no-deficit", goals=("revenue",), tidy="none"
)


@runs(max_examples=10, deadline=None)
@given(st.integers(0, 1000), st.sampled_from(("revenue", "floor", "parties")))
def test_many_ties(seed: int, goal: str) -> None:
    agree(coarse(seed), replace(ASKED, goals=(goal,)))


def test_ties_need_no_search() -> None:
    """The rules near the interior point are the whole answer."""

    def none(master: Master, watch: Watch) -> None:
        pytest.fail("rules were searched for")

    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(road, "Search", none)
        found = [pose_terms(coarse(seed), ASKED, path="interim") for seed in range(5)]
    plain = [pose_terms(coarse(seed), ASKED, path="full") for seed in range(5)]
    assert all(verdict.proved for verdict in found)
    assert [verdict.goal_value for verdict in found] == [v.goal_value for v in plain]


@runs(max_examples=60, deadline=None)
@given(st.integers(0, 50), st.data())
def test_changed_documents_are_refused_or_true(seed: int, data: st.DataObject) -> None:
    setting = coarse(seed)
    document: Any = parse_document(as_bytes(pose_terms(setting, ASKED, path="interim").proof))
    assert recheck(document).holds
    assert rebuild(setting, document) == []
    value = document["stages"][0]["value"]
    event(mutate(document, data))
    if recheck(document).holds and rebuild(setting, document) == []:
        assert document["verdict"] == "possible"
        assert document["stages"][0]["value"] == value or document["terms"]["ir"] != "interim"


@pytest.mark.parametrize("seed", range(5))
def test_exceptions_must_be_efficient(seed: int) -> None:
    """A road that opens every option makes a sound proof of a rule that nobody asked for."""
    setting = coarse(seed)
    truth = pose_terms(setting, ASKED, path="interim")

    def everything(self: Leading, first: int, rows: int) -> Mask:
        part = self.outer[0][:, first : first + rows]
        return np.ones((*part.shape, self.inner[0].shape[1]), dtype=bool)

    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(Leading, "open", everything)
        assert not pose_terms(setting, ASKED, path="interim").proved
        # Nor is the document believed where it is handed in by somebody who believes it.
        patch.setattr(check, "_forbidden", lambda setting, terms, rule: None)
        verdict = pose_terms(setting, ASKED, path="interim")
    assert verdict.goal_value != truth.goal_value
    document: Any = parse_document(as_bytes(verdict.proof))
    assert recheck(document).holds
    assert rebuild(setting, document) == ["a listed rule makes an exception that is not efficient"]
