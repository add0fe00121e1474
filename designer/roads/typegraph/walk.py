"""One walk down the type-graph road: decide, find the paths, settle what is left, and back.

Where profiles are tied the walk starts with the first option listed, and changes choices as
the multipliers ask until they prove that no choice does better. Should they not soon, the
choices are opened to lotteries (`mixing.py`); where these are not looked for, or not found, the
plain road takes over if it can.
"""

from __future__ import annotations

import itertools
import time
from dataclasses import dataclass, replace
from fractions import Fraction

from designer.demands.terms import Terms
from designer.engines.report import Engine
from designer.engines.watch import Stopped, Watch
from designer.program.labels import Decides
from designer.program.program import Program
from designer.proof.outcome import Outcome
from designer.proof.prove import prove
from designer.roads import full
from designer.roads.settled import GoalResult, Settled
from designer.roads.typegraph.bases import OWN, Base, Cycle, TooBig, base
from designer.roads.typegraph.cases import Cases, cases_program
from designer.roads.typegraph.decided import Decided, decide
from designer.roads.typegraph.evidence import plain_base, plain_part
from designer.roads.typegraph.fibers import Fibers, fibers
from designer.roads.typegraph.lotteries import Lies
from designer.roads.typegraph.mechanism import GraphMechanism, runs
from designer.roads.typegraph.mixing import Mixing, Unsettled, first_roots, uncovered
from designer.roads.typegraph.paths import trail
from designer.roads.typegraph.pots import least_pot
from designer.roads.typegraph.prices import better, prices
from designer.roads.typegraph.road import in_every_case
from designer.roads.typegraph.totals import Figures, spending, totals_program
from designer.setting.profiles import strides
from designer.setting.setting import IntArray, Setting

TABLE_UP_TO = 200_000
"""Profiles up to which the whole table is made at once."""
ROUNDS = 8
"""Times that choices at tied profiles are changed before the plain road takes over."""
PLAIN_UP_TO = 1_000_000
"""Columns up to which the plain road takes over by itself: minutes, and some 6 GiB."""
FIRST = 3
"""Times that they are changed before lotteries are looked for, where they can be."""


class Torn(Exception):  # noqa: N818 - not an error: another road may go there
    """The choices at tied profiles were not settled."""


@dataclass(frozen=True, eq=False)
class Found:
    """What one choice at the tied profiles leads to: a settled answer, or other choices."""

    settled: Settled | None
    choices: Decided | None = None


class Walk:
    """The state of one walk: the rule and what was spent."""

    def __init__(
        self, own: Setting, asked: Setting, terms: Terms, engine: Engine, watch: Watch
    ) -> None:
        """`own` has independent priors where those of `asked` are a product."""
        self.setting, self.asked, self.terms = own, asked, terms
        self.engine, self.watch = engine, watch
        self.goal = terms.goals[0]
        self.cases = Cases(())
        self.seconds: dict[str, float] = {}
        self.bases: list[Base] | None = None

    def walk(self) -> Settled:
        """Decide, and change the choices at ties until they are proved best."""
        try:
            since = time.perf_counter()
            decided = decide(self.setting, self.terms.decision, self.watch)
            self._spent("decide", since)
            return self._choose(decided)
        except (Torn, TooBig) as reason:
            return self._elsewhere(str(reason))
        except Stopped as stop:
            return self._undecided(f"{stop.reason}; {stop.remedy}")

    def _choose(self, decided: Decided) -> Settled:
        """Change choices at ties, then open them to lotteries. Raises Torn, TooBig."""
        first, seen = decided, list[IntArray]()
        why = uncovered(self.setting, self.terms, decided)
        rounds = ROUNDS if why is not None else FIRST
        while len(seen) < rounds and not any((decided.choices == one).all() for one in seen):
            seen.append(decided.choices)
            found = self.attempt(decided)
            if found.settled is not None:
                return found.settled
            if found.choices is None:
                break
            decided = found.choices
        if why is None:
            try:
                return self._mixed(first, seen)
            except Unsettled as reason:
                why = str(reason)
        raise Torn(f"lotteries where several options are efficient may do better, and {why}")

    def attempt(self, decided: Decided) -> Found:
        """What one choice at the tied profiles leads to."""
        since = time.perf_counter()
        works = [
            fibers(self.setting, self.terms, decided, i) for i in range(len(self.setting.parties))
        ]
        self._spent("decide", since)
        bases: list[Base] = []
        since = time.perf_counter()
        for work in works:
            found = base(work, self.watch)
            if isinstance(found, Cycle):
                self._spent("paths", since)
                return self._contradiction(decided, found)
            bases.append(found)
        self._spent("paths", since)
        self.bases = bases
        if in_every_case(self.terms):
            since = time.perf_counter()
            least, profile = least_pot(works, bases, self.watch)
            self._spent("pots", since)
            short = self.terms.balance == "ex-post" and least < -self.terms.subsidy
            if self.goal in ("outside-money", "worst-pot") or short:
                return self._at(decided, works, bases, profile, least)
        return self._totals(decided, works, bases)

    # -- a cycle of lies -----------------------------------------------------------------

    def _contradiction(self, decided: Decided, cycle: Cycle) -> Found:
        """No payments make this rule honest; with ties perhaps another one."""
        party, ring = cycle.party, cycle.types
        at = [_profile(self.setting, party, cycle.other, a) for a in ring]
        cases = Cases(tuple((party, at[j], at[(j + 1) % len(ring)]) for j in range(len(ring))))
        program = cases_program(self.setting, self.terms, cases, "any")
        return self._excluded(decided, program, cases)

    def _excluded(self, decided: Decided, program: Program, cases: Cases) -> Found:
        """The rows exclude every table, or tell better choices."""
        outcome = self._prove(program)
        if outcome.status == "infeasible":
            goal = GoalResult(self.goal, None, True)
            return Found(self._settled("impossible", program, outcome, goal, _listed(cases)))
        return Found(None, self._asked_for(decided, program, outcome))

    def _asked_for(self, decided: Decided, program: Program, outcome: Outcome) -> Decided | None:
        """The choices that a point of some rows makes where they mention a tied profile."""
        if outcome.primal is None:
            return None
        position = {profile: j for j, profile in enumerate(decided.tied.tolist())}
        choices = decided.choices.copy()
        share: dict[int, Fraction] = {}
        for column, value in outcome.primal.fractions().items():
            label = program.column_axis.label(column)
            if isinstance(label, Decides):
                place = position[_number(self.setting, label.at)]
                if value > share.get(place, Fraction(0)):
                    share[place] = value
                    choices[place] = self.setting.options.index(label.option)
        if (choices == decided.choices).all():
            return None
        return decided.choosing(choices)

    # -- one profile decides -------------------------------------------------------------

    def _at(
        self,
        decided: Decided,
        works: list[Fibers],
        bases: list[Base],
        profile: int,
        least: Fraction,
    ) -> Found:
        """The pot at its least favourable profile, and the paths that bound it there."""
        # Rows of earlier choices stay: together they keep the choices from going in circles.
        cases = self.cases = self.cases.and_also(_paths_to(self.setting, works, bases, profile))
        goal = self.goal if self.goal in ("outside-money", "worst-pot") else "any"
        program = cases_program(self.setting, self.terms, cases, goal)
        outcome = self._prove(program)
        if outcome.status == "infeasible":
            result = GoalResult(self.goal, None, True)
            listed = _listed(cases)
            return Found(self._settled("impossible", program, outcome, result, listed))
        value = -least if self.goal == "outside-money" else least
        if outcome.status != "optimal" or goal == "any" or outcome.value != value:
            return Found(None, self._asked_for(decided, program, outcome))
        result = GoalResult(self.goal, outcome.value, outcome.proved, dual=outcome.dual)
        reduction = _listed(cases) | self._evidence(decided, bases)
        settled = self._settled("possible", program, outcome, result, reduction)
        return Found(self._with_table(settled, decided, works, bases, None))

    # -- averages decide -----------------------------------------------------------------

    def _totals(self, decided: Decided, works: list[Fibers], bases: list[Base]) -> Found:
        """A program in the parties' average payments."""
        outlay, designer = spending(self.setting, works[0])
        figures = Figures(
            tuple(found.most for found in bases),
            tuple(found.worth for found in bases),
            outlay,
            designer,
            bool(len(decided.tied)),
        )
        program = totals_program(self.setting, self.terms, figures)
        outcome = self._prove(program)
        status = {"optimal": "possible", "infeasible": "impossible"}.get(
            outcome.status, "unbounded"
        )
        certificate = outcome.farkas if status == "impossible" else outcome.dual
        if status != "unbounded" and len(decided.tied):
            if certificate is None:
                return Found(None)
            since = time.perf_counter()
            dual = certificate.fractions()
            priced = prices(self.setting, decided, works, bases, program, dual)
            choices = better(decided, priced)
            self._spent("prices", since)
            if (choices != decided.choices).any():
                return Found(None, decided.choosing(choices))
        value = outcome.value if status == "possible" else None
        result = GoalResult(self.goal, value, outcome.proved, dual=outcome.dual)
        reduction = self._evidence(decided, bases)
        settled = self._settled(status, program, outcome, result, reduction)
        if status != "possible" or outcome.primal is None:
            return Found(settled)
        paid = [outcome.primal.value(i) for i in range(len(bases))]
        # Where pots are asked case by case it is the greatest table that fills them.
        greatest = in_every_case(self.terms)
        return Found(self._with_table(settled, decided, works, bases, None if greatest else paid))

    # -- lotteries at ties -----------------------------------------------------------------

    def _mixed(self, decided: Decided, seen: list[IntArray]) -> Settled:
        """The best lotteries at ties, beginning with choices that were tried. Raises Unsettled."""
        search = Mixing(self.setting, self.terms, decided, self.engine, self.watch, self.seconds)
        found = search.settle(first_roots(search.opened.works, self.bases), seen)
        outcome = found.outcome
        status = {"optimal": "possible", "infeasible": "impossible"}.get(
            outcome.status, "unbounded"
        )
        value = outcome.value if status == "possible" else None
        result = GoalResult(self.goal, value, outcome.proved, dual=outcome.dual)
        reduction: dict[str, object] = {
            "road": "type-graph",
            "cuts": [plain_part(part) for part in found.parts],
        }
        if found.pots:
            reduction["pots"] = [[pot.profile, list(map(list, pot.trails))] for pot in found.pots]
        if found.decided is not None:
            reduction["parties"] = [
                None if isinstance(part, Lies) else plain_base(base)
                for part, base in zip(found.parts, found.bases, strict=True)
            ]
        settled = self._settled(status, found.program, outcome, result, reduction)
        if status != "possible" or found.decided is None or outcome.primal is None:
            return settled
        paid = [outcome.primal.value(i) for i in range(len(found.bases))]
        works, bases = list(found.works), list(found.bases)
        # Where pots are asked case by case it is the greatest table that fills them.
        averages = None if in_every_case(self.terms) else paid
        return self._with_table(settled, found.decided, works, bases, averages)

    # -- home ----------------------------------------------------------------------------

    def _with_table(
        self,
        settled: Settled,
        decided: Decided,
        works: list[Fibers],
        bases: list[Base],
        paid: list[Fraction] | None,
    ) -> Settled:
        """The mechanism, and the table where it is small; `paid`: the averages to reach."""
        since = time.perf_counter()
        shifts = [
            Fraction(0) if paid is None else paid[i] - found.average
            for i, found in enumerate(bases)
        ]
        mechanism = GraphMechanism(
            self.setting,
            decided,
            tuple(works),
            tuple(found.pays for found in bases),
            works[0].den,
            tuple(shifts),
        )
        table = mechanism.table() if self.setting.profiles <= TABLE_UP_TO else None
        self._spent("table", since)
        return replace(settled, mechanism=mechanism, table=table)

    def _evidence(self, decided: Decided, bases: list[Base]) -> dict[str, object]:
        return {
            "road": "type-graph",
            "ties": runs(decided.choices),
            "parties": [plain_base(found) for found in bases],
        }

    def _prove(self, program: Program) -> Outcome:
        outcome = prove(program.stage(0), engine=self.engine, watch=self.watch)
        for part, seconds in outcome.seconds.items():
            self.seconds[part] = self.seconds.get(part, 0.0) + seconds
        if outcome.status == "undecided" or not outcome.proved:
            raise Torn(outcome.reason or "the engine's word was not confirmed")
        return outcome

    def _settled(
        self,
        status: str,
        program: Program,
        outcome: Outcome,
        goal: GoalResult,
        reduction: dict[str, object],
    ) -> Settled:
        return Settled(
            status=status,  # type: ignore[arg-type]
            path="type-graph",
            program=program,
            goals=(goal,),
            primal=outcome.primal if status != "impossible" else None,
            farkas=outcome.farkas,
            ray=outcome.ray,
            engine=outcome.engine,
            seconds=self.seconds,
            reduction=reduction,
        )

    def _elsewhere(self, reason: str) -> Settled:
        """The next road that can go there, by likeness or plain; its `path` says which."""
        from designer.roads.likeness.road import ByLikeness

        likeness = ByLikeness()
        if likeness.applies(self.asked, self.terms) is None:
            return likeness.travel(self.asked, self.terms, self.engine, self.watch)
        cells = self.asked.profiles * (len(self.asked.parties) + len(self.asked.options))
        if cells > PLAIN_UP_TO:
            can = "take --path full and several GiB, " if cells <= full.CELLS_UP_TO else ""
            return self._undecided(
                f"{reason}; the plain program would have {cells:,} columns: "
                f"{can}ask for less, or take fewer types"
            )
        return full.travel(self.asked, self.terms, self.engine, self.watch)

    def _undecided(self, reason: str) -> Settled:
        program = cases_program(self.setting, self.terms, Cases(()), "any")
        return Settled(
            status="undecided",
            path="type-graph",
            program=program,
            goals=(GoalResult(self.goal, None, False, reason=reason),),
            reason=reason,
            seconds=self.seconds,
        )

    def _spent(self, part: str, since: float) -> None:
        self.seconds[part] = self.seconds.get(part, 0.0) + time.perf_counter() - since


def _paths_to(setting: Setting, works: list[Fibers], bases: list[Base], profile: int) -> Cases:
    """Every party's path to its payment at a profile, and the pot there."""
    lies: list[tuple[int, int, int]] = []
    takes: list[tuple[int, int]] = []
    for i, (work, found) in enumerate(zip(works, bases, strict=True)):
        if found.tree is None or found.root != OWN:
            raise AssertionError("participation in every case gives each type its own room")
        step, size = strides(setting.shape)[i], setting.shape[i]
        other = profile // (step * size) * step + profile % step
        types = trail(found.tree[work.of[other]], profile // step % size)
        at = [_profile(setting, i, other, a) for a in types]
        lies += [(i, true, told) for true, told in itertools.pairwise(at)]
        takes.append((i, at[-1]))
    return Cases(tuple(lies), tuple(takes), (profile,))


def _profile(setting: Setting, party: int, other: int, a: int) -> int:
    """The profile number of a type of a party and one of the others' profiles."""
    step, size = strides(setting.shape)[party], setting.shape[party]
    return other // step * (step * size) + a * step + other % step


def _number(setting: Setting, labels: tuple[str, ...]) -> int:
    positions = tuple(
        [kind.label for kind in party.types].index(label)
        for party, label in zip(setting.parties, labels, strict=True)
    )
    return setting.profile_of(positions)


def _listed(cases: Cases) -> dict[str, object]:
    """What a document says of rows taken from the full program."""
    rows = {
        "lies": [list(row) for row in cases.lies],
        "takes": [list(row) for row in cases.takes],
        "pots": list(cases.pots),
    }
    return {"road": "type-graph", "rows": rows}
