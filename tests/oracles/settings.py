"""Small random settings and demands, for comparing one way of computing with another."""

from __future__ import annotations

import math
from fractions import Fraction

from hypothesis import strategies as st

from designer.demands.terms import Demands
from designer.setting.setting import Limits, Party, Setting, Type, integers

NAMES = ("Aster", "Briar", "Clover")


@st.composite
def small_settings(
    draw: st.DrawFn,
    *,
    most_profiles: int = 8,
    most_options: int = 3,
    correlated: bool = True,
    with_rule: bool = False,
    interdependent: bool = True,
    outlays: bool = True,
) -> Setting:
    """Up to three parties of up to three types; whole worths over a grain of 1, 2 or 3.

    Priors are independent or joint (then with zeros at times); worths and outside options
    are private or depend on everyone's types; some parties are compelled. The switches leave
    out what a test has no use for.
    """
    count = draw(st.sampled_from((2, 1, 3)))
    shape: list[int] = []
    for _ in range(count):
        shape.append(draw(st.integers(1, max(1, min(3, most_profiles // math.prod(shape))))))
    profiles = math.prod(shape)
    options = draw(st.integers(1, most_options))
    depends = interdependent and draw(st.booleans()) and draw(st.booleans())
    joint = None
    if correlated and draw(st.booleans()):
        joint = draw(st.lists(st.integers(0, 4), min_size=profiles, max_size=profiles))
    weights = [draw(st.lists(st.integers(1, 4), min_size=t, max_size=t)) for t in shape]
    if joint is not None:
        sums = [[0] * t for t in shape]
        for number, weight in enumerate(joint):
            for i, a in enumerate(_positions(number, shape)):
                sums[i][a] += weight
        if all(total for row in sums for total in row):
            weights = sums
        else:
            joint = None  # a type of no probability is an input error
    parties = tuple(
        Party(
            name=NAMES[i],
            types=tuple(Type(str(a), Fraction(a)) for a in range(shape[i])),
            weights=tuple(weights[i]),
            value=_table(draw, (profiles if depends else shape[i], options), -3, 6),
            outside=_table(draw, (profiles if depends else shape[i],), -1, 2),
            depends=depends,
            outside_depends=depends,
            compelled=draw(st.integers(0, 5)) == 0,
        )
        for i in range(count)
    )
    rule = None
    if with_rule:
        picks = draw(st.lists(st.integers(0, options - 1), min_size=profiles, max_size=profiles))
        rule = integers([[2 * (k == pick) for k in range(options)] for pick in picks])
    return Setting(
        title="random",
        options=tuple(f"option {k}" for k in range(options)),
        parties=parties,
        outlay=_table(draw, (options,), 0, 5 if outlays else 0),
        worth=_table(draw, (options,), -1, 1),
        grain=draw(st.integers(1, 3)),
        joint=None if joint is None else integers(joint),
        rule=rule,
        rule_den=2 if with_rule else 1,
        support_only=draw(st.booleans()),
        digest="0" * 64,
    )


def small_demands(
    goals: tuple[str, ...],
    decisions: tuple[str, ...] = ("efficient", "randomized"),
    limited: bool = False,
) -> st.SearchStrategy[Demands]:
    """Demands that go together; limits on payments only if asked for."""
    caps = st.one_of(
        st.none(),
        st.builds(
            Limits,
            pays_at_most=st.sampled_from([None, Fraction(2), Fraction(9, 2)]),
            pays_at_least=st.sampled_from([None, Fraction(-2), Fraction(-5)]),
            within_worth=st.booleans(),
        ),
    )
    return st.builds(
        Demands,
        decision=st.sampled_from(decisions),
        ic=st.sampled_from(("none", "bayesian", "dominant")),
        ir=st.sampled_from(("none", "ex-ante", "interim", "ex-post")),
        balance=st.sampled_from(("none", "ex-ante", "ex-post")),
        budget=st.sampled_from(("exact", "no-deficit")),
        goal=st.sampled_from(goals),
        subsidy=st.sampled_from((0, 1, "1/2")),
        limits=caps if limited else st.none(),
    ).filter(_askable)


def _askable(demands: Demands) -> bool:
    if demands.goal == "outside-money" and demands.balance == "none":
        return False
    return not (demands.goal == "margin" and demands.ic == "none")


def _table(draw: st.DrawFn, shape: tuple[int, ...], low: int, high: int):  # type: ignore[no-untyped-def]
    size = math.prod(shape)
    entries = draw(st.lists(st.integers(low, high), min_size=size, max_size=size))
    return integers(entries, shape)


def _positions(number: int, shape: list[int]) -> tuple[int, ...]:
    positions = []
    for size in reversed(shape):
        number, position = divmod(number, size)
        positions.append(position)
    return tuple(reversed(positions))
