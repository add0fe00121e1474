"""The best lotteries where several options are efficient: paths are listed as they bind.

What a party can be made to pay is concave in the lotteries at ties, and piecewise linear: the
length of the shortest paths. The small program of `lotteries.py` is solved with a few paths
listed; the shortest paths under the lotteries it takes are listed as well, until nobody is to
pay more than the paths allow. The last rounds are exact.
"""

from __future__ import annotations

import time
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from designer.demands.terms import Terms
from designer.engines.report import BASIC, Basis, Engine, FloatArray, Report
from designer.engines.watch import Watch
from designer.program.linear import LinearProgram
from designer.program.program import Program
from designer.proof.outcome import Outcome
from designer.proof.prove import prove
from designer.proof.vector import Vector
from designer.roads.typegraph.bases import OWN, Base, Cycle, Root, TooBig, base, kind
from designer.roads.typegraph.decided import Decided
from designer.roads.typegraph.fibers import Fibers, fibers
from designer.roads.typegraph.listing import (
    Listed,
    Spelling,
    mixed,
    rule_of,
    spelled_base,
    starts,
)
from designer.roads.typegraph.lotteries import Opened, Parts, lottery_program, on_average
from designer.roads.typegraph.openpots import Pot, pot_at
from designer.roads.typegraph.pots import low_pots
from designer.roads.typegraph.road import in_every_case
from designer.setting.setting import IntArray, Setting

TIES = 60_000
"""Tied profiles up to which their lotteries are columns of one program."""
CUTS = 600_000
"""Paths and lies that may be listed; half as many take about a minute and 1.5 GiB."""
ROUNDS = 60
"""Times that paths are added."""
FINE = 1 << 28
"""The parts into which lotteries are rounded while floats lead the search."""
FEW = 20
"""A basis is carried over where no more than one row in so many is new."""
POTS = 200
"""Pots that are listed in one round, the smallest first."""
CELLS = 250_000
"""Payments by class and type up to which a party is spelled."""


class Unsettled(Exception):  # noqa: N818 - not an error: another road may go there
    """The lotteries were not found; the message says why."""


@dataclass(frozen=True, eq=False)
class Mixture:
    """The answer: a program, what it says, and the table's rule and paths where there is one."""

    program: Program
    outcome: Outcome
    opened: Opened
    parts: Parts
    pots: tuple[Pot, ...] = ()
    decided: Decided | None = None
    works: tuple[Fibers, ...] = ()
    bases: tuple[Base, ...] = ()


def uncovered(
    setting: Setting, terms: Terms, decided: Decided, limit: int | None = TIES
) -> str | None:
    """None, or why lotteries at ties are not looked for; limit None: at any number of ties."""
    if not len(decided.tied):
        return "no profile is tied"
    if setting.interdependent:
        return "worths depend on the others' types"
    if in_every_case(terms) and terms.goals[0] in ("outside-money", "worst-pot"):
        return "the goal is about single pots"
    if limit is not None and len(decided.tied) > limit:
        return f"{len(decided.tied):,} profiles are tied, more than {limit:,}"
    return None


class _Started:
    """An engine whose first program starts from a basis that is known."""

    def __init__(self, engine: Engine, basis: Basis) -> None:
        """Keep the basis for the first program asked."""
        self.engine, self.basis = engine, basis

    @property
    def name(self) -> str:
        """The engine's own name."""
        return self.engine.name

    def solve(
        self,
        lp: LinearProgram,
        watch: Watch,
        *,
        basis: Basis | None = None,
        tolerance: float | None = None,
    ) -> Report:
        """As the engine does."""
        fits = len(self.basis.rows) == lp.rows and len(self.basis.columns) == lp.columns
        start = self.basis if basis is None and fits else basis
        return self.engine.solve(lp, watch, basis=start, tolerance=tolerance)


class Mixing:
    """One search for the best lotteries."""

    def __init__(
        self,
        setting: Setting,
        terms: Terms,
        decided: Decided,
        engine: Engine,
        watch: Watch,
        seconds: dict[str, float],
    ) -> None:
        """`decided` takes the option first listed at ties."""
        works = [fibers(setting, terms, decided, i) for i in range(len(setting.parties))]
        self.setting, self.terms, self.decided = setting, terms, decided
        self.engine, self.watch, self.seconds = engine, watch, seconds
        self.opened = Opened(setting, terms, works)
        self.listed: list[list[Listed]] = [[] for _ in works]
        self.spelling: dict[int, Spelling] = {}
        self.pots: list[Pot] = []
        self._last: tuple[Program, Basis] | None = None

    def settle(self, roots: list[list[Root]], choices: list[IntArray]) -> Mixture:
        """The best lotteries, or that there are none.

        roots    per party where its paths may end at first, if paths bound what it pays
        choices  choices at ties that are worth looking at first
        """
        for i, places in enumerate(roots):
            self.listed[i] = [Listed(self.opened.torn[i], root) for root in places]
        self._begin([bounds for bounds in self.listed if bounds], choices)
        leading = True
        for _ in range(ROUNDS):
            self.watch.tell("lotteries at ties", self._size())
            if leading:
                leading = self._led(self._program(ordered=False))
                continue
            program = self._program(ordered=True)
            outcome = self._prove(program)
            if outcome.status == "infeasible":
                listed = self._parts(ordered=True)
                return Mixture(program, outcome, self.opened, listed, tuple(self.pots))
            if outcome.primal is None:
                raise Unsettled("the program over lotteries gave no point")
            found = self._home(program, outcome, outcome.primal)
            if found is not None:
                return found
            leading = True
        raise Unsettled("the lotteries where several options are efficient were not settled")

    # -- what is listed ------------------------------------------------------------------

    def _begin(self, listed: Sequence[Sequence[Listed]], choices: list[IntArray]) -> None:
        """List the paths of some bounds under lotteries to begin with."""
        for shares, den in self._first(choices):
            decided = mixed(self.decided, shares, den)
            for bounds in listed:
                alone = bounds[0].found.alone(decided)
                for bound in bounds:
                    bound.paths_under(alone)

    def _first(self, choices: list[IntArray]) -> list[tuple[IntArray, int]]:
        """Lotteries to begin with: given choices, each option in turn, and all alike."""
        torn = self.decided.torn
        counts = torn.sum(axis=1)
        rows = np.arange(len(torn))
        picks = list(choices)
        order = np.argsort(~torn, axis=1, kind="stable")
        picks += [order[rows, j % counts] for j in range(1, int(counts.max()))]
        found = []
        for pick in picks:
            shares = np.zeros(torn.shape, dtype=np.int64)
            shares[rows, pick] = 1
            found.append((shares, 1))
        common = int(np.lcm.reduce(np.unique(counts)))
        found.append((torn * (common // counts)[:, None], common))
        return found

    def _each(self) -> list[list[Listed | Spelling]]:
        """Per party what has payments of its own in the program, in their order."""
        return [
            [self.spelling[i]] if i in self.spelling else list(bounds)
            for i, bounds in enumerate(self.listed)
        ]

    def _size(self) -> int:
        return sum(len(part.lines.rows) for parts in self._each() for part in parts)

    def _parts(self, *, ordered: bool) -> Parts:
        found: Parts = []
        for i, bounds in enumerate(self.listed):
            if i in self.spelling:
                found.append(self.spelling[i].lies(ordered))
            else:
                found.append([bound.bound(ordered) for bound in bounds])
        return found

    # -- rounds --------------------------------------------------------------------------

    def _program(self, *, ordered: bool) -> Program:
        if self._size() > CUTS:
            raise Unsettled(f"more than {CUTS:,} paths and lies bind at ties")
        since = time.perf_counter()
        parts = self._parts(ordered=ordered)
        program = lottery_program(self.setting, self.terms, self.opened, parts, self.pots)
        self._spent("lotteries", since)
        return program

    def _led(self, program: Program) -> bool:
        """A round in floats: whether paths were added."""
        since = time.perf_counter()
        lp = program.stage(0)
        report = self.engine.solve(lp, self.watch, basis=self._carried(program))
        if report.x is None and report.basis is not None:
            # Large programs come back as a basis alone.
            report = self.engine.solve(lp, self.watch, basis=report.basis)
        self._spent("solve", since)
        self._last = None if report.basis is None else (program, report.basis)
        if report.status != "optimal" or report.x is None:
            return False
        since = time.perf_counter()
        x = report.x
        start = program.column_axis.start("decides")
        chances = x[start : start + len(self.opened.cells)]
        decided = mixed(self.decided, self._rounded(chances), FINE)
        added, firsts = 0, iter(starts(program))
        for parts in self._each():
            for part, alone in self._alone(parts, decided):
                first = next(firsts)
                added += part.near(alone, x[first : first + _width(part)])
        added += self._short(decided)
        self._spent("paths", since)
        return added > 0

    def _short(
        self, decided: Decided, works: list[Fibers] | None = None, bases: list[Base] | None = None
    ) -> int:
        """List pots that are smaller under a rule than is asked; how many."""
        if not in_every_case(self.terms):
            return 0
        if works is None or bases is None:
            works = [fibers(self.setting, self.terms, decided, i) for i in range(len(self.listed))]
            bases = [found for work in works if (found := self._based(work)) is not None]
        low = low_pots(works, bases, -self.terms.subsidy, POTS, self.watch)
        known = set(self.pots)
        fresh = [pot for pot in (pot_at(works, bases, p) for p in low) if pot not in known]
        self.pots += fresh
        return len(fresh)

    def _alone(
        self, parts: list[Listed | Spelling], decided: Decided
    ) -> list[tuple[Listed | Spelling, Fibers]]:
        """A party's parts, each with its graphs under a rule."""
        alone = parts[0].found.alone(decided) if parts else None
        return [] if alone is None else [(part, alone) for part in parts]

    def _carried(self, program: Program) -> Basis | None:
        """The last basis where little was added since: new rows are basic, the others stay."""
        if self._last is None:
            return None
        before, basis = self._last
        added = program.matrix.rows - before.matrix.rows
        if program.matrix.columns != before.matrix.columns or added * FEW > program.matrix.rows:
            return None
        old, new = before.row_axis.blocks, program.row_axis.blocks
        if [block.family for block in old] != [block.family for block in new]:
            return None
        parts, start = [], 0
        for count, now in zip((b.count for b in old), (b.count for b in new), strict=True):
            parts += [basis.rows[start : start + count], np.full(now - count, BASIC, np.int8)]
            start += count
        return Basis(basis.columns, np.concatenate(parts))

    def _rounded(self, chances: FloatArray) -> IntArray:
        """Lotteries near what floats say, int (M, K) over FINE."""
        torn = self.decided.torn
        shares = np.zeros(torn.shape, dtype=np.int64)
        shares[torn] = np.rint(np.clip(chances, 0, 1) * FINE).astype(np.int64)
        rows = np.arange(len(shares))
        most = shares.argmax(axis=1)
        shares[rows, most] += FINE - shares.sum(axis=1)
        return shares

    def _prove(self, program: Program) -> Outcome:
        engine = self.engine
        basis = self._ordered(program)
        if basis is not None:
            # The corner that floats ended in: another one may ask for paths not listed.
            engine = _Started(self.engine, basis)
        outcome = prove(
            program.stage(0), engine=engine, watch=self.watch, scale=program.row_scale[0]
        )
        for part, seconds in outcome.seconds.items():
            self.seconds[part] = self.seconds.get(part, 0.0) + seconds
        if outcome.status == "undecided" or not outcome.proved:
            raise Unsettled(outcome.reason or "the engine's word was not confirmed")
        return outcome

    def _ordered(self, program: Program) -> Basis | None:
        """The last basis, its rows in the order of the finished program."""
        if self._last is None or self._last[0].matrix.rows != program.matrix.rows:
            return None
        rows = self._last[1].rows.copy()
        listed = [part.lines for parts in self._each() for part in parts]
        orders = [lines.order for lines in listed if len(lines.rows)]
        start = 0
        for block in program.row_axis.blocks:
            if block.family in ("paths", "honest"):
                part = rows[start : start + block.count]
                rows[start : start + block.count] = part[orders.pop(0)]
            start += block.count
        return Basis(self._last[1].columns, rows)

    def _home(self, program: Program, outcome: Outcome, primal: Vector) -> Mixture | None:
        """The table of a point of the program, or None where paths were added against it."""
        since = time.perf_counter()
        decided = rule_of(program, self.opened, primal)
        paid = [primal.value(i) for i in range(len(self.setting.parties))]
        values = np.array(primal.numerators(), dtype=object)
        added, firsts, spelled = 0, iter(starts(program)), {}
        for i, parts in enumerate(self._each()):
            for part, alone in self._alone(parts, decided):
                first = next(firsts)
                mine = values[first : first + _width(part)]
                added += part.exactly(alone, mine, primal.den)
                spelled[i] = mine
        bases: list[Base] = []
        works = [fibers(self.setting, self.terms, decided, i) for i in range(len(paid))]
        for i, work in enumerate(works if not added else []):
            if i in self.spelling:
                bases.append(spelled_base(self.opened, i, work, spelled[i], primal.den))
                continue
            found = self._based(work)
            if found is None or (found.most is not None and paid[i] > found.most):
                self._held_elsewhere(i, found, decided)
                added += 1
                break
            bases.append(found)
        if not added:
            added = self._short(decided, works, bases)
        self._spent("paths", since)
        if added:
            return None
        parts_listed = self._parts(ordered=True)
        return Mixture(
            program,
            outcome,
            self.opened,
            parts_listed,
            tuple(self.pots),
            decided,
            tuple(works),
            tuple(bases),
        )

    def _based(self, work: Fibers) -> Base | None:
        """A party's own best table under a rule; None where there are too many graphs for it."""
        try:
            found = base(work, self.watch)
        except TooBig:
            return None
        if isinstance(found, Cycle):
            raise AssertionError("private worths keep an efficient rule honest")
        return found

    def _held_elsewhere(self, i: int, found: Base | None, decided: Decided) -> None:
        """Another type's participation binds under a rule: list the paths to it, or spell.

        Raises Unsettled where there are too many payments to tell apart.
        """
        self._last = None
        known = {listed.root for listed in self.listed[i]}
        if found is not None and found.tree is not None and found.root not in known:
            fresh = [Listed(self.opened.torn[i], found.root)]
            self.listed[i] += fresh
            self._begin([fresh], [])
            return
        graphs = self.opened.spelled(i)
        if graphs.place.size > CELLS:
            name = self.setting.parties[i].name
            raise Unsettled(f"several types of {name} are worst off together")
        self.spelling[i] = Spelling(graphs)
        self.spelling[i].paths_under(graphs.alone(decided))

    def _spent(self, part: str, since: float) -> None:
        self.seconds[part] = self.seconds.get(part, 0.0) + time.perf_counter() - since


def _width(part: Listed | Spelling) -> int:
    """How many payments a part has in the program."""
    return part.found.place.size if isinstance(part, Spelling) else len(part.found.others)


def first_roots(works: list[Fibers], bases: list[Base] | None) -> list[list[Root]]:
    """Where each party's paths end at first; `bases` under some choices at ties."""
    found: list[list[Root]] = []
    for i, work in enumerate(works):
        held, known = kind(work), None if bases is None else bases[i]
        if held == "cases":
            found.append([OWN])
        elif held == "types" and not on_average(work):
            if known is None or known.flow is not None:
                found.append(list(range(work.types)))
            else:
                found.append([known.root])
        else:
            found.append([])
    return found
