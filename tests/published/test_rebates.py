"""How much of the pivotal rule's takings can be handed back: entries R01 and R02.

Three roads to the worst-case share: the closed form of the sources, an exact program over
rebates in this file, and, over all honest tables instead of rebates, the goal `returned-share`.
"""

from __future__ import annotations

from fractions import Fraction
from math import comb

import pytest

from designer import Demands, audit, pose
from designer.proof.recheck import recheck
from designer.ruling.registry import RULES
from designer.ruling.worst_case_linear_rebate import share
from tests.oracles.audited import achieved, shortcomings
from tests.oracles.simplex import Row, maximise
from tests.oracles.textbook import build_and_solve
from tests.published.corpus import as_setting, entries
from tests.published.families import endpoints, midpoints, units

ANY_TABLE = Demands(
    decision="efficient",
    ic="dominant",
    ir="ex-post",
    balance="ex-post",
    budget="no-deficit",
    goal="returned-share",
    tidy="none",
)
"""Dominant, nobody ever worse off, never a deficit: the most that is sure to go back."""


def stored(kind: str) -> list[tuple[int, int, int, Fraction]]:
    """(parties, units, points of the grid or 0, value) of entry R01, by kind of tag."""
    found = []
    for item in entries()["R01"]["beyond"]:
        name, *rest = item["tag"].split("_")
        if name == kind:
            n, m = rest[0].removeprefix("n").split("m")
            size = int(rest[1].removeprefix("end")) if len(rest) > 1 else 0
            found.append((int(n), int(m), size, Fraction(item["value"])))
    return found


def test_the_entry_is_used_to_the_last_value() -> None:
    assert len(stored("groves")) == 27
    assert len(stored("dsic")) == 8
    assert len(entries()["R01"]["beyond"]) == 35


# -- Guo and Conitzer 2009, GEB 67:69-98; Moulin 2009, JET 144:96-119 (formula from memory)


@pytest.mark.parametrize(("n", "m", "size", "value"), stored("groves"))
def test_the_share_that_rebates_can_promise(n: int, m: int, size: int, value: Fraction) -> None:
    """The closed form and the rule's own promise, against the published list."""
    assert value == 1 - Fraction(comb(n - 1, m), sum(comb(n - 1, j) for j in range(m, n)))
    if m < n - 1:
        assert share(n, m) == value


@pytest.mark.parametrize(("n", "m", "size", "value"), stored("groves"))
def test_no_rebate_promises_more(n: int, m: int, size: int, value: Fraction) -> None:
    """Worths 0 and 1 alone bound every rebate, and by symmetry r(number of ones among others).

    With j ones the pivotal rule takes V(j) = m if j > m, else 0, and
    z V(j) <= j r(j-1) + (n-j) r(j) <= V(j), r >= 0: the largest z, by an exact simplex.
    """
    rows: list[Row] = [({k: Fraction(1)}, ">=", Fraction(0)) for k in range(n)]
    for j in range(n + 1):
        back: dict[int, Fraction] = {}
        if j:
            back[j - 1] = Fraction(j)
        if j < n:
            back[j] = Fraction(n - j)
        taken = Fraction(m if j > m else 0)
        rows.append(({k: -part for k, part in back.items()}, ">=", -taken))
        rows.append(({**back, n: -taken}, ">=", Fraction(0)))
    status, best = maximise({n: Fraction(1)}, rows, n + 1)
    assert (status, best) == ("possible", value)


@pytest.mark.parametrize(
    ("n", "m", "size"),
    [(3, 1, 5), (4, 1, 3), (4, 2, 3), (5, 1, 2), (5, 2, 2), (5, 3, 2), (6, 3, 2)],
)
def test_the_rule_keeps_its_promise_exactly(n: int, m: int, size: int) -> None:
    """The linear rebate, built and audited: its worst case is the promise exactly."""
    setting = as_setting(units(n, m, endpoints(size)))
    table = RULES["worst-case-linear-rebate"].build(setting).table
    found = audit(setting, table)
    assert shortcomings(found, ANY_TABLE) == []
    assert achieved(found, "returned-share") == share(n, m)


# -- the same over every honest table: finite grids leave slack that rebates cannot use


@pytest.mark.parametrize(("n", "m", "size", "value"), stored("dsic"))
def test_the_share_that_any_honest_table_can_promise(
    n: int, m: int, size: int, value: Fraction
) -> None:
    setting = as_setting(units(n, m, endpoints(size)))
    verdict = pose(setting, ANY_TABLE)
    assert verdict.proved, verdict.reason
    assert recheck(verdict.proof).holds
    assert verdict.goal_value == value
    assert verdict.table is not None
    found = audit(setting, verdict.table)
    assert shortcomings(found, ANY_TABLE) == []
    assert achieved(found, "returned-share") == value
    assert value >= 1 - Fraction(comb(n - 1, m), sum(comb(n - 1, j) for j in range(m, n)))


@pytest.mark.parametrize("size", [7, 9])
def test_one_unit_among_three_at_sizes_not_listed(size: int) -> None:
    """The entry's closed form 1/3 + 5/(3(K-1)), from K = 4."""
    verdict = pose(as_setting(units(3, 1, endpoints(size))), ANY_TABLE)
    assert verdict.proved
    assert verdict.goal_value == Fraction(1, 3) + Fraction(5, 3 * (size - 1))


@pytest.mark.parametrize("size", [3, 6, 7, 8])
def test_two_units_among_three_at_sizes_not_listed(size: int) -> None:
    """The entry says 5/(2(K-1)); beyond six points that is too much, and 2/(K-2) is right.

    Our own finding, so the textbook program, which shares no row with ours, is asked as well.
    """
    setting = as_setting(units(3, 2, endpoints(size)))
    verdict = pose(setting, ANY_TABLE)
    assert verdict.proved
    assert verdict.goal_value == min(
        Fraction(1), Fraction(5, 2 * (size - 1)), Fraction(2, max(size - 2, 1))
    )
    status, value, _ = build_and_solve(setting, ANY_TABLE)
    assert status == "possible"
    assert value == pytest.approx(float(verdict.goal_value), abs=1e-7)


# -- Bailey 1997, Public Choice 91:107-126 (from memory); Cavallo 2006, AAMAS (looked up)


@pytest.mark.parametrize("rule", ["cavallo-rebate", "bailey-rebate"])
@pytest.mark.parametrize("item", entries()["R02"]["beyond"], ids=lambda item: item["tag"])
def test_the_rebate_rules_leave_what_is_published(item: dict[str, str], rule: str) -> None:
    """Entry R02: dominant, efficient, ex-post participation, never a deficit; the leftover."""
    bidders, grid = item["tag"].split("_")
    size = int(grid.removeprefix("mid"))
    setting = as_setting(units(int(bidders.removeprefix("n")), 1, midpoints(size)))
    found = audit(setting, RULES[rule].build(setting).table)
    asked = Demands(
        decision="efficient", ic="dominant", ir="ex-post", balance="ex-post", budget="no-deficit"
    )
    assert shortcomings(found, asked) == []
    assert found.pot.expected == Fraction(item["value"])


@pytest.mark.parametrize("size", [3, 5, 7, 16])
def test_the_leftover_of_three_bidders_at_other_sizes(size: int) -> None:
    """Entry R02: (K^2-1)/(6K^2), towards 2/(n(n+1)) = 1/6."""
    setting = as_setting(units(3, 1, midpoints(size)))
    found = audit(setting, RULES["bailey-rebate"].build(setting).table)
    assert found.pot.expected == Fraction(size**2 - 1, 6 * size**2)
