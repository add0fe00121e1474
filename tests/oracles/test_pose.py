"""`pose` against the oracles on random small settings, through every combination of demands."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from designer import Demands, audit, pose
from designer.proof.recheck import recheck
from designer.setting.setting import Setting
from designer.setting.vocabulary import GOALS
from designer.verdict import Verdict
from tests.oracles.audited import achieved, shortcomings
from tests.oracles.brute import best_of, best_of_all
from tests.oracles.settings import small_demands, small_settings
from tests.oracles.textbook import build_and_solve

CLOSE = 1e-6
LINEAR = ("any", "welfare", "revenue", "parties", "outside-money")
WITHOUT_BLEND = tuple(goal for goal in GOALS if goal != "blend")


def proved(setting: Setting, demands: Demands) -> Verdict:
    """A verdict on which the checker and the audit of its table agree."""
    verdict = pose(setting, demands)
    assert verdict.proved, (verdict.status, verdict.reason)
    finding = recheck(verdict.proof)
    assert finding.holds, finding.faults
    if verdict.table is not None:
        terms = verdict.terms
        found = audit(
            setting,
            verdict.table,
            subsidy=verdict.subsidy,
            slack=terms.slack,
            limits=terms.limits,
            side=terms.side,
        )
        assert shortcomings(found, demands) == []
        for goal, value in verdict.goal_values.items():
            if goal not in ("any", "margin", "blend"):
                assert achieved(found, goal) == value
    return verdict


def same_as_textbook(setting: Setting, demands: Demands, close: float = CLOSE) -> None:
    """Compare with the textbook program, in floats."""
    verdict = proved(setting, demands)
    status, value, _ = build_and_solve(setting, demands)
    assert verdict.status == status
    if value is not None:
        exact = list(verdict.goal_values.values())[-1]
        assert exact is not None
        assert float(exact) == pytest.approx(value, rel=close, abs=close)


@settings(max_examples=250, deadline=None, derandomize=True)
@given(small_settings(), small_demands(WITHOUT_BLEND, limited=True))
def test_lotteries_and_efficient_rules(setting: Setting, demands: Demands) -> None:
    same_as_textbook(setting, demands)


@settings(max_examples=100, deadline=None, derandomize=True)
@given(small_settings(with_rule=True), small_demands(WITHOUT_BLEND, ("table",), limited=True))
def test_given_rules(setting: Setting, demands: Demands) -> None:
    same_as_textbook(setting, demands)


@settings(max_examples=60, deadline=None, derandomize=True)
@given(small_settings(most_profiles=6), small_demands(WITHOUT_BLEND, ("deterministic",)))
def test_deterministic_rules(setting: Setting, demands: Demands) -> None:
    same_as_textbook(setting, demands)


WEIGHTS = st.dictionaries(
    st.sampled_from(("worth", "pot", "parties", "Aster")),
    st.sampled_from((-1, 1, 2, "1/2")),
    min_size=1,
)


@settings(max_examples=60, deadline=None, derandomize=True)
@given(small_settings(), small_demands(("any",)), WEIGHTS)
def test_blends(setting: Setting, demands: Demands, blend: dict[str, int | str]) -> None:
    asked = {**vars(demands), "goal": "blend", "blend": blend}
    same_as_textbook(setting, Demands(**asked))


PAIRS = st.permutations([goal for goal in WITHOUT_BLEND if goal not in ("any", "margin")])


@settings(max_examples=60, deadline=None, derandomize=True)
@given(small_settings(), small_demands(("any",)), PAIRS.map(lambda goals: goals[:2]))
def test_two_goals_one_after_the_other(
    setting: Setting, demands: Demands, goals: list[str]
) -> None:
    balance = "ex-post" if demands.balance == "none" else demands.balance
    asked = {**vars(demands), "goal": tuple(goals), "balance": balance}
    # In floats the first goal is kept only within 1e-7, which the second can use.
    same_as_textbook(setting, Demands(**asked), close=1e-4)


@settings(max_examples=100, deadline=None, derandomize=True)
@given(small_settings(with_rule=True), small_demands(LINEAR, ("table",)))
def test_given_rules_exactly(setting: Setting, demands: Demands) -> None:
    """The payments of one rule by the rational simplex: equal as fractions."""
    assert setting.rule is not None
    rule = tuple(int(k) for k in np.argmax(setting.rule, axis=1))
    compare(proved(setting, demands), best_of(setting, demands.over(setting), iter([rule])))


@settings(max_examples=60, deadline=None, derandomize=True)
@given(small_settings(most_profiles=6, most_options=2), small_demands(LINEAR, ("deterministic",)))
def test_deterministic_rules_exactly(setting: Setting, demands: Demands) -> None:
    """All K**N rules by brute force: equal as fractions."""
    compare(proved(setting, demands), best_of_all(setting, demands))


def compare(verdict: Verdict, brute: tuple[str, Fraction | None]) -> None:
    status, value = brute
    assert verdict.status == status
    if status == "possible" and verdict.terms.goals != ("any",):
        assert verdict.goal_value == value
