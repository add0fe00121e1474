"""Small random designs with parties that are alike, and their proofs spread over all profiles.

`spread` turns the multipliers over representatives into multipliers of the full program, shared
evenly among the rows that a trade of places makes of one another: an ordinary document that the
plain checker can judge without knowing of the road.
"""

from __future__ import annotations

import math
from collections import defaultdict
from dataclasses import replace
from fractions import Fraction
from typing import Any

from hypothesis import strategies as st

from designer.demands.formulate import Formulation, amounts_of
from designer.demands.terms import Terms
from designer.program.labels import Decides, ExpectedDecision, ExpectedPay, Pays, Unknown
from designer.program.program import Program
from designer.proof.document import compose
from designer.proof.vector import Vector
from designer.roads.likeness.draft import LikenessDraft
from designer.roads.likeness.road import reduced
from designer.roads.settled import GoalResult
from designer.setting.likeness import twins
from designer.setting.setting import Chance, Limits, Party, Setting, Side, Type, integers
from designer.verdict import Verdict

GOALS = (
    "any",
    "outside-money",
    "revenue",
    "welfare",
    "parties",
    "floor",
    "margin",
    "blend",
    "swing",
    "worst-pot",
)
NAMES = ("Norhaven", "Suth", "Old Quay", "Weir")


@st.composite
def settings(draw: st.DrawFn, most_profiles: int = 27) -> Setting:
    """Two or three alike parties, perhaps another, or two and two; options that may move along.

    kind "common"  the same options concern all in the same way
    kind "own"     one option per alike party concerns it alone, as the sale of a lot does
    """
    alike = draw(st.sampled_from((2, 2, 3)))
    size = draw(st.integers(1, 3 if alike == 2 else 2))
    other = draw(st.sampled_from((0, 0, 1, 2))) if alike == 2 else draw(st.integers(0, 1))
    kind = draw(st.sampled_from(("common", "common", "own")))
    low = draw(st.sampled_from((0, -3)))
    small = st.integers(low, draw(st.sampled_from((2, 9))))
    options = 1 + (alike if kind == "own" else draw(st.integers(0, 2)))

    def rows(count: int) -> list[list[int]]:
        return [[draw(small) for _ in range(count)] for _ in range(size)]

    def party(name: str, value: list[list[int]], like: Party | None) -> Party:
        weights = tuple(draw(st.sampled_from((1, 1, 2, 5))) for _ in value)
        outside = integers([draw(st.sampled_from((0, 0, 1))) for _ in value])
        found = Party(
            name=name,
            types=tuple(Type(f"t{a}") for a in range(len(value))),
            weights=weights,
            value=integers(value, (len(value), options)),
            outside=outside,
            compelled=draw(st.integers(0, 5)) == 0,
        )
        return found if like is None else replace(like, name=name, value=found.value)

    def gang(count: int, names: tuple[str, ...], own: bool) -> list[Party]:
        first: Party | None = None
        made: list[Party] = []
        common, mine = rows(1 if own else options), rows(1)
        for i in range(count):
            value = (
                [
                    [common[a][0] if k == 0 else mine[a][0] * (k == i + 1) for k in range(options)]
                    for a in range(size)
                ]
                if own
                else common
            )
            made.append(party(names[i], value, first))
            first = made[0]
        return made

    parties = gang(alike, NAMES, kind == "own")
    if kind == "own":
        flat = [[draw(small)] + [draw(small)] * alike for _ in range(size)]
        parties += [party(NAMES[alike], flat, None)] * (1 if other else 0)
        spent = [draw(st.integers(0, 3))] + [draw(st.integers(0, 2))] * alike
    else:
        parties += gang(other, NAMES[alike:], own=False)
        spent = [draw(st.integers(0, 6)) for _ in range(options)]
    order = draw(st.permutations(range(len(parties))))
    setting = Setting(
        title="Drawn alike",
        options=tuple(f"k{k}" for k in range(options)),
        parties=tuple(parties[i] for i in order),
        outlay=integers(spent),
        worth=integers([0] * options),
        grain=draw(st.sampled_from((1, 1, 2))),
        digest="0" * 64,
    )
    assert setting.profiles <= 81
    if setting.profiles > most_profiles or draw(st.integers(0, 3)):
        return setting
    # a given rule that everybody's total alone decides treats alike parties alike
    shares = [[draw(st.integers(0, 2)) for _ in range(options)] for _ in range(3)]
    shares = [[v + (not any(row)) for v in row] for row in shares]
    if kind == "own":
        shares = [[row[0] + 1] + [row[0]] * alike for row in shares]
    den = math.lcm(*(sum(row) for row in shares))
    palette = [[v * den // sum(row) for v in row] for row in shares]
    rule = [palette[sum(setting.types_at(p)) % 3] for p in range(setting.profiles)]
    return replace(setting, rule=integers(rule), rule_den=den)


@st.composite
def designs(draw: st.DrawFn, lists: bool = True) -> tuple[Setting, Terms]:
    """A setting and terms of every kind that is linear."""
    setting = draw(settings())
    decisions = ["efficient", "randomized"] + ["table"] * (setting.rule is not None)
    ic = draw(st.sampled_from(("bayesian", "dominant", "dominant", "none")))
    balance = draw(st.sampled_from(("none", "ex-ante", "ex-post")))
    goals = [
        goal
        for goal in GOALS
        if not (goal == "outside-money" and balance == "none")
        and not (goal == "margin" and ic == "none")
    ]
    asked = draw(st.lists(st.sampled_from(goals), min_size=1, max_size=2 if lists else 1))
    names = [party.name for party in setting.parties]
    blend = draw(
        st.lists(
            st.tuples(
                st.sampled_from(["worth", "pot", "parties", *names]),
                st.sampled_from((Fraction(1), Fraction(-1), Fraction(1, 2))),
            ),
            min_size=1,
            max_size=2,
            unique_by=lambda pair: pair[0],
        )
    )
    limits = Limits()
    if not draw(st.integers(0, 2)):
        limits = Limits(
            pays_at_most=draw(st.sampled_from((None, Fraction(3), Fraction(5, 2)))),
            pays_at_least=draw(st.sampled_from((None, Fraction(0), Fraction(-1)))),
            within_worth=draw(st.booleans()),
            only_when_served=draw(st.booleans()),
        )
        if limits.only_when_served and limits.pays_at_most is None:
            limits = replace(limits, only_when_served=False)
    side = Side()
    if not draw(st.integers(0, 2)):
        party = draw(st.integers(0, len(setting.parties) - 1))
        a = draw(st.integers(0, setting.shape[party] - 1))
        low, high = draw(
            st.sampled_from(
                ((Fraction(1, 4), None), (None, Fraction(1, 3)), (None, Fraction(1, 2)))
            )
        )
        chance = Chance(party, a, draw(st.integers(0, len(setting.options) - 1)), low, high)
        side = Side(
            welfare_at_least=draw(st.sampled_from((None, Fraction(1)))),
            revenue_at_least=draw(st.sampled_from((None, Fraction(-1)))),
            chances=draw(st.sampled_from(((), _closed(setting, chance), _closed(setting, chance)))),
        )
    terms = Terms(
        decision=draw(st.sampled_from(decisions)),
        ic=ic,
        ir=draw(st.sampled_from(("none", "ex-ante", "interim", "ex-post", "ex-post"))),
        balance=balance,
        budget=draw(st.sampled_from(("exact", "no-deficit"))),
        goals=tuple(dict.fromkeys(asked)),
        subsidy=draw(st.sampled_from((Fraction(0), Fraction(1), Fraction(5, 2)))),
        slack=draw(st.sampled_from((Fraction(0), Fraction(0), Fraction(1, 3)))),
        shortfall=draw(st.sampled_from((Fraction(0), Fraction(0), Fraction(1, 2)))),
        tidy="none",
        compelled=frozenset(p.name for p in setting.parties if p.compelled),
        trusted=frozenset(name for name in names if draw(st.integers(0, 9)) == 0),
        limits=limits,
        side=side,
        blend=tuple(blend),
        even_handed=draw(st.integers(0, 3)) == 0,
    )
    return setting, terms


def _closed(setting: Setting, chance: Chance) -> tuple[Chance, ...]:
    """A side demand with all that trades of places make of it."""
    found = [chance]
    for seen in found:
        for i, j, move in twins(setting):
            party = {i: j, j: i}.get(seen.party, seen.party)
            other = replace(seen, party=party, option=int(move[seen.option]))
            if other not in found:
                found.append(other)
    return tuple(found)


def spread(setting: Setting, terms: Terms, verdict: Verdict) -> dict[str, Any]:
    """The verdict's document, about the full program of the same terms."""
    found = reduced(setting, terms)
    assert not isinstance(found, str)
    orbits, own = found
    draft = LikenessDraft(orbits, own.decision, amounts_of(own))
    small = Formulation(orbits.setting, own, draft=draft).pose(own.goals[0])
    whole = Formulation(orbits.setting, own).pose(own.goals[0])
    column = [
        _column(draft, small, whole.column_axis.label(j)) for j in range(whole.matrix.columns)
    ]
    scenario = {"title": setting.title, "digest": setting.digest}
    plain = {**verdict.proof["terms"], "even_handed": False}
    vector = verdict.farkas if verdict.status == "impossible" else verdict.goals[0].dual
    assert vector is not None
    dual = _shared(small, whole, column, vector)
    if verdict.status == "impossible":
        return compose(whole, verdict="impossible", scenario=scenario, terms=plain, farkas=dual)
    assert verdict.primal is not None
    values = verdict.primal.dense()
    primal = Vector.of({j: values[k] for j, k in enumerate(column) if k >= 0}, len(column))
    result = GoalResult(own.goals[0], verdict.goal_value, True, dual=dual)
    return compose(
        whole, verdict="possible", scenario=scenario, terms=plain, goals=(result,), primal=primal
    )


def _column(draft: LikenessDraft, small: Program, label: Any) -> int:
    """The column over representatives that a full column is one of."""
    import numpy as np

    setting = draft.setting
    names = [party.name for party in setting.parties]
    match label:
        case Pays(name, at):
            place = np.array([_number(setting, at)], dtype=np.int64)
            return int(draft.payment_columns(names.index(name), place)[0])
        case Decides(option, at):
            place = np.array([_number(setting, at)], dtype=np.int64)
            return int(draft.chances(place)[1][0, setting.options.index(option)])
        case ExpectedPay(name, kind):
            first = draft.orbits.likeness.group_of(names.index(name))[0]
            return _labelled(small, ExpectedPay(names[first], kind))
        case ExpectedDecision(name, kind, option):
            k = setting.options.index(option)
            group = draft.orbits.likeness.group_of(names.index(name))
            member = group.index(names.index(name))
            if member:
                k = int(draft.orbits.likeness.trade(group, 0, member)[k])
            columns, _ = draft.expected_decision(group[0])
            kinds = [t.label for t in setting.parties[group[0]].types]
            return int(columns[kinds.index(kind), k])
        case Unknown():
            return _labelled(small, label)
    raise AssertionError(label)


def _labelled(program: Program, label: Any) -> int:
    for j in range(program.matrix.columns):
        if program.column_axis.label(j) == label:
            return j
    raise AssertionError(label)


def _number(setting: Setting, at: tuple[str, ...]) -> int:
    kinds = ([kind.label for kind in party.types] for party in setting.parties)
    return setting.profile_of(tuple(labels.index(a) for labels, a in zip(kinds, at, strict=True)))


def _shared(small: Program, whole: Program, column: list[int], vector: Vector) -> Vector:
    """Multipliers over representatives, evenly shared among the rows each stands for."""
    alike: dict[Any, list[tuple[int, Fraction]]] = defaultdict(list)
    for row in range(whole.matrix.rows):
        entries: dict[int, int] = defaultdict(int)
        for j, number in _entries(whole, row):
            entries[column[j]] += number
        key, scale = _lowest(whole, row, entries)
        alike[key].append((row, scale))
    found: dict[int, Fraction] = defaultdict(Fraction)
    for row, value in vector.fractions().items():
        key, scale = _lowest(small, row, dict(_entries(small, row)))
        assert alike[key], small.row_axis.label(row)
        for place, own in alike[key]:
            found[place] += value * scale / own / len(alike[key])
    return Vector.of(found, whole.matrix.rows)


def _entries(program: Program, row: int) -> list[tuple[int, int]]:
    matrix = program.matrix
    span = range(int(matrix.indptr[row]), int(matrix.indptr[row + 1]))
    return [(int(matrix.indices[k]), int(matrix.data[k])) for k in span]


def _lowest(program: Program, row: int, entries: dict[int, int]) -> tuple[Any, Fraction]:
    """A row up to a positive factor, and that factor."""
    low, high = program.matrix.row_lo, program.matrix.row_hi
    ends = [int(low.num[row]), int(high.num[row]) if high.finite[row] else None]
    kept = {j: v for j, v in sorted(entries.items()) if v}
    shared = math.gcd(*kept.values(), *(end for end in ends if end is not None)) or 1
    key = (
        tuple((j, v // shared) for j, v in kept.items()),
        tuple(None if end is None else end // shared for end in ends),
    )
    return key, Fraction(shared)
