"""Decides a continuous program exactly: an optimal corner, a Farkas vector or a ray."""

from __future__ import annotations

import threading
from collections import Counter
from dataclasses import dataclass, field, replace
from importlib import import_module

from designer.engines.highs import HIGHS
from designer.engines.report import Basis, Engine, Report
from designer.engines.watch import Interrupted, TimeUp, Watch
from designer.program.linear import LinearProgram
from designer.proof.corner import Corner
from designer.proof.elastic import directions, elastic
from designer.proof.exact import Exact, Point
from designer.proof.kernel import PEEL, Singular
from designer.proof.magnify import magnified
from designer.proof.pivot import drop_added, pivot, slack_basis
from designer.proof.sparse import dot
from designer.setting.setting import IntArray

AGREE = 1e-5
"""Relative difference of two optima that is worth a word."""
STRICT = 1e-10
"""Feasibility tolerances of the warm restart, the smallest HiGHS accepts."""
MAGNIFY = 3
"""Rounds of magnification."""
PIVOTS_FIRST = 40
"""Exact pivots that may finish a repair."""
PIVOTS = 400
"""Exact pivots before giving up for good."""
PIVOTS_SMALL = 4_000
"""The same for small programs."""
SMALL = 400
"""Rows plus columns of a program on which exact pivots from scratch are quick."""


@dataclass
class Effort:
    """What one proof took: seconds inside engines, and counts."""

    engine_seconds: float = 0.0
    counts: Counter[str] = field(default_factory=Counter)

    def add(self, report: Report) -> Report:
        """Add an engine's seconds and iterations."""
        self.engine_seconds += report.seconds
        self.counts["solves"] += 1
        self.counts["iterations"] += report.iterations
        return report

    def note(self, report: Report) -> Report:
        """Add a report; raise Stopped if the engine was stopped."""
        self.add(report)
        if report.status == "time-limit":
            raise TimeUp
        if report.status == "interrupted":
            raise Interrupted
        return report


@dataclass(frozen=True, eq=False)
class Settled:
    """An exact answer about a program, or the engine's word.

    corner  optimal; with `ray` it is only feasible and the program unbounded
    farkas  infeasible
    said    nothing exact was found: the engine's report
    reason  why nothing was found, or that the engine was overruled
    """

    corner: Corner | None = None
    ray: Point | None = None
    farkas: Point | None = None
    said: Report | None = None
    reason: str = ""


def settle(
    lp: LinearProgram,
    engine: Engine,
    watch: Watch,
    effort: Effort,
    scale: IntArray | None = None,
) -> Settled:
    """Decide a continuous program exactly, as far as it goes. Raises Stopped."""
    if lp.rows > PEEL:
        # The kernel will need a sparse factorisation: load it while the engine works.
        threading.Thread(target=import_module, args=("scipy.sparse.linalg",), daemon=True).start()
    return conclude(lp, effort.note(engine.solve(lp, watch)), watch, effort, scale)


def conclude(
    lp: LinearProgram,
    report: Report,
    watch: Watch,
    effort: Effort,
    scale: IntArray | None = None,
) -> Settled:
    """Go on from an engine's report to an exact answer. Raises Stopped."""
    exact, first = Exact(lp), report
    if report.status == "optimal" and report.basis is None and report.x is not None:
        # an engine without bases: HiGHS makes a corner of its point
        report = effort.note(HIGHS.cross(lp, report, watch))
    if report.status == "optimal" and report.basis is not None:
        found = repair(exact, report.basis, watch, effort)
        if found is not None:
            return replace(found, reason=_disagreement(exact, first, found))

    # No optimum seen, or none that holds: first whether there is a feasible point at all.
    feasible = find_feasible(lp, watch, effort, scale)
    if feasible.corner is None:
        if feasible.farkas is not None:
            return feasible
        return _pivoted(exact, slack_basis(exact), watch, effort, 0) or _unsettled(first)
    start = feasible.corner
    ray = None
    if report.status in ("unbounded", "unclear"):
        ray = _direction(exact, watch, effort)
    if ray is None:
        # the engine was wrong, or does not know: go on from the feasible corner
        report = effort.note(HIGHS.solve(lp, watch, basis=start.basis, tolerance=STRICT))
        if report.status == "optimal" and report.basis is not None:
            found = repair(exact, report.basis, watch, effort)
            if found is not None:
                return replace(found, reason=_overruled(first))
        ray = _direction(exact, watch, effort)
    if ray is not None:
        return Settled(corner=start, ray=ray)
    return _pivoted(exact, start.basis, watch, effort, PIVOTS) or _unsettled(first)


def repair(exact: Exact, basis: Basis, watch: Watch, effort: Effort) -> Settled | None:
    """Settle from a basis, repairing it if need be; None if it cannot be done.

    In this order: the basis itself; a warm restart at the strictest tolerances; the
    magnified program; exact pivots.
    """
    corner = _regular(exact, basis, watch, effort)
    if corner is not None and corner.optimal:
        return Settled(corner=corner)

    effort.counts["repairs"] += 1
    report = effort.note(HIGHS.solve(exact.lp, watch, basis=basis, tolerance=STRICT))
    if report.basis is not None and report.status == "optimal":
        corner = _regular(exact, report.basis, watch, effort) or corner
        if corner is not None and corner.optimal:
            return Settled(corner=corner)
    for _ in range(MAGNIFY):
        if corner is None:
            break
        effort.counts["magnified"] += 1
        again = effort.note(magnified(corner, watch)).basis
        better = None if again is None else _regular(exact, again, watch, effort)
        if better is None:
            break
        corner = better
        if corner.optimal:
            return Settled(corner=corner)
    start = corner.basis if corner is not None else slack_basis(exact)
    return _pivoted(exact, start, watch, effort, PIVOTS_FIRST)


def find_feasible(
    lp: LinearProgram, watch: Watch, effort: Effort, scale: IntArray | None = None
) -> Settled:
    """Find an exact feasible corner of `lp` or an exact Farkas vector, by the elastic program.

    The corner is feasible, not optimal. `said` is set when neither was found.
    """
    exact = Exact(lp)
    for full in (False, True):
        wider = Exact(elastic(lp, scale, full=full))
        report = effort.note(HIGHS.solve(wider.lp, watch))
        if report.status != "optimal" or report.basis is None:
            continue
        found = repair(wider, report.basis, watch, effort)
        if found is None:
            continue
        if found.corner is not None and dot(wider.cost, found.corner.x.num) == 0:
            kept = _regular(exact, drop_added(found.corner, lp.columns), watch, effort)
            if kept is not None and kept.feasible:
                return Settled(corner=kept)
            continue
        y = found.farkas if found.corner is None else found.corner.y
        if y is not None and exact.proves_infeasible(y):
            return Settled(farkas=y)
    return Settled(said=report)


def _direction(exact: Exact, watch: Watch, effort: Effort) -> Point | None:
    """An exact improving direction of the program, if it has one."""
    along = Exact(directions(exact.lp))
    report = effort.note(HIGHS.solve(along.lp, watch))
    if report.status != "optimal" or report.basis is None:
        return None
    found = repair(along, report.basis, watch, effort)
    if found is None or found.corner is None:
        return None
    return found.corner.x if exact.proves_ray(found.corner.x) else None


def _regular(exact: Exact, basis: Basis, watch: Watch, effort: Effort) -> Corner | None:
    """The corner of a basis, None if the basis is singular."""
    corner = Corner(exact, basis, watch)
    try:
        effort.counts["kernel"] = max(effort.counts["kernel"], corner.kernel.size)
        _ = corner.x, corner.y
    except Singular:
        return None
    return corner


def _pivoted(exact: Exact, basis: Basis, watch: Watch, effort: Effort, cap: int) -> Settled | None:
    small = exact.matrix.rows + exact.matrix.columns <= SMALL
    starts = [basis, slack_basis(exact)] if small else [basis]
    cap = PIVOTS_SMALL if small else cap
    for start in starts:
        try:
            ended = pivot(exact, start, watch, cap)
        except Singular:
            continue
        if ended is None:
            continue
        effort.counts["pivots"] += ended.pivots
        if ended.farkas is not None:
            return Settled(farkas=ended.farkas) if exact.proves_infeasible(ended.farkas) else None
        if ended.ray is not None:
            return Settled(ended.corner, ended.ray) if exact.proves_ray(ended.ray) else None
        if ended.corner is not None and ended.corner.optimal:
            return Settled(corner=ended.corner)
    return None


def _disagreement(exact: Exact, report: Report, found: Settled) -> str:
    """Say when an engine's optimum is not the proved one; '' when they agree."""
    if report.x is None or found.corner is None or found.ray is not None:
        return ""
    said, value = exact.rough_value(report.x), exact.approximate(found.corner.x)
    if abs(said - value) <= AGREE * max(1.0, abs(value)):
        return ""
    return f"{report.engine} stopped at {said:.9g}; the proved optimum is {value:.9g}"


def _overruled(report: Report) -> str:
    return f"{report.engine} said {report.status!r}; the exact proof stands on HiGHS's basis"


def _unsettled(report: Report) -> Settled:
    return Settled(
        said=report,
        reason=f"{report.engine} says {report.status!r} but no exact proof was found; "
        "try another engine, or state the amounts with smaller denominators",
    )
