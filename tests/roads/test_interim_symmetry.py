"""Alike parties on the interim road: prices alike, counted together, the plain road's answer."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import replace
from fractions import Fraction
from typing import Any

import numpy as np
import pytest
from hypothesis import event, given
from hypothesis import settings as runs
from hypothesis import strategies as st

from designer.demands.terms import Demands, Terms
from designer.engines.watch import Watch
from designer.posing import pose_terms
from designer.proof.document import as_bytes, parse_document
from designer.proof.recheck import recheck
from designer.rebuilding import rebuild
from designer.roads.interim import alike, blocks, counting, halves, items, sums
from designer.roads.interim.rule import Index, Rule, welfare_index
from designer.roads.interim.symmetry import alike_parties, even_tables
from designer.setting.scenario import parse_scenario
from designer.setting.setting import Setting, Side
from tests.roads.interim_settings import questions


@contextmanager
def by_multisets() -> Iterator[list[int]]:
    """Every rule that sees alike parties is counted by multisets; how many were."""
    usual, used = counting._way, [0]

    def way(setting: Setting, rule: Rule, lead: int | None) -> str:
        if not rule.indices or alike.work(setting, rule, lead) == float("inf"):
            return usual(setting, rule, lead)
        used[0] += 1
        return "alike"

    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(counting, "_way", way)
        yield used


@st.composite
def crowds(draw: st.DrawFn) -> tuple[Setting, Terms]:
    """A question in which parties are repeated, most of the time in all that is asked of them."""
    setting, terms = draw(questions(max_parties=2))
    copies = [draw(st.integers(1, 3)) for _ in setting.parties]
    while np.prod([n**c for n, c in zip(setting.shape, copies, strict=True)]) > 81:
        copies[copies.index(max(copies))] -= 1
    names: dict[str, list[str]] = {}
    parties, places = [], []
    for index, (party, count) in enumerate(zip(setting.parties, copies, strict=True)):
        names[party.name] = [f"{party.name} {number}" for number in range(count)]
        parties += [replace(party, name=name) for name in names[party.name]]
        places += [index] * count
    order = draw(st.permutations(range(len(parties))))
    parties, places = [parties[i] for i in order], [places[i] for i in order]
    chances = tuple(
        replace(chance, party=i)
        for i, place in enumerate(places)
        for chance in terms.side.chances
        if chance.party == place
    )
    crowd = replace(setting, parties=tuple(parties), rule=None, rule_den=1)
    blend = {name: weight for word, weight in terms.blend for name in names.get(word, [word])}
    if draw(st.integers(0, 4)) == 0:
        blend[parties[0].name] = Fraction(3)  # one of them counts for more
    terms = replace(
        terms,
        decision="randomized" if terms.decision == "table" else terms.decision,
        compelled=frozenset(n for word in terms.compelled for n in names[word]),
        trusted=frozenset(n for word in terms.trusted for n in names[word]),
        side=replace(terms.side, chances=chances),
        blend=tuple(blend.items()),
    )
    return crowd, terms


@runs(max_examples=150, deadline=None)
@given(crowds(), st.booleans())
def test_same_verdict_and_value_as_the_plain_road(
    question: tuple[Setting, Terms], whole: bool
) -> None:
    setting, terms = question
    with by_multisets() as used, pytest.MonkeyPatch.context() as patch:
        if whole:  # no lead party: all alike parties are counted together
            patch.setattr("designer.roads.interim.road.lead_party", lambda _: None)
        ours = pose_terms(setting, terms, path="interim")
        document: Any = parse_document(as_bytes(ours.proof))
        assert recheck(document).holds
        assert rebuild(setting, document) == []
    event(f"{ours.status}, {'some' if used[0] else 'nothing'} counted by multisets")
    plain = pose_terms(setting, terms, path="full")
    assert (ours.status, ours.proved, ours.reason) == (plain.status, True, "")
    assert ours.goal_values == plain.goal_values


def test_who_is_alike() -> None:
    setting = _farms(4, [1, 2], [1, 1])
    terms = Demands().over(setting)
    assert alike_parties(setting, terms, None) == ((0, 1, 2, 3),)
    assert alike_parties(setting, terms, 2) == ((0, 1, 3),)
    odd = Demands(compelled=frozenset({"Farm 2"})).over(setting)
    assert alike_parties(setting, odd, None) == ((0, 2, 3),)
    blend = Demands(goal="blend", blend={"Farm 1": 1, "Farm 2": 1, "pot": 1}).over(setting)
    assert alike_parties(setting, blend, None) == ((0, 1), (2, 3))
    assert alike_parties(setting, replace(terms, trusted=frozenset({"Farm 4"})), None) == (
        (0, 1, 2),
    )
    heavier = replace(setting.parties[3], weights=(1, 2))
    other = replace(setting, parties=(*setting.parties[:3], heavier))
    assert alike_parties(other, replace(terms, side=Side()), None) == ((0, 1, 2),)


def test_means_keep_what_all_parties_add_together() -> None:
    tables = tuple(np.array([[float(i), 2.0 * i]]) for i in range(4))
    even = even_tables(((0, 2),), tables)
    assert [table.tolist() for table in even] == [[[1, 2]], [[1, 2]], [[1, 2]], [[3, 6]]]
    assert np.array_equal(sum(even), sum(tables))


def _farms(count: int, worths: list[int], weights: list[int], outlay: int = 0) -> Setting:
    return parse_scenario(
        f'decisions.options = ["build", "leave"]\ndesigner.outlay.build = {outlay}\n[[party]]\n'
        f'name = "Farm"\ncount = {count}\ntypes = {worths}\nweights = {weights}\n'
        'value = { build = "type", leave = 0 }\n'
    )


def test_a_joint_project_of_twenty_with_many_ties_is_decided() -> None:
    """10^20 profiles, worths 0 to 9 and outlay 90: where the worths sum to 90, welfare is tied.

    By hand: a type gains over the next lower one at least the lower one's chance q of building,
    so the least is left above the floor where ties go to leaving, q(b) = P(S' + b > 90) with S'
    the sum of 19 worths. The floor is a 20th of welfare E[max(S - 90, 0)] less the mean of
    sum_{b < a} q(b); chances rise with the type, so no other lie gains.
    """
    setting = _farms(20, list(range(10)), [1] * 10, 90)
    terms = Demands(ir="none", goal="floor").over(setting)
    rule = Rule((welfare_index(setting),))
    counts = counting.count(setting, rule, None, Watch())
    assert counting.tied(setting, rule, counts, Watch())
    verdict = pose_terms(setting, terms, path="interim")
    assert (verdict.status, verdict.proved) == ("possible", True)
    others = [1]
    for _ in range(19):
        others = [sum(others[max(0, s - 9) : s + 1]) for s in range(len(others) + 9)]
    q = [Fraction(sum(others[91 - b :]), 10**19) for b in range(10)]
    everyone = [sum(others[max(0, s - 9) : s + 1]) for s in range(len(others) + 9)]
    welfare = Fraction(sum(w * (s - 90) for s, w in enumerate(everyone) if s > 90), 10**20)
    above = Fraction(sum((sum(q[:a], Fraction(0)) for a in range(10)), Fraction(0)), 10)
    assert verdict.goal_value == welfare / 20 - above


def test_generic_second_indices_over_twenty_parties_are_counted() -> None:
    """No other way takes a rule whose ties are broken in numbers of no short range."""
    setting = _farms(20, list(range(10)), [1] * 10, 90)
    rng = np.random.default_rng(5)
    table = np.array([[int(v), 0] for v in rng.integers(-(10**12), 10**12, 10)], dtype=object)
    zero = np.zeros(2, dtype=np.int64)
    rule = Rule((welfare_index(setting), Index((table,) * 20, zero)))
    others = (blocks.work(setting), halves.work(setting, None), items.work(setting, rule))
    assert min(*others, sums.work(setting, rule)) > counting.MOST
    counts = counting.count(setting, rule, None, Watch())
    plain = counting.count(setting, Rule((welfare_index(setting),)), None, Watch())
    # Ties went to building; now some go either way, and nothing else has changed.
    tied = _ways_to_sum(90)
    less = plain.totals()[0] - counts.totals()[0]
    assert 0 < less < tied


def _ways_to_sum(total: int) -> int:
    ways = [1]
    for _ in range(20):
        ways = [sum(ways[max(0, s - 9) : s + 1]) for s in range(len(ways) + 9)]
    return ways[total]
