"""The program as a textbook writes it: PuLP, floats, one loop per quantifier.

Written from the definitions alone and sharing nothing with `designer.program`: no interim
columns, no integer rows, no presolved rule. Every incentive row spells out the sum over the
others' types, so it has n*T**(n+1) nonzeros. It is slow and rounded on purpose; it serves as
an oracle for small settings and as the baseline of the benchmarks.

Unknowns at a profile theta: x[k, theta] in [0, 1] (an option's probability) and t[i, theta]
(paid BY party i). Utility u_i = sum_k x[k] v_i(k) - t[i]; the pot is the sum of the payments
less the expected outlay.
"""

from __future__ import annotations

import itertools
import time
from collections.abc import Iterable
from dataclasses import dataclass, field
from typing import Any

import pulp

from designer.demands.terms import Demands, Terms
from designer.setting.setting import Setting

Profile = tuple[int, ...]
NEVER = 1e-12
"""Profiles less likely than this are off the support (exact zeros become exact 0.0)."""


@dataclass
class Plain:
    """The setting in floats, as a textbook would hold it."""

    setting: Setting
    profiles: list[Profile] = field(init=False)
    chance: dict[Profile, float] = field(init=False)

    def __post_init__(self) -> None:
        """List the profiles and their probabilities."""
        self.profiles = list(itertools.product(*(range(t) for t in self.setting.shape)))
        weights = [int(w) for w in self.setting.weights]
        total = sum(weights)
        self.chance = {p: w / total for p, w in zip(self.profiles, weights, strict=True)}
        self.number = {p: j for j, p in enumerate(self.profiles)}

    @property
    def asked_at(self) -> list[Profile]:
        """Where demands 'in every case' are asked (convention 5)."""
        if self.setting.support_only:
            return [p for p in self.profiles if self.chance[p] > NEVER]
        return self.profiles

    def marginal(self, i: int, a: int) -> float:
        """P(theta_i = a)."""
        return sum(self.chance[p] for p in self.profiles if p[i] == a)

    def worth(self, i: int, k: int, p: Profile) -> float:
        """v_i(k, theta)."""
        party = self.setting.parties[i]
        row = self.number[p] if party.depends else p[i]
        return int(party.value[row, k]) / self.setting.grain

    def outside(self, i: int, p: Profile) -> float:
        """Party i's worth of staying out at theta."""
        party = self.setting.parties[i]
        row = self.number[p] if party.outside_depends else p[i]
        return int(party.outside[row]) / self.setting.grain

    def outlay(self, k: int) -> float:
        """The designer's outlay for option k."""
        return int(self.setting.outlay[k]) / self.setting.grain

    def net_worth(self, k: int, p: Profile) -> float:
        """Everyone's worth of option k at theta, the designer's included, less the outlay."""
        own = int(self.setting.worth[k]) / self.setting.grain
        parties = sum(self.worth(i, k, p) for i in range(len(self.setting.parties)))
        return parties + own - self.outlay(k)

    def efficient(self, p: Profile) -> list[int]:
        """The options of largest net worth; ties within rounding all count."""
        worths = [self.net_worth(k, p) for k in range(len(self.setting.options))]
        best = max(worths)
        return [k for k, w in enumerate(worths) if w >= best - 1e-9 * max(1.0, abs(best))]

    def takings(self, p: Profile) -> float:
        """What the pivotal rule collects: everyone's harm to the others, the designer included."""
        options, first = range(len(self.setting.options)), self.efficient(p)[0]
        total = 0.0
        for i in range(len(self.setting.parties)):
            others = [self.net_worth(k, p) - self.worth(i, k, p) for k in options]
            total += max(others) - others[first]
        return total if total > 1e-9 else 0.0

    def others(self, i: int) -> list[Profile]:
        """The profiles with party i's place held at 0: one per profile of the others."""
        return [p for p in self.profiles if p[i] == 0]


def swap(p: Profile, i: int, a: int) -> Profile:
    """The profile with party i's type replaced by a."""
    return (*p[:i], a, *p[i + 1 :])


class Textbook:
    """One PuLP problem for one setting and its terms; the last goal's stage is solved."""

    def __init__(self, setting: Setting, terms: Terms, quick: bool = False) -> None:
        """`quick` adds terms up by a dictionary instead of `lpSum`: less idiom, less time."""
        self.plain = Plain(setting)
        self.terms = terms
        self.quick = quick
        self.parties = range(len(setting.parties))
        self.options = range(len(setting.options))
        self.problem = pulp.LpProblem("textbook", pulp.LpMinimize)
        # PuLP 3.3 and later hand out variables through the problem; before, the class did.
        self.variable = getattr(self.problem, "add_variable", pulp.LpVariable)
        self.money = self.variable("S") if "outside-money" in terms.goals else None
        widened = "margin" in terms.goals
        self.margin = self.variable("margin", -float(terms.slack)) if widened else None
        self._variables(setting)

    def total(self, pairs: Iterable[tuple[float, Any]]) -> Any:
        """The sum of coefficient times variable."""
        if self.quick:
            merged: dict[Any, float] = {}
            for coefficient, variable in pairs:
                merged[variable] = merged.get(variable, 0.0) + coefficient
            return pulp.LpAffineExpression(merged)
        return pulp.lpSum(coefficient * variable for coefficient, variable in pairs)

    def _variables(self, setting: Setting) -> None:
        plain, decision = self.plain, self.terms.decision
        self.x: dict[tuple[int, Profile], Any] = {}
        self.t: dict[tuple[int, Profile], Any] = {}
        kind = pulp.LpBinary if decision == "deterministic" else pulp.LpContinuous
        for p in plain.profiles:
            number = plain.number[p]
            best = plain.efficient(p) if decision == "efficient" else []
            for k in self.options:
                x = self.variable(f"x_{k}_{number}", 0, 1, kind)
                self.x[k, p] = x
                if decision == "efficient" and k not in best:
                    self.problem += x == 0
                if decision == "table":
                    assert setting.rule is not None
                    self.problem += x == int(setting.rule[number, k]) / setting.rule_den
            self.problem += self.total((1.0, self.x[k, p]) for k in self.options) == 1
            for i in self.parties:
                self.t[i, p] = self.variable(f"t_{i}_{number}")

    # -- the building blocks, as lists of (coefficient, variable)

    def utility(self, i: int, true: Profile, told: Profile, scale: float) -> list[Any]:
        """Scale * u_i when the profile is `true` and the reports are `told`."""
        pairs = [(scale * self.plain.worth(i, k, true), self.x[k, told]) for k in self.options]
        return [*pairs, (-scale, self.t[i, told])]

    def pot(self, p: Profile, scale: float) -> list[Any]:
        """Scale * the pot at theta."""
        paid = [(scale, self.t[i, p]) for i in self.parties]
        return paid + [(-scale * self.plain.outlay(k), self.x[k, p]) for k in self.options]

    def expected_pot(self) -> list[Any]:
        """E[pot]."""
        return [pair for p in self.plain.profiles for pair in self.pot(p, self.plain.chance[p])]

    def expected_utility(self, i: int) -> list[Any]:
        """E[u_i]."""
        chance = self.plain.chance
        return [pair for p in self.plain.profiles for pair in self.utility(i, p, p, chance[p])]

    def interim_gain(self, i: int, a: int) -> tuple[list[Any], float]:
        """E[u_i | a] as pairs, and E[outside | a]."""
        pairs, outside = [], 0.0
        mass = self.plain.marginal(i, a)
        for rest in self.plain.others(i):
            p = swap(rest, i, a)
            share = self.plain.chance[p] / mass
            pairs += self.utility(i, p, p, share)
            outside += share * self.plain.outside(i, p)
        return pairs, outside

    def welfare(self) -> list[Any]:
        """Expected total worth net of outlay."""
        return [
            (self.plain.chance[p] * self.plain.net_worth(k, p), self.x[k, p])
            for p in self.plain.profiles
            for k in self.options
        ]

    # -- demands

    def demand_honesty(self) -> None:
        """No lie gains more than the slack; or every lie loses the margin, where it is widened."""
        terms, plain = self.terms, self.plain
        extra = [(-1.0, self.margin)] if self.margin is not None else []
        floor = 0.0 if self.margin is not None else -float(terms.slack)
        for i in self.parties:
            if plain.setting.parties[i].name in terms.trusted:
                continue
            size = plain.setting.shape[i]
            for a, b in itertools.permutations(range(size), 2):
                if terms.ic == "bayesian":
                    mass = plain.marginal(i, a)
                    pairs = list(extra)
                    for rest in plain.others(i):
                        p, q = swap(rest, i, a), swap(rest, i, b)
                        share = plain.chance[p] / mass
                        pairs += self.utility(i, p, p, share) + self.utility(i, p, q, -share)
                    self.problem += self.total(pairs) >= floor
                elif terms.ic == "dominant":
                    for p in plain.asked_at:
                        if p[i] == a:
                            q = swap(p, i, b)
                            pairs = self.utility(i, p, p, 1.0) + self.utility(i, p, q, -1.0)
                            self.problem += self.total(pairs + extra) >= floor

    def demand_participation(self) -> None:
        """Nobody asked to take part does better by staying out, on the level demanded."""
        terms, plain = self.terms, self.plain
        give = float(terms.shortfall)
        for i in self.parties:
            if plain.setting.parties[i].name in terms.compelled:
                continue
            if terms.ir == "ex-ante":
                outside = sum(plain.chance[p] * plain.outside(i, p) for p in plain.profiles)
                self.problem += self.total(self.expected_utility(i)) >= outside - give
            elif terms.ir == "interim":
                for a in range(plain.setting.shape[i]):
                    pairs, outside = self.interim_gain(i, a)
                    self.problem += self.total(pairs) >= outside - give
            elif terms.ir == "ex-post":
                for p in plain.asked_at:
                    gain = self.total(self.utility(i, p, p, 1.0))
                    self.problem += gain >= plain.outside(i, p) - give

    def demand_balance(self) -> None:
        """The pot is, or is at least, minus the outside money; expected or in every case."""
        terms = self.terms
        extra = [(1.0, self.money)] if self.money is not None else []
        need = 0.0 if self.money is not None else -float(terms.subsidy)
        pots = []
        if terms.balance == "ex-ante":
            pots = [self.expected_pot()]
        elif terms.balance == "ex-post":
            pots = [self.pot(p, 1.0) for p in self.plain.asked_at]
        for pot in pots:
            left = self.total(pot + extra)
            self.problem += left == need if terms.budget == "exact" else left >= need

    def demand_limits(self) -> None:
        """Caps and floors on payments, at every profile."""
        limits = self.terms.limits
        for variable in self.t.values():
            if limits.pays_at_most is not None:
                self.problem += variable <= float(limits.pays_at_most)
            if limits.pays_at_least is not None:
                self.problem += variable >= float(limits.pays_at_least)
        for i in self.parties:
            for p in self.plain.profiles:
                if limits.within_worth:
                    self.problem += self.total(self.utility(i, p, p, 1.0)) >= 0.0
                if limits.only_when_served and limits.pays_at_most is not None:
                    cap = float(limits.pays_at_most)
                    served = [k for k in self.options if self.plain.worth(i, k, p) > 0]
                    room = [(cap, self.x[k, p]) for k in served]
                    self.problem += self.total([*room, (-1.0, self.t[i, p])]) >= 0.0

    def demand_sides(self) -> None:
        """Floors on expected welfare and pot, and interim probabilities."""
        side, plain = self.terms.side, self.plain
        if side.welfare_at_least is not None:
            self.problem += self.total(self.welfare()) >= float(side.welfare_at_least)
        if side.revenue_at_least is not None:
            self.problem += self.total(self.expected_pot()) >= float(side.revenue_at_least)
        for chance in side.chances:
            i, a, k = chance.party, chance.type, chance.option
            mass = plain.marginal(i, a)
            held = [(plain.chance[p] / mass, self.x[k, p]) for p in plain.profiles if p[i] == a]
            if chance.at_least is not None:
                self.problem += self.total(held) >= float(chance.at_least)
            if chance.at_most is not None:
                self.problem += self.total(held) <= float(chance.at_most)

    # -- goals

    def goal(self, name: str) -> tuple[int, Any]:
        """(+1 to maximise or -1 to minimise, the expression); rows are added as needed."""
        if name == "any":
            return 1, self.total([])
        if name == "outside-money":
            return -1, self.money
        if name == "revenue":
            return 1, self.total(self.expected_pot())
        if name == "welfare":
            return 1, self.total(self.welfare())
        if name == "parties":
            return 1, self.total([q for i in self.parties for q in self.expected_utility(i)])
        if name == "margin":
            return 1, self.margin
        if name == "blend":
            return 1, self._blend()
        bound = self.variable(name.replace("-", "_"))
        if name == "floor":
            for i in self.parties:
                for a in range(self.plain.setting.shape[i]):
                    pairs, outside = self.interim_gain(i, a)
                    self.problem += self.total(pairs) - outside >= bound
            return 1, bound
        if name == "swing":
            for variable in self.t.values():
                self.problem += variable <= bound
                self.problem += -variable <= bound
            return -1, bound
        if name == "worst-pot":
            for p in self.plain.asked_at:
                self.problem += self.total(self.pot(p, 1.0)) >= bound
            return 1, bound
        if name == "returned-share":
            for p in self.plain.asked_at:
                takings = self.plain.takings(p)
                if takings > NEVER:
                    self.problem += self.total(self.pot(p, 1.0)) <= takings * (1 - bound)
            return 1, bound
        raise ValueError(name)

    def _blend(self) -> Any:
        setting, pairs = self.plain.setting, list[Any]()
        for name, weight in self.terms.blend:
            part: list[Any]
            if name == "worth":
                part = [
                    (chance * int(setting.worth[k]) / setting.grain, self.x[k, p])
                    for p, chance in self.plain.chance.items()
                    for k in self.options
                ]
            elif name == "pot":
                part = self.expected_pot()
            elif name == "parties":
                part = [q for i in self.parties for q in self.expected_utility(i)]
            else:
                part = self.expected_utility(setting.party_index(name))
            pairs += [(float(weight) * coefficient, variable) for coefficient, variable in part]
        return self.total(pairs)


def build(setting: Setting, terms: Terms, quick: bool = False) -> Textbook:
    """The textbook problem with every demand in it, no goal yet.

    Raises NotImplementedError for even-handedness, which it does not know.
    """
    if terms.even_handed:
        raise NotImplementedError("even-handedness")
    textbook = Textbook(setting, terms, quick)
    textbook.demand_honesty()
    textbook.demand_participation()
    textbook.demand_balance()
    textbook.demand_limits()
    textbook.demand_sides()
    return textbook


def build_and_solve(
    setting: Setting, demands: Demands, quick: bool = False
) -> tuple[str, float | None, dict[str, float]]:
    """Status, value of the last goal and seconds spent; floats throughout.

    The status is "possible", "impossible", "unbounded" or "undecided". Goals are optimised
    in turn, each kept within 1e-7 of its best before the next.
    """
    terms = demands.over(setting)
    start = time.perf_counter()
    textbook = build(setting, terms, quick)
    seconds = {"formulate": time.perf_counter() - start, "solve": 0.0}
    status, value = "undecided", None
    for name in terms.goals:
        sign, goal = textbook.goal(name)
        textbook.problem.sense = pulp.LpMinimize if sign < 0 else pulp.LpMaximize
        textbook.problem.setObjective(goal + 0.0 * _any_variable(textbook))
        start = time.perf_counter()
        status = solve(textbook)
        seconds["solve"] += time.perf_counter() - start
        if status != "possible":
            return status, None, seconds
        if name != "any":
            value = float(pulp.value(goal))
            keep = 1e-7 * max(1.0, abs(value))
            held = goal >= value - keep if sign > 0 else goal <= value + keep
            textbook.problem += held
    return status, value, seconds


def solve(textbook: Textbook) -> str:
    """Solve in memory by HiGHS; an 'infeasible or unbounded' is settled without the goal."""
    problem = textbook.problem
    problem.solve(pulp.HiGHS(msg=False))
    if problem.status == pulp.LpStatusOptimal:
        return "possible"
    objective, sense = problem.objective, problem.sense
    problem.setObjective(0.0 * _any_variable(textbook))
    problem.solve(pulp.HiGHS(msg=False))
    feasible = problem.status == pulp.LpStatusOptimal
    infeasible = problem.status == pulp.LpStatusInfeasible
    problem.setObjective(objective)
    problem.sense = sense
    if infeasible:
        return "impossible"
    return "unbounded" if feasible else "undecided"


def _any_variable(textbook: Textbook) -> Any:
    return next(iter(textbook.x.values()))
