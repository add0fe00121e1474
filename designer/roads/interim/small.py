"""The small program of a corner: shares of one rule, and chances of other options at profiles.

It grows: profiles at which its multipliers speak for another option than the rule's join it.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from designer.engines.floats import floats
from designer.engines.listening import listening
from designer.engines.model import load, quiet_highs, sides_of, their_basis
from designer.engines.report import BASIC, LOWER, UPPER, Basis
from designer.engines.watch import Watch
from designer.program.program import Program
from designer.roads.interim.master import Master
from designer.roads.interim.merged import Merged
from designer.roads.interim.slab import Floats

TOLERANCE = 1e-9
"""Of HiGHS: profiles are many, and each counts for little."""


@dataclass(eq=False)
class Other:
    """One option that may be taken at one profile instead of what the first rule takes."""

    types: tuple[int, ...]
    before: int
    after: int
    chance: float = 0.0
    stands: int = LOWER
    column: int = 0
    unit: float = 1.0
    last: bool = False

    @property
    def basic(self) -> bool:
        """Whether its chance is basic."""
        return self.stands == BASIC

    @property
    def ends(self) -> bool:
        """Whether its stretch ends: not if it is basic in the place of the first rule's option."""
        return self.basic and not self.last


class Small:
    """The master over one rule, and the chances of others at some profiles."""

    def __init__(self, master: Master, classes: tuple[Merged, ...], program: Program) -> None:
        """Load the master over one rule."""
        self.master, self.classes = master, classes
        self.others: list[Other] = []
        self.program = floats(program.stage(0))
        self.model = quiet_highs()
        self.model.setOptionValue("presolve", "off")
        for side in ("primal", "dual"):
            self.model.setOptionValue(f"{side}_feasibility_tolerance", TOLERANCE)
        load(self.model, self.program)
        self.start = program.row_axis.start("slice")
        num, den = program.row_scale
        ratio = np.array([int(n) / int(d) for n, d in zip(num, den, strict=True)])
        self.scale = ratio * np.exp2(self.program.row_exp.astype(np.float64))
        self.marginals = [
            np.array([float(p) for p in party.marginal]) for party in master.setting.parties
        ]
        self.at: dict[tuple[int, ...], list[int]] = {}
        self.row_at: dict[tuple[int, ...], int] = {}

    def add(self, others: list[Other]) -> None:
        """One column per other option, and a row where a profile has several."""
        if not others:
            return
        shape = self.master.setting.shape
        types = np.array([other.types for other in others])
        own = np.stack([m[types[:, i]] for i, m in enumerate(self.marginals)], axis=1)
        chance = own.prod(axis=1)
        unit = np.sqrt(chance)
        rows, values = [], []
        place = self.start + self.master.slices
        for i, (size, classes) in enumerate(zip(shape, self.classes, strict=True)):
            before = classes.of[[other.before for other in others]]
            after = classes.of[[other.after for other in others]]
            at = place + types[:, i] * classes.size
            for option, sign in ((before, -1.0), (after, 1.0)):
                rows.append(at + option)
                value = sign * unit / own[:, i] * self.scale[at + option]
                values.append(np.where(before == after, 0.0, value))
            place += size * classes.size
        index, value = np.stack(rows, axis=1), np.stack(values, axis=1)
        count, used = len(others), value != 0
        self.model.addCols(
            count,
            np.zeros(count),
            np.zeros(count),
            unit,
            int(used.sum()),
            (np.cumsum(used.sum(axis=1)) - used.sum(axis=1)).astype(np.int32),
            index[used].astype(np.int32),
            value[used],
        )
        for other, size in zip(others, unit, strict=True):
            other.column, other.unit = len(self.others), float(size)
            self.others.append(other)
            shared = self.at.setdefault(other.types, [])
            shared.append(len(self.program.cost) + other.column)
            if len(shared) > 1:
                self._share(other.types, shared, other.unit)

    def _share(self, types: tuple[int, ...], columns: list[int], unit: float) -> None:
        """A profile's chances sum to 1 at most: the row says so, so no chance has an upper end.

        Two ways to say the same would leave bases that no list of rules has.
        """
        if types in self.row_at:
            self.model.changeCoeff(self.row_at[types], columns[-1], 1.0)
        else:
            self.row_at[types] = self.model.getNumRow()
            both = np.array(columns, dtype=np.int32)
            self.model.addRow(-np.inf, unit, len(both), both, np.ones(len(both)))
        for column in columns:
            self.model.changeColBounds(column, 0.0, np.inf)

    def codes(self) -> npt.NDArray[np.int64]:
        """The numbers of the others' profiles, times K, plus the option."""
        setting = self.master.setting
        if not self.others:
            return np.empty(0, dtype=np.int64)
        types = np.array([other.types for other in self.others])
        after = np.array([other.after for other in self.others])
        places = np.ravel_multi_index(tuple(types.T), setting.shape)
        return np.asarray(places * len(setting.options) + after, dtype=np.int64)

    def hint(self, tight: npt.NDArray[np.bool_]) -> None:
        """Start where the others stand, with the rows that bind."""
        columns = np.full(self.model.getNumCol(), BASIC, dtype=np.int8)
        for place, other in enumerate(self.others):
            columns[len(self.program.cost) + place] = other.stands
        rows = np.full(self.model.getNumRow(), BASIC, dtype=np.int8)
        lo, hi = self.program.row_lo, self.program.row_hi
        for types, row in self.row_at.items():
            own = np.array(self.at[types])
            if np.any(columns[own] == UPPER):
                columns[own[columns[own] == UPPER]], rows[row] = BASIC, UPPER
        binds = tight | (lo == hi)
        side_of = np.where(np.isfinite(lo), LOWER, UPPER)
        rows[: len(lo)] = np.where(binds, side_of, BASIC)
        self.model.setBasis(their_basis(Basis(columns, rows)))

    def solve(self, watch: Watch) -> bool:
        """Fill in the chances; whether there is an optimum."""
        import highspy

        watch.check()
        if watch.limit is not None:
            self.model.setOptionValue("time_limit", self.model.getRunTime() + watch.left)
        with listening(self.model, watch, attached=True) as stop:
            self.model.run()
        if stop.interrupted:
            raise KeyboardInterrupt
        watch.check()
        return bool(self.model.getModelStatus() == highspy.HighsModelStatus.kOptimal)

    def prices(self) -> Floats:
        """What the multipliers say of decisions, per unit of probability: (stacked types, K)."""
        y = np.array(self.model.getSolution().row_dual)[: len(self.scale)] * self.scale
        place = self.start + self.master.slices
        tables = []
        for marginal, own in zip(self.marginals, self.classes, strict=True):
            table = y[place : place + len(marginal) * own.size].reshape(-1, own.size)
            tables.append((table / marginal[:, None])[:, own.of])
            place += table.size
        return np.vstack(tables)

    def read(self) -> tuple[npt.NDArray[np.int8], npt.NDArray[np.int8]]:
        """Fill in chances and standings; the statuses of columns and rows."""
        basis = self.model.getBasis()
        column_status, row_status = list(basis.col_status), list(basis.row_status)
        lp, first = self.program, len(self.program.cost)
        count = len(lp.row_lo)
        columns = np.array([int(status) for status in column_status], dtype=np.int8)
        own = column_status[:first], np.isfinite(lp.col_lo), np.isfinite(lp.col_hi)
        columns[:first] = sides_of(*own)
        rows = row_status[:count], np.isfinite(lp.row_lo), np.isfinite(lp.row_hi)
        values: Floats = np.array(self.model.getSolution().col_value)
        for place, other in enumerate(self.others):
            other.stands = int(columns[first + place])
            other.chance = float(np.clip(values[first + place] / other.unit, 0.0, 1.0))
            other.last = False
        for types, row in self.row_at.items():
            # A row that binds leaves nothing to the first rule's option.
            if int(row_status[row]) != BASIC:
                mixed = [self.others[j - first] for j in self.at[types]]
                for other in [other for other in mixed if other.basic][-1:]:
                    other.last = True
        return columns[:first], sides_of(*rows)
