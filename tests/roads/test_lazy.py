"""Leaving far lies out changes how long an answer takes, never the answer or its proof."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import replace
from fractions import Fraction
from typing import Any
from unittest.mock import patch

import numpy as np
import pytest
from hypothesis import event, given
from hypothesis import settings as runs
from hypothesis import strategies as st

from designer.auditing import audit, judge
from designer.demands.formulate import Formulation
from designer.demands.plain import as_plain
from designer.demands.terms import Demands, Terms
from designer.engines.highs import HIGHS
from designer.engines.report import Basis, Engine, Report
from designer.engines.watch import Watch
from designer.errors import UsageError
from designer.posing import pose_terms
from designer.program.labels import Honest
from designer.program.linear import LinearProgram
from designer.proof.document import as_bytes, parse_document
from designer.proof.prove import prove
from designer.proof.recheck import recheck
from designer.rebuilding import rebuild
from designer.roads import lazy
from designer.setting.setting import Party, Setting, Type, integers
from designer.verdict import Verdict
from tests.engines import programs as plain_programs
from tests.oracles.settings import small_demands
from tests.proof.test_prove import programs
from tests.strategies import small_settings

GOALS = ("any", "outside-money", "revenue", "welfare", "parties", "floor", "margin")


@contextmanager
def eager(far: int = 1) -> Iterator[None]:
    """Leave lies out from `far` far ones on, for any number of parties."""
    with patch.object(lazy, "LATE_FROM", far), patch.object(lazy, "PARTIES", 99):
        yield


def posed(setting: Setting, terms: Terms) -> Verdict:
    return pose_terms(setting, terms, path="full")


def agree(setting: Setting, terms: Terms) -> None:
    with eager(10**9):
        whole = posed(setting, terms)
    with eager():
        event(f"far lies: {lazy.late_lies(Formulation(setting, terms)) is not None}")
        ours = posed(setting, terms)
    event(whole.status)
    assert (ours.status, ours.proved, ours.path) == (whole.status, whole.proved, "full")
    assert ours.goal_values == whole.goal_values
    document: Any = parse_document(as_bytes(ours.proof))
    assert recheck(document).holds
    assert rebuild(setting, document) == []
    if ours.table is not None:
        found = audit(
            setting,
            ours.table,
            subsidy=ours.subsidy,
            slack=terms.slack,
            shortfall=terms.shortfall,
            compelled=terms.compelled,
            limits=terms.limits,
            side=terms.side,
        )
        assert judge(found, as_plain(terms)) == []


@runs(max_examples=100, deadline=None)
@given(
    small_settings(max_parties=2, max_types=5),
    small_demands(GOALS, limited=True),
    st.sampled_from(("bayesian", "dominant")),
)
def test_same_verdict_value_and_proof(setting: Setting, demands: Demands, ic: str) -> None:
    try:
        terms = demands.over(setting)
    except UsageError:
        return
    agree(setting, Terms(**{**vars(terms), "ic": ic}))


@runs(max_examples=40, deadline=None)
@given(
    small_settings(min_parties=2, max_parties=2, max_types=4),
    st.lists(st.sampled_from(GOALS), min_size=2, max_size=3, unique=True),
    st.sampled_from(("none", "swing")),
    st.sampled_from(("bayesian", "dominant")),
)
def test_several_goals_and_the_tidy_stage(
    setting: Setting, goals: list[str], tidy: str, ic: str
) -> None:
    demands = Demands(ic=ic, decision="randomized", goal=tuple(goals), tidy=tidy, balance="ex-ante")
    agree(setting, demands.over(setting))


class BasisOnly:
    """HiGHS as it answers large programs: no point to screen the rows by, only a basis."""

    name = "basis only"

    def solve(
        self,
        lp: LinearProgram,
        watch: Watch,
        *,
        basis: Basis | None = None,
        tolerance: float | None = None,
    ) -> Report:
        report = HIGHS.solve(lp, watch, basis=basis, tolerance=tolerance)
        return replace(report, x=None, y=None)


@runs(max_examples=200, deadline=None)
@given(programs(), st.sampled_from((HIGHS, BasisOnly())), st.data())
def test_any_rows_may_come_late(lp: LinearProgram, engine: Engine, data: st.DataObject) -> None:
    """Whatever is left out at first, every certificate is judged against the whole program."""
    late = np.array(data.draw(st.lists(st.booleans(), min_size=lp.rows, max_size=lp.rows)), bool)
    ours, whole = prove(lp, late=late, engine=engine), prove(lp)
    event(whole.status)
    assert ours.status == whole.status
    if whole.status != "unbounded":  # then the value is that of any point that meets the rows
        assert ours.value == whole.value
    plain_programs.judge(lp, ours)


# -- what is left out ----------------------------------------------------------------------


def seller(values: list[list[int]], numbers: list[int] | None = None) -> Party:
    return Party(
        "Seller",
        tuple(
            Type(f"t{a}", None if numbers is None else Fraction(numbers[a]))
            for a in range(len(values))
        ),
        tuple(1 for _ in values),
        integers(values, (len(values), len(values[0]))),
        integers([0] * len(values)),
    )


def test_order_of_types() -> None:
    """By worth on a line, by number off it, by place where there are no numbers."""
    on = [[4, 0, 1], [0, 0, 1], [2, 0, 1]]
    off = [[4, 0, 1], [0, 0, 3], [2, 5, 1]]
    assert lazy.line(seller(on)) == [0, -4, -2]
    assert lazy.line(seller(off)) is None
    assert lazy.ranks(seller(on, [1, 2, 3])).tolist() == [2, 0, 1]
    assert lazy.ranks(seller(off, [7, 9, 8])).tolist() == [0, 2, 1]
    assert lazy.ranks(seller(off)).tolist() == [0, 1, 2]


def sale(size: int) -> Setting:
    """A buyer and a seller on overlapping grids."""
    grid = range(1, size + 1)
    return Setting(
        title="A sale",
        options=("sell", "keep"),
        parties=(
            Party(
                "Buyer",
                tuple(Type(str(a)) for a in grid),
                (1,) * size,
                integers([[3 * a, 0] for a in grid]),
                integers([0] * size),
            ),
            seller([[0, 3 * a - 2] for a in grid]),
        ),
        outlay=integers([0, 0]),
        worth=integers([0, 0]),
        grain=1,
        digest="0" * 64,
    )


@pytest.mark.parametrize("ic", ["bayesian", "dominant"])
def test_late_rows_are_the_lies_to_types_that_are_no_neighbours(ic: str) -> None:
    setting = sale(6)
    terms = Demands(ic=ic, decision="randomized", goal="welfare").over(setting)
    work = Formulation(setting, terms)
    with eager():
        late = lazy.late_lies(work)
    assert late is not None
    axis = work.pose("welfare").row_axis
    names = [{kind.label: a for a, kind in enumerate(party.types)} for party in setting.parties]
    place = dict(zip([party.name for party in setting.parties], names, strict=True))
    for row, is_late in enumerate(late):
        label = axis.label(row)
        far = isinstance(label, Honest) and (
            abs(place[label.party][label.true] - place[label.party][label.told]) > 1
        )
        assert is_late == far


def test_far_lies_stay_out_of_a_sale() -> None:
    """Types on a line: neighbours' lies imply the others, so one round on few rows is enough."""
    setting = sale(12)
    terms = Demands(ic="dominant", decision="randomized", goal="welfare", tidy="none").over(setting)
    work = Formulation(setting, terms)
    late = lazy.late_lies(work)
    assert late is not None
    lp = work.pose("welfare").stage(0)
    late = np.concatenate([late, np.zeros(lp.rows - len(late), dtype=bool)])
    ours, whole = prove(lp, late=late), prove(lp)
    assert ours.value == whole.value
    assert ours.effort["rounds"] == 1
    assert ours.effort["rows left out"] == int(late.sum()) > lp.rows // 2


def test_a_far_lie_that_pays_is_added() -> None:
    """Off the line the first answer misses a lie; what is added makes up for it."""
    setting = Setting(
        title="Drawn",
        options=("a", "b", "c"),
        parties=(seller([[9, 0, 0], [0, 5, 0], [8, 0, 1], [0, 0, 7], [6, 1, 3]]),),
        outlay=integers([0, 0, 0]),
        worth=integers([0, 0, 0]),
        grain=1,
        digest="0" * 64,
    )
    terms = Demands(decision="randomized", goal="revenue", balance="none", tidy="none").over(
        setting
    )
    work = Formulation(setting, terms)
    with eager():
        late = lazy.late_lies(work)
    assert late is not None
    lp = work.pose("revenue").stage(0)
    late = np.concatenate([late, np.zeros(lp.rows - len(late), dtype=bool)])
    ours, whole = prove(lp, late=late), prove(lp)
    assert ours.effort["rounds"] > 1
    assert (ours.status, ours.value) == ("optimal", whole.value)
    plain_programs.judge(lp, ours)


def test_more_parties() -> None:
    """With three parties far lies are left out where honesty is dominant and types on a line."""
    three = sale(9)
    third = Party(
        "Guard",
        tuple(Type(str(a)) for a in range(9)),
        (1,) * 9,
        integers([[a, 0] for a in range(9)]),
        integers([0] * 9),
    )
    three = Setting(**{**vars(three), "parties": (*three.parties, third)})
    asked = {"decision": "randomized", "goal": "welfare", "tidy": "none"}
    for ic, left_out in (("bayesian", False), ("dominant", True), ("none", False)):
        terms = Demands(ic=ic, **asked).over(three)  # type: ignore[arg-type]
        with patch.object(lazy, "LATE_FROM", 1):
            assert (lazy.late_lies(Formulation(three, terms)) is not None) == left_out
