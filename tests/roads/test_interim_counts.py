"""Four ways to count what a rule takes, each against a profile-by-profile count."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import settings as runs
from hypothesis import strategies as st

from designer.engines.watch import TimeUp, Watch
from designer.roads.interim import blocks, counting, halves, items, sums
from designer.roads.interim.additive import additive
from designer.roads.interim.dominance import dominance
from designer.roads.interim.rule import Counts, Index, Rule
from designer.setting.setting import Setting
from tests.roads.interim_settings import counted, invented, rules, settings


def plain(counts: Counts) -> list[list[list[list[int]]]]:
    return [[[[int(v) for v in row] for row in t] for t in part] for part in counts.taken]


@pytest.mark.parametrize("big", [False, True], ids=["words", "limbs"])
@runs(max_examples=300, deadline=None)
@given(data=st.data())
def test_passes_and_halves_count_every_profile(big: bool, data: st.DataObject) -> None:
    setting = data.draw(settings(max_options=4))
    rule = data.draw(rules(setting, big))
    lead = data.draw(st.sampled_from([None, *range(len(setting.parties))]))
    truth = counted(setting, rule, lead)
    assert plain(blocks.count(setting, rule, lead, Watch())) == truth
    assert plain(counting.count(setting, rule, lead, Watch())) == truth
    if len(setting.options) in halves.OPTIONS:
        counts = halves.count(setting, rule, lead, Watch())
        assert plain(counts) == truth
        assert halves.totals(setting, rule, Watch()) == counts.totals()


@runs(max_examples=200, deadline=None)
@given(settings(min_options=2, max_options=2), st.data())
def test_sums_count_every_profile(setting: Setting, data: st.DataObject) -> None:
    rule = data.draw(rules(setting))
    assume(sums.span(setting, rule) < 5000)
    assert plain(sums.count(setting, rule, Watch())) == counted(setting, rule, None)


@runs(max_examples=200, deadline=None)
@given(st.data())
def test_items_count_every_profile(data: st.DataObject) -> None:
    """Each option concerns one party or none; indices stand on any level."""
    setting = data.draw(settings(max_options=4))
    options = len(setting.options)
    owners = data.draw(st.permutations([*range(options), *([None] * 4)]))
    number = st.integers(-3, 3)
    found = []
    for _ in range(data.draw(st.integers(1, 2))):
        tables = []
        for party, size in enumerate(setting.shape):
            table = np.array([[data.draw(number)] * options for _ in range(size)], dtype=object)
            own = owners[party]
            if own is not None:
                table[:, own] = [data.draw(number) for _ in range(size)]
            tables.append(table)
        found.append(
            Index(
                tuple(tables), np.array([data.draw(number) for _ in range(options)], dtype=object)
            )
        )
    rule = Rule(tuple(found))
    assume(items.concerned(additive(rule).parties) is not None)
    assert plain(items.count(setting, rule, Watch())) == counted(setting, rule, None)


@runs(max_examples=200, deadline=None)
@given(settings(max_options=4), st.data())
def test_ties_are_seen(setting: Setting, data: st.DataObject) -> None:
    """A rule is tied where the order of options matters: reversing the options shows it."""
    rule = data.draw(rules(setting))
    turned = Rule(
        tuple(
            Index(tuple(table[:, ::-1] for table in index.parties), index.options[::-1])
            for index in rule.indices
        )
    )
    back = [
        [[row[::-1] for row in table] for table in part] for part in counted(setting, turned, None)
    ]
    counts = counting.count(setting, rule, None, Watch())
    assert counting.tied(setting, rule, counts, Watch()) == (back != plain(counts))


@runs(max_examples=200, deadline=None)
@given(st.integers(1, 4), st.integers(0, 2**32 - 1), st.booleans())
def test_dominance_adds_up_the_points_beyond(axes: int, seed: int, weighed: bool) -> None:
    rng = np.random.default_rng(seed)
    size, asked = int(rng.integers(0, 40)), int(rng.integers(0, 40))
    points = [rng.integers(-6, 7, size) for _ in range(axes)]
    queries = [rng.integers(-8, 9, asked) for _ in range(axes)]
    weights = rng.integers(0, 9, size) if weighed else np.ones(size, dtype=np.int64)
    truth = [
        sum(
            int(weights[p])
            for p in range(size)
            if all(at[p] >= least[q] for at, least in zip(points, queries, strict=True))
        )
        for q in range(asked)
    ]
    assert dominance(points, weights if weighed else None, queries).tolist() == truth


@pytest.mark.parametrize(("parties", "options"), [(6, 2), (6, 3), (5, 4)])
def test_halves_agree_with_a_pass_over_many_profiles(parties: int, options: int) -> None:
    setting = invented(parties, 9, options, parties * options)
    tables = tuple(party.value for party in setting.parties)
    rule = Rule((Index(tables, setting.outlay),))
    for lead in (None, 1):
        one = blocks.count(setting, rule, lead, Watch())
        assert plain(one) == plain(halves.count(setting, rule, lead, Watch()))
    if options == 2:
        assert plain(one.merged()) == plain(sums.count(setting, rule, Watch()))


def test_weights_beyond_words() -> None:
    """Weights whose products pass 64 bits by far are counted exactly by every way."""
    setting = invented(4, 4, 2, 7, 5)
    heavy = replace(
        setting,
        parties=tuple(
            replace(party, weights=tuple(w * 10**4 + a for a, w in enumerate(party.weights)))
            for party in setting.parties
        ),
    )
    heavier = replace(
        setting,
        parties=tuple(
            replace(party, weights=tuple(w * 10**7 + a for a, w in enumerate(party.weights)))
            for party in setting.parties
        ),
    )
    rule = Rule((Index(tuple(p.value for p in setting.parties), setting.outlay),))
    for one in (heavy, heavier):
        truth = counted(one, rule, None)
        for counts in (
            halves.count(one, rule, None, Watch()),
            blocks.count(one, rule, None, Watch()),
            sums.count(one, rule, Watch()),
        ):
            assert plain(counts) == truth


def test_counting_stops_at_the_time_limit() -> None:
    setting = invented(8, 9, 5, 1)
    rule = Rule((Index(tuple(p.value for p in setting.parties), setting.outlay),))
    with pytest.raises(TimeUp):
        blocks.count(setting, rule, None, Watch(limit=0.05))


def test_hopeless_counts_are_refused_at_once() -> None:
    setting = invented(40, 10, 5, 1)
    rule = Rule((Index(tuple(p.value for p in setting.parties), setting.outlay),))
    with pytest.raises(counting.TooMany):
        counting.count(setting, rule, None, Watch())
    assert counting.too_many(setting, "randomized")
