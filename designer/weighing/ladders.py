"""Weaker and stronger forms of each demand, and which of them settle the matter.

ic       dominant > bayesian > none              balance  ex-post > ex-ante > none
ir       ex-post > interim > ex-ante > none      budget   exact > no-deficit
decision deterministic, efficient, table > randomized ('free')
"""

from __future__ import annotations

import itertools
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace
from typing import Any, cast

from designer.demands.terms import Terms
from designer.weighing.groups import may_free_decision
from designer.weighing.oracle import Oracle

RUNGS: dict[str, tuple[str, ...]] = {
    "ic": ("dominant", "bayesian", "none"),
    "ir": ("ex-post", "interim", "ex-ante", "none"),
    "balance": ("ex-post", "ex-ante", "none"),
    "budget": ("exact", "no-deficit"),
    "decision": ("deterministic", "randomized"),
}
"""Strongest first."""


@dataclass(frozen=True)
class Ladder:
    """One demand alone: what is asked, and the strongest weaker form that cures the mix.

    settled  None if no weaker form of this demand alone is enough
    tried     the forms that were posed, with whether each cures
    """

    demand: str
    asked: str
    settled: str | None
    tried: tuple[tuple[str, bool], ...]
    proved: bool


@dataclass(frozen=True)
class Step:
    """A combination of forms; only what differs from what is asked is named."""

    forms: tuple[tuple[str, str], ...]
    proved: bool


def below(terms: Terms, demand: str) -> tuple[str, ...]:
    """The weaker forms of a demand, strongest first."""
    asked = getattr(terms, demand)
    if demand == "decision":
        return ("randomized",) if may_free_decision(terms) else ()
    if demand == "budget" and terms.balance == "none":
        return ()
    rungs = RUNGS[demand]
    return rungs[rungs.index(asked) + 1 :]


def above(terms: Terms, demand: str) -> tuple[tuple[str, ...], ...]:
    """The stronger forms of a demand, weakest first; a free decision has two ways up."""
    asked = getattr(terms, demand)
    if demand == "decision":
        return (("deterministic",), ("efficient",)) if asked == "randomized" else ()
    if demand == "budget" and terms.balance == "none":
        return ()
    rungs = RUNGS[demand]
    return (tuple(reversed(rungs[: rungs.index(asked)])),)


def with_forms(terms: Terms, forms: Mapping[str, str]) -> Terms:
    """The terms with other forms of some demands."""
    return replace(terms, **cast(Any, dict(forms)))


def climb_down(oracle: Oracle, terms: Terms) -> Iterator[Ladder]:
    """For each demand alone, the strongest weaker form under which the mix is possible."""
    for demand in RUNGS:
        forms = below(terms, demand)
        if forms:
            yield _climbed(oracle, terms, demand, forms, until=True)


def climb_up(oracle: Oracle, terms: Terms) -> Iterator[Ladder]:
    """For each demand alone, the strongest form that still holds."""
    for demand in RUNGS:
        for forms in above(terms, demand):
            if forms:
                yield _climbed(oracle, terms, demand, forms, until=False)


def _climbed(
    oracle: Oracle, terms: Terms, demand: str, forms: tuple[str, ...], until: bool
) -> Ladder:
    """Rung by rung until one is possible, or until one is not."""
    tried: list[tuple[str, bool]] = []
    proved = True
    for form in forms:
        finding = oracle.ask(with_forms(terms, {demand: form}))
        tried.append((form, finding.possible))
        proved = proved and finding.proved
        if finding.possible is until:
            break
    held = [form for form, possible in tried if possible]
    settled = held[-1] if held else None
    return Ladder(demand, getattr(terms, demand), settled, tuple(tried), proved)


def least_steps(oracle: Oracle, terms: Terms) -> tuple[Step, ...]:
    """The Pareto set of combined steps down: no form in it can be made stronger alone."""
    return _border(oracle, terms, {d: (getattr(terms, d), *below(terms, d)) for d in RUNGS})


def most_steps(oracle: Oracle, terms: Terms) -> tuple[Step, ...]:
    """The strongest combinations above what is asked that still hold together."""
    forms: dict[str, tuple[str, ...]] = {}
    for demand in RUNGS:
        up = above(terms, demand)
        forms[demand] = (*reversed(up[0] if up else ()), getattr(terms, demand))
    borders = []
    for decision in above(terms, "decision") or ((),):
        forms["decision"] = (*decision, terms.decision)
        borders.append(_border(oracle, terms, forms))
    # With the decision left free a combination is strongest only if it is so both ways.
    found: dict[tuple[tuple[str, str], ...], Step] = {}
    for border in borders:
        for step in border:
            free = "decision" not in dict(step.forms)
            everywhere = all(any(s.forms == step.forms for s in other) for other in borders)
            if everywhere or not free:
                found[step.forms] = step
    return tuple(found.values())


Rungs = tuple[int, ...]


def _border(oracle: Oracle, terms: Terms, forms: dict[str, tuple[str, ...]]) -> tuple[Step, ...]:
    """The strongest possible combinations; weaker than possible is possible, and so on.

    Asked first is whatever settles most of the rest whichever way the answer goes.
    """
    demands = list(forms)
    waiting = set(itertools.product(*(range(len(forms[demand])) for demand in demands)))
    possible: list[Rungs] = []
    proved = True
    while waiting:
        rungs = max(sorted(waiting), key=lambda one: _settles(one, waiting))
        asked = {d: forms[d][rung] for d, rung in zip(demands, rungs, strict=True)}
        finding = oracle.ask(with_forms(terms, asked))
        proved = proved and finding.proved
        if finding.possible:
            possible.append(rungs)
            waiting = {one for one in waiting if not _weaker(one, rungs)}
        else:
            waiting = {one for one in waiting if not _weaker(rungs, one)}
    steps = []
    for rungs in sorted(possible, key=lambda one: (sum(map(bool, one)), sum(one), one)):
        if any(_weaker(rungs, other) and rungs != other for other in possible):
            continue
        named = tuple(
            (demand, forms[demand][rung])
            for demand, rung in zip(demands, rungs, strict=True)
            if forms[demand][rung] != getattr(terms, demand)
        )
        steps.append(Step(named, proved))
    return tuple(steps)


def _settles(one: Rungs, waiting: set[Rungs]) -> int:
    """How many combinations an answer settles at least."""
    return min(
        sum(_weaker(other, one) for other in waiting),
        sum(_weaker(one, other) for other in waiting),
    )


def _weaker(one: Rungs, two: Rungs) -> bool:
    """Whether every rung of `one` is at or below that of `two` (and so asks no more)."""
    return all(a >= b for a, b in zip(one, two, strict=True))
