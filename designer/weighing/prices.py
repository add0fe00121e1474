"""The price of each way out alone, all other demands kept whole; exact."""

from __future__ import annotations

import itertools
from collections.abc import Collection, Iterator, Mapping
from dataclasses import dataclass, replace
from fractions import Fraction

import numpy as np

from designer.demands.terms import Terms
from designer.setting.setting import Setting
from designer.weighing.groups import CAPS, FLOORS, may_free_decision
from designer.weighing.mix import Mix
from designer.weighing.relaxed import Answer, Freedom, Relaxed, allowed

ONE = Fraction(1)

Changes = tuple[tuple[tuple[str, ...], tuple[tuple[str, Fraction], ...]], ...]


@dataclass(frozen=True)
class Price:
    """What one way out costs.

    relax    the way out, in a stable word: "outside-money", "outside-money-on-average",
             "shortfall", "shortfall:NAME", "compel", "lies", "welfare", "limit:KEY", "side:KEY"
    amount   how much more must be allowed than the terms do, or how much is given up: exact
             money (0: nothing has to give), for "compel" the number of parties; None: this way
             alone does not help
    asked, becomes   what the terms allow, and what they would have to (for "welfare": the
             expected welfare of the demanded decision, and the most that can be had)
    parties  for "compel": the parties to compel
    buys     (criterion, amount): of how much of another allowance one unit of this one, the
             last that is needed, is worth: the exact one-sided rate
    idle     criteria of which a little would take nothing off this price
    changes  for "welfare": profiles whose decision differs from the demanded one, and
             the decision there (option, probability), in one table that gives up least
    """

    relax: str
    amount: Fraction | None
    proved: bool
    asked: Fraction | None = None
    becomes: Fraction | None = None
    parties: tuple[str, ...] = ()
    buys: tuple[tuple[str, Fraction], ...] = ()
    idle: tuple[str, ...] = ()
    changes: Changes = ()
    reason: str = ""


class Prices:
    """Every way out in turn, the programs shared between them."""

    def __init__(self, mix: Mix) -> None:
        """Nothing is priced yet."""
        self.mix, self.terms, self.setting = mix, mix.terms, mix.setting

    def __iter__(self) -> Iterator[Price]:
        """The prices, cheapest questions first. Raises Stopped and Unsettled."""
        terms = self.terms
        whole = self.mix.program(decided=True)
        if "money" in whole.columns:
            yield self._single(whole, "outside-money", "money")
            if terms.balance == "ex-post":
                on_average = replace(terms, balance="ex-ante")
                average = allowed(self.setting, on_average, self.mix.engine, self.mix.watch)
                yield self._single(average, "outside-money-on-average", "money")
        if "shortfall" in whole.columns:
            yield self._single(whole, "shortfall", "shortfall")
            for party in self._invited():
                name = f"shortfall:{party}"
                yield self._single(self._freed(terms, {name: self._above(name)}), name, name)
            yield from self._compelled()
        if "lies" in whole.columns:
            yield self._single(whole, "lies", "lies")
        if terms.decision in ("efficient", "table") and may_free_decision(terms):
            yield self._second_best()
        for kind, keys in (("limit", CAPS), ("side", FLOORS)):
            part = terms.limits if kind == "limit" else terms.side
            for key in keys:
                if getattr(part, key) is not None:
                    yield self._given_way(kind, key)

    def _invited(self) -> list[str]:
        return [p.name for p in self.setting.parties if p.name not in self.terms.compelled]

    def _freed(self, terms: Terms, free: Mapping[str, Freedom]) -> Relaxed:
        """The demands with an allowance freed, and outside money beside it to compare."""
        beside: dict[str, Freedom] = {}
        if terms.balance != "none":
            beside["subsidy"] = (terms.subsidy, None)
        return Relaxed(self.setting, terms, {**free, **beside}, self.mix.engine, self.mix.watch)

    def _above(self, name: str) -> Freedom:
        return (self.terms.shortfall, None) if name.startswith("shortfall") else (None, None)

    def _single(self, relaxed: Relaxed, relax: str, criterion: str) -> Price:
        """The least of one allowance, all others closed."""
        closed = [name for name in relaxed.columns if name != criterion]
        answer = relaxed.minimise({criterion: ONE}, closed=closed)
        if answer.status != "optimal" or answer.at is None:
            return _no_price(relax, answer)
        asked = relaxed.asked(criterion)
        found = Price(
            relax, answer.at[criterion] - asked, answer.proved, asked, answer.at[criterion]
        )
        return _with_rates(found, relaxed, answer, closed)

    def _second_best(self) -> Price:
        """The welfare given up when the decision may differ from the demanded one."""
        freed = self.mix.program(decided=False)
        closed = list(freed.columns)
        answer = freed.minimise({"welfare": ONE}, closed=closed)
        if answer.status != "optimal" or answer.at is None:
            return _no_price("welfare", answer)
        asked = _welfare_as_asked(self.setting, self.terms, freed)
        lost = answer.at["welfare"]
        becomes = freed.first_best - lost
        changes = _changed(self.setting, self.terms, freed, answer)
        found = Price("welfare", lost, answer.proved, asked, becomes, changes=changes)
        return _with_rates(found, freed, answer, closed)

    def _given_way(self, kind: str, key: str) -> Price:
        """How far a cap must rise, or a floor fall."""
        name = f"{kind}:{key}"
        if self.terms.limits.only_when_served and key == "pays_at_most":
            return Price(
                name,
                None,
                False,
                reason="the cap also bounds what is collected upon service: not priced apart",
            )
        up = key == "pays_at_most"
        given: Fraction = getattr(self.terms.limits if kind == "limit" else self.terms.side, key)
        free: Freedom = (given, None) if up else (None, given)
        relaxed = self._freed(self.terms, {key: free})
        closed = [other for other in relaxed.columns if other != key]
        answer = relaxed.minimise({key: Fraction(1 if up else -1)}, closed=closed)
        if answer.status != "optimal" or answer.at is None:
            return _no_price(name, answer)
        moved = abs(answer.at[key] - given)
        found = Price(name, moved, answer.proved, given, answer.at[key])
        return _with_rates(found, relaxed, answer, closed)

    def _compelled(self) -> Iterator[Price]:
        """The smallest sets of parties to compel, all of them.

        A set cures only if it hits every known collision through the participation in it
        (implicit hitting sets: Moreno-Centeno & Karp 2013, Operations Research 61:453-468).
        """
        mix, free = self.mix, self._invited()
        everything = frozenset(mix.groups)
        invited = {name: f"ir:{name}" for name in free}
        found = mix.ask(everything - frozenset(invited.values()))
        if found in mix.collisions:
            yield Price("compel", None, found.proved)
            return
        for size in range(len(free) + 1):
            cured = False
            for chosen in itertools.combinations(free, size):
                kept = everything - {invited[name] for name in chosen}
                found = mix.ask(kept)
                if found in mix.possible:
                    cured = True
                    yield Price("compel", Fraction(size), found.proved, parties=chosen)
            if cured:
                return  # larger sets are not smallest


def _with_rates(price: Price, relaxed: Relaxed, answer: Answer, partners: Collection[str]) -> Price:
    """The price with what a unit of it is worth of every closed allowance."""
    if answer.lp.integer.any() or not price.amount:
        return price
    buys, idle = [], []
    for partner in partners:
        rate = relaxed.rate(answer, partner, partners)
        if rate > 0:
            buys.append((partner, 1 / rate))
        else:
            idle.append(partner)
    return replace(price, buys=tuple(buys), idle=tuple(idle))


def _no_price(relax: str, answer: Answer) -> Price:
    proved = answer.status == "infeasible" and answer.proved
    return Price(relax, None, proved, reason=answer.reason)


def _welfare_as_asked(setting: Setting, terms: Terms, freed: Relaxed) -> Fraction:
    """Expected welfare of the demanded decision."""
    if terms.decision != "table" or setting.rule is None:
        return freed.first_best
    weights = setting.weights.astype(object)
    worth = (setting.rule.astype(object) * freed.draft.welfare.astype(object)).sum(axis=1)
    total = int((worth * weights).sum())
    return Fraction(total, setting.total_weight * setting.grain * setting.rule_den)


def _changed(setting: Setting, terms: Terms, freed: Relaxed, answer: Answer) -> Changes:
    """The profiles at which the answer decides otherwise than demanded."""
    chances, den = freed.decisions(answer)
    if terms.decision == "table" and setting.rule is not None:
        other = (chances * setting.rule_den != setting.rule.astype(object) * den).any(axis=1)
    else:
        welfare = freed.draft.welfare
        efficient = welfare == welfare.max(axis=1, keepdims=True)
        other = ((chances != 0) & ~efficient).any(axis=1)
    return tuple(
        (
            setting.labels_at(int(profile)),
            tuple(
                (option, Fraction(int(chances[profile, k]), den))
                for k, option in enumerate(setting.options)
                if chances[profile, k]
            ),
        )
        for profile in np.flatnonzero(other)
    )
