"""The best lotteries where several options are efficient: paths are listed as they bind.

What a party can be made to pay is concave in the lotteries at ties, and piecewise linear: the
length of the shortest paths. The small program of `lotteries.py` is solved with a few paths
listed; the shortest paths under the lotteries it takes are listed as well, until nobody is to
pay more than the paths allow. The last rounds are exact.
"""

from __future__ import annotations

import time
from dataclasses import dataclass
from fractions import Fraction

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
from designer.roads.typegraph.decided import Decided, Indices
from designer.roads.typegraph.fibers import Fibers, fibers
from designer.roads.typegraph.lotteries import Bound, Opened, lottery_program, on_average
from designer.roads.typegraph.road import in_every_case
from designer.roads.typegraph.torn import Torn, shortest
from designer.setting.setting import IntArray, Setting

TIES = 12_000
"""Tied profiles up to which their lotteries are columns of one program."""
CUTS = 150_000
"""Paths that may be listed."""
ROUNDS = 60
"""Times that paths are added."""
FINE = 1 << 28
"""The parts into which lotteries are rounded while floats lead the search."""
FEW = 20
"""A basis is carried over where no more than one row in so many is new."""
NEAR = 1e-9
"""What floats may leave of a difference, relative to the largest amount in sight."""


class Unsettled(Exception):  # noqa: N818 - not an error: another road may go there
    """The lotteries were not found; the message says why."""


@dataclass(frozen=True, eq=False)
class Mixture:
    """The answer: a program, what it says, and the table's rule and paths where there is one."""

    program: Program
    outcome: Outcome
    opened: Opened
    bounds: list[list[Bound]]
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
    if in_every_case(terms):
        return "the pot is asked case by case"
    if limit is not None and len(decided.tied) > limit:
        return f"{len(decided.tied):,} profiles are tied, more than {limit:,}"
    return None


@dataclass
class _Listed:
    """A bound in the making: its paths, and by key which are there."""

    party: int
    root: Root
    even: IntArray
    graph: Indices
    trees: IntArray
    known: set[bytes]

    def add(self, graph: Indices, trees: IntArray) -> int:
        """List paths that are not there yet; how many."""
        lines = np.ascontiguousarray(np.column_stack([graph, trees]).astype(np.int64))
        fresh = []
        for j, line in enumerate(lines):
            key = line.tobytes()
            if key not in self.known:
                self.known.add(key)
                fresh.append(j)
        self.graph = np.concatenate([self.graph, graph[fresh]]).astype(np.int64)
        self.trees = np.concatenate([self.trees, trees[fresh]]).astype(np.int64)
        return len(fresh)

    def bound(self, ordered: bool) -> Bound:
        """As the program takes it, in the order of arrival; `ordered`: by torn profile."""
        order = np.argsort(self.graph, kind="stable") if ordered else slice(None)
        return Bound(self.root, self.even, self.graph[order], self.trees[order])


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
        self.listed: list[list[_Listed]] = [[] for _ in works]
        self._last: tuple[Program, Basis] | None = None

    def settle(self, roots: list[list[Root]], choices: list[IntArray]) -> Mixture:
        """The best lotteries, or that there are none.

        roots    per party where its paths may end at first, if paths bound what it pays
        choices  choices at ties that are worth looking at first
        """
        for i, places in enumerate(roots):
            for root in places:
                self._open(i, root)
        for shares in self._first(choices):
            self._list(shares, None)
        leading = True
        for _ in range(ROUNDS):
            self.watch.tell("lotteries at ties", self._size())
            if leading:
                leading = self._led(self._program(ordered=False))
                continue
            program = self._program(ordered=True)
            outcome = self._prove(program)
            if outcome.status == "infeasible":
                return Mixture(program, outcome, self.opened, self._bounds())
            if outcome.primal is None:
                raise Unsettled("the program over lotteries gave no point")
            found = self._home(program, outcome, outcome.primal)
            if found is not None:
                return found
            leading = True
        raise Unsettled("the lotteries where several options are efficient were not settled")

    # -- the paths that are listed -------------------------------------------------------

    def _open(self, i: int, root: Root) -> _Listed:
        """A bound on a party, with the paths under the options first listed."""
        found = self.opened.torn[i]
        _, tree = shortest(found.work, root)
        none = np.zeros(0, dtype=np.int64)
        listed = _Listed(i, root, tree[found.even], none, tree[:0], set())
        every = np.arange(len(found.others), dtype=np.int64)
        listed.add(every, tree[found.work.of[found.others]])
        self.listed[i].append(listed)
        return listed

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

    def _list(self, shares: tuple[IntArray, int], paid: list[list[FloatArray]] | None) -> int:
        """List the shortest paths under lotteries; `paid`: only where more is to be paid."""
        decided = mixed(self.decided, *shares)
        added = 0
        for i, bounds in enumerate(self.listed):
            if not bounds:
                continue
            found = self.opened.torn[i]
            alone = found.alone(decided)
            for b, listed in enumerate(bounds):
                dist, tree = shortest(alone, listed.root)
                chosen = np.arange(len(found.others), dtype=np.int64)
                if paid is not None:
                    reached = _averages(found, dist, alone.den)
                    near = NEAR * max(1.0, float(abs(reached).max(initial=0)))
                    chosen = np.flatnonzero(paid[i][b] > reached + near)
                added += listed.add(chosen, tree[chosen])
        if self._size() > CUTS:
            raise Unsettled(f"more than {CUTS:,} paths bind at ties")
        return added

    def _size(self) -> int:
        return sum(len(listed.graph) for bounds in self.listed for listed in bounds)

    def _bounds(self, ordered: bool = True) -> list[list[Bound]]:
        return [[listed.bound(ordered) for listed in bounds] for bounds in self.listed]

    # -- rounds --------------------------------------------------------------------------

    def _program(self, ordered: bool) -> Program:
        since = time.perf_counter()
        bounds = self._bounds(ordered)
        program = lottery_program(self.setting, self.terms, self.opened, bounds)
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
        paid, at = [], _starts(program)
        for i, bounds in enumerate(self.listed):
            size = len(self.opened.torn[i].others)
            paid.append([x[(first := next(at)) : first + size] for _ in bounds])
        added = self._list((self._rounded(chances), FINE), paid)
        self._spent("paths", since)
        return added > 0

    def _carried(self, program: Program) -> Basis | None:
        """The last basis where little was added since: new rows are basic, the others stay."""
        if self._last is None:
            return None
        before, basis = self._last
        added = program.matrix.rows - before.matrix.rows
        if program.matrix.columns != before.matrix.columns or added * FEW > program.matrix.rows:
            return None
        parts, start = [], 0
        old = [block.count for block in before.row_axis.blocks]
        new = [block.count for block in program.row_axis.blocks]
        for count, now in zip(old, new, strict=True):
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
        orders = [np.argsort(listed.graph, kind="stable") for b in self.listed for listed in b]
        start = 0
        for block in program.row_axis.blocks:
            if block.family == "paths":
                part = rows[start : start + block.count]
                rows[start : start + block.count] = part[orders.pop(0)]
            start += block.count
        return Basis(self._last[1].columns, rows)

    def _home(self, program: Program, outcome: Outcome, primal: Vector) -> Mixture | None:
        """The table of a point of the program, or None where paths were added against it."""
        since = time.perf_counter()
        decided = rule_of(program, self.opened, primal)
        paid = [primal.value(i) for i in range(len(self.setting.parties))]
        if self._against(program, primal, decided, paid):
            self._spent("paths", since)
            return None
        works = [fibers(self.setting, self.terms, decided, i) for i in range(len(paid))]
        bases = []
        for i, work in enumerate(works):
            try:
                found = base(work, self.watch)
            except TooBig as reason:
                raise Unsettled(str(reason)) from None
            if isinstance(found, Cycle):
                raise AssertionError("private worths keep an efficient rule honest")
            bases.append(found)
            if found.most is not None and paid[i] > found.most:
                self._held_elsewhere(i, found)
                self._spent("paths", since)
                return None
        self._spent("paths", since)
        bounds = self._bounds()
        return Mixture(program, outcome, self.opened, bounds, decided, tuple(works), tuple(bases))

    def _against(
        self, program: Program, primal: Vector, decided: Decided, paid: list[Fraction]
    ) -> int:
        """List the paths that allow less than a point pays, exactly; how many."""
        added, at = 0, _starts(program)
        values = primal.dense()
        for i, bounds in enumerate(self.listed):
            found = self.opened.torn[i]
            alone = found.alone(decided) if bounds else None
            for listed in bounds:
                first = next(at)
                if alone is None:
                    continue
                dist, tree = shortest(alone, listed.root)
                sinks = found.sinks().astype(object)
                total = (sinks * np.where(sinks != 0, dist, 0)).sum(axis=1)
                whole = sinks.sum(axis=1) * alone.den
                short = [
                    j
                    for j, (got, den) in enumerate(zip(total, whole, strict=True))
                    if values[first + j] * den > got
                ]
                chosen = np.array(short, dtype=np.int64)
                added += listed.add(chosen, tree[chosen])
        return added

    def _held_elsewhere(self, i: int, found: Base) -> None:
        """Another type's participation binds: list the paths that end there.

        Raises Unsettled where one type alone does not tell.
        """
        known = {listed.root for listed in self.listed[i]}
        if found.flow is not None:
            fresh = [a for a, share in enumerate(found.flow.roots) if share and a not in known]
        else:
            fresh = [] if found.root in known else [int(found.root)]
        if not fresh:
            name = self.setting.parties[i].name
            raise Unsettled(f"several types of {name} are worst off together")
        for a in fresh:
            self._open(i, a)
        for shares in self._first([]):
            self._list(shares, None)

    def _spent(self, part: str, since: float) -> None:
        self.seconds[part] = self.seconds.get(part, 0.0) + time.perf_counter() - since


def _starts(program: Program):  # type: ignore[no-untyped-def]
    """The first column of each bound's payments at torn profiles, in order."""
    place = 0
    for block in program.column_axis.blocks:
        if block.family == "pays against":
            yield place
        place += block.count


def _averages(found: Torn, dist: IntArray, den: int) -> FloatArray:
    """What a party pays on average over its own types, by torn profile."""
    sinks = found.sinks()
    counted = np.where(sinks != 0, dist, 0).astype(np.float64) / den
    weights = sinks.astype(np.float64)
    averages: FloatArray = (weights * counted).sum(axis=1) / weights.sum(axis=1)
    return averages


def mixed(decided: Decided, shares: IntArray, den: int) -> Decided:
    """The rule with these lotteries at tied profiles, int (M, K) over den; equal ones once."""
    found: dict[tuple[int, ...], int] = {}
    of = [found.setdefault(tuple(row), len(found)) for row in shares.tolist()]
    lotteries = np.array(list(found), dtype=object)
    return decided.mixing(lotteries, den, np.array(of, dtype=np.int64))


def rule_of(program: Program, opened: Opened, primal: Vector) -> Decided:
    """The rule with the lotteries of a point of the program.

    Raises ValueError where they are no lotteries over efficient options.
    """
    start = program.column_axis.start("decides")
    stop = start + len(opened.cells)
    shares = np.zeros(opened.decided.torn.shape, dtype=object)
    inside = [
        (j - start, n) for j, n in zip(primal.idx, primal.num, strict=True) if start <= j < stop
    ]
    for j, num in inside:
        row, option = opened.cells[j]
        shares[row, option] = Fraction(num, primal.den)
    den = int(np.lcm.reduce([Fraction(v).denominator for v in shares.flat], dtype=object))
    return mixed(opened.decided, np.vectorize(lambda v: int(v * den), otypes=[object])(shares), den)


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
