"""From a setting and its terms to the exact labelled program, stage by stage."""

from __future__ import annotations

from collections.abc import Mapping
from fractions import Fraction

import numpy as np

from designer.demands.kinds import Goal
from designer.demands.registry import DEMANDS, GOALS
from designer.demands.terms import Terms
from designer.program.affine import Affine, Rows
from designer.program.draft import Draft
from designer.program.labels import Pin
from designer.program.linear import Bound, LinearProgram
from designer.program.program import Axis, Program, Stage
from designer.setting.setting import IntArray, Setting


class Formulation:
    """A program that grows goal by goal: pose a goal, settle it, pin it, pose the next."""

    def __init__(
        self,
        setting: Setting,
        terms: Terms,
        free: Mapping[str, tuple[Fraction | None, Fraction | None]] | None = None,
        draft: Draft | None = None,
    ) -> None:
        """Write every demand of `terms`; no goal yet.

        `free` turns allowances (subsidy, slack, shortfall, shortfall:PARTY, pays_at_most,
        pays_at_least, welfare_at_least, revenue_at_least) into unknowns within bounds.
        `draft` is where to write; by default a new one with a column per profile.
        """
        self.setting = setting
        self.terms = terms
        self.draft = draft or Draft(setting, terms.decision, amounts_of(terms))
        self.stages: list[Stage] = []
        self._objectives: list[tuple[Goal, Affine]] = []
        for name, (low, high) in (free or {}).items():
            self.draft.free_allowance(name, low, high)
        for name in terms.goals:
            GOALS[name].prepare(self.draft, terms)
        for demand in DEMANDS:
            if demand.asked(terms):
                demand.rows(self.draft, terms)

    def pose(self, asked: str | Goal) -> Program:
        """Add a goal, by name or of one's own, as the next stage; the program so far."""
        goal = GOALS[asked] if isinstance(asked, str) else asked
        form = goal.objective(self.draft, self.terms)
        cost = np.zeros(self.draft.columns, dtype=form.num.dtype)
        np.add.at(cost, form.col, form.num)
        rows = sum(block.count for block in self.draft.row_blocks)
        self.stages.append(
            Stage(
                goal=goal.name,
                sense=goal.sense,
                columns=self.draft.columns,
                rows=rows,
                cost=cost,
                cost_den=int(form.den[0]),
                cost_const=Fraction(int(form.const[0]), int(form.den[0])),
            )
        )
        self._objectives.append((goal, form))
        return self.program()

    def pin(self, value: Fraction) -> int:
        """Fix the value of the goal posed last; the number of the new row."""
        goal, form = self._objectives[-1]
        row = sum(block.count for block in self.draft.row_blocks)
        # A pinned value may carry a denominator of any length.
        big = Affine(
            form.row,
            form.col,
            form.num.astype(object),
            form.const.astype(object),
            form.den.astype(object),
        )
        self.draft.require(big.plus(-value), "=", "pin", lambda _: Pin(goal.name))
        rows, relation = self.draft.rows[-1]
        self.draft.rows[-1] = _narrowed(rows), relation
        return row

    def program(self) -> Program:
        """Everything written so far, as one frozen program."""
        draft = self.draft
        parts = [rows for rows, _ in draft.rows]
        relations = [relation for _, relation in draft.rows]
        pointers = [np.zeros(1, dtype=np.int64)]
        start = 0
        for rows in parts:
            pointers.append(rows.indptr[1:] + start)
            start += int(rows.indptr[-1])
        low = _joined([-rows.const for rows in parts])
        upper = np.concatenate(
            [np.full(len(r.const), kind == "=") for r, kind in zip(parts, relations, strict=True)]
            or [np.zeros(0, dtype=bool)]
        )
        col_lo, col_hi, col_den = _column_bounds(draft)
        last = self.stages[-1] if self.stages else None
        columns = draft.columns
        cost = np.zeros(columns, dtype=np.int64)
        if last is not None:
            cost = np.concatenate([last.cost, np.zeros(columns - len(last.cost), last.cost.dtype)])
        integer = np.zeros(columns, dtype=bool)
        if self.terms.decision == "deterministic":
            integer[draft.chance_col[draft.chance_col >= 0]] = True
        matrix = LinearProgram(
            indptr=np.concatenate(pointers),
            indices=_joined([rows.indices for rows in parts]).astype(np.int64),
            data=_joined([rows.data for rows in parts]),
            row_lo=Bound(low, np.ones(len(low), dtype=bool)),
            row_hi=Bound(low, upper),
            col_lo=col_lo,
            col_hi=col_hi,
            col_den=col_den,
            cost=cost,
            integer=integer,
            cost_den=last.cost_den if last else 1,
            cost_const=last.cost_const if last else Fraction(0),
            sense=last.sense if last else "min",
        )
        return Program(
            matrix=matrix,
            stages=tuple(self.stages),
            column_axis=Axis(tuple(draft.column_blocks)),
            row_axis=Axis(tuple(draft.row_blocks)),
            row_scale=(
                _joined([rows.scale_num for rows in parts]),
                _joined([rows.scale_den for rows in parts]),
            ),
        )


def formulate(setting: Setting, terms: Terms) -> Program:
    """The program of the first goal alone, for export and for engines on their own."""
    return Formulation(setting, terms).pose(terms.goals[0])


def amounts_of(terms: Terms) -> tuple[Fraction, ...]:
    """Every exact amount the terms may write into a row."""
    limits, side = terms.limits, terms.side
    found: list[Fraction | None] = [
        terms.subsidy,
        terms.slack,
        terms.shortfall,
        limits.pays_at_most,
        side.welfare_at_least,
        side.revenue_at_least,
    ]
    for chance in side.chances:
        found += [chance.at_least, chance.at_most]
    found += [weight for _, weight in terms.blend]
    return tuple(amount for amount in found if amount)


def _narrowed(rows: Rows) -> Rows:
    """The same rows in int64 where every number fits, so that one row widens no other."""
    numbers = [rows.data, rows.const, rows.scale_num, rows.scale_den]
    if not all(-(2**62) < int(n) < 2**62 for array in numbers for n in array):
        return rows
    data, const, num, den = (np.asarray(array, dtype=np.int64) for array in numbers)
    return Rows(rows.indptr, rows.indices, data, const, num, den)


def _joined(parts: list[IntArray]) -> IntArray:
    if not parts:
        return np.zeros(0, dtype=np.int64)
    return np.concatenate(parts)


def _column_bounds(draft: Draft) -> tuple[Bound, Bound, int]:
    """Bounds of every column over one denominator; later entries override earlier ones."""
    den = 1
    for _, _, lo, hi in draft.bounds:
        for bound in (lo, hi):
            if bound is not None:
                den = den * bound.denominator // np.gcd(den, bound.denominator)
    den = int(den)
    exact: list[Fraction] = [b for entry in draft.bounds for b in entry[2:] if b is not None]
    small = all(abs(bound * den) < 2**62 for bound in exact)
    sides = []
    for pick in (2, 3):
        num = np.zeros(draft.columns, dtype=np.int64 if small else object)
        finite = np.zeros(draft.columns, dtype=bool)
        for entry in draft.bounds:
            bound = entry[2] if pick == 2 else entry[3]
            finite[entry[0] : entry[1]] = bound is not None
            if bound is not None:
                num[entry[0] : entry[1]] = int(bound * den)
        sides.append(Bound(num, finite))
    return sides[0], sides[1], den
