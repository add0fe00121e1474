"""The interim road, from terms to a settled answer.

Down: the demands over interim quantities and shares of rules (`master`). Settle: price, list
the best rule, solve again, until no rule improves; the last master and the last pricing are
exact. Back: a mechanism whose payments are computed on demand, and a proof document of the
last master with the rules it lists.
"""

from __future__ import annotations

import time
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from dataclasses import replace
from fractions import Fraction

import numpy as np

from designer.demands.terms import Terms
from designer.engines.report import Basis, Engine
from designer.engines.watch import Stopped, Watch
from designer.program.program import Program
from designer.proof.face import lift
from designer.proof.outcome import Outcome
from designer.proof.prove import prove
from designer.proof.vector import Vector
from designer.roads.interim.barrier import Interior, interior
from designer.roads.interim.certificate import outcome_of
from designer.roads.interim.counting import TooMany, lead_party, structured, tied, too_many
from designer.roads.interim.draft import InterimDraft
from designer.roads.interim.lies import broken, first_lies, with_more
from designer.roads.interim.master import (
    Master,
    Posed,
    Prices,
    Reached,
    averaged,
    beyond,
    exact_prices,
    rule_for,
)
from designer.roads.interim.mechanism import Mechanism, of_point, rules_to_plain
from designer.roads.interim.multiplier import optimum, sides
from designer.roads.interim.near import Hinted, corner_near
from designer.roads.interim.rule import Index, Listed, Rule, welfare_index
from designer.roads.interim.search import Search
from designer.roads.interim.symmetry import alike_parties, even_lies, even_outcome
from designer.roads.product import as_independent
from designer.roads.settled import GoalResult, Settled, Status
from designer.setting.setting import Setting

GOALS = ("any", "outside-money", "revenue", "welfare", "parties", "floor", "margin", "blend")
TABLE_UP_TO = 10_000
"""Profiles up to which the whole table is made at once."""


class Interim:
    """Independent types, private worths, Bayesian honesty, at most interim participation."""

    name = "interim"

    def applies(self, setting: Setting, terms: Terms) -> str | None:
        """None, or why the demands cannot be written in interim quantities."""
        if any(p.depends or p.outside_depends for p in setting.parties):
            return "a worth or an outside option depends on other parties' types"
        if terms.ic == "dominant":
            return "dominant honesty is asked profile by profile"
        if terms.ir == "ex-post":
            return "participation is asked in every case"
        if terms.limits != type(terms.limits)():
            return "payments are limited profile by profile"
        if terms.even_handed:
            return "even-handedness ties profiles together"
        if terms.decision == "deterministic":
            return "the decision must be sure at every profile"
        other = next((goal for goal in terms.goals if goal not in GOALS), None)
        if other is not None:
            return f"the goal {other} is about single profiles"
        if terms.tidy == "swing":
            return "a tidy table is asked, profile by profile"
        if len(setting.parties) == 1 and terms.balance == "ex-post":
            return "one party has no one to share with"
        if too_many(setting, terms.decision):
            return "there are too many profiles to count what a rule takes"
        if as_independent(setting) is None:
            return "the types are correlated"
        return None

    def travel(self, setting: Setting, terms: Terms, engine: Engine, watch: Watch) -> Settled:
        """Down, settle, and back."""
        own = as_independent(setting)
        if own is None:
            raise ValueError("the types are correlated")
        return _Walk(own, terms, engine, watch).walk()


class _Walk:
    def __init__(self, setting: Setting, terms: Terms, engine: Engine, watch: Watch) -> None:
        self.setting, self.asked, self.engine, self.watch = setting, terms, engine, watch
        self.terms = averaged(terms)
        self.master = Master(setting, self.terms, None, first_lies(setting), watch)
        self.results: list[Reached] = []
        self.seconds: dict[str, float] = {}
        self.search: Search | None = None
        self.wanted: set[int] = set()  # columns that an exact look asked for
        self.only = False  # whether no other rule than the listed one is allowed

    def walk(self) -> Settled:
        """Find rules until none improves."""
        try:
            with self._spending("count"):
                best = self._start()
            step = None if best is None else self._reached(*best)
            if step is None and not self.results:
                step = self._from_within()
            if step is not None:
                return step
            while True:
                chosen = list(range(len(self.master.columns)))
                if not self.only:
                    with self._spending("search"):
                        self.search = self.search or Search(self.master, self.watch)
                        chosen = sorted({*self.search.run(), *self.wanted})
                step = self._exact(chosen)
                if step is not None:
                    return step
        except Stopped as stop:
            return self._undecided(f"{stop.reason}; {stop.remedy}")
        except KeyboardInterrupt:
            return self._undecided("interrupted; run it again to go on")

    @property
    def goal(self) -> str:
        """The goal that is asked now."""
        return self.terms.goals[len(self.results)]

    def _start(self) -> tuple[Posed, Outcome, list[int]] | None:
        """A first list of rules; the whole answer where one multiplier finds it."""
        setting, master = self.setting, self.master
        if self.terms.decision == "table":
            self.only = True
            self._list(Rule(()))
            return None
        if self.terms.decision == "efficient":
            plain = Rule(master.first())
            if structured(setting, plain):
                counts = master.count(plain)
                self.only = not tied(setting, plain, counts, self.watch)
                if self.only:
                    master.add(Listed(plain, counts))
                    return None
        # A later goal `outside-money` leaves the subsidy unknown from the start (convention 11).
        unknown = "outside-money" in self.terms.goals[1:]
        found = None if unknown else sides(setting, self.terms)
        if found is not None:
            with suppress(TooMany):
                best = optimum(setting, self.terms, found, master.count)
                columns = [master.add(listed)[0] for _, listed in best.shares]
                if len(self.terms.goals) > 1 and self.terms.decision == "efficient":
                    plain = Rule(master.first())
                    self.only = not tied(setting, plain, master.count(plain), self.watch)
                posed = master.posed()
                outcome = outcome_of(setting, self.terms, found, best, posed.draft, posed.program)
                return posed, outcome, columns
        if self.terms.decision == "efficient":
            rule = Rule(master.first())
            counts = master.count(rule)
            self.only = not tied(setting, rule, counts, self.watch)
            if self.only:
                master.add(Listed(rule, counts))
                return None
            master.lead = lead_party(setting)
            if master.lead is None:
                master.add(Listed(rule, counts))
            else:
                self._list(rule)
            return None
        master.lead = lead_party(setting)
        return None

    def _from_within(self) -> Settled | None:
        """List the rules near an interior point, or simple ones; the answer if they settle it."""
        master = self.master
        if self.only:
            return None
        told = self.goal != "any"
        while told:
            told = False
            for found in self._points():
                first = len(master.columns)
                with self._spending("search"):
                    corner = corner_near(master, found, self.watch)
                if corner is None:
                    continue
                lies = master.lies
                chosen = list(range(first, len(master.columns)))
                self.wanted.update(chosen)
                step = self._exact(chosen, corner.basis)
                if step is not None:
                    return step
                told = master.lies is not lies
                if told or self.results:
                    break
        if not master.columns:
            with self._spending("count"):
                self._list_simple()
        return None

    def _points(self) -> Iterator[Interior]:
        """Interior points, ever nearer the optimum."""
        with self._spending("search"):
            draft, program = self.master.program([])
            points = interior(self.setting, draft, program, self.watch, self.master.first())
        while True:
            with self._spending("search"):
                found = next(points, None)
            if found is None:
                return
            yield found

    def _list_simple(self) -> None:
        """The efficient rule, and one that always takes the same option for each."""
        setting = self.setting
        options = len(setting.options)
        nothing = tuple(np.zeros((n, options), dtype=np.int64) for n in setting.shape)
        self._list(Rule((welfare_index(setting),)))
        for k in range(options):
            row = np.zeros(options, dtype=np.int64)
            row[k] = 1
            self._list(Rule((Index(nothing, row),)))

    def _list(self, rule: Rule) -> None:
        self.master.add(Listed(rule, self.master.count(rule)))

    def _exact(self, chosen: list[int], basis: Basis | None = None) -> Settled | None:
        """Settle the master over chosen columns exactly; None if rules or lies came to light."""
        master = self.master
        with self._spending("formulate"):
            posed = master.posed([master.columns[j] for j in chosen])
        draft, program = posed.draft, posed.program
        engine = self.engine if basis is None else Hinted(basis)
        outcome = prove(posed.asked, engine=engine, watch=self.watch)
        for part, seconds in outcome.seconds.items():
            self.seconds[part] = self.seconds.get(part, 0.0) + seconds
        if outcome.status == "undecided" or not outcome.proved:
            return self._undecided(outcome.reason)
        with self._spending("count"):
            if self._told(draft, outcome):
                return None
            mixed = any(master.listed[master.columns[j][1]].rule.exceptions for j in chosen)
            if not (self.only or mixed or self.results):
                outcome = even_outcome(self.setting, self.terms, master.lead, program, outcome)
            certificate = outcome.farkas if outcome.status == "infeasible" else outcome.dual
            if outcome.status != "unbounded" and certificate is not None and not self.only:
                prices = exact_prices(self.setting, master.lead, program, certificate, draft.merged)
                if self._improve(prices):
                    return None
            return self._reached(posed, outcome, chosen)

    def _reached(self, posed: Posed, outcome: Outcome, chosen: list[int]) -> Settled | None:
        """Keep what is settled; the answer, or None where another goal is to be asked."""
        master = self.master
        if outcome.status != "optimal" or outcome.value is None or outcome.dual is None:
            return self._back(posed, outcome, chosen)
        program, dual = posed.program, outcome.dual
        earlier = next((goal.prices for goal in reversed(self.results) if goal.prices), None)

        def prices_of(vector: Vector) -> Prices | None:
            if self.only:
                return None
            return exact_prices(self.setting, master.lead, program, vector, posed.draft.merged)

        if posed.faces:
            here = prices_of(dual)
            least = Fraction(0) if earlier is None or here is None else beyond(earlier, here)
            dual = lift(posed.whole, posed.faces, dual, least)
        more = len(self.results) + 1 < len(self.terms.goals)
        prices = prices_of(dual) if more and program.stages[-1].cost.any() else None
        goal = Reached(self.goal, outcome.value, dual, program.row_scale, prices)
        self.results.append(goal)
        if not more:
            return self._back(posed, outcome, chosen)
        master.columns = [master.columns[j] for j in chosen]
        master.go_on(goal)
        self.search = None  # its rows are out of date
        self.wanted.clear()
        return None

    def _told(self, draft: InterimDraft, outcome: Outcome) -> bool:
        """Write lies that the point tells although they are not written yet; whether any."""
        master = self.master
        if master.lies is None or outcome.status == "infeasible":
            return False
        found = [
            broken(self.setting, self.terms, draft, vector, ray)
            for vector, ray in ((outcome.primal, False), (outcome.ray, True))
            if vector is not None
        ]
        if not any(pairs for lies in found for pairs in lies):
            return False
        self.search = None  # its rows are out of date
        self.results.clear()
        master.again()
        groups = alike_parties(self.setting, self.terms, master.lead)
        for lies in found:
            master.lies = with_more(master.lies, even_lies(groups, lies))
        return True

    def _improve(self, prices: Prices) -> bool:
        """List the best rule at some prices where it improves; whether it does."""
        master = self.master
        rule = rule_for(self.setting, master.first(), prices.parties)
        counts = master.count(rule)
        worth = [prices.worth(counts, g) for g in range(master.slices)]
        better = [g for g in range(master.slices) if worth[g] > prices.slices[g]]
        if better:
            self.wanted.update(master.add(Listed(rule, counts), better))
        return bool(better)

    def _back(self, posed: Posed, outcome: Outcome, chosen: list[int]) -> Settled:
        """The answer on the full program: a mechanism, and the master that proves it."""
        words: dict[str, Status] = {"optimal": "possible", "infeasible": "impossible"}
        status = words.get(outcome.status, "unbounded")
        keep, primal, ray = self._kept(outcome, chosen)
        final = posed
        if len(keep) < len(chosen):
            with self._spending("formulate"):
                final = self.master.posed([self.master.columns[j] for j in keep])
        goals = [
            GoalResult(goal.name, goal.value, True, dual=goal.stored(final.program, stage.rows))
            for goal, stage in zip(self.results, final.program.stages, strict=False)
        ]
        if status != "possible":
            goals.append(GoalResult(self.goal, None, outcome.proved))
        settled = Settled(
            status=status,
            path="interim",
            program=final.program,
            goals=tuple(goals),
            primal=primal,
            farkas=_restored(outcome.farkas, posed.program, final.program),
            ray=ray,
            engine=outcome.engine,
            seconds=self.seconds,
            reduction=self._reduction(keep),
        )
        if status != "possible" or primal is None:
            return settled
        with self._spending("table"):
            mechanism = self._mechanism(final.draft, primal, keep)
            table = mechanism.table() if self.setting.profiles <= TABLE_UP_TO else None
        return replace(settled, mechanism=mechanism, table=table)

    def _kept(
        self, outcome: Outcome, chosen: list[int]
    ) -> tuple[list[int], Vector | None, Vector | None]:
        """The share columns the answer needs, and its vectors over those alone."""
        count = len(chosen)
        used: set[int] = set()
        for vector in (outcome.primal, outcome.ray):
            used |= {j for j in vector.idx if j < count} if vector is not None else set()
        slices = [self.master.columns[j][0] for j in chosen]
        for g in set(slices) - {slices[j] for j in used}:
            used.add(slices.index(g))  # an empty slice would contradict itself
        keep = sorted(used)
        place = {j: new for new, j in enumerate(keep)}
        dropped = count - len(keep)

        def over(vector: Vector | None) -> Vector | None:
            if vector is None:
                return None
            idx = tuple(place[j] if j < count else j - dropped for j in vector.idx)
            return Vector(vector.den, idx, vector.num, vector.size - dropped)

        return [chosen[j] for j in keep], over(outcome.primal), over(outcome.ray)

    def _reduction(self, keep: list[int]) -> dict[str, object]:
        """What the document says of the rules behind its share columns."""
        used = sorted({self.master.columns[j][1] for j in keep})
        rules, places = rules_to_plain([self.master.listed[r].rule for r in used])
        place = dict(zip(used, places, strict=True))
        return {
            "road": "interim",
            "lead": self.master.lead,
            "rules": rules,
            "shares": [[self.master.columns[j][0], place[self.master.columns[j][1]]] for j in keep],
            "lies": None
            if self.master.lies is None
            else [[list(pair) for pair in pairs] for pairs in self.master.lies],
        }

    def _mechanism(self, draft: InterimDraft, primal: Vector, keep: list[int]) -> Mechanism:
        setting, master = self.setting, self.master
        shares = primal.numerators()[: len(keep)]
        mixture = []
        for g in range(master.slices):
            parts = [
                (Fraction(share, primal.den), master.listed[master.columns[j][1]].rule)
                for share, j in zip(shares, keep, strict=True)
                if share and master.columns[j][0] == g
            ]
            mixture.append(tuple(parts))
        balanced = self.asked.balance == "ex-post"
        return of_point(setting, master.lead, tuple(mixture), draft, primal, balanced)

    def _undecided(self, reason: str) -> Settled:
        _, program = self.master.program([])
        goals = [GoalResult(goal.name, goal.value, True) for goal in self.results]
        return Settled(
            status="undecided",
            path="interim",
            program=program,
            goals=(*goals, GoalResult(self.goal, None, False, reason=reason)),
            reason=reason,
            seconds=self.seconds,
        )

    @contextmanager
    def _spending(self, part: str) -> Iterator[None]:
        since = time.perf_counter()
        try:
            yield
        finally:
            self.seconds[part] = self.seconds.get(part, 0.0) + time.perf_counter() - since


def _restored(dual: Vector | None, old: Program, new: Program) -> Vector | None:
    """The same natural multipliers over rows that dropping columns may have scaled anew."""
    if dual is None or old is new:
        return dual
    entries = {}
    for row, value in dual.fractions().items():
        natural = value * int(old.row_scale[0][row]) / int(old.row_scale[1][row])
        entries[row] = natural * int(new.row_scale[1][row]) / int(new.row_scale[0][row])
    return Vector.of(entries, dual.size)
