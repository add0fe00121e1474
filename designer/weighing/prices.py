"""The price of each way out alone, all other demands kept whole; exact."""

from __future__ import annotations

import itertools
from collections.abc import Iterator
from dataclasses import dataclass, replace
from fractions import Fraction

import numpy as np

from designer.demands.terms import Terms
from designer.program.draft import Draft
from designer.setting.setting import Setting
from designer.table import Table
from designer.weighing.oracle import Oracle
from designer.weighing.relaxed import Answer, Bounds, Relaxed

NONNEGATIVE: Bounds = (Fraction(0), None)


@dataclass(frozen=True)
class Price:
    """What one way out costs.

    relax    the way out, in a stable word: "outside-money", "outside-money-on-average",
             "shortfall", "shortfall:NAME", "compel", "lies", "welfare", "limit:KEY", "side:KEY"
    amount   exact money (0: nothing has to give); None: this way alone does not help
    parties  for "compel": the parties to compel
    buys     what a first unit of another allowance would take off the price, by allowance
    changes  for "welfare": profiles whose decision differs from the efficient one, and
             the decision there (option, probability)
    """

    relax: str
    amount: Fraction | None
    proved: bool
    parties: tuple[str, ...] = ()
    buys: tuple[tuple[str, Fraction], ...] = ()
    changes: tuple[tuple[tuple[str, ...], tuple[tuple[str, Fraction], ...]], ...] = ()
    reason: str = ""


def ways_out(oracle: Oracle, terms: Terms) -> Iterator[Price]:
    """Every way out in turn, cheapest questions first."""
    if terms.balance != "none":
        yield _single(oracle, terms, "outside-money", "subsidy", "money")
        if terms.balance == "ex-post":
            on_average = replace(terms, balance="ex-ante")
            yield _single(oracle, on_average, "outside-money-on-average", "subsidy", "money")
    if terms.ir != "none":
        yield _single(oracle, terms, "shortfall", "shortfall", "shortfall")
        for party in oracle.setting.parties:
            if party.name not in terms.compelled:
                name = f"shortfall:{party.name}"
                yield _single(oracle, terms, name, name, name)
        yield from _compelled(oracle, terms)
    if terms.ic != "none":
        yield _single(oracle, terms, "lies", "slack", "lies")
    if terms.decision in ("efficient", "table"):
        yield _second_best(oracle, terms)
    for key in ("pays_at_most", "pays_at_least"):
        if getattr(terms.limits, key) is not None:
            yield _given_way(oracle, terms, "limit", key)
    for key in ("welfare_at_least", "revenue_at_least"):
        if getattr(terms.side, key) is not None:
            yield _given_way(oracle, terms, "side", key)


def _single(oracle: Oracle, terms: Terms, relax: str, allowance: str, criterion: str) -> Price:
    """The least of one allowance, and what the others would take off it."""
    free = {allowance: NONNEGATIVE}
    relaxed = Relaxed(oracle.setting, terms, free, oracle.engine, oracle.watch)
    answer = relaxed.minimise({criterion: Fraction(1)})
    if answer.status != "optimal" or answer.at is None:
        return _no_price(relax, answer)
    buys = []
    for other in ("shortfall", "lies"):
        worth = relaxed.worth_of(answer, other)
        if worth > 0 and not criterion.startswith(other):
            buys.append((other, worth))
    return Price(relax, answer.at[criterion], answer.proved, buys=tuple(buys))


def _no_price(relax: str, answer: Answer) -> Price:
    proved = answer.status == "infeasible" and answer.proved
    return Price(relax, None, proved, reason=answer.reason)


def _second_best(oracle: Oracle, terms: Terms) -> Price:
    """The welfare given up when the decision may differ from the efficient one."""
    freed = replace(terms, decision="randomized")
    relaxed = Relaxed(oracle.setting, freed, {}, oracle.engine, oracle.watch)
    answer = relaxed.minimise({"welfare": Fraction(1)})
    if answer.status != "optimal" or answer.at is None:
        return _no_price("welfare", answer)
    table = relaxed.table(answer)
    changes = () if table is None else _changed(oracle.setting, table)
    return Price("welfare", answer.at["welfare"], answer.proved, changes=changes)


def _changed(
    setting: Setting, table: Table
) -> tuple[tuple[tuple[str, ...], tuple[tuple[str, Fraction], ...]], ...]:
    """The profiles at which a table decides otherwise than efficiently."""
    welfare = Draft(setting, "randomized").welfare
    efficient = welfare == welfare.max(axis=1, keepdims=True)
    elsewhere = ((table.decides != 0) & ~efficient).any(axis=1)
    return tuple(
        (
            setting.labels_at(int(profile)),
            tuple(
                (option, table.chance(int(profile), k))
                for k, option in enumerate(setting.options)
                if table.decides[profile, k]
            ),
        )
        for profile in np.flatnonzero(elsewhere)
    )


def _given_way(oracle: Oracle, terms: Terms, kind: str, key: str) -> Price:
    """How far a cap must rise, or a floor fall."""
    given = getattr(terms.limits if kind == "limit" else terms.side, key)
    relaxed = Relaxed(oracle.setting, terms, {key: (None, None)}, oracle.engine, oracle.watch)
    up = key == "pays_at_most"
    answer = relaxed.minimise({key: Fraction(1 if up else -1)})
    name = f"{kind}:{key}"
    if answer.status != "optimal" or answer.at is None:
        return _no_price(name, answer)
    moved = (answer.at[key] - given) if up else (given - answer.at[key])
    return Price(name, max(moved, Fraction(0)), answer.proved)


def _compelled(oracle: Oracle, terms: Terms) -> Iterator[Price]:
    """The smallest sets of parties to compel: all minimal ones, by size."""
    free = [p.name for p in oracle.setting.parties if p.name not in terms.compelled]
    everyone = replace(terms, compelled=terms.compelled | frozenset(free))
    finding = oracle.ask(everyone)
    if not finding.possible:
        yield Price("compel", None, finding.proved)
        return
    cures: list[frozenset[str]] = []
    for size in range(len(free) + 1):
        if cures and size > len(cures[0]):
            return  # larger sets are not smallest
        for chosen in itertools.combinations(free, size):
            finding = oracle.ask(replace(terms, compelled=terms.compelled | frozenset(chosen)))
            if finding.possible:
                cures.append(frozenset(chosen))
                yield Price("compel", Fraction(size), finding.proved, parties=chosen)
