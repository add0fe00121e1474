"""The oracles against each other and against published answers, before they judge anything."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import linprog

from designer.demands.terms import Demands
from designer.setting.setting import Setting
from tests.oracles.brute import best_of, best_of_all, best_of_efficient
from tests.oracles.settings import small_demands, small_settings
from tests.oracles.simplex import Row, maximise
from tests.oracles.textbook import build_and_solve
from tests.published.corpus import Query, queries, setting_of

CLOSE = 1e-6


@pytest.mark.parametrize("query", queries(), ids=lambda query: query.name)
def test_the_textbook_gives_the_published_answer(query: Query) -> None:
    status, value, _ = build_and_solve(setting_of(query.instance), query.demands, quick=True)
    assert status == query.verdict
    if query.value is not None:
        assert value == pytest.approx(float(query.value), abs=CLOSE)


def test_both_ways_of_adding_up_give_the_same_problem() -> None:
    setting = setting_of("B01_mid4")
    demands = Demands(decision="randomized", balance="ex-post", goal="welfare")
    slow, quick = (build_and_solve(setting, demands, quick) for quick in (False, True))
    assert slow[0] == quick[0] == "possible"
    assert slow[1] == pytest.approx(quick[1])


@st.composite
def programs(draw: st.DrawFn) -> tuple[dict[int, Fraction], list[Row], int]:
    columns = draw(st.integers(1, 4))
    whole = st.integers(-3, 3).map(Fraction)
    line = st.lists(whole, min_size=columns, max_size=columns)
    rows: list[Row] = [
        (dict(enumerate(draw(line))), draw(st.sampled_from((">=", "="))), draw(whole))
        for _ in range(draw(st.integers(0, 6)))
    ]
    return dict(enumerate(draw(line))), rows, columns


@settings(max_examples=200, deadline=None, derandomize=True)
@given(programs())
def test_the_rational_simplex_agrees_with_scipy(
    program: tuple[dict[int, Fraction], list[Row], int],
) -> None:
    cost, rows, columns = program
    status, value = maximise(cost, rows, columns)
    dense = {
        kind: [[float(row.get(j, 0)) for j in range(columns)] for row, k, _ in rows if k == kind]
        for kind in (">=", "=")
    }
    bounds = {kind: [float(b) for _, k, b in rows if k == kind] for kind in (">=", "=")}

    def scipy_says(objective: list[float]) -> tuple[int, float]:
        answer = linprog(
            objective,
            A_ub=-np.array(dense[">="]) if dense[">="] else None,
            b_ub=-np.array(bounds[">="]) if dense[">="] else None,
            A_eq=dense["="] or None,
            b_eq=bounds["="] or None,
            bounds=[(None, None)] * columns,
        )
        return answer.status, answer.fun

    feasible, _ = scipy_says([0.0] * columns)
    if status == "impossible":
        assert feasible == 2
        return
    assert feasible == 0
    code, best = scipy_says([-float(cost[j]) for j in range(columns)])
    if status == "unbounded":
        assert code in (3, 4)
    else:
        assert value is not None
        assert code == 0
        assert best == pytest.approx(-float(value), abs=CLOSE)


GOALS = ("any", "welfare", "revenue", "parties", "outside-money")


def agree(
    exact: tuple[str, Fraction | None], floats: tuple[str, float | None, dict[str, float]]
) -> None:
    assert exact[0] == floats[0]
    if exact[0] == "possible" and floats[1] is not None:
        assert exact[1] is not None
        assert floats[1] == pytest.approx(float(exact[1]), abs=CLOSE)


@settings(max_examples=60, deadline=None, derandomize=True)
@given(small_settings(with_rule=True), small_demands(GOALS, ("table",)))
def test_brute_force_and_textbook_agree_on_a_given_rule(setting: Setting, demands: Demands) -> None:
    assert setting.rule is not None
    rule = tuple(int(k) for k in np.argmax(setting.rule, axis=1))
    exact = best_of(setting, demands.over(setting), iter([rule]))
    agree(exact, build_and_solve(setting, demands))


@settings(max_examples=25, deadline=None, derandomize=True)
@given(small_settings(most_profiles=4, most_options=2), small_demands(GOALS, ("deterministic",)))
def test_brute_force_and_textbook_agree_on_all_deterministic_rules(
    setting: Setting, demands: Demands
) -> None:
    agree(best_of_all(setting, demands), build_and_solve(setting, demands))


def test_brute_force_finds_the_published_deterministic_answers() -> None:
    setting = setting_of("B06_base")  # Myerson 2008, see entries/B06.json
    demands = Demands(decision="deterministic", goal="welfare")
    assert best_of_all(setting, demands) == ("possible", Fraction(30))
    lottery = setting_of("S04_base")
    selling = Demands(decision="deterministic", balance="none", goal="revenue")
    assert best_of_all(lottery, selling) == ("possible", Fraction(5, 2))


def test_brute_force_finds_no_balanced_dominant_efficient_rule_where_none_is_published() -> None:
    demands = Demands(ic="dominant", ir="none", goal="any")
    assert best_of_efficient(setting_of("D01_n2_m2_1_3"), demands) == ("impossible", None)
    assert best_of_efficient(setting_of("D01_n2_m1_1_2"), demands)[0] == "possible"
