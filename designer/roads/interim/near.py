"""From an interior point to the rules that carry the optimum, and the corner they form.

At the prices of the interior point one option is best at all profiles but a few. Those few,
and some that come close, become unknowns of a small program of their own: the chance of each
other option there. A corner of it mixes options at few profiles, by one common random number:
an option is taken while the number lies in its stretch of [0, 1]. Between two ends of
stretches nothing changes, so a slice with R ends needs R + 1 rules, all alike but for
exceptions, and what they take is known without another pass.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
import numpy.typing as npt

from designer.engines.floats import floats
from designer.engines.highs import HIGHS
from designer.engines.listening import listening
from designer.engines.model import load, quiet_highs, sides_of, their_basis
from designer.engines.report import BASIC, LOWER, UPPER, Basis, Report
from designer.engines.watch import Watch
from designer.program.linear import LinearProgram
from designer.program.program import Program
from designer.roads.interim.barrier import Interior
from designer.roads.interim.cube import Floats
from designer.roads.interim.live import Duals
from designer.roads.interim.master import Column, Master, rough_rule
from designer.roads.interim.merged import Merged
from designer.roads.interim.rule import Listed, Move, Rule

FINE = 40
"""Bits of the prices as integers."""
CLOSE = 1e-2
"""Share of the money at stake that an option may lack and still be looked at."""


@dataclass(frozen=True, eq=False)
class Corner:
    """The columns of the master to keep, in order, and the basis they come with, if any."""

    columns: list[Column]
    basis: Basis | None


@dataclass(frozen=True)
class Hinted:
    """Says what basis to look at first, and leaves the rest to HiGHS."""

    basis: Basis

    @property
    def name(self) -> str:
        """HiGHS's: the basis is its own."""
        return HIGHS.name

    def solve(
        self,
        lp: LinearProgram,
        watch: Watch,
        *,
        basis: Basis | None = None,
        tolerance: float | None = None,
    ) -> Report:
        """The basis, as if it were optimal: `prove` repairs one that is not."""
        return Report("optimal", self.name, basis=basis or self.basis)


@dataclass(eq=False)
class _Other:
    """One option that may be taken at one profile instead of what the first rule takes."""

    types: tuple[int, ...]
    before: int
    after: int
    chance: float = 0.0
    stands: int = LOWER
    column: int = 0

    @property
    def basic(self) -> bool:
        """Whether its chance is basic."""
        return self.stands == BASIC


@dataclass(eq=False)
class _Slice:
    """The others of one slice, profile by profile."""

    at: dict[tuple[int, ...], list[_Other]] = field(default_factory=dict)

    def rules(self) -> list[list[_Other]]:
        """Per stretch of the random number what differs from the first rule."""
        ends: list[tuple[float, int]] = []
        for others in self.at.values():
            level = 0.0
            for other in others:
                level += other.chance
                if other.basic:
                    ends.append((level, other.column))
        order = [column for _, column in sorted(ends)]
        found = []
        for step in range(len(order) + 1):
            gone = set(order[:step])
            taken = (self._taken(others, gone) for others in self.at.values())
            found.append([other for other in taken if other is not None])
        return found

    def _taken(self, others: list[_Other], gone: set[int]) -> _Other | None:
        """The first other whose stretch has not ended; None for the first rule's option."""
        for other in others:
            if other.basic:
                if other.column not in gone:
                    return other
            elif other.chance > 0.5:
                return other
        return None


def corner_near(master: Master, found: Interior, watch: Watch) -> Corner | None:
    """List rules near an interior point; None where the small program has no optimum.

    Raises Stopped as `watch` says.
    """
    setting = master.setting
    prices = Duals(found.prices, np.zeros(0), 0.0)
    rule = rough_rule(setting, master.first(), prices, FINE)
    counts = master.count(rule)
    master.add(Listed(rule, counts), [])
    first = len(master.listed) - 1
    draft, program = master.program([(g, first) for g in range(master.slices)])
    others = _others(master, found, rule)
    ended = _Small(master, draft.merged, program, others, found).solve(watch)
    if ended is None:
        return None
    columns_at, rows_at = ended
    slices = [_Slice() for _ in range(master.slices)]
    for other in others:
        g = 0 if master.lead is None else other.types[master.lead]
        slices[g].at.setdefault(other.types, []).append(other)
    kept: list[Column] = []
    for g, own in enumerate(slices):
        for differs in own.rules():
            if not differs:
                kept.append((g, first))
                master.columns.append((g, first))
                continue
            moves: list[Move] = [(one.types, one.before, one.after) for one in differs]
            other_rule = Rule(rule.indices, tuple((one.types, one.after) for one in differs))
            listed = Listed(other_rule, counts.moved(setting, master.lead, moves))
            kept += [master.columns[j] for j in master.add(listed, [g])]
    base = columns_at[master.slices :]
    status = np.concatenate([np.full(len(kept), BASIC, dtype=np.int8), base])
    return Corner(kept, Basis(status, rows_at))


def _others(master: Master, found: Interior, rule: Rule) -> list[_Other]:
    """What else may be taken at the profiles that come close to a tie."""
    takes = rule.decides(master.setting, found.profiles)[0].argmax(axis=1)
    # Chance times lack is about the same everywhere: the larger of the two says which is 0.
    taken_at = found.chances > found.lacks / found.money
    seen = taken_at | (found.lacks <= CLOSE * found.money)
    listed: list[_Other] = []
    for row, taken in enumerate(takes):
        types = tuple(int(a) for a in found.profiles[row])
        for k in np.flatnonzero(seen[row]):
            if k != taken:
                other = _Other(types, int(taken), int(k), float(found.chances[row, k]))
                other.column = len(listed)
                if taken_at[row, k]:
                    other.stands = BASIC if taken_at[row, taken] else UPPER
                listed.append(other)
    return listed


class _Small:
    """The master over one rule, and the chances of others at some profiles."""

    def __init__(
        self,
        master: Master,
        classes: tuple[Merged, ...],
        program: Program,
        others: list[_Other],
        found: Interior,
    ) -> None:
        self.master, self.classes, self.others = master, classes, others
        self.program = floats(program.stage(0))
        self.model = quiet_highs()
        load(self.model, self.program)
        self.start = program.row_axis.start("slice")
        num, den = program.row_scale
        ratio = np.array([int(n) / int(d) for n, d in zip(num, den, strict=True)])
        self.scale = ratio * np.exp2(self.program.row_exp.astype(np.float64))
        self._add()
        self._hint(found)

    def _add(self) -> None:
        """One column per other option, and a row where a profile has several."""
        setting, others = self.master.setting, self.others
        if not others:
            return
        types = np.array([other.types for other in others])
        marginals = [np.array([float(p) for p in party.marginal]) for party in setting.parties]
        own = np.stack([m[types[:, i]] for i, m in enumerate(marginals)], axis=1)
        chance = own.prod(axis=1)
        rows, values = [], []
        place = self.start + self.master.slices
        for i, (size, classes) in enumerate(zip(setting.shape, self.classes, strict=True)):
            before = classes.of[[other.before for other in others]]
            after = classes.of[[other.after for other in others]]
            at = place + types[:, i] * classes.size
            for option, sign in ((before, -1.0), (after, 1.0)):
                rows.append(at + option)
                value = sign * chance / own[:, i] * self.scale[at + option]
                values.append(np.where(before == after, 0.0, value))
            place += size * classes.size
        index, value = np.stack(rows, axis=1), np.stack(values, axis=1)
        count, used = len(others), value != 0
        self.model.addCols(
            count,
            np.zeros(count),
            np.zeros(count),
            np.ones(count),
            int(used.sum()),
            (np.cumsum(used.sum(axis=1)) - used.sum(axis=1)).astype(np.int32),
            index[used].astype(np.int32),
            value[used],
        )
        shared: dict[tuple[int, ...], list[int]] = {}
        for place, other in enumerate(others):
            shared.setdefault(other.types, []).append(len(self.program.cost) + place)
        for columns in shared.values():
            if len(columns) > 1:
                ones = np.ones(len(columns))
                self.model.addRow(
                    -np.inf, 1.0, len(columns), np.array(columns, dtype=np.int32), ones
                )

    def _hint(self, found: Interior) -> None:
        """Start where the interior point leads."""
        columns = np.full(self.model.getNumCol(), BASIC, dtype=np.int8)
        for place, other in enumerate(self.others):
            columns[len(self.program.cost) + place] = other.stands
        rows = np.full(self.model.getNumRow(), BASIC, dtype=np.int8)
        lo, hi = self.program.row_lo, self.program.row_hi
        binds = found.tight | (lo == hi)
        side_of = np.where(np.isfinite(lo), LOWER, UPPER)
        rows[: len(lo)] = np.where(binds, side_of, BASIC)
        self.model.setBasis(their_basis(Basis(columns, rows)))

    def solve(self, watch: Watch) -> tuple[npt.NDArray[np.int8], npt.NDArray[np.int8]] | None:
        """Fill in the chances; the statuses of columns and rows, or None without an optimum."""
        import highspy

        watch.check()
        if watch.limit is not None:
            self.model.setOptionValue("time_limit", watch.left)
        with listening(self.model, watch, attached=True) as stop:
            self.model.run()
        if stop.interrupted:
            raise KeyboardInterrupt
        watch.check()
        if self.model.getModelStatus() != highspy.HighsModelStatus.kOptimal:
            return None
        basis = self.model.getBasis()
        lp, first = self.program, len(self.program.cost)
        count = len(lp.row_lo)
        columns = np.array([int(status) for status in basis.col_status], dtype=np.int8)
        own = basis.col_status[:first], np.isfinite(lp.col_lo), np.isfinite(lp.col_hi)
        columns[:first] = sides_of(*own)
        rows = basis.row_status[:count], np.isfinite(lp.row_lo), np.isfinite(lp.row_hi)
        values: Floats = np.array(self.model.getSolution().col_value)
        for place, other in enumerate(self.others):
            other.stands = int(columns[first + place])
            other.chance = float(np.clip(values[first + place], 0.0, 1.0))
        return columns[:first], sides_of(*rows)
