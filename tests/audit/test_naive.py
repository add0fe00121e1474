"""The audit against the naive one of this folder, on random settings and random tables."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from designer.auditing import Audit, audit, honesty
from designer.auditing.view import see
from designer.setting.setting import Limits, Setting
from designer.table import Table
from tests.audit.naive import Naive
from tests.oracles.settings import small_settings as plain_settings
from tests.strategies import small_settings

FEW = (Fraction(0), Fraction(1), Fraction(-1, 2), Fraction(7, 3), Fraction(5))


@st.composite
def tables(draw: st.DrawFn, setting: Setting) -> Table:
    """Payments from a few values (so that ties occur) or at random, some of them enormous."""
    options, profiles = len(setting.options), setting.profiles
    form = draw(st.sampled_from(("sure", "lottery", "broken")))
    decides: list[list[Fraction | int]] = []
    for _ in range(profiles):
        if form == "sure":
            pick = draw(st.integers(0, options - 1))
            decides.append([int(k == pick) for k in range(options)])
        else:
            low = -1 if form == "broken" else 0
            shares = [draw(st.integers(low, 3)) for _ in range(options)]
            shares[0] += 1 if form == "broken" or sum(shares) == 0 else 0
            den = sum(shares) if form == "lottery" else 4
            decides.append([Fraction(share, den) for share in shares])
    factor = Fraction(draw(st.sampled_from(("1", "1", "1/7", "1e9", "1e30"))))
    amount = st.sampled_from(FEW) | st.fractions(-9, 9, max_denominator=6)
    flat = draw(
        st.lists(
            amount,
            min_size=profiles * len(setting.parties),
            max_size=profiles * len(setting.parties),
        )
    )
    pays: list[list[Fraction | int]] = [
        [value * factor for value in flat[i * profiles : (i + 1) * profiles]]
        for i in range(len(setting.parties))
    ]
    return Table.of(decides, pays)


@st.composite
def cases(draw: st.DrawFn) -> tuple[Setting, Table]:
    setting = draw(small_settings(max_types=4, extras=None) | plain_settings(most_profiles=12))
    return setting, draw(tables(setting))


def check_places(checked: Audit, naive: Naive) -> None:
    """Every finding's margin is really met where it says."""
    setting = checked.setting
    names = [party.name for party in setting.parties]
    for name in ("ic-bayesian", "ic-dominant", "ir-interim", "ir-ex-post"):
        finding = checked.worst[name]
        if finding.margin is None:
            continue
        assert finding.party is not None
        i = names.index(finding.party)
        labels = [kind.label for kind in setting.parties[i].types]
        assert finding.type is not None
        own = labels.index(finding.type)
        lie = own if finding.lie is None else labels.index(finding.lie)
        if finding.profile is None:
            met = naive.bayesian(i, own)[lie] if finding.lie else naive.gain(i, own)
        else:
            p = tuple(
                [kind.label for kind in party.types].index(finding.profile[party.name])
                for party in setting.parties
            )
            assert p[i] == own
            said = naive.replaced(p, i, lie)
            rest = naive.u(i, p, said) if finding.lie else naive.outside(i, p)
            met = naive.u(i, p, p) - rest
        assert met == finding.margin


@given(cases(), st.sampled_from((Fraction(0), Fraction(3, 2))))
@settings(max_examples=150, deadline=None)
def test_every_margin_is_the_naive_one(case: tuple[Setting, Table], subsidy: Fraction) -> None:
    setting, table = case
    checked, naive = audit(setting, table, subsidy=subsidy), Naive(setting, table)
    expected = naive.margins(subsidy)
    assert {name: finding.margin for name, finding in checked.worst.items()} == expected
    assert dict(checked.holds) == {
        name: margin is None or margin >= 0 for name, margin in expected.items()
    }
    check_places(checked, naive)
    for finding in checked.excused:
        i = setting.party_index(finding.party or "")
        assert finding.margin == naive.participation(i)[finding.demand]
    for profile, number in naive.number.items():
        assert checked.pot[number] == naive.pot(profile)
    i = setting.party_index(checked.largest.party)
    at = [checked.largest.profile[party.name] for party in setting.parties]
    assert tuple(at) in {setting.labels_at(n) for n in range(setting.profiles)}
    p = next(p for p, n in naive.number.items() if setting.labels_at(n) == tuple(at))
    assert checked.largest.amount == naive.t(i, p)
    assert abs(checked.largest.amount) == max(
        abs(naive.t(i, p)) for p in naive.all for i in range(len(setting.parties))
    )


@given(cases())
@settings(max_examples=75, deadline=None)
def test_every_standing_is_the_naive_one(case: tuple[Setting, Table]) -> None:
    setting, table = case
    naive = Naive(setting, table)
    rows = iter(audit(setting, table).standings)
    for i, party in enumerate(setting.parties):
        for own, kind in enumerate(party.types):
            row = next(rows)
            met = naive.given(i, own)
            assert (row.party, row.type) == (party.name, kind.label)
            assert row.probability == sum(c for p, c in naive.chance.items() if p[i] == own)
            assert row.pays == sum(c * naive.t(i, p) for p, c in met.items())
            assert row.worth == sum(c * naive.worth(i, p, p) for p, c in met.items())
            assert row.utility == row.worth - row.pays
            assert row.outside == sum(c * naive.outside(i, p) for p, c in met.items())
            assert row.gain == naive.gain(i, own)
            lies = {party.types[b].label: m for b, m in naive.bayesian(i, own).items()}
            if row.lie is None:
                assert not lies
                assert row.margin is None
            else:
                assert row.margin == lies[row.lie] == min(lies.values())
    assert next(rows, None) is None


@given(cases())
@settings(max_examples=75, deadline=None)
def test_the_decisions_are_judged_as_the_naive_audit_judges_them(
    case: tuple[Setting, Table],
) -> None:
    setting, table = case
    naive, found = Naive(setting, table), audit(setting, table).decisions
    rows = [[naive.x(k, p) for k in naive.options] for p in naive.all]
    assert found.lottery.holds == all(min(row) >= 0 and sum(row) == 1 for row in rows)
    zero = Fraction(0)
    off = max(max(abs(sum(row, zero) - 1), -min(row)) for row in rows)
    assert found.lottery.violation == max(zero, off)
    assert found.certain == all(sorted(row)[-1] == sum(map(abs, row)) == 1 for row in rows)
    assert found.efficient.violation == max(Fraction(0), *map(naive.lost, naive.all))
    assert found.lost == sum(c * naive.lost(p) for p, c in naive.chance.items())
    assert found.welfare == sum(
        c * naive.x(k, p) * naive.welfare(k, p)
        for p, c in naive.chance.items()
        for k in naive.options
    )
    if setting.rule is None:
        assert found.follows is None
    else:
        assert found.follows is not None
        assert found.follows.violation == max(
            abs(naive.x(k, p) - Fraction(int(setting.rule[n, k]), setting.rule_den))
            for n, p in enumerate(naive.all)
            for k in naive.options
        )


@given(cases(), st.sampled_from((None, Fraction(2), Fraction(-1, 3))))
@settings(max_examples=75, deadline=None)
def test_limits_are_judged_as_they_are_defined(
    case: tuple[Setting, Table], cap: Fraction | None
) -> None:
    setting, table = case
    limits = Limits(cap, None if cap is None else -cap, only_when_served=True, within_worth=True)
    found, naive = audit(setting, table, limits=limits).limits, Naive(setting, table)
    cells = [(i, p) for i in range(len(setting.parties)) for p in naive.all]

    def served(i: int, p: tuple[int, ...]) -> Fraction:
        return sum((naive.x(k, p) for k in naive.options if naive.value(i, k, p) > 0), Fraction(0))

    assert found["within_worth"].margin == min(naive.u(i, p, p) for i, p in cells)
    if cap is None:
        unserved = [-naive.t(i, p) for i, p in cells if served(i, p) == 0]
        assert found["only_when_served"].margin == min(unserved, default=None)
    else:
        rests = [cap * served(i, p) - naive.t(i, p) for i, p in cells]
        assert found["only_when_served"].margin == min(rests)
        assert found["pays_at_most"].margin == min(cap - naive.t(i, p) for i, p in cells)
        assert found["pays_at_least"].margin == min(naive.t(i, p) + cap for i, p in cells)
    for n, chance in enumerate(setting.side.chances):
        met = naive.given(chance.party, chance.type)
        value = sum(c * naive.x(chance.option, p) for p, c in met.items())
        ends = [value - chance.at_least] if chance.at_least is not None else []
        ends += [chance.at_most - value] if chance.at_most is not None else []
        assert found[f"chance[{n}]"].margin == min(ends)


@given(cases())
@settings(max_examples=100, deadline=None)
def test_both_ways_to_the_closest_lie_agree(case: tuple[Setting, Table]) -> None:
    """Going by the lotteries that lies lead to is an optimisation; going by lies is plain."""
    setting, table = case
    for index, party in enumerate(setting.parties):
        view = see(setting, table, index)
        if party.size == 1:
            continue
        which, lotteries = honesty._lotteries(view.chosen)
        assert np.array_equal(lotteries[which], view.chosen)
        slow, told_slow = honesty._by_type(view)
        fast, told_fast = honesty._by_lottery(view, which, lotteries)
        assert np.array_equal(slow, fast)
        for a in range(party.size):
            for o in range(view.others):
                said = int(told_fast[a, o])
                assert said != a
                assert int(told_slow[a, o]) != a
                worth = sum(
                    int(view.chosen[said, o, k])
                    * int(view.value[a, min(o, view.value.shape[1] - 1), k])
                    for k in range(len(setting.options))
                )
                honest = int(view.truthful[a, o])
                assert honest - worth + int(view.pays[said, o]) == int(fast[a, o])
