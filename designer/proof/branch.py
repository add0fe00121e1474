"""Mixed-integer programs: an exact table, and our own branch and bound to prove it best.

HiGHS finds the incumbent. With its integers fixed the rest is a linear program, which gives
the table and its value exactly. Optimality is proved by a tree whose leaves are exact dual
certificates: no better value, or no point at all, under the branch's bounds.
Source of the scheme: K. Cheung, A. Gleixner, D. Steffy, "Verifying integer programming
results", IPCO 2017, LNCS 10328, 148-160.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from fractions import Fraction

import numpy as np

from designer.engines.highs import HIGHS
from designer.engines.report import Engine, FloatArray, Report
from designer.engines.watch import Stopped, TimeUp, Watch
from designer.program.linear import Bound, LinearProgram
from designer.proof.exact import Exact, Point
from designer.proof.outcome import Branch, Leaf, Outcome, Status, Tree
from designer.proof.settle import Effort, conclude, settle
from designer.proof.sparse import narrow
from designer.setting.setting import IntArray

NEAR = 1e-6
"""Floats this close count as equal when they steer the search."""
GRACE = 5.0
"""Seconds for the exact look at a table that was found before a limit or Ctrl-C."""


@dataclass(frozen=True, eq=False)
class Incumbent:
    """The best exact point so far and its value c.X (min problem), or a ray from it."""

    point: Point
    value: Fraction
    ray: Point | None = None


def prove_mixed(
    lp: LinearProgram,
    engine: Engine,
    watch: Watch,
    effort: Effort,
    scale: IntArray | None,
    seconds: float,
) -> Outcome:
    """Solve and prove a program with integer columns; see `prove`. Raises Stopped."""
    exact = Exact(lp)
    report = effort.add(engine.solve(lp, watch))
    stopped = report.status in ("time-limit", "interrupted")
    # a table found before the limit is still worth a moment's exact look
    looking = Watch(GRACE) if stopped else watch
    incumbent = None
    if report.x is not None:
        incumbent = with_integers(exact, report.x, looking, effort)
    if stopped:
        if incumbent is None:
            effort.note(report)
        return _unfinished(exact, report, incumbent)
    if report.status not in ("optimal", "infeasible"):
        incumbent = _unbounded(exact, incumbent, engine, watch, effort, scale)
    if incumbent is not None and incumbent.ray is not None:
        return Outcome(
            "unbounded",
            proved=True,
            table_proved=True,
            value=exact.value(incumbent.point),
            primal=exact.primal_vector(incumbent.point),
            ray=exact.primal_vector(incumbent.ray),
        )
    search = Search(exact, watch, seconds, effort, incumbent)
    why = f"within {seconds:g} seconds"
    try:
        if incumbent is None and report.status != "optimal":
            tree = _empty(exact, search)
            if tree is not None:
                return Outcome("infeasible", proved=True, tree=tree)
        tree = search.tree()
    except (Stopped, KeyboardInterrupt) as stop:
        # the table and the engine's word outlive the search for a proof
        if search.incumbent is None:
            raise
        tree = None
        why = f"before it stopped: {getattr(stop, 'reason', 'interrupted')}"
    if tree is None and search.budget.left > 0 and why.startswith("within"):
        why = "as it could not close some branch"
    if search.incumbent is not None:
        return _optimal(exact, report, search.incumbent, tree, why)
    if tree is not None:
        return Outcome("infeasible", proved=True, tree=tree)
    status: Status = "infeasible" if report.status == "infeasible" else "undecided"
    return Outcome(status, reason=_unproved(report, why))


def _optimal(
    exact: Exact, report: Report, incumbent: Incumbent, tree: Tree | None, why: str
) -> Outcome:
    found = Outcome(
        "optimal" if tree is not None or report.status == "optimal" else "undecided",
        proved=tree is not None,
        table_proved=True,
        value=exact.value(incumbent.point),
        primal=exact.primal_vector(incumbent.point),
        tree=tree,
    )
    if tree is not None:
        return found
    return replace(found, bound=_bound(exact, report), reason=_unproved(report, why))


def _unfinished(exact: Exact, report: Report, incumbent: Incumbent | None) -> Outcome:
    words = {"time-limit": "the time limit was reached", "interrupted": "interrupted"}
    reason = f"{words[report.status]} before the search ended; give it more time with --time-limit"
    if incumbent is None:
        return Outcome("undecided", reason=reason, bound=_bound(exact, report))
    return Outcome(
        "undecided",
        table_proved=True,
        value=exact.value(incumbent.point),
        primal=exact.primal_vector(incumbent.point),
        bound=_bound(exact, report),
        reason=reason,
    )


def _bound(exact: Exact, report: Report) -> float | None:
    return None if report.bound is None else exact.rough_bound(report.bound)


def _unproved(report: Report, why: str) -> str:
    return (
        f"{report.engine} says {report.status!r}; our own branch and bound did not confirm it {why}"
    )


def fixed(lp: LinearProgram, columns: list[int], values: list[int]) -> LinearProgram:
    """Fix some columns at whole numbers and let go of all integrality."""
    numbers = [value * lp.col_den for value in values]
    return replace(
        lp,
        col_lo=_with(lp.col_lo, columns, numbers),
        col_hi=_with(lp.col_hi, columns, numbers),
        integer=np.zeros(lp.columns, dtype=bool),
    )


def _with(bound: Bound, columns: list[int], numbers: list[int]) -> Bound:
    num, finite = bound.num.astype(object), bound.finite.copy()
    num[columns], finite[columns] = numbers, True
    return Bound(narrow(num), finite)


def with_integers(exact: Exact, x: FloatArray, watch: Watch, effort: Effort) -> Incumbent | None:
    """Find the best exact point whose integers are those of the float point x, if there is one."""
    columns = np.flatnonzero(exact.lp.integer)
    values = [int(value) for value in np.rint(x[columns]).tolist()]
    scaled = np.array([value * exact.lp.col_den for value in values], dtype=object)
    lo, hi = exact.col_lo, exact.col_hi
    low = lo.finite[columns] & np.asarray(scaled < lo.num[columns], dtype=bool)
    high = hi.finite[columns] & np.asarray(scaled > hi.num[columns], dtype=bool)
    if (low | high).any():
        return None
    found = settle(fixed(exact.lp, columns.tolist(), values), HIGHS, watch, effort)
    if found.corner is None:
        return None
    point = found.corner.x
    return Incumbent(point, exact.minimum(point), found.ray)


def _unbounded(
    exact: Exact,
    incumbent: Incumbent | None,
    engine: Engine,
    watch: Watch,
    effort: Effort,
    scale: IntArray | None,
) -> Incumbent | None:
    """Give the incumbent, or any point with whole integers, a ray if the relaxation has one.

    The ray is rational, so whole multiples of it keep integers whole.
    """
    if incumbent is not None and incumbent.ray is not None:
        return incumbent
    relaxed = replace(exact.lp, integer=np.zeros(exact.lp.columns, dtype=bool))
    ray = settle(relaxed, HIGHS, watch, effort, scale).ray
    if ray is None:
        return incumbent
    if incumbent is not None:
        return replace(incumbent, ray=ray)
    costless = replace(exact.lp, cost=np.zeros(exact.lp.columns, dtype=np.int64))
    report = effort.note(engine.solve(costless, watch))
    if report.x is None:
        return None
    start = with_integers(Exact(costless), report.x, watch, effort)
    return None if start is None else Incumbent(start.point, exact.minimum(start.point), ray)


def _empty(exact: Exact, search: Search) -> Tree | None:
    """A tree that shows there is no point with whole integers, if there is none.

    Without a cost, since a goal that grows for ever leaves nodes that nothing can close. A
    point that is met on the way becomes the first table of `search`.
    """
    costless = Exact(replace(exact.lp, cost=np.zeros(exact.lp.columns, dtype=np.int64)))
    looking = Search(costless, search.budget, search.budget.left, search.effort, None)
    try:
        tree = looking.tree(until_met=True)
    except TimeUp:
        search.watch.check()  # only the budget is ours to run out of
        return None
    if looking.incumbent is None:
        return tree
    point = looking.incumbent.point
    search.incumbent = Incumbent(point, exact.minimum(point))
    return None


class Search:
    """Depth-first branch and bound: floats steer it, exact certificates close its leaves."""

    def __init__(
        self,
        exact: Exact,
        watch: Watch,
        seconds: float,
        effort: Effort,
        incumbent: Incumbent | None,
    ) -> None:
        """Keep what the search needs; `incumbent` is replaced whenever a better one is met."""
        self.exact, self.watch, self.effort = exact, watch, effort
        self.budget = watch.within(seconds)
        self.incumbent = incumbent
        self.columns = np.flatnonzero(exact.lp.integer)

    def tree(self, until_met: bool = False) -> Tree | None:
        """Search; None if the budget was too short or some leaf could not be proved.

        With `until_met` also None as soon as any point is met.
        """
        relaxed = replace(self.exact.lp, integer=np.zeros(self.exact.lp.columns, dtype=bool))
        # an explicit stack, since depth may exceed Python's recursion limit; a pair marks
        # where the two subtrees finished last become one
        todo: list[LinearProgram | tuple[int, int]] = [relaxed]
        done: list[Tree] = []
        try:
            while todo:
                item = todo.pop()
                if isinstance(item, tuple):
                    right, left = done.pop(), done.pop()
                    done.append(Branch(item[0], item[1], left, right))
                    continue
                found = self._visit(item)
                if found is None or (until_met and self.incumbent is not None):
                    return None
                if isinstance(found, Leaf):
                    done.append(found)
                    continue
                todo += [found, *self._children(item, *found)]
        except TimeUp:
            self.watch.check()  # only the budget is ours to run out of
            return None
        return done[0]

    def _children(self, lp: LinearProgram, column: int, value: int) -> list[LinearProgram]:
        """The right and the left branch; the left is taken first."""
        den = self.exact.lp.col_den
        return [
            replace(lp, col_lo=_with(lp.col_lo, [column], [(value + 1) * den])),
            replace(lp, col_hi=_with(lp.col_hi, [column], [value * den])),
        ]

    def _visit(self, lp: LinearProgram) -> Leaf | tuple[int, int] | None:
        """Close a node with a certificate or say where to split it; None: neither."""
        self.effort.counts["nodes"] += 1
        self.budget.tell("branch and bound", self.effort.counts["nodes"])
        report = self.effort.note(HIGHS.solve(lp, self.budget))
        if report.x is not None and self._promising(report.x):
            split = self._rough_split(report.x)
            if split is not None:
                return split
        found = conclude(lp, report, self.budget, self.effort)
        if found.farkas is not None:
            return Leaf("infeasible", self.exact.farkas_vector(found.farkas))
        if found.corner is None or found.ray is not None:
            return None
        x, value = found.corner.x, self.exact.minimum(found.corner.x)
        split = self._split(x)
        better = self.incumbent is None or value < self.incumbent.value
        if better and split is None:
            self.incumbent, better = Incumbent(x, value), False
        return split if better else Leaf("bound", self.exact.dual_vector(found.corner.y))

    def _promising(self, x: FloatArray) -> bool:
        """Whether floats see this node clearly below the incumbent: split it without a proof."""
        if self.incumbent is None:
            return True
        here = self.exact.rough_minimum(x)
        best = float(self.incumbent.value / self.exact.lp.col_den)
        return here < best - NEAR * max(1.0, abs(best))

    def _rough_split(self, x: FloatArray) -> tuple[int, int] | None:
        values = x[self.columns]
        far = np.abs(values - np.rint(values))
        if not len(far) or far.max() < NEAR:
            return None
        at = int(np.argmax(far))
        return int(self.columns[at]), int(np.floor(values[at]))

    def _split(self, x: Point) -> tuple[int, int] | None:
        """The integer column farthest from whole and its floor; None if all are whole."""
        den = x.den * self.exact.lp.col_den
        best: tuple[int, int, int] | None = None
        for column in self.columns.tolist():
            floor, rest = divmod(int(x.num[column]), den)
            far = min(rest, den - rest)
            if far and (best is None or far > best[0]):
                best = (far, column, floor)
        return None if best is None else (best[1], best[2])
