"""Weaker and stronger forms of each demand, and which of them settle the matter.

ic       dominant > bayesian > none              balance  ex-post > ex-ante > none
ir       ex-post > interim > ex-ante > none      budget   exact > no-deficit
decision deterministic > randomized; efficient, table > randomized ('free')
"""

from __future__ import annotations

import itertools
from dataclasses import dataclass, replace

from designer.demands.terms import Terms
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

    cured_by  None if no weaker form of this demand alone is enough
    tried     the forms that were posed, with whether each cures
    """

    demand: str
    asked: str
    cured_by: str | None
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
    if demand == "decision" and asked in ("efficient", "table"):
        return ("randomized",)
    if demand == "budget" and terms.balance == "none":
        return ()
    rungs = RUNGS[demand]
    return rungs[rungs.index(asked) + 1 :]


def above(terms: Terms, demand: str) -> tuple[str, ...]:
    """The stronger forms of a demand, weakest first."""
    asked = getattr(terms, demand)
    if demand == "decision":
        return ("deterministic",) if asked == "randomized" else ()
    if demand == "budget" and terms.balance == "none":
        return ()
    rungs = RUNGS[demand]
    return tuple(reversed(rungs[: rungs.index(asked)]))


def climb_down(oracle: Oracle, terms: Terms) -> tuple[Ladder, ...]:
    """For each demand alone, the strongest weaker form under which the mix is possible."""
    ladders = []
    for demand in RUNGS:
        tried: list[tuple[str, bool]] = []
        proved = True
        for form in below(terms, demand):
            finding = oracle.ask(replace(terms, **{demand: form}))
            tried.append((form, finding.possible))
            proved = proved and finding.proved
            if finding.possible:
                break
        if tried:
            cure = tried[-1][0] if tried[-1][1] else None
            ladders.append(Ladder(demand, getattr(terms, demand), cure, tuple(tried), proved))
    return tuple(ladders)


def climb_up(oracle: Oracle, terms: Terms) -> tuple[Ladder, ...]:
    """For each demand alone, the strongest form that still holds."""
    ladders = []
    for demand in RUNGS:
        tried: list[tuple[str, bool]] = []
        proved = True
        for form in above(terms, demand):
            finding = oracle.ask(replace(terms, **{demand: form}))
            tried.append((form, finding.possible))
            proved = proved and finding.proved
            if not finding.possible:
                break
        if tried:
            held = [form for form, possible in tried if possible]
            best = held[-1] if held else None
            ladders.append(Ladder(demand, getattr(terms, demand), best, tuple(tried), proved))
    return tuple(ladders)


def least_steps(oracle: Oracle, terms: Terms) -> tuple[Step, ...]:
    """The Pareto set of combined steps down: no form in it can be made stronger alone."""
    return _border(oracle, terms, {d: (getattr(terms, d), *below(terms, d)) for d in RUNGS})


def most_steps(oracle: Oracle, terms: Terms) -> tuple[Step, ...]:
    """The strongest combinations above what is asked that still hold together."""
    forms = {d: (*reversed(above(terms, d)), getattr(terms, d)) for d in RUNGS}
    return _border(oracle, terms, forms)


def _border(oracle: Oracle, terms: Terms, forms: dict[str, tuple[str, ...]]) -> tuple[Step, ...]:
    """The strongest possible combinations; weaker than possible is possible, and so on."""
    demands = list(forms)
    sizes = [range(len(forms[demand])) for demand in demands]
    possible: list[tuple[int, ...]] = []
    impossible: list[tuple[int, ...]] = []
    for rungs in sorted(itertools.product(*sizes), key=sum):
        if any(_weaker(rungs, known) for known in possible):
            continue
        if any(_weaker(known, rungs) for known in impossible):
            continue
        finding = oracle.ask(_at(terms, demands, forms, rungs))
        (possible if finding.possible else impossible).append(rungs)
    steps = []
    for rungs in possible:
        named = tuple(
            (demand, forms[demand][rung])
            for demand, rung in zip(demands, rungs, strict=True)
            if forms[demand][rung] != getattr(terms, demand)
        )
        steps.append(Step(named, oracle.ask(_at(terms, demands, forms, rungs)).proved))
    return tuple(steps)


def _weaker(one: tuple[int, ...], two: tuple[int, ...]) -> bool:
    """Whether every rung of `one` is at or below that of `two` (and so asks no more)."""
    return all(a >= b for a, b in zip(one, two, strict=True))


def _at(
    terms: Terms, demands: list[str], forms: dict[str, tuple[str, ...]], rungs: tuple[int, ...]
) -> Terms:
    return replace(terms, **{d: forms[d][rung] for d, rung in zip(demands, rungs, strict=True)})
