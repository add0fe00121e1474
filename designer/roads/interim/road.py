"""The interim road, from terms to a settled answer.

Down: the demands over interim quantities and shares of rules (`master`). Settle: price, list
the best rule, solve again, until no rule improves; the last master and the last pricing are
exact. Back: a mechanism whose payments are computed on demand, and a proof document of the
last master with the rules it lists.
"""

from __future__ import annotations

import time
from dataclasses import replace
from fractions import Fraction

import numpy as np

from designer.demands.terms import Terms
from designer.engines.report import Engine
from designer.engines.watch import Stopped, Watch
from designer.program.program import Program
from designer.proof.outcome import Outcome
from designer.proof.prove import prove
from designer.proof.vector import Vector
from designer.roads.interim.draft import InterimDraft
from designer.roads.interim.master import (
    Master,
    Prices,
    exact_prices,
    rough_prices,
    rule_for,
)
from designer.roads.interim.mechanism import Mechanism
from designer.roads.interim.rule import Index, Rule, welfare_index
from designer.roads.product import as_independent
from designer.roads.settled import GoalResult, Settled
from designer.setting.setting import Setting

GOALS = ("any", "outside-money", "revenue", "welfare", "parties", "floor", "margin", "blend")
MOST = 20_000_000_000
"""Profiles that a pass may be asked to count: a few minutes."""
TABLE_UP_TO = 200_000
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
        if len(terms.goals) > 1:
            return "several goals are asked one after the other"
        if terms.goals[0] not in GOALS:
            return f"the goal {terms.goals[0]} is about single profiles"
        if terms.tidy == "swing":
            return "a tidy table is asked, profile by profile"
        if len(setting.parties) == 1 and terms.balance == "ex-post":
            return "one party has no one to share with"
        if setting.profiles > MOST:
            return f"there are more than {MOST:,} profiles to count"
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
        balance = "none" if terms.balance == "none" else "ex-ante"
        self.terms = replace(terms, balance=balance, tidy="none")
        sizes = setting.shape
        self.lead = sizes.index(max(sizes))
        self.master = Master(setting, self.terms, self.lead, watch)
        self.goal = terms.goals[0]
        self.seconds: dict[str, float] = {}

    def walk(self) -> Settled:
        """Find rules until none improves."""
        try:
            self._start()
            while True:
                program, outcome = self._exact()
                if outcome.status == "undecided" or not outcome.proved:
                    return self._undecided(program, outcome.reason)
                certificate = outcome.farkas if outcome.status == "infeasible" else outcome.dual
                if outcome.status == "unbounded" or certificate is None:
                    return self._back(program, outcome)
                prices = exact_prices(self.setting, self.lead, program, certificate.fractions())
                if self.terms.decision == "table" or not self._improve(prices):
                    return self._back(program, outcome)
                if outcome.status == "optimal":
                    self._search()
        except Stopped as stop:
            program = self.master.program(self.goal)
            return self._undecided(program, f"{stop.reason}; {stop.remedy}")

    def _start(self) -> None:
        """A first list of rules: the given table, the efficient rule, every constant one."""
        since = time.perf_counter()
        if self.terms.decision == "table":
            self.master.add(Rule(()))
        else:
            options = len(self.setting.options)
            nothing = tuple(np.zeros((n, options), dtype=np.int64) for n in self.setting.shape)
            efficient = self.master.first()
            if efficient:
                self.master.add(Rule(efficient))
            else:
                self.master.add(Rule((welfare_index(self.setting),)))
                for k in range(options):
                    row = np.zeros(options, dtype=np.int64)
                    row[k] = 1
                    self.master.add(Rule((Index(nothing, row),)))
        self._spent("count", since)

    def _exact(self) -> tuple[Program, Outcome]:
        since = time.perf_counter()
        program = self.master.program(self.goal)
        self._spent("formulate", since)
        outcome = prove(program.stage(0), engine=self.engine, watch=self.watch)
        for part, seconds in outcome.seconds.items():
            self.seconds[part] = self.seconds.get(part, 0.0) + seconds
        return program, outcome

    def _improve(self, prices: Prices) -> bool:
        """List the best rule at some prices if it improves in any slice."""
        since = time.perf_counter()
        rule = rule_for(self.setting, self.master.first(), prices)
        counts = self.master.add(rule)
        better = [
            g
            for g in range(self.setting.shape[self.lead])
            if prices.worth(counts, g) > prices.slices[g]
        ]
        place = len(self.master.listed) - 1
        self.master.columns = [
            column for column in self.master.columns if column[1] != place or column[0] in better
        ]
        if not better:
            self.master.listed.pop()
        self._spent("count", since)
        return bool(better)

    def _search(self) -> None:
        """Look for rules with an engine's floats until it finds none."""
        while True:
            self.watch.check()
            since = time.perf_counter()
            program = self.master.program(self.goal)
            self._spent("formulate", since)
            since = time.perf_counter()
            report = self.engine.solve(program.stage(0), self.watch)
            self._spent("solve", since)
            if report.status != "optimal":
                return
            prices = rough_prices(self.setting, self.lead, program, report)
            if prices is None:
                return
            # A rounding error must not look like an improvement for ever.
            noise = Fraction(max((abs(s) for s in prices.slices), default=Fraction(0))) / 2**30 + 1
            eased = replace(prices, slices=tuple(s + noise for s in prices.slices))
            if not self._improve(eased):
                return

    def _back(self, program: Program, outcome: Outcome) -> Settled:
        """The answer on the full program: a mechanism, and the master that proves it."""
        status = {"optimal": "possible", "infeasible": "impossible"}.get(
            outcome.status, "unbounded"
        )
        keep, primal, ray = self._kept(program, outcome)
        final = self.master.program(self.goal, [self.master.columns[j] for j in keep])
        settled = Settled(
            status=status,  # type: ignore[arg-type]
            path="interim",
            program=final,
            goals=(
                GoalResult(
                    self.goal,
                    outcome.value if status == "possible" else None,
                    outcome.proved,
                    dual=_restored(outcome.dual, program, final),
                ),
            ),
            primal=primal,
            farkas=_restored(outcome.farkas, program, final),
            ray=ray,
            engine=outcome.engine,
            seconds=self.seconds,
            reduction=self._reduction(keep),
        )
        if status != "possible" or primal is None:
            return settled
        since = time.perf_counter()
        mechanism = self._mechanism(final, primal, keep)
        table = mechanism.table() if self.setting.profiles <= TABLE_UP_TO else None
        self._spent("table", since)
        return replace(settled, mechanism=mechanism, table=table)

    def _kept(
        self, program: Program, outcome: Outcome
    ) -> tuple[list[int], Vector | None, Vector | None]:
        """The share columns the answer needs, and its vectors over those alone."""
        count = len(self.master.columns)
        used = {j for j in outcome.primal.idx if j < count} if outcome.primal else set()
        if outcome.ray is not None:
            used |= {j for j in outcome.ray.idx if j < count}
        for g in range(self.setting.shape[self.lead]):
            mine = [j for j, column in enumerate(self.master.columns) if column[0] == g]
            if not used & set(mine):
                used.add(mine[0])  # an empty slice would contradict itself
        keep = sorted(used)
        place = {j: new for new, j in enumerate(keep)}
        dropped = count - len(keep)

        def over(vector: Vector | None) -> Vector | None:
            if vector is None:
                return None
            idx = tuple(place[j] if j < count else j - dropped for j in vector.idx)
            return Vector(vector.den, idx, vector.num, vector.size - dropped)

        return keep, over(outcome.primal), over(outcome.ray)

    def _reduction(self, keep: list[int]) -> dict[str, object]:
        """What the document says of the rules behind its share columns."""
        used = sorted({self.master.columns[j][1] for j in keep})
        place = {r: new for new, r in enumerate(used)}
        return {
            "road": "interim",
            "lead": self.lead,
            "rules": [
                [index.plain() for index in self.master.listed[r].rule.indices] for r in used
            ],
            "shares": [[self.master.columns[j][0], place[self.master.columns[j][1]]] for j in keep],
        }

    def _mechanism(self, program: Program, primal: Vector, keep: list[int]) -> Mechanism:
        setting = self.setting
        values = primal.fractions()
        mixture = []
        for g in range(setting.shape[self.lead]):
            parts = [
                (values.get(new, Fraction(0)), self.master.listed[self.master.columns[j][1]].rule)
                for new, j in enumerate(keep)
                if self.master.columns[j][0] == g
            ]
            mixture.append(tuple((share, rule) for share, rule in parts if share))
        work = self.master.formulation([self.master.columns[j] for j in keep])
        work.pose(self.goal)
        draft = work.draft
        if not isinstance(draft, InterimDraft):
            raise AssertionError("the master writes on an interim draft")
        pays = []
        known = draft.pays_columns
        for index, party in enumerate(setting.parties):
            columns = known.get(index)
            pays.append(
                tuple(
                    Fraction(0) if columns is None else values.get(int(columns[a]), Fraction(0))
                    for a in range(party.size)
                )
            )
        chances = [
            [
                [values.get(int(column), Fraction(0)) for column in row]
                for row in draft.expected_decision(index)[0]
            ]
            for index in range(len(setting.parties))
        ]
        mechanism = Mechanism(setting, self.lead, tuple(mixture), tuple(pays))
        if self.asked.balance != "ex-post":
            return mechanism
        return _balanced(mechanism, chances)

    def _undecided(self, program: Program, reason: str) -> Settled:
        return Settled(
            status="undecided",
            path="interim",
            program=program,
            goals=(GoalResult(self.goal, None, False, reason=reason),),
            reason=reason,
            seconds=self.seconds,
        )

    def _spent(self, part: str, since: float) -> None:
        self.seconds[part] = self.seconds.get(part, 0.0) + time.perf_counter() - since


def _restored(dual: Vector | None, old: Program, new: Program) -> Vector | None:
    """The same natural multipliers over rows that dropping columns may have scaled anew."""
    if dual is None:
        return None
    entries = {}
    for row, value in dual.fractions().items():
        natural = value * int(old.row_scale[0][row]) / int(old.row_scale[1][row])
        entries[row] = natural * int(new.row_scale[1][row]) / int(new.row_scale[0][row])
    return Vector.of(entries, dual.size)


def _balanced(mechanism: Mechanism, chances: list[list[list[Fraction]]]) -> Mechanism:
    """The same mechanism with the pot at its expectation in every case."""
    setting = mechanism.setting
    outlay = [Fraction(int(spent), setting.grain) for spent in setting.outlay]
    averages = [
        sum((p * m for p, m in zip(party.marginal, table, strict=True)), Fraction(0))
        for party, table in zip(setting.parties, mechanism.pays_on_average, strict=True)
    ]
    spent = [
        [sum((q * o for q, o in zip(row, outlay, strict=True)), Fraction(0)) for row in table]
        for table in chances
    ]
    first = setting.parties[0]
    expected = sum((p * s for p, s in zip(first.marginal, spent[0], strict=True)), Fraction(0))
    pot = sum(averages, Fraction(0)) - expected
    everything = sum(averages, Fraction(0))
    effects = tuple(
        tuple(
            spent[i][a] + pot - mine - (everything - averages[i])
            for a, mine in enumerate(mechanism.pays_on_average[i])
        )
        for i in range(len(setting.parties))
    )
    return replace(mechanism, effects=effects, pot=pot)
