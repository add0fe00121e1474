"""Our exact programs given to engines we don't use ourselves, and to the textbook program.

The arrays come from `formulate`; the answers they lead to must be the published ones, and on
random settings those of the textbook program, which shares no row with ours.
"""

from __future__ import annotations

import pytest
from hypothesis import given, settings

from designer.demands.formulate import formulate
from designer.demands.terms import Demands
from designer.program.linear import LinearProgram
from designer.setting.setting import Setting
from designer.setting.vocabulary import GOALS
from tests.oracles.engines import by_clarabel, by_glpk
from tests.oracles.settings import small_demands, small_settings
from tests.oracles.textbook import build_and_solve
from tests.published.corpus import Query, queries, setting_of

CLOSE = 1e-6
WITHOUT_BLEND = tuple(goal for goal in GOALS if goal != "blend")


def program(setting: Setting, demands: Demands) -> LinearProgram:
    return formulate(setting, demands.over(setting)).stage(0)


@pytest.mark.parametrize("query", queries(), ids=lambda query: query.name)
def test_glpk_finds_the_published_answer_on_our_arrays(query: Query) -> None:
    status, value = by_glpk(program(setting_of(query.instance), query.demands))
    assert status == query.verdict
    if query.value is not None:
        assert value == pytest.approx(float(query.value), rel=CLOSE, abs=CLOSE)


@pytest.mark.parametrize(
    "query",
    [query for query in queries() if query.demands.decision != "deterministic"],
    ids=lambda query: query.name,
)
def test_clarabel_finds_the_published_answer_on_our_arrays(query: Query) -> None:
    status, value = by_clarabel(program(setting_of(query.instance), query.demands))
    assert status == query.verdict
    if query.value is not None:
        assert value == pytest.approx(float(query.value), rel=CLOSE, abs=CLOSE)


@settings(max_examples=300, deadline=None, derandomize=True)
@given(small_settings(), small_demands(WITHOUT_BLEND, limited=True))
def test_glpk_on_our_arrays_agrees_with_the_textbook(setting: Setting, demands: Demands) -> None:
    status, value = by_glpk(program(setting, demands))
    plain_status, plain_value, _ = build_and_solve(setting, demands)
    assert status == plain_status
    if plain_value is not None:
        assert value == pytest.approx(plain_value, rel=CLOSE, abs=CLOSE)


@settings(max_examples=60, deadline=None, derandomize=True)
@given(
    small_settings(most_profiles=6),
    small_demands(("welfare", "revenue", "parties", "floor"), ("deterministic",)),
)
def test_glpk_branches_to_the_textbook_answer(setting: Setting, demands: Demands) -> None:
    status, value = by_glpk(program(setting, demands))
    plain_status, plain_value, _ = build_and_solve(setting, demands)
    assert status == plain_status
    if plain_value is not None:
        assert value == pytest.approx(plain_value, rel=CLOSE, abs=CLOSE)
