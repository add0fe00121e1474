"""The master program in floats, kept warm: rules are added as columns, nothing is rebuilt.

Only a search: what it finds is a list of rules, each with exact counts. While no share of
the listed rules meets the demands, stand-in columns make up the shortfall at a price.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from designer.engines.floats import floats
from designer.engines.listening import listening
from designer.engines.model import load, quiet_highs
from designer.engines.watch import Watch
from designer.program.linear import LinearProgram
from designer.program.program import Program
from designer.roads.interim.merged import Merged
from designer.roads.interim.rule import Counts
from designer.setting.setting import Setting

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Duals:
    """Float multipliers: an index per party, type and option, and a price per slice.

    `level` is the dual value without the slices; a rule improves slice g when
    sum_i index_i . taken_i / total_weight > slices[g].
    """

    parties: tuple[Floats, ...]
    slices: Floats
    level: float

    def mixed(self, other: Duals, share: float) -> Duals:
        """Share * other + (1 - share) * self."""
        return Duals(
            tuple(
                (1 - share) * a + share * b
                for a, b in zip(self.parties, other.parties, strict=True)
            ),
            (1 - share) * self.slices + share * other.slices,
            (1 - share) * self.level + share * other.level,
        )

    @property
    def bound(self) -> float:
        """The dual value."""
        return self.level - float(self.slices.sum())


class Live:
    """A HiGHS model of the master program that grows by columns."""

    def __init__(
        self,
        setting: Setting,
        program: Program,
        lp: LinearProgram,
        lead: int | None,
        classes: tuple[Merged, ...],
    ) -> None:
        """Load `lp`, the last stage of the program of a master without rules, or its face."""
        self.setting, self.lead, self.classes = setting, lead, classes
        self.sizes = [n * own.size for n, own in zip(setting.shape, classes, strict=True)]
        self.slices = 1 if lead is None else setting.shape[lead]
        self.program = floats(lp)
        self.model = quiet_highs()
        self.model.setOptionValue("presolve", "off")
        load(self.model, self.program)
        num, den = program.row_scale
        stored = zip(num[: lp.rows], den[: lp.rows], strict=True)
        ratio = np.array([int(n) / int(d) for n, d in stored])
        self.scale = ratio * np.exp2(self.program.row_exp.astype(np.float64))
        self.base = len(self.program.cost)
        self.start = program.row_axis.start("slice")
        self.stand_ins: list[int] = []
        self._stand_in()

    def _stand_in(self) -> None:
        """A column for every inequality and equation that rules alone may not meet."""
        first = self.start + self.slices + sum(self.sizes)
        lo, hi = self.program.row_lo, self.program.row_hi
        for row in range(len(lo)):
            if self.start <= row < first:
                continue
            if np.isfinite(lo[row]):
                self._column([row], [1.0], 1.0)
            if np.isfinite(hi[row]):
                self._column([row], [-1.0], 1.0)
        self.standing = bool(self.stand_ins)
        if self.standing:
            columns = np.arange(self.base, dtype=np.int32)
            self.model.changeColsCost(len(columns), columns, np.zeros(self.base))

    def _column(self, rows: list[int], values: list[float], cost: float) -> None:
        self.stand_ins.append(self.model.getNumCol())
        self.model.addCol(
            cost, 0.0, np.inf, len(rows), np.array(rows, dtype=np.int32), np.array(values)
        )

    def add(self, g: int, counts: Counts) -> int:
        """List a rule in one slice; its column."""
        setting = self.setting
        rows, values = [np.array([self.start + g])], [np.ones(1)]
        place = self.start + self.slices
        for index, party in enumerate(setting.parties):
            each = setting.total_weight // sum(party.weights)
            taken = self.classes[index].sums(counts.taken[g][index])
            mass = [each * weight * counts.den for weight in party.weights]
            share = np.array(
                [[int(v) / m for v in row] for row, m in zip(taken, mass, strict=True)]
            ).ravel()
            spot = np.flatnonzero(share)
            rows.append(place + spot)
            values.append(share[spot])
            place += self.sizes[index]
        row = np.concatenate(rows)
        value = np.concatenate(values) * self.scale[row]
        column = int(self.model.getNumCol())
        self.model.addCol(0.0, 0.0, np.inf, len(row), row.astype(np.int32), value)
        return column

    def solve(self, watch: Watch) -> str:
        """Go on from the last basis; 'optimal', 'infeasible', 'unbounded' or another word.

        Raises Stopped as `watch` says, and KeyboardInterrupt for Ctrl-C.
        """
        import highspy

        watch.check()
        if watch.limit is not None:
            self.model.setOptionValue("time_limit", self.model.getRunTime() + watch.left)
        with listening(self.model, watch, attached=True) as stop:
            self.model.run()
        if stop.interrupted:
            raise KeyboardInterrupt
        watch.check()
        words = {
            highspy.HighsModelStatus.kOptimal: "optimal",
            highspy.HighsModelStatus.kInfeasible: "infeasible",
            highspy.HighsModelStatus.kUnbounded: "unbounded",
        }
        return words.get(self.model.getModelStatus(), "other")

    @property
    def value(self) -> float:
        """The objective of the last solve, in the engine's own money."""
        return float(self.model.getInfo().objective_function_value)

    @property
    def moved(self) -> bool:
        """Whether the last solve changed the basis."""
        return int(self.model.getInfo().simplex_iteration_count) > 0

    def release(self) -> None:
        """The demands can be met: the stand-ins go, and the goal comes."""
        columns = np.array(self.stand_ins, dtype=np.int32)
        none = np.zeros(len(columns))
        self.model.changeColsBounds(len(columns), columns, none, none)
        self.model.changeColsCost(len(columns), columns, none)
        columns = np.arange(self.base, dtype=np.int32)
        self.model.changeColsCost(len(columns), columns, self.program.cost)
        self.standing = False

    def duals(self) -> Duals:
        """The multipliers of the last solve, in the engine's own money."""
        y = np.array(self.model.getSolution().row_dual) * self.scale
        slices = -y[self.start : self.start + self.slices]
        place = self.start + self.slices
        tables = []
        for party, own, size in zip(self.setting.parties, self.classes, self.sizes, strict=True):
            marginal = np.array([float(p) for p in party.marginal])
            table = y[place : place + size].reshape(party.size, own.size) / marginal[:, None]
            tables.append(table[:, own.of])
            place += size
        return Duals(tuple(tables), slices, self.value + float(slices.sum()))

    def reduced(self) -> Floats:
        """Reduced costs of all columns."""
        return np.array(self.model.getSolution().col_dual)

    def levels(self) -> Floats:
        """The values of all columns."""
        return np.array(self.model.getSolution().col_value)
