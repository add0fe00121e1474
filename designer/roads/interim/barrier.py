"""An interior point of the whole program, which is never written down.

The program over all profiles is

    min c q + c' u   such that   A q + B u >= b,   q = sum over profiles of chances,

chances x >= 0 summing to one at each profile. A primal-dual interior-point step (Mehrotra
1992) eliminates the profiles one by one: what is left is a system in the interim quantities
q and u alone, whose matrix needs the chances only summed over pairs of types (`cube.py`). Some
twenty passes end within 1e-8 of the optimum, whatever the number of profiles: column generation
needs many more, since its prices jump. All in floats, and only a hint: it says which rules
to list.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from functools import partial

import numpy as np
import numpy.typing as npt

from designer.engines.floats import floats
from designer.engines.watch import Watch
from designer.program.program import Program
from designer.roads.interim.cores import one_blas_thread
from designer.roads.interim.cube import CELLS, Cube
from designer.roads.interim.draft import InterimDraft
from designer.roads.interim.rule import Index
from designer.roads.interim.slab import Floats, Slab, curved
from designer.setting.setting import Setting

LOOKED = 200_000_000
"""Chances up to which profiles are looked at for ties."""
ROWS = 4_000
"""Rows of the master up to which its matrix is held densely."""
MOST = 100
"""Steps; twenty to thirty are usual."""
CLOSE = 1e-8
"""Relative complementarity at which the point is near enough."""
LOOSE = 1e-3
"""The same for a first try, which often succeeds."""
COSTLY = 1 << 17
"""Chances below which the last steps cost less than a corner that is farther away."""
MANY = 1 << 18
"""Profiles beyond which such a try is lost: too many would have to join the corner."""
USEFUL = 1e-4
"""The same where no further step succeeds."""
CANDIDATES = 400
"""Profiles, closest to a tie, that are looked at one by one."""
KEPT = 1e-5
"""How far rows may be from being kept."""
FAR = 1e4
"""A multiplier of this size says that the demands cannot be met."""
LARGE = 1 << 14
"""Profiles from which those that are clear are left out."""
OPEN = 4_000
"""Profiles that are never left out."""
CLEAR = 1e-2
"""Relative complementarity from which some are."""
DRIFTS = 2.0
"""A profile is clear where every other option lacks so many times what the last steps moved.

With fewer some turn out not to be, and more must join the corner than it can hold.
"""
SHORT = 0.1
"""A step that goes no farther than this is tried again."""
REFINED = 1
"""Corrections of a solution by what is missing in the equations it should solve."""
STIFF = 1e8
"""Weight of the equations: their multipliers move by it times what is missing."""


@dataclass(frozen=True, eq=False)
class Interior:
    """Near the optimum: prices of decisions, and the profiles that come closest to a tie.

    prices    per party, shape (T_i, K), per unit of probability
    profiles  int, shape (R, n), positions of types
    chances   of the options there, shape (R, K);  lacks  what each lacks to be the best
    money     what is at stake at a profile, at most
    tight     bool per row of the master: whether it binds
    cube      all profiles that are not settled
    """

    prices: tuple[Floats, ...]
    profiles: npt.NDArray[np.int64]
    chances: Floats
    lacks: Floats
    money: float
    tight: npt.NDArray[np.bool_]
    cube: Cube


def fits(setting: Setting, rows: int, ties: bool) -> bool:
    """Whether chances and rows fit in memory; `ties`: those at tied profiles may."""
    options = len(setting.options)
    most = LOOKED if ties else CELLS
    return options > 1 and setting.profiles * options <= most and rows <= ROWS


def interior(
    setting: Setting,
    draft: InterimDraft,
    program: Program,
    watch: Watch,
    first: Sequence[Index] = (),
) -> Iterator[Interior]:
    """Points ever nearer the optimum, two at most; none where there is none or none is found.

    `program` is a master without rules; `first` are indices that decide before all prices, so
    that only what they leave tied is open. Raises Stopped as `watch` says.
    """
    if not fits(setting, program.matrix.rows, bool(first)):
        return
    path = None
    few = not first and setting.profiles * len(setting.options) < COSTLY
    for close in (CLOSE if few or setting.profiles > MANY else LOOSE, CLOSE):
        try:
            with np.errstate(all="ignore"), one_blas_thread():
                if path is None:
                    path = _Path(setting, _Rows.of(setting, draft, program), watch, first)
                    if not path.begin():
                        return
                found = path.walk(close)
        except np.linalg.LinAlgError:
            return
        if found is None:
            return
        yield found
        if path.far <= CLOSE:
            return


@dataclass(frozen=True, eq=False)
class _Rows:
    """A (q, u) >= b first, then A (q, u) = b, in natural units; costs of q and u.

    places  which of the master's `count` rows each inequality is; beyond them, bounds of columns
    """

    quantities: Floats
    others: Floats
    bound: Floats
    inequalities: int
    cost: Floats
    other_cost: Floats
    places: npt.NDArray[np.int64]
    count: int

    @staticmethod
    def of(setting: Setting, draft: InterimDraft, program: Program) -> _Rows:
        """Read them off a master without rules."""
        stage = program.stage(len(program.stages) - 1)
        lp = floats(stage)
        rows, columns = len(lp.row_lo), len(lp.cost)
        num, den = program.row_scale
        ratio = np.array([int(n) / int(d) for n, d in zip(num, den, strict=True)])[:rows]
        row_unit = 1.0 / (ratio * np.exp2(lp.row_exp.astype(np.float64)))
        unit = np.exp2(-lp.col_exp.astype(np.float64))
        whole = np.zeros((rows, columns))
        whole[np.repeat(np.arange(rows), np.diff(lp.indptr)), lp.indices] = lp.data
        whole *= row_unit[:, None] * unit
        start = program.row_axis.start("slice")
        first = start + (1 if draft.lead is None else setting.shape[draft.lead])
        defined = first + sum(
            n * own.size for n, own in zip(setting.shape, draft.merged, strict=True)
        )
        keep = np.r_[0:start, defined:rows]
        whole = np.vstack([whole[keep], np.eye(columns)])
        low = np.concatenate([(lp.row_lo * row_unit)[keep], lp.col_lo / unit])
        high = np.concatenate([(lp.row_hi * row_unit)[keep], lp.col_hi / unit])
        same = low == high
        least, most = np.isfinite(low) & ~same, np.isfinite(high) & ~same
        matrix = np.vstack([whole[least], -whole[most], whole[same]])
        bound = np.concatenate([low[least], -high[most], low[same]])
        origin = np.concatenate([keep, np.arange(rows, rows + columns)])
        cost = lp.cost * unit / 2.0**lp.cost_exp / stage.cost_den
        # Options that are all one to a party share a column of the master; here each has its own.
        own = [
            draft.expected_decision(i)[0][:, draft.merged[i].of].ravel()
            for i in range(len(setting.parties))
        ]
        place = np.concatenate(own)
        rest = np.setdiff1d(np.arange(columns), place)
        return _Rows(
            matrix[:, place],
            matrix[:, rest],
            bound,
            int(least.sum() + most.sum()),
            cost[place],
            cost[rest],
            np.concatenate([origin[least], origin[most]]),
            rows,
        )


class _Path:
    """The iterates: multipliers y of the rows, slacks s, unknowns u, and the cube's x and z."""

    def __init__(self, setting: Setting, rows: _Rows, watch: Watch, first: Sequence[Index]) -> None:
        self.setting, self.rows, self.watch = setting, rows, watch
        self.cube = Cube(setting, watch, first)
        self.options = len(setting.options)
        from scipy.sparse import csr_array

        self.matrix = csr_array(np.hstack([rows.quantities, rows.others]))
        self.turned = csr_array(self.matrix.T)
        marginal = np.concatenate(self.cube.marginals)
        self.share = np.repeat(marginal, self.options)
        self.drifts: list[float] = []  # what each step, taken whole, changes between options
        self.far = float("inf")  # relative complementarity

    def begin(self) -> bool:
        """Choose where to start; whether there is room."""
        rows = self.rows
        a, b, free = rows.quantities, rows.others, rows.inequalities
        self.size = max(1.0, float(np.abs(a).max(initial=0.0)))
        y = np.zeros(len(rows.bound))
        y[:free] = 0.25 / max(self.setting.shape)
        missing = rows.other_cost - b.T @ y
        y += b @ np.linalg.lstsq(b.T @ b, missing, rcond=None)[0]
        y[:free] = np.maximum(y[:free], 0.1 * np.abs(y[:free]).mean() + 1e-9 if free else 0.0)
        self.y = y
        self.price = a.T @ y - rows.cost
        tables = self._tables(self.price)
        edges = np.cumsum([0, *self.setting.shape])[:-1]
        spread = np.maximum.reduceat(tables, edges) - np.minimum.reduceat(tables, edges)
        self.money = max(float(spread.max(axis=1).sum()), 1e-6 * self.size)
        if not self.cube.start(tables, self.money):
            return False
        seen = self.cube.each(lambda slab: slab.see(slab.x))
        even = (self.cube.fixed.ravel() + _total(seen)) / self.share
        self.u = np.linalg.lstsq(b.T @ b, b.T @ (rows.bound - a @ even), rcond=None)[0]
        slack = (a @ even + b @ self.u - rows.bound)[:free]
        top = float(np.abs(slack).max(initial=0.0))
        self.s = np.maximum(slack, 0.1 * top + 0.01 * self.size)
        return True

    def _tables(self, price: Floats) -> Floats:
        """Prices of interim quantities as stacked tables of prices per unit of probability."""
        tables: Floats = (price / self.share).reshape(-1, self.options)
        return tables

    def walk(self, close: float) -> Interior | None:
        """Step until the point is near enough."""
        move = (0.0, 0.0)
        for step in range(len(self.drifts), MOST):
            self.watch.tell("looking for prices, step", step)
            self._settle(move)
            seen = self.cube.each(_curved)
            fixed = self.cube.fixed.ravel() / self.share
            q = fixed + _total(part[0] for part in seen) / self.share
            near = self._near(q, sum(part[3] for part in seen))
            if near is None:
                return None
            self.far, off, short = near
            if self.far <= close and max(off, short) <= max(KEPT, close):
                return self._found()
            stuck = step > 3 and 0.0 < min(move) < 1e-3
            if stuck or (self.far <= USEFUL and short > KEPT):
                return self._found() if self.far <= USEFUL else None
            centred = fixed + _total(part[1] for part in seen) / self.share
            blocks = np.sum([part[2] for part in seen], axis=0)
            pairs = curved(blocks, self.options)
            pairs /= self.share[:, None] * self.share
            move = self._step(q, centred, pairs)
        return None

    def _settle(self, move: tuple[float, float]) -> None:
        """Take the step; leave out profiles at which prices will hardly change what is best."""
        for _ in self.cube.each(partial(Slab.move, primal=move[0], dual=move[1])):
            pass
        # a point that was near enough at once has no steps behind it to judge by
        if self.drifts and self.setting.profiles > LARGE and self.far < CLEAR:
            self.cube.settle(DRIFTS * max(self.drifts[-3:]), OPEN)

    def _near(self, q: Floats, gap: float) -> tuple[float, float, float] | None:
        """Complementarity relative to the money at stake, and what rows and multipliers lack.

        None where the path has no end.
        """
        rows, free = self.rows, self.rows.inequalities
        level = rows.quantities @ q + rows.others @ self.u - rows.bound
        level[:free] -= self.s
        self.off = level
        self.short = rows.other_cost - rows.others.T @ self.y
        self.gap = (gap, float(self.y[:free] @ self.s))
        near = sum(self.gap) / (self.money + self.size)
        off = float(np.abs(level).max(initial=0.0)) / self.size
        short = float(np.abs(self.short).max(initial=0.0))
        fine = np.isfinite(near + off + short) and float(np.abs(self.y).max(initial=0.0)) < FAR
        return (near, off, short) if fine else None

    def _step(self, q: Floats, centred: Floats, pairs: Floats) -> tuple[float, float]:
        """Predict and correct; how far to go in x, s and u, and in y and z."""
        from scipy.linalg.lapack import dgetrf, dgetrs

        rows, free = self.rows, self.rows.inequalities
        matrix = self.matrix
        size = rows.quantities.shape[1]
        stiff = np.full(len(self.y), STIFF)
        stiff[:free] = self.y[:free] / self.s
        system = (self.turned.multiply(stiff) @ matrix).toarray()
        system[:, :size] = system[:, :size] @ pairs
        system[:size, :size].flat[:: size + 1] += 1.0
        factors, pivots, failed = dgetrf(system)
        if failed:
            raise np.linalg.LinAlgError("the system is singular")

        def solve(quantities: Floats, aimed: Floats) -> tuple[Floats, ...]:
            """Moves of prices, u, y and s; `quantities` are those at unchanged prices."""
            right = rows.bound - matrix @ np.concatenate([quantities, self.u])
            right[:free] += aimed / self.y[:free]
            dy = stiff * right
            found = np.zeros(len(system))
            for _ in range(1 + REFINED):
                left = self.turned @ dy
                left[:size] -= found[:size]
                left[size:] -= self.short
                found += dgetrs(factors, pivots, left)[0]
                moved = np.concatenate([pairs @ found[:size], found[size:]])
                dy = stiff * (right - matrix @ moved)
            prices, du = found[:size], found[size:]
            ds = (aimed - self.s * dy[:free]) / self.y[:free] - self.s
            return prices, du, dy, ds

        prices, du, dy, ds = solve(centred, np.zeros(free))
        tables = self._tables(prices)
        looks = self.cube.each(lambda slab: slab.predict(tables))
        primal = _reach(min(part[3] for part in looks), ds, self.s)
        dual = _reach(min(part[4] for part in looks), dy[:free], self.y[:free])
        # The averages of x dz and of dx dz follow from the tables: chances sum to one.
        one = sum(part[2] for part in looks)
        one -= float((q - self.cube.fixed.ravel() / self.share) @ prices)
        both = -float((centred - q + pairs @ prices) @ prices)
        gap, own = self.gap
        after = gap + primal * (-gap - one) + dual * one + primal * dual * both
        after += float((self.y[:free] + dual * dy[:free]) @ (self.s + primal * ds))
        centre = min(1.0, max(after / (gap + own), 0.0) ** 3)
        per_target = _total(part[0] for part in looks) / self.share
        crossed = _total(part[1] for part in looks) / self.share
        keep = min(0.999, max(0.9, 1.0 - (gap + own) / (self.money + self.size)))
        product = ds * dy[:free]

        def correct(centre: float, share: float) -> tuple[float, float, tuple[Floats, ...]]:
            """How far the step goes that aims at a share of the gap, and the step."""
            target = centre * gap / (self.options * self.cube.weight)
            aimed = centre * own / max(free, 1) - share * product
            step = solve(centred + target * per_target - share * crossed, aimed)
            tables = self._tables(step[0])
            ends = self.cube.each(lambda slab: slab.correct(tables, target, share))
            primal = keep * _reach(min(part[0] for part in ends), step[3], self.s)
            dual = keep * _reach(min(part[1] for part in ends), step[2][:free], self.y[:free])
            return primal, dual, step

        best = correct(centre, 1.0)
        if min(best[:2]) < SHORT:
            # The predictor was too bold: aim nearer the middle, and believe less of it.
            best = correct(max(centre, 0.5), primal * dual)
        primal, dual, (prices, du, dy, ds) = best
        tables = self._tables(prices)
        edges = np.cumsum([0, *self.setting.shape])[:-1]
        self.drifts.append(float(np.maximum.reduceat(np.ptp(tables, axis=1), edges).sum()))
        self.u = self.u + primal * du
        self.s = self.s + primal * ds
        self.y = self.y + dual * dy
        self.price = self.price + dual * prices
        return primal, dual

    def _found(self) -> Interior:
        edges = np.cumsum(self.setting.shape)[:-1]
        prices = tuple(np.split(self._tables(self.price), edges))
        rows = self.rows
        tight = np.zeros(rows.count, dtype=bool)
        binds = rows.places[self.y[: rows.inequalities] > self.s]
        tight[binds[binds < rows.count]] = True
        return Interior(prices, *self.cube.closest(CANDIDATES), self.money, tight, self.cube)


def _curved(slab: Slab) -> tuple[Floats, Floats, Floats, float]:
    return slab.curvature()


def _total(parts: Iterable[Floats]) -> Floats:
    """The sum of what the slabs see, as interim quantities times their probability."""
    found: Floats = np.sum(list(parts), axis=0).ravel()
    return found


def _reach(least: float, step: Floats, at: Floats) -> float:
    """How far up to 1 one may go before something becomes negative."""
    if len(step):
        least = min(least, float((step / at).min()))
    return 1.0 if least >= -1.0 else -1.0 / least
