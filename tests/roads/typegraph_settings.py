"""Small random designs that the type-graph road can decide, and their proofs lifted.

`lifted` turns the compact multipliers of a type-graph document into multipliers of the full
program, row by row, and the table into its columns: an ordinary document that the plain
checker can judge without knowing of the road.
"""

from __future__ import annotations

import itertools
from collections.abc import Callable
from dataclasses import replace
from fractions import Fraction
from typing import Any

import numpy as np
from hypothesis import strategies as st

from designer import Demands
from designer.demands.formulate import Formulation
from designer.demands.terms import Terms
from designer.engines.watch import Watch
from designer.program.labels import (
    AtMost,
    Balances,
    Covered,
    Decides,
    ExpectedDecision,
    ExpectedPay,
    Honest,
    Label,
    Lottery,
    OnAverage,
    Paths,
    Pays,
    TakesPart,
    Unknown,
)
from designer.program.program import Program
from designer.proof.document import compose
from designer.proof.vector import Vector
from designer.roads.product import as_independent
from designer.roads.settled import GoalResult
from designer.roads.typegraph.decided import decide
from designer.roads.typegraph.evidence import read_claim, read_part
from designer.roads.typegraph.fibers import Fibers, fibers, others_weights
from designer.roads.typegraph.lotteries import Bound, Lies, Opened, on_average
from designer.roads.typegraph.mechanism import unrolled
from designer.roads.typegraph.paths import carried
from designer.roads.typegraph.road import TypeGraph
from designer.roads.typegraph.torn import places
from designer.setting.setting import Setting
from designer.verdict import Verdict
from tests.oracles.settings import small_settings

ON_AVERAGE = [
    (ir, balance, budget, goal)
    for ir in ("none", "ex-ante", "interim", "ex-post")
    for balance in ("none", "ex-ante")
    for budget in ("exact", "no-deficit")
    for goal in ("any", "outside-money", "revenue", "welfare", "parties")
    if (goal, balance) != ("outside-money", "none")
]
IN_EVERY_CASE = [
    ("ex-post", balance, "no-deficit", goal)
    for balance in ("none", "ex-post")
    for goal in ("any", "outside-money", "revenue", "welfare", "worst-pot")
    if (goal, balance) != ("outside-money", "none")
]


@st.composite
def designs(
    draw: st.DrawFn, most_profiles: int = 12, decision: str | None = None, bounded: bool = False
) -> tuple[Setting, Terms]:
    """A setting and terms that the road can decide.

    bounded  participation is asked of everybody, so that no goal grows for ever without cause
    """
    word = decision or draw(st.sampled_from(("efficient", "efficient", "table")))
    in_cases = draw(st.booleans())
    ir, balance, budget, goal = draw(st.sampled_from(IN_EVERY_CASE if in_cases else ON_AVERAGE))
    if bounded and ir == "none":
        ir = "interim"
    setting = draw(
        small_settings(
            most_profiles=most_profiles, with_rule=word == "table", correlated=ir != "interim"
        )
    )
    terms = Demands(
        decision=word,
        ic="dominant",
        ir=ir,
        balance=balance,
        budget=budget,
        goal=goal,
        subsidy=draw(st.sampled_from((Fraction(0), Fraction(1), Fraction(1, 2), Fraction(3)))),
        slack=draw(st.sampled_from((Fraction(0), Fraction(0), Fraction(1, 3)))),
        tidy="none",
        compelled=frozenset() if in_cases or bounded else None,
    ).over(setting)
    first = frozenset({setting.parties[0].name})
    trusted = draw(st.sampled_from([frozenset[str](), frozenset[str](), first]))
    shortfall = Fraction(draw(st.sampled_from((0, 0, 1))))
    found = replace(terms, trusted=trusted, shortfall=shortfall)
    assert TypeGraph().applies(setting, found) is None
    return setting, found


@st.composite
def torn_designs(draw: st.DrawFn, most_profiles: int = 18) -> tuple[Setting, Terms]:
    """Efficient designs with private worths of 0 to 2: many profiles are tied."""
    ir, balance, budget, goal = draw(st.sampled_from(ON_AVERAGE))
    ir = draw(st.sampled_from((ir, "ex-post", "interim")))
    if draw(st.integers(0, 3)) == 0:
        goal = draw(st.sampled_from(("any", "revenue", "revenue", "welfare")))
        ir, balance, budget = "ex-post", "ex-post", "no-deficit"
    setting = draw(
        small_settings(
            most_profiles=most_profiles, correlated=ir != "interim", interdependent=False
        )
    )
    few = draw(st.sampled_from((2, 3)))
    setting = replace(
        setting,
        parties=tuple(replace(party, value=party.value % few) for party in setting.parties),
        outlay=setting.outlay % 2,
        worth=setting.worth * 0,
        grain=1,
    )
    terms = Demands(
        decision="efficient",
        ic="dominant",
        ir=ir,
        balance=balance,
        budget=budget,
        goal=goal,
        subsidy=draw(st.sampled_from((Fraction(0), Fraction(1, 2)))),
        slack=draw(st.sampled_from((Fraction(0), Fraction(0), Fraction(1, 3)))),
        tidy="none",
        compelled=frozenset(),
    ).over(setting)
    first = frozenset({setting.parties[0].name})
    trusted = draw(st.sampled_from([frozenset[str](), frozenset[str](), first]))
    shortfall = Fraction(draw(st.sampled_from((0, 0, 1))))
    found = replace(terms, trusted=trusted, shortfall=shortfall)
    assert TypeGraph().applies(setting, found) is None
    return setting, found


def lifted(setting: Setting, terms: Terms, verdict: Verdict) -> dict[str, Any]:
    """The verdict's document, about the full program."""
    program = Formulation(setting, terms).pose(terms.goals[0])
    document, status = verdict.proof, verdict.status
    small = verdict.program
    scenario = {"title": setting.title, "digest": setting.digest}
    plain = document["terms"]
    primal = None if verdict.table is None else _columns(setting, program, verdict)
    if status == "unbounded":
        raise ValueError("an endless goal has a ray, not multipliers")
    vector = verdict.farkas if status == "impossible" else verdict.goals[0].dual
    assert vector is not None
    multipliers = _by_label(small, vector)
    if "cuts" in document["reduction"]:
        multipliers = _spread_cuts(setting, terms, document["reduction"], multipliers)
    elif "parties" in document["reduction"] and "rows" not in document["reduction"]:
        multipliers = _spread(setting, terms, document["reduction"], multipliers)
    cost = status != "impossible"
    dual = _completed(program, multipliers, cost)
    if status == "impossible":
        return compose(program, verdict=status, scenario=scenario, terms=plain, farkas=dual)
    result = GoalResult(terms.goals[0], verdict.goal_value, True, dual=dual)
    return compose(
        program, verdict=status, scenario=scenario, terms=plain, goals=(result,), primal=primal
    )


def _by_label(program: Program, vector: Vector) -> dict[Label, Fraction]:
    """Natural multipliers by row label."""
    num, den = program.row_scale
    return {
        program.row_axis.label(row): value * int(num[row]) / int(den[row])
        for row, value in vector.fractions().items()
    }


def _spread(
    setting: Setting, terms: Terms, reduction: dict[str, Any], small: dict[Label, Fraction]
) -> dict[Label, Fraction]:
    """Bounds on averages as what they stand for: lies and participation, case by case."""
    own = as_independent(setting) or setting
    decided = decide(own, terms.decision, Watch())
    decided = decided.choosing(unrolled(reduction["ties"], len(decided.tied)))
    found = {label: v for label, v in small.items() if not isinstance(label, (AtMost, OnAverage))}
    for i, party in enumerate(own.parties):
        charge = small.get(AtMost(party.name), Fraction(0))
        if not charge:
            continue
        work = fibers(own, terms, decided, i)
        for label, value in _party_rows(own, terms, work, reduction["parties"][i]).items():
            if value:
                found[label] = charge * value
    return found


Add = Callable[[Label, Fraction], None]


def _spread_cuts(
    setting: Setting, terms: Terms, reduction: dict[str, Any], small: dict[Label, Fraction]
) -> dict[Label, Fraction]:
    """The same where lotteries at ties are open: cuts and spelled lies, case by case."""
    own = as_independent(setting) or setting
    decided = decide(own, terms.decision, Watch())
    works = [fibers(own, terms, decided, i) for i in range(len(own.parties))]
    opened = Opened(own, terms, works)
    reduced = (AtMost, Covered, OnAverage, Lottery, Paths)
    found: dict[Label, Fraction] = {}
    spelled = {
        own.parties[i].name for i, plain in enumerate(reduction["cuts"]) if isinstance(plain, dict)
    }
    for label, value in small.items():
        if isinstance(label, reduced) or (isinstance(label, Honest) and label.party in spelled):
            continue
        found[label] = value

    def add(label: Label, value: Fraction) -> None:
        if value:
            found[label] = found.get(label, Fraction(0)) + value

    for i, plain in enumerate(reduction["cuts"]):
        party, part = own.parties[i], read_part(plain, opened, i)
        if on_average(works[i]):
            charge = small.get(AtMost(party.name), Fraction(0))
            if terms.ir == "ex-ante":
                add(TakesPart(party.name), charge)
            else:
                for a, weight in enumerate(party.weights):
                    share = Fraction(weight, sum(party.weights))
                    add(TakesPart(party.name, party.types[a].label), charge * share)
        elif isinstance(part, Lies):
            _spread_lies(opened, i, part, small, add)
        else:
            for bound in part:
                _spread_bound(opened, i, bound, small, add)
    for profile, trails in reduction.get("pots", []):
        value = small.get(Covered(own.labels_at(profile)), Fraction(0))
        _spread_pot(own, profile, trails, value, add)
    return found


def _spread_pot(
    setting: Setting, profile: int, trails: list[list[int]], value: Fraction, add: Add
) -> None:
    """The lies and participation on the paths into one pot."""
    add(Balances(setting.labels_at(profile)), value)
    types = list(setting.types_at(profile))
    for i, (party, path) in enumerate(zip(setting.parties, trails, strict=True)):
        at = [setting.labels_at(setting.profile_of((*types[:i], a, *types[i + 1 :]))) for a in path]
        for here, there in itertools.pairwise(at):
            add(_lie(party.name, here, here[i], there[i]), value)
        add(TakesPart(party.name, at[-1][i], at[-1]), value)


def _spread_bound(
    opened: Opened, i: int, bound: Bound, small: dict[Label, Fraction], add: Add
) -> None:
    """One bound: the classes that no tie touches by its own row, torn profiles by their cuts."""
    setting, found, party = opened.setting, opened.torn[i], opened.setting.parties[i]
    work = found.work
    worst = None if bound.root == "own" else party.types[int(bound.root)].label
    charge = small.get(AtMost(party.name, worst), Fraction(0))
    if worst is not None:
        add(TakesPart(party.name, worst), charge)
    flows: list[tuple[int, Any, Any, Fraction]] = []
    for r in range(len(work.of)):
        place = np.flatnonzero(found.even == work.of[r])
        if len(place):
            one = replace(found, others=np.array([r]))
            sinks, mass = one.sinks(), 1
            if setting.joint is None:
                mass = int(others_weights(setting, i)[r])
            flows.append((r, bound.even[place], sinks, charge * Fraction(mass, work.total)))
    numbers: dict[int, int] = {}
    for graph, tree in zip(bound.graph.tolist(), bound.trees, strict=True):
        number = numbers.get(graph, 0)
        numbers[graph] = number + 1
        value = small.get(Paths(party.name, opened.others(i, graph), number, worst), Fraction(0))
        sinks = found.sinks()[graph : graph + 1]
        r = int(found.others[graph])
        flows.append((r, tree[None], sinks, value / int(sinks.sum())))
    for r, trees, sinks, value in flows:
        carry = carried(trees, sinks.astype(object))[0]
        at = [setting.labels_at(int(p)) for p in places(work, np.array([r]))[0]]
        for a, b in enumerate(trees[0].tolist()):
            true = at[a][i]
            if a != b:
                add(_lie(party.name, at[a], true, at[b][i]), value * int(carry[a]))
            elif worst is None:
                add(TakesPart(party.name, true, at[a]), value * int(carry[a]))


def _spread_lies(
    opened: Opened, i: int, lies: Lies, small: dict[Label, Fraction], add: Add
) -> None:
    """The lies of one graph, shared among the others' profiles that have it."""
    setting, found, name = opened.setting, opened.spelled(i), opened.setting.parties[i].name
    work, weights = found.work, others_weights(setting, i)
    even = len(opened.torn[i].even)
    for graph, a, b in lies.listed.tolist():
        first = int(found.others[graph])
        members = np.flatnonzero(work.of == work.of[first]) if graph < even else [first]
        at = setting.labels_at(int(places(work, np.array([first]))[0, a]))
        labels = [kind.label for kind in setting.parties[i].types]
        value = small.get(Honest(name, labels[a], labels[b], at), Fraction(0))
        for r in members:
            here = setting.labels_at(int(places(work, np.array([r]))[0, a]))
            share = Fraction(int(weights[r]), int(found.masses[graph]))
            add(Honest(name, labels[a], labels[b], here), value * share)


def _party_rows(setting: Setting, terms: Terms, work: Fibers, plain: Any) -> dict[Label, Fraction]:
    """Multipliers of one party's rows that add up to E[t_i] <= the most."""
    claim = read_claim(plain, work)
    party = setting.parties[work.party]
    if terms.ir == "ex-ante":
        return {TakesPart(party.name): Fraction(1)}
    found: dict[Label, Fraction] = {}
    size, total = work.types, setting.total_weight
    others = [n for j, n in enumerate(setting.shape) if j != work.party]
    weights = others_weights(setting, work.party) if setting.joint is None else None
    flow = claim.flow
    if terms.ir == "interim":
        for a in range(size):
            share = Fraction(party.weights[a], sum(party.weights))
            if claim.root == "zero" or claim.root == "own":
                found[TakesPart(party.name, party.types[a].label)] = share
            elif flow is not None:
                found[TakesPart(party.name, party.types[a].label)] = Fraction(
                    flow.roots[a], flow.den
                )
            elif claim.root == a:
                found[TakesPart(party.name, party.types[a].label)] = Fraction(1)
        if claim.root in ("zero", "own") and size == 1:
            return found
    for r, rest in enumerate(itertools.product(*map(range, others))):
        g = int(work.of[r])

        def at(a: int, rest: tuple[int, ...] = rest) -> tuple[str, ...]:
            types = (*rest[: work.party], a, *rest[work.party :])
            return setting.labels_at(setting.profile_of(types))

        if flow is not None and weights is not None:
            whole = total // sum(party.weights)
            for place, true, told, amount in flow.lies:
                if place == g:
                    part = Fraction(amount, flow.den * whole) * int(weights[r]) / int(work.mass[g])
                    label = _lie(party.name, at(true), at(true)[work.party], at(told)[work.party])
                    found[label] = part
            continue
        assert claim.tree is not None
        sinks = work.sinks(r, r + 1) if weights is None else None
        own = np.array([int(w) for w in party.weights], dtype=object)
        held = sinks.astype(object) if sinks is not None else own[None] * int(weights[r])  # type: ignore[index]
        carry = carried(claim.tree[g : g + 1], held)[0]
        for a in range(size):
            b = int(claim.tree[g, a])
            if a != b:
                label = _lie(party.name, at(a), at(a)[work.party], at(b)[work.party])
                found[label] = Fraction(int(carry[a]), total)
            elif terms.ir == "ex-post":
                found[TakesPart(party.name, at(a)[work.party], at(a))] = Fraction(
                    int(carry[a]), total
                )
    return found


def _lie(name: str, at: tuple[str, ...], true: str, told: str) -> Label:
    return Honest(name, true, told, at)


def _completed(program: Program, known: dict[Label, Fraction], cost: bool) -> Vector:
    """The multipliers over all rows: those that only define, or make lotteries, follow."""
    stage = program.stages[0]
    matrix = program.matrix
    sign = -1 if stage.sense == "max" else 1
    left = [sign * Fraction(int(c), stage.cost_den) if cost else Fraction(0) for c in stage.cost]
    num, den = program.row_scale
    entries: dict[int, Fraction] = {}
    missing = dict(known)

    def use(row: int, value: Fraction) -> None:
        entries[row] = value
        for k in range(int(matrix.indptr[row]), int(matrix.indptr[row + 1])):
            left[int(matrix.indices[k])] -= value * int(matrix.data[k])

    defining, lotteries = [], []
    for row in range(matrix.rows):
        label = program.row_axis.label(row)
        if isinstance(label, (ExpectedPay, ExpectedDecision)):
            defining.append(row)
        elif isinstance(label, Lottery):
            lotteries.append(row)
        elif label in missing:
            use(row, missing.pop(label) * int(den[row]) / int(num[row]))
    for row in defining:
        label = program.row_axis.label(row)
        for k in range(int(matrix.indptr[row]), int(matrix.indptr[row + 1])):
            if program.column_axis.label(int(matrix.indices[k])) == label:
                use(row, left[int(matrix.indices[k])] / int(matrix.data[k]))
                break
    for row in lotteries:
        span = range(int(matrix.indptr[row]), int(matrix.indptr[row + 1]))
        use(row, min(left[int(matrix.indices[k])] / int(matrix.data[k]) for k in span))
    assert all(isinstance(label, Lottery) for label in missing), missing
    return Vector.of(entries, matrix.rows)


def _columns(setting: Setting, program: Program, verdict: Verdict) -> Vector:
    """The table as a point of the full program."""
    table = verdict.table
    assert table is not None
    entries: dict[int, Fraction] = {}
    parties = {party.name: i for i, party in enumerate(setting.parties)}
    everywhere = range(setting.profiles)
    for column in range(program.matrix.columns):
        label = program.column_axis.label(column)
        match label:
            case Pays(name, at):
                entries[column] = table.payment(parties[name], _number(setting, at))
            case Decides(option, at):
                k = setting.options.index(option)
                entries[column] = table.chance(_number(setting, at), k)
            case ExpectedPay(name, kind):
                i = parties[name]
                entries[column] = _mean(setting, i, kind, [table.payment(i, p) for p in everywhere])
            case ExpectedDecision(name, kind, option):
                k = setting.options.index(option)
                chances = [table.chance(p, k) for p in everywhere]
                entries[column] = _mean(setting, parties[name], kind, chances)
            case Unknown():
                assert verdict.goal_value is not None
                entries[column] = verdict.goal_value
    return Vector.of(entries, program.matrix.columns)


def _number(setting: Setting, at: tuple[str, ...]) -> int:
    kinds = ([kind.label for kind in party.types] for party in setting.parties)
    places = tuple(labels.index(a) for labels, a in zip(kinds, at, strict=True))
    return setting.profile_of(places)


def _mean(setting: Setting, i: int, kind: str, values: list[Fraction]) -> Fraction:
    """The average of a value per profile, given one party's type."""
    total = weight = Fraction(0)
    for profile, value in enumerate(values):
        if setting.labels_at(profile)[i] == kind:
            chance = setting.probability(profile)
            weight += chance
            total += chance * value
    return total / weight
