"""Like units assigned: options are sets of parties, counted without a pass."""

from __future__ import annotations

import itertools
import math
from dataclasses import replace
from fractions import Fraction
from itertools import pairwise
from typing import Any

import numpy as np
import pytest
from hypothesis import assume, event, given
from hypothesis import settings as runs
from hypothesis import strategies as st

from designer.demands.terms import Demands, Terms
from designer.engines.watch import Watch
from designer.posing import pose_terms
from designer.proof.document import as_bytes, parse_document
from designer.rebuilding import rebuild
from designer.roads.interim import blocks, counting, units
from designer.roads.interim.rule import Index, Rule
from designer.setting.setting import Party, Setting, Type, integers
from tests.roads.interim_settings import counted, sides
from tests.roads.test_interim_counts import plain


def orders(parties: int, least: int, most: int) -> list[list[tuple[int, ...]]]:
    """The sets in the orders that somebody would list them in."""
    sizes = range(least, most + 1)
    rising = [s for size in sizes for s in itertools.combinations(range(parties), size)]
    falling = [s for size in reversed(sizes) for s in itertools.combinations(range(parties), size)]
    binary = sorted(rising, key=lambda s: sum(1 << i for i in s))
    return [rising, falling, binary, rising[::-1], falling[::-1], binary[::-1]]


def assigning(
    sets: list[tuple[int, ...]], worths: list[list[int]], weights: list[list[int]], idle: int = 0
) -> Setting:
    """A unit is worth something to those served; idle parties get nothing from any."""
    parties = []
    for i, (worth, own) in enumerate(zip(worths, weights, strict=True)):
        rows = [[w * (i in s) for s in sets] for w in worth]
        types = tuple(Type(str(a)) for a in range(len(worth)))
        parties.append(
            Party(f"p{i}", types, tuple(own), integers(rows), integers([0] * len(worth)))
        )
    none = integers([[0] * len(sets)] * 2)
    lazy = tuple(
        Party(f"idle {i}", (Type("0"), Type("1")), (1, 2), none, integers([0, 0]))
        for i in range(idle)
    )
    zero = integers([0] * len(sets))
    return Setting("Drawn", tuple(map(str, sets)), (*parties, *lazy), zero, zero, 1)


@st.composite
def assignments(draw: st.DrawFn) -> tuple[Setting, Rule]:
    """A setting with units and a rule that asks of each party only whether it is served."""
    parties = draw(st.integers(1, 4))
    least = draw(st.integers(0, parties))
    most = draw(st.integers(least, parties))
    sets = draw(st.sampled_from(orders(parties, least, most)))
    number = st.integers(-3, 3)
    sizes = [draw(st.integers(1, 3)) for _ in range(parties)]
    worths = [[draw(st.integers(1, 9)) for _ in range(n)] for n in sizes]
    weights = [[draw(st.integers(1, 5)) for _ in range(n)] for n in sizes]
    setting = assigning(sets, worths, weights, draw(st.integers(0, 1)))
    found = []
    for _ in range(draw(st.integers(1, 2))):
        tables = []
        for i, party in enumerate(setting.parties):
            inside = [draw(number) for _ in range(party.size)]
            level = [draw(number) for _ in range(party.size)]
            tables.append(
                np.array(
                    [[x + z * (i in s) for s in sets] for x, z in zip(level, inside, strict=True)],
                    dtype=object,
                )
            )
        each = [draw(number) for _ in range(parties)]
        found.append(
            Index(tuple(tables), np.array([sum(each[i] for i in s) for s in sets], dtype=object))
        )
    return setting, Rule(tuple(found))


@runs(max_examples=500, deadline=None)
@given(assignments())
def test_units_count_every_profile(drawn: tuple[Setting, Rule]) -> None:
    setting, rule = drawn
    if len(setting.options) < 2:
        return
    assert units.work(setting, rule) < math.inf
    counts = units.count(setting, rule, Watch())
    assert plain(counts) == counted(setting, rule, None)
    zero = tuple(np.zeros((n, len(setting.options)), dtype=np.int64) for n in setting.shape)
    later = Rule((*rule.indices, Index(zero, np.arange(len(setting.options)))))
    backward = units.count(setting, rule, Watch(), last=True)
    assert plain(backward) == counted(setting, later, None)
    event("tied" if plain(backward) != plain(counts) else "untied")


@pytest.mark.parametrize("parties", [4, 5, 6])
def test_half_of_the_parties_are_served(parties: int) -> None:
    """Served and not served are told apart up to turning both over."""
    rng = np.random.default_rng(parties)
    for least, most in ((parties // 2, parties // 2), (1, parties - 1), (parties - 2, parties)):
        sets = orders(parties, least, most)[0]
        worths = [[int(v) for v in rng.integers(1, 9, 2)] for _ in range(parties)]
        setting = assigning(sets, worths, [[1, 2]] * parties)
        rule = Rule((Index(tuple(p.value for p in setting.parties), setting.outlay),))
        assert plain(units.count(setting, rule, Watch())) == counted(setting, rule, None)


def test_what_is_no_assignment_is_declined() -> None:
    sets = orders(3, 1, 2)[0]
    setting = assigning(sets, [[1, 2]] * 3, [[1, 1]] * 3)
    rule = Rule((Index(tuple(p.value for p in setting.parties), setting.outlay),))
    assert units.work(setting, rule) < math.inf
    uneven = np.array([0, 0, 0, 0, 0, 1], dtype=object)
    assert units.work(setting, Rule((Index(rule.indices[0].parties, uneven),))) == math.inf
    missing = assigning(sets[1:], [[1, 2]] * 3, [[1, 1]] * 3)
    assert units.family(missing) is None
    mixed = [sets[1], sets[4], sets[0], sets[3], sets[2], sets[5]]
    assert units.family(assigning(mixed, [[1, 2]] * 3, [[1, 1]] * 3)) is None


def test_two_units_among_seven_agree_with_a_pass() -> None:
    rng = np.random.default_rng(1)
    sets = orders(7, 0, 2)[1]
    worths = [[int(v) for v in rng.integers(1, 12, 4)] for _ in range(7)]
    setting = assigning(sets, worths, [[1, 2, 3, 1]] * 7)
    rule = Rule((Index(tuple(p.value for p in setting.parties), setting.outlay),))
    assert plain(units.count(setting, rule, Watch())) == plain(
        blocks.count(setting, rule, 0, Watch()).merged()
    )


def test_two_units_among_twelve_sold_for_the_most() -> None:
    """10^12 profiles, 79 options: E[the two largest positive virtual worths] (Myerson 1981).

    Worths 1 to 10, all as likely: w counts w - (10 - w), 2 w - 10 in all. The largest is at most
    v with probability F**12, the second with F**12 + 12 F**11 (1 - F). Here the parties differ in
    their worths' scale: those of every other one are half as large.
    """
    sets = orders(12, 0, 2)[0]
    worths = [[w * (1 + i % 2) for w in range(1, 11)] for i in range(12)]
    setting = assigning(sets, worths, [[1] * 10] * 12)
    asked = Demands(decision="randomized", balance="ex-post", budget="no-deficit", goal="revenue")
    verdict = pose_terms(setting, asked.over(setting), path="interim")
    assert (verdict.status, verdict.proved) == ("possible", True)
    virtual = [[(1 + i % 2) * (2 * w - 10) for w in range(1, 11)] for i in range(12)]
    values = sorted({max(v, 0) for row in virtual for v in row})
    expected = Fraction(0)
    for low, high in pairwise(values):
        below = [Fraction(sum(v <= low for v in row), 10) for row in virtual]
        none = math.prod(below, start=Fraction(1))
        one = sum((1 - b) * none / b for b in below)
        expected += (high - low) * ((1 - none) + (1 - none - one))
    assert verdict.goal_value == expected


@pytest.mark.parametrize("high", [6, 40])
def test_two_units_that_must_go_are_decided_ties_and_all(high: int) -> None:
    """Efficient, honest, balanced: expected-externality payments do it without outside money.

    d'Aspremont & Gerard-Varet, Journal of Public Economics 11 (1979). So with participation not
    asked it is possible whatever the ties. How large the smallest utility can be is for rules to
    say that break the ties: 244 million profiles, 66 options, no way but one to count them.
    """
    rng = np.random.default_rng(high)
    sets = orders(12, 2, 2)[0]
    worths = [sorted(int(v) for v in rng.choice(high, 5, replace=False)) for _ in range(12)]
    setting = assigning(sets, worths, [[1, 2, 3, 1, 1]] * 12)
    verdict = pose_terms(setting, Demands(ir="none", goal="any").over(setting), path="interim")
    assert (verdict.status, verdict.proved) == ("possible", True)
    floor = pose_terms(setting, Demands(ir="none", goal="floor").over(setting), path="interim")
    assert (floor.status, floor.proved) == ("possible", True)
    document: Any = parse_document(as_bytes(floor.proof))
    assert rebuild(setting, document) == []


@runs(max_examples=120, deadline=None)
@given(st.data())
def test_same_verdict_and_value_as_the_plain_road(data: st.DataObject) -> None:
    """Every rule that units can count is counted so; options may cost the same for each unit."""
    parties = data.draw(st.integers(1, 3))
    least = data.draw(st.integers(0, parties - 1))
    most = data.draw(st.integers(max(least, 1), parties))
    sets = data.draw(st.sampled_from(orders(parties, least, most)))
    assume(len(sets) > 1)
    sizes = [data.draw(st.integers(1, 3 if parties < 3 else 2)) for _ in range(parties)]
    worths = [[data.draw(st.integers(1, 6)) for _ in range(n)] for n in sizes]
    weights = [[data.draw(st.integers(1, 3)) for _ in range(n)] for n in sizes]
    cost = data.draw(st.integers(0, 3))
    setting = assigning(sets, worths, weights, data.draw(st.integers(0, 1)))
    setting = replace(setting, outlay=integers([cost * len(own) for own in sets]))
    goal = data.draw(st.sampled_from(("any", "outside-money", "revenue", "welfare", "floor")))
    terms = Terms(
        decision=data.draw(st.sampled_from(("efficient", "randomized"))),
        ir=data.draw(st.sampled_from(("none", "interim"))),
        balance="ex-ante",
        budget=data.draw(st.sampled_from(("exact", "no-deficit"))),
        goals=(goal,),
        subsidy=data.draw(st.sampled_from((Fraction(0), Fraction(1, 2)))),
        side=data.draw(sides(setting)),
        tidy="none",
    )
    usual = counting._way

    def way(one: Setting, rule: Rule, lead: int | None) -> str:
        could = rule.indices and not rule.exceptions and lead is None
        able = could and units.work(one, rule) < math.inf
        event("by order statistics" if able else "by another way")
        return "units" if able else usual(one, rule, lead)

    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(counting, "_way", way)
        patch.setattr("designer.roads.interim.road.lead_party", lambda _: None)
        ours = pose_terms(setting, terms, path="interim")
        document: Any = parse_document(as_bytes(ours.proof))
        assert rebuild(setting, document) == []
    plain_road = pose_terms(setting, terms, path="full")
    assert (ours.status, ours.proved, ours.reason) == (plain_road.status, True, "")
    assert ours.goal_values == plain_road.goal_values
