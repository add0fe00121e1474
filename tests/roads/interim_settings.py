"""Random small questions the interim road can be asked, and what both roads say to them."""

from __future__ import annotations

import itertools
import math
from dataclasses import replace
from fractions import Fraction

import numpy as np
from hypothesis import strategies as st

from designer.demands.terms import Terms
from designer.roads.interim.rule import Index, Rule
from designer.setting.setting import Chance, Party, Setting, Side, Type, integers

GOALS = ("any", "outside-money", "revenue", "welfare", "parties", "floor", "margin", "blend")
NAMES = ("Norhaven", "Suth", "Old Quay", "Weir")


@st.composite
def settings(
    draw: st.DrawFn,
    *,
    min_parties: int = 1,
    max_parties: int = 4,
    max_types: int = 3,
    min_options: int = 1,
    max_options: int = 3,
) -> Setting:
    """Independent private settings; few different numbers, so that ties are frequent."""
    count = draw(st.integers(min_parties, max_parties))
    options = draw(st.integers(min_options, max_options))
    most = max_types if count < 4 else 2
    grain = draw(st.sampled_from((1, 1, 2, 3)))
    high = draw(st.sampled_from((1, 3, 9)))
    small = st.integers(-high, high)
    parties = []
    for i in range(count):
        size = draw(st.integers(1, most))
        rows = [[draw(small) for _ in range(options)] for _ in range(size)]
        flat = draw(st.booleans())
        parties.append(
            Party(
                name=NAMES[i],
                types=tuple(Type(f"t{a}") for a in range(size)),
                weights=tuple(draw(st.sampled_from((1, 1, 1, 2, 5))) for _ in range(size)),
                value=integers(rows, (size, options)),
                outside=integers([0 if flat else draw(small) for _ in range(size)]),
                compelled=draw(st.integers(0, 5)) == 0,
            )
        )
    setting = Setting(
        title="Drawn",
        options=tuple(f"k{k}" for k in range(options)),
        parties=tuple(parties),
        outlay=integers([draw(st.integers(0, high)) for _ in range(options)]),
        worth=integers([draw(st.integers(0, 1)) * draw(small) for _ in range(options)]),
        grain=grain,
        digest="0" * 64,
    )
    if draw(st.integers(0, 2)):
        return setting
    shares = [[draw(st.integers(0, 2)) for _ in range(options)] for _ in range(setting.profiles)]
    shares = [[s + (not any(row)) for s in row] for row in shares]
    den = math.lcm(*(sum(row) for row in shares))
    rule = integers([[s * den // sum(row) for s in row] for row in shares])
    return replace(setting, rule=rule, rule_den=den)


def amounts(low: int = 0, high: int = 4) -> st.SearchStrategy[Fraction]:
    """Exact amounts, often 0."""
    return st.one_of(
        st.just(Fraction(0)),
        st.builds(Fraction, st.integers(low, high), st.sampled_from((1, 2, 3))),
    )


@st.composite
def questions(draw: st.DrawFn, max_parties: int = 4) -> tuple[Setting, Terms]:
    """A setting and terms that the interim road takes."""
    setting = draw(settings(max_parties=max_parties))
    decisions = ["efficient", "randomized"] + ["table"] * (setting.rule is not None)
    balance = draw(st.sampled_from(("none", "ex-ante", "ex-post")))
    if len(setting.parties) == 1 and balance == "ex-post":
        balance = "ex-ante"
    ic = draw(st.sampled_from(("bayesian", "bayesian", "none")))
    goals = [
        goal
        for goal in GOALS
        if not (goal == "outside-money" and balance == "none")
        and not (goal == "margin" and ic == "none")
    ]
    names = [party.name for party in setting.parties]
    blend = tuple(
        (name, draw(st.sampled_from((Fraction(1), Fraction(-1), Fraction(1, 2)))))
        for name in draw(
            st.lists(
                st.sampled_from(["worth", "pot", "parties", *names]),
                unique=True,
                min_size=1,
                max_size=3,
            )
        )
    )
    terms = Terms(
        decision=draw(st.sampled_from(decisions)),
        ic=ic,
        ir=draw(st.sampled_from(("none", "ex-ante", "interim", "interim"))),
        balance=balance,
        budget=draw(st.sampled_from(("exact", "no-deficit"))),
        goals=(draw(st.sampled_from(goals)),),
        subsidy=draw(amounts(-2)),
        slack=draw(amounts()),
        shortfall=draw(amounts()),
        tidy="none",
        compelled=frozenset(p.name for p in setting.parties if p.compelled),
        trusted=frozenset(name for name in names if draw(st.integers(0, 6)) == 0),
        side=draw(sides(setting)),
        blend=blend,
    )
    return setting, terms


def in_order(setting: Setting, terms: Terms, data: st.DataObject) -> tuple[Setting, Terms]:
    """The question with two or three goals, one after the other."""
    others = [
        goal
        for goal in GOALS
        if goal != terms.goals[0]
        and not (goal == "outside-money" and terms.balance == "none")
        and not (goal == "margin" and terms.ic == "none")
    ]
    more = data.draw(st.lists(st.sampled_from(others), min_size=1, max_size=2, unique=True))
    return setting, replace(terms, goals=(*terms.goals, *more))


@st.composite
def sides(draw: st.DrawFn, setting: Setting) -> Side:
    """Side demands, half of the time none."""
    if draw(st.booleans()):
        return Side()
    chances = []
    for _ in range(draw(st.integers(0, 2))):
        party = draw(st.integers(0, len(setting.parties) - 1))
        low = draw(st.sampled_from((None, Fraction(0), Fraction(1, 3))))
        high = draw(st.sampled_from((None, Fraction(1, 3), Fraction(1))))
        if low is None and high is None:
            low = Fraction(1, 4)
        chances.append(
            Chance(
                party,
                draw(st.integers(0, setting.shape[party] - 1)),
                draw(st.integers(0, len(setting.options) - 1)),
                low,
                high,
            )
        )
    floors = st.one_of(st.none(), amounts(-6, 3))
    return Side(draw(floors), draw(floors), tuple(chances))


@st.composite
def rules(draw: st.DrawFn, setting: Setting, big: bool = False) -> Rule:
    """Lexicographic index rules with many ties; `big` adds numbers beyond 64 bits."""
    high = draw(st.sampled_from((1, 2, 5, 2**20)))
    scales = (1, 2**50, 2**90 + 1, 3**60) if big else (1,)
    found = []
    for _ in range(draw(st.integers(1, 3))):
        scale = draw(st.sampled_from(scales))

        def table(
            size: int, scale: int = scale
        ) -> np.ndarray[tuple[int, ...], np.dtype[np.object_]]:
            drawn = [
                [draw(st.integers(-high, high)) * scale for _ in setting.options]
                for _ in range(size)
            ]
            return np.array(drawn, dtype=object)

        found.append(Index(tuple(table(size) for size in setting.shape), table(1)[0]))
    return Rule(tuple(found))


def counted(setting: Setting, rule: Rule, lead: int | None) -> list[list[list[list[int]]]]:
    """What `count` should say, profile by profile: [slice][party][type][option]."""
    slices = 1 if lead is None else setting.shape[lead]
    tables = [
        [[[0] * len(setting.options) for _ in range(size)] for size in setting.shape]
        for _ in range(slices)
    ]
    for types in itertools.product(*(range(size) for size in setting.shape)):
        weight = math.prod(p.weights[a] for p, a in zip(setting.parties, types, strict=True))
        best = list(range(len(setting.options)))
        for index in rule.indices:
            score = {
                k: int(index.options[k])
                + sum(int(table[a][k]) for table, a in zip(index.parties, types, strict=True))
                for k in best
            }
            best = [k for k in best if score[k] == max(score.values())]
        place = 0 if lead is None else types[lead]
        for party, a in enumerate(types):
            tables[place][party][a][best[0]] += weight
    return tables


@st.composite
def lines(draw: st.DrawFn) -> tuple[Setting, Terms]:
    """One-dimensional types, a free rule and a known worst-off type, and what to ask of them."""
    count = draw(st.integers(1, 3))
    options = draw(st.integers(2, 4 if count > 1 else 3))
    form = draw(st.sampled_from(("item", "any")))
    parties = []
    for i in range(count):
        size = draw(st.integers(1, 4 if count < 3 else 3))
        thetas = draw(st.lists(st.integers(-3, 9), min_size=size, max_size=size, unique=True))
        slopes = [draw(st.integers(0, 2)) for _ in range(options)]
        if form == "item":
            slopes = [int(k == i + 1) for k in range(options)]
        turn = draw(st.sampled_from((1, -1)))
        base = [draw(st.integers(-2, 2)) for _ in range(options)]
        rows = [
            [turn * slope * theta + b for slope, b in zip(slopes, base, strict=True)]
            for theta in thetas
        ]
        level = draw(st.integers(-2, 2))
        # Staying out is worth a constant, or as much as the best option brings.
        best = turn * (max(slopes) if draw(st.booleans()) else 0)
        parties.append(
            Party(
                name=NAMES[i],
                types=tuple(Type(f"t{a}") for a in range(size)),
                weights=tuple(draw(st.integers(1, 5)) for _ in range(size)),
                value=integers(rows, (size, options)),
                outside=integers([best * theta + level for theta in thetas]),
            )
        )
    setting = Setting(
        title="Drawn",
        options=tuple(f"k{k}" for k in range(options)),
        parties=tuple(parties),
        outlay=integers([draw(st.integers(0, 6)) for _ in range(options)]),
        worth=integers([draw(st.integers(0, 3)) for _ in range(options)]),
        grain=draw(st.sampled_from((1, 2))),
        digest="0" * 64,
    )
    goal = draw(
        st.sampled_from(("welfare", "welfare", "welfare", "revenue", "outside-money", "any"))
    )
    balances = ["ex-ante", *(["ex-post"] if count > 1 else [])]
    balances += ["none"] if goal != "outside-money" else []
    terms = Terms(
        decision=draw(st.sampled_from(("randomized", "randomized", "efficient"))),
        balance=draw(st.sampled_from(balances)),
        budget=draw(st.sampled_from(("exact", "no-deficit"))),
        goals=(goal,),
        subsidy=draw(amounts(-3, 6)),
        shortfall=draw(amounts(0, 2)),
        tidy="none",
    )
    return setting, terms


def invented(parties: int, size: int, options: int, seed: int, high: int = 1000) -> Setting:
    """Any number of parties with drawn worths and uneven weights."""
    rng = np.random.default_rng(seed)
    return Setting(
        title="Drawn",
        options=tuple(f"k{k}" for k in range(options)),
        parties=tuple(
            Party(
                f"p{i}",
                tuple(Type(str(a)) for a in range(size)),
                tuple(int(w) for w in rng.integers(1, 4, size)),
                integers(rng.integers(-high, high, (size, options))),
                integers([0] * size),
            )
            for i in range(parties)
        ),
        outlay=integers([0] * options),
        worth=integers([0] * options),
        grain=1,
        digest="0" * 64,
    )
