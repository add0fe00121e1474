"""Facts that practitioners rely on. Common practice, no source."""

from __future__ import annotations

from fractions import Fraction

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from designer import Demands, Table, audit, pose
from designer.ruling.amounts import Amounts, stacked, total
from designer.ruling.expected_externality import redistributed
from designer.ruling.lift import balanced
from designer.ruling.profiles import (
    by_profile,
    certain,
    chosen,
    efficient,
    expected,
    expected_by_type,
    outlay,
)
from designer.setting.setting import Setting
from tests.published.corpus import setting_of
from tests.ruling.helpers import table_of
from tests.strategies import small_settings

several = small_settings(
    interdependent=False, compelled=False, correlated=False, min_parties=2, max_parties=3
)


@pytest.mark.parametrize("count", [2, 3, 4, 7])
def test_every_column_of_the_weights_adds_up_to_zero(count: int) -> None:
    """Common practice, no source: row i holds the weights of g_1..g_n in party i's payment."""
    rows = []
    for j in range(count):
        unit = [Amounts.of([int(i == j)]) for i in range(count)]
        rows.append([part.at(0) for part in redistributed(unit)])
    weights = [[rows[j][i] for j in range(count)] for i in range(count)]
    for i in range(count):
        assert weights[i][i] == -1
        assert all(weights[i][j] == Fraction(1, count - 1) for j in range(count) if j != i)
        assert sum(row[i] for row in weights) == 0


@settings(max_examples=60, deadline=None, derandomize=True, suppress_health_check=list(HealthCheck))
@given(several, st.data())
def test_balance_on_average_becomes_balance_in_every_case(
    setting: Setting, data: st.DataObject
) -> None:
    """Common practice, no source: met constructively, from any honest table with even odds.

    An honest table that balances on average: pivotal payments, whose pot is handed back in
    lump sums that are drawn at random but add up. The lift keeps every expectation.
    """
    choice = efficient(setting)
    cost = chosen(outlay(setting), choice)
    table = table_of("pivotal", setting)
    rows = [Amounts(row, table.pays_den) for row in table.pays]
    left = expected(setting, total(rows) - cost)
    n = len(rows)
    sums = [Fraction(data.draw(st.integers(-5, 5))) for _ in range(n - 1)]
    sums.append(left - sum(sums))
    rows = [row - Amounts.of([back]) for row, back in zip(rows, sums, strict=True)]
    before = audit(setting, Table(certain(setting, choice), 1, *stacked(rows)))
    assert before.holds["ic-bayesian"]
    assert before.pot.expected == 0

    interim = [expected_by_type(setting, i, row) for i, row in enumerate(rows)]
    after = audit(
        setting,
        Table(certain(setting, choice), 1, *stacked(balanced(setting, interim, cost))),
    )
    assert after.pot.least == after.pot.most == 0
    assert after.holds["ic-bayesian"]
    assert after.standings == before.standings


@settings(max_examples=60, deadline=None, derandomize=True, suppress_health_check=list(HealthCheck))
@given(several)
def test_no_deficit_on_average_becomes_no_deficit_ever(setting: Setting) -> None:
    """Common practice, no source: whatever is left on average can be left in every case."""
    table = table_of("pivotal-equal-shares", setting)
    rows = [Amounts(row, table.pays_den) for row in table.pays]
    choice = efficient(setting)
    cost = chosen(outlay(setting), choice)
    left = expected(setting, total(rows) - cost)
    assert left >= 0
    interim = [expected_by_type(setting, i, row) for i, row in enumerate(rows)]
    lifted = balanced(setting, interim, cost + Amounts.of([left]))
    found = audit(setting, Table(certain(setting, choice), 1, *stacked(lifted)))
    assert found.pot.least == found.pot.most == left
    assert found.holds["ic-bayesian"]
    assert found.holds["balance-ex-post-no-deficit"]


@settings(max_examples=25, deadline=None, derandomize=True, suppress_health_check=list(HealthCheck))
@given(several)
def test_the_program_agrees_that_average_balance_is_enough(setting: Setting) -> None:
    """The same fact, posed: with independent types both kinds of balance have one answer."""
    for budget in ("exact", "no-deficit"):
        on_average, in_every_case = (
            pose(setting, Demands(balance=kind, budget=budget, goal="any", tidy="none"))
            for kind in ("ex-ante", "ex-post")
        )
        assert on_average.status == in_every_case.status
        assert on_average.proved
        assert in_every_case.proved


def test_with_correlated_types_average_balance_is_not_enough() -> None:
    """The contrast, entry A02: the lift needs independence. 11/5 on average, 27/13 in each case."""
    setting = setting_of("A02_corr_p1over5")
    assert setting.joint is not None
    values = [
        pose(
            setting,
            Demands(decision="randomized", balance=kind, budget="exact", goal="welfare"),
        ).goal_value
        for kind in ("ex-ante", "ex-post")
    ]
    assert values == [Fraction(11, 5), Fraction(27, 13)]


def test_one_party_has_nobody_to_share_with() -> None:
    """Convention 9: the lift cannot move a single party's payments between cases."""
    from tests.published.corpus import as_setting
    from tests.published.families import midpoints, one_item

    setting = as_setting(one_item([midpoints(2)]))
    even = [Amounts.of([0, 0])]
    uneven = Amounts.of([1, -1])
    with pytest.raises(ValueError, match="one party"):
        balanced(setting, even, uneven)
    with pytest.raises(ValueError, match="on average"):
        balanced(setting, even, Amounts.of([1, 1]))
    assert by_profile(setting, 0, even[0]).fractions() == [0, 0]
