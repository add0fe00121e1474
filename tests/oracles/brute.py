"""Brute force: every deterministic rule there is, the payments of each by exact simplex.

For a rule d(theta) the payments t_i(theta) are the only unknowns, and every demand is a row
in rationals, written here from the definitions. The answer over all K**N rules is the best.
"""

from __future__ import annotations

import itertools
from collections.abc import Iterator, Sequence
from fractions import Fraction

from designer.demands.terms import Demands, Terms
from designer.setting.setting import Setting
from tests.oracles.simplex import Row, maximise

Rule = Sequence[int]
"""An option per profile number."""


def best_of_all(setting: Setting, demands: Demands) -> tuple[str, Fraction | None]:
    """Status and exact optimum of the one goal over all deterministic rules."""
    terms = demands.over(setting)
    everything = itertools.product(range(len(setting.options)), repeat=setting.profiles)
    return best_of(setting, terms, everything)


def best_of_efficient(setting: Setting, demands: Demands) -> tuple[str, Fraction | None]:
    """The same over the deterministic efficient rules, every way of breaking ties."""
    terms = demands.over(setting)
    choices = []
    for p in range(setting.profiles):
        worths = [net_worth(setting, k, p) for k in range(len(setting.options))]
        choices.append([k for k, w in enumerate(worths) if w == max(worths)])
    return best_of(setting, terms, itertools.product(*choices))


def best_of(
    setting: Setting, terms: Terms, rules: Iterator[tuple[int, ...]]
) -> tuple[str, Fraction | None]:
    """The best of some rules; unbounded if any is."""
    best: tuple[str, Fraction | None] = ("impossible", None)
    sign = -1 if terms.goals == ("outside-money",) else 1
    for rule in rules:
        status, value = payments(setting, terms, rule)
        if status == "unbounded":
            return status, None
        if status == "possible":
            assert value is not None
            if best[1] is None or sign * value > sign * best[1]:
                best = status, value
    return best


def worth(setting: Setting, i: int, k: int, p: int) -> Fraction:
    """v_i(k, theta)."""
    party = setting.parties[i]
    row = p if party.depends else setting.types_at(p)[i]
    return Fraction(int(party.value[row, k]), setting.grain)


def outside(setting: Setting, i: int, p: int) -> Fraction:
    """Party i's worth of staying out."""
    party = setting.parties[i]
    row = p if party.outside_depends else setting.types_at(p)[i]
    return Fraction(int(party.outside[row]), setting.grain)


def net_worth(setting: Setting, k: int, p: int) -> Fraction:
    """Everyone's worth of option k at theta less the outlay."""
    own = Fraction(int(setting.worth[k]) - int(setting.outlay[k]), setting.grain)
    return own + sum((worth(setting, i, k, p) for i in range(len(setting.parties))), Fraction(0))


class _Payments:
    """The rows and costs of one rule; columns t_i(theta), then one scalar unknown."""

    def __init__(self, setting: Setting, terms: Terms, rule: Rule) -> None:
        self.setting, self.terms, self.rule = setting, terms, rule
        self.n, self.size = len(setting.parties), setting.profiles
        self.scalar = self.n * self.size
        self.rows: list[Row] = []
        self.chance = [setting.probability(p) for p in range(self.size)]
        self.scope = [p for p in range(self.size) if self.chance[p] or not setting.support_only]

    def told(self, i: int, p: int, b: int) -> int:
        """The profile number with party i's report replaced."""
        positions = list(self.setting.types_at(p))
        positions[i] = b
        return self.setting.profile_of(tuple(positions))

    def own(self, i: int, p: int, q: int) -> Fraction:
        """Party i's worth at theta of what the rule decides when q is reported."""
        return worth(self.setting, i, self.rule[q], p)

    def demand(self, parts: list[tuple[Fraction, int, int]], relation: str, rhs: Fraction) -> None:
        """A row of (coefficient, party, profile) parts; the scalar unknown has party -1."""
        row: dict[int, Fraction] = {}
        for coefficient, i, p in parts:
            column = self.scalar if i < 0 else i * self.size + p
            row[column] = row.get(column, Fraction(0)) + coefficient
        self.rows.append((row, relation, rhs))

    def profiles_of(self, i: int, a: int) -> list[int]:
        """The profiles at which party i's type is a."""
        return [p for p in range(self.size) if self.setting.types_at(p)[i] == a]

    def honesty(self) -> None:
        """Bayesian rows are unconditional (scaled by the type's chance): the same half-space."""
        for i, party in enumerate(self.setting.parties):
            for a, b in itertools.permutations(range(party.size), 2):
                at = self.profiles_of(i, a)
                if self.terms.ic == "bayesian":
                    self._lie(i, at, b, [self.chance[p] for p in at])
                elif self.terms.ic == "dominant":
                    for p in at:
                        if p in self.scope:
                            self._lie(i, [p], b, [Fraction(1)])

    def _lie(self, i: int, at: list[int], b: int, shares: list[Fraction]) -> None:
        parts, rhs = [], Fraction(0)
        for p, share in zip(at, shares, strict=True):
            q = self.told(i, p, b)
            parts += [(-share, i, p), (share, i, q)]
            rhs -= share * (self.own(i, p, p) - self.own(i, p, q))
            rhs -= share * self.terms.slack
        self.demand(parts, ">=", rhs)

    def participation(self) -> None:
        """Utility at least outside: on average, per type or at every profile."""
        for i, party in enumerate(self.setting.parties):
            if party.name in self.terms.compelled:
                continue
            groups: list[list[int]] = []
            if self.terms.ir == "ex-ante":
                groups = [list(range(self.size))]
            elif self.terms.ir == "interim":
                groups = [self.profiles_of(i, a) for a in range(party.size)]
            elif self.terms.ir == "ex-post":
                groups = [[p] for p in self.scope]
            for group in groups:
                shares = [self.chance[p] if self.terms.ir != "ex-post" else 1 for p in group]
                gains = [self.own(i, p, p) - outside(self.setting, i, p) for p in group]
                rhs = -sum((s * g for s, g in zip(shares, gains, strict=True)), Fraction(0))
                self.demand(
                    [(-Fraction(s), i, p) for s, p in zip(shares, group, strict=True)], ">=", rhs
                )

    def balance(self) -> None:
        """Pot plus outside money covers: on average or at every profile."""
        groups: list[list[int]] = []
        if self.terms.balance == "ex-ante":
            groups = [list(range(self.size))]
        elif self.terms.balance == "ex-post":
            groups = [[p] for p in self.scope]
        money = self.terms.goals == ("outside-money",)
        relation = "=" if self.terms.budget == "exact" else ">="
        for group in groups:
            average = self.terms.balance == "ex-ante"
            shares = [self.chance[p] if average else Fraction(1) for p in group]
            rhs = sum((s * self.outlay(p) for s, p in zip(shares, group, strict=True)), Fraction(0))
            parts = [(s, i, p) for s, p in zip(shares, group, strict=True) for i in range(self.n)]
            if money:
                parts.append((Fraction(1), -1, 0))
            self.demand(parts, relation, rhs if money else rhs - self.terms.subsidy)

    def outlay(self, p: int) -> Fraction:
        """The outlay of what the rule decides at theta."""
        return Fraction(int(self.setting.outlay[self.rule[p]]), self.setting.grain)

    def goal(self) -> tuple[dict[int, Fraction], Fraction, int]:
        """(cost over the columns, constant, sign of the goal)."""
        (name,) = self.terms.goals
        cost: dict[int, Fraction] = {}
        constant = Fraction(0)
        if name == "outside-money":
            return {self.scalar: Fraction(-1)}, constant, -1
        for p, chance in enumerate(self.chance):
            if name == "welfare":
                constant += chance * net_worth(self.setting, self.rule[p], p)
            if name == "revenue":
                constant -= chance * self.outlay(p)
            for i in range(self.n):
                if name == "parties":
                    constant += chance * self.own(i, p, p)
                if name in ("parties", "revenue"):
                    cost[i * self.size + p] = chance if name == "revenue" else -chance
        if name not in ("any", "welfare", "revenue", "parties"):
            raise NotImplementedError(name)
        return cost, constant, 1


def payments(setting: Setting, terms: Terms, rule: Rule) -> tuple[str, Fraction | None]:
    """Status and exact optimum of the payments under one rule.

    Goals any, welfare, revenue, parties and outside-money; no limits, no side demands.
    """
    program = _Payments(setting, terms, rule)
    program.honesty()
    program.participation()
    program.balance()
    cost, constant, sign = program.goal()
    status, value = maximise(cost, program.rows, program.scalar + 1)
    return status, None if value is None else sign * value + constant
