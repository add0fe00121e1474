"""Parties alike counted by multisets, against a profile-by-profile count."""

from __future__ import annotations

import math
from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import event, given
from hypothesis import settings as runs
from hypothesis import strategies as st

from designer.engines.watch import Watch
from designer.roads.interim import alike, blocks, counting, halves
from designer.roads.interim.rule import Index, Rule
from designer.roads.multisets import multisets
from designer.setting.setting import Party, Setting, Type, integers
from tests.roads.interim_settings import counted
from tests.roads.test_interim_counts import plain


@st.composite
def crowds(draw: st.DrawFn) -> tuple[Setting, Rule]:
    """Up to seven parties of at most three kinds, in any order, and a rule that sees no more."""
    options = draw(st.integers(1, 5))
    high = draw(st.sampled_from((1, 2, 5, 2**70)))
    heavy = draw(st.sampled_from((1, 1, 10**12)))
    number = st.integers(-high, high)

    def table(size: int) -> np.ndarray[tuple[int, ...], np.dtype[np.object_]]:
        return np.array([[draw(number) for _ in range(options)] for _ in range(size)], dtype=object)

    depth = draw(st.integers(1, 2))
    kinds = []
    for _ in range(draw(st.integers(1, 3))):
        size = draw(st.integers(1, 3))
        weights = tuple(draw(st.integers(1, 3)) * heavy for _ in range(size))
        kinds.append((size, weights, [table(size) for _ in range(depth)]))
    chosen = draw(st.lists(st.sampled_from(range(len(kinds))), min_size=1, max_size=7))
    chosen.append(chosen[0])
    while math.prod(kinds[c][0] for c in chosen) > 300:
        chosen.pop()
    parties = []
    for i, c in enumerate(chosen):
        size, weights, _ = kinds[c]
        none = integers(np.zeros((size, options), dtype=object))
        types = tuple(Type(str(a)) for a in range(size))
        parties.append(Party(f"p{i}", types, weights, none, integers([0] * size)))
    none = integers([0] * options)
    setting = Setting("Drawn", tuple(map(str, range(options))), tuple(parties), none, none, 1)
    rule = Rule(
        tuple(Index(tuple(kinds[c][2][d] for c in chosen), table(1)[0]) for d in range(depth))
    )
    return setting, rule


@runs(max_examples=400, deadline=None)
@given(crowds(), st.data())
def test_multisets_count_every_profile(crowd: tuple[Setting, Rule], data: st.DataObject) -> None:
    setting, rule = crowd
    lead = data.draw(st.sampled_from([None, *range(len(setting.parties))]))
    if math.isinf(alike.work(setting, rule, lead)):
        event("nobody alike beside the lead")
        return
    truth = counted(setting, rule, lead)
    assert plain(alike.count(setting, rule, lead, Watch())) == truth
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(alike, "SWEPT", 0)
        if len(setting.options) in halves.OPTIONS:
            assert plain(alike.count(setting, rule, lead, Watch())) == truth
        else:
            assert math.isinf(alike.work(setting, rule, lead))


def crowd(
    parties: int, size: int, options: int, seed: int, high: int = 100
) -> tuple[Setting, Rule]:
    """Parties alike with drawn worths and uneven weights, and their efficient rule."""
    rng = np.random.default_rng(seed)
    value = integers(rng.integers(-high, high, (size, options)))
    weights = tuple(int(w) for w in rng.integers(1, 5, size))
    types = tuple(Type(str(a)) for a in range(size))
    none = integers([0] * options)
    members = tuple(
        Party(f"p{i}", types, weights, value, integers([0] * size)) for i in range(parties)
    )
    setting = Setting("Drawn", tuple(map(str, range(options))), members, none, none, 1)
    return setting, Rule((Index(tuple(p.value for p in members), none),))


@pytest.mark.parametrize(("parties", "options"), [(7, 2), (7, 3), (6, 4), (6, 5)])
def test_multisets_agree_with_a_pass_over_many_profiles(parties: int, options: int) -> None:
    setting, rule = crowd(parties, 6, options, parties * options)
    assert plain(alike.count(setting, rule, None, Watch())) == plain(
        blocks.count(setting, rule, 0, Watch()).merged()
    )


@runs(max_examples=100, deadline=None)
@given(st.integers(1, 8), st.lists(st.integers(1, 10**6), min_size=1, max_size=4))
def test_multinomial_weights(size: int, masses: list[int]) -> None:
    numbers, weights = multisets(size, tuple(masses))
    assert len(numbers) == math.comb(size + len(masses) - 1, size) == len(set(map(tuple, numbers)))
    assert sum(map(int, weights)) == sum(masses) ** size
    for own, weight in zip(numbers.tolist(), weights.tolist(), strict=True):
        ways = Fraction(math.factorial(size), math.prod(map(math.factorial, own)))
        assert weight == ways * math.prod(m**n for m, n in zip(masses, own, strict=True))


def test_a_crowd_beyond_every_other_way_is_counted() -> None:
    """10^20 profiles with generic worths: two chunks of ten parties, 92,378 multisets each.

    Every party is treated alike, and what is taken sums to all profiles at every type.
    """
    setting, rule = crowd(20, 10, 2, 1, 10**9)
    assert min(blocks.work(setting), halves.work(setting, None)) > counting.MOST
    counts = counting.count(setting, rule, None, Watch())
    first = counts.taken[0][0]
    assert all(np.array_equal(table, first) for table in counts.taken[0])
    each = setting.total_weight // sum(setting.parties[0].weights)
    assert [sum(row) for row in first.tolist()] == [each * w for w in setting.parties[0].weights]
    assert 0 < counts.totals()[0] < setting.total_weight


def test_two_crowds_and_a_party_between_them_in_halves_and_alone() -> None:
    """A lead party is never put together with others, though it is alike."""
    setting, rule = crowd(6, 3, 3, 4)
    odd = replace(setting.parties[0], weights=(1, 1, 1))
    mixed = replace(setting, parties=(*setting.parties[:3], odd, *setting.parties[3:]))
    rule = Rule((Index(tuple(p.value for p in mixed.parties), rule.indices[0].options),))
    for lead in (None, 0, 3):
        counts = alike.count(mixed, rule, lead, Watch())
        assert plain(counts) == plain(blocks.count(mixed, rule, lead, Watch()))
