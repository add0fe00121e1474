"""The labelled program: one growing matrix, and for each goal the part of it that counts.

Goals are optimised one after the other. Each stage may add columns and rows of its own and,
once settled, pins its value with one more row. So there is one matrix, and stage s reads
its first `columns` columns and first `rows` rows; no row among those reaches a later column.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from fractions import Fraction
from typing import Literal

from designer.program.labels import Label
from designer.program.linear import LinearProgram
from designer.setting.setting import IntArray


@dataclass(frozen=True)
class Block:
    """A run of labels on one axis: `label(j)` names the j-th of `count`."""

    family: str
    count: int
    label: Callable[[int], Label]


@dataclass(frozen=True)
class Axis:
    """The labels of the rows or of the columns, computed only when asked for."""

    blocks: tuple[Block, ...] = ()

    def __len__(self) -> int:
        return sum(block.count for block in self.blocks)

    def label(self, index: int) -> Label:
        """The label at a position; IndexError outside the axis."""
        if index < 0:
            raise IndexError(index)
        for block in self.blocks:
            if index < block.count:
                return block.label(index)
            index -= block.count
        raise IndexError(index)

    def take(self, stop: int) -> Axis:
        """The first `stop` labels."""
        kept = []
        for block in self.blocks:
            count = min(block.count, stop)
            kept.append(Block(block.family, count, block.label))
            stop -= count
        return Axis(tuple(kept))

    def start(self, family: str) -> int:
        """The position of the first label of a family; KeyError if there is none."""
        start = 0
        for block in self.blocks:
            if block.family == family:
                return start
            start += block.count
        raise KeyError(family)


@dataclass(frozen=True, eq=False)
class Stage:
    """One goal: optimise (cost . x) / cost_den + cost_const over a prefix of the program."""

    goal: str
    sense: Literal["min", "max"]
    columns: int
    rows: int
    cost: IntArray
    cost_den: int = 1
    cost_const: Fraction = Fraction(0)


@dataclass(frozen=True, eq=False)
class Program:
    """The whole labelled program.

    matrix     every row and column of every stage; its own cost is that of the last stage
    row_scale  (num, den), int arrays over rows: natural row * num / den = stored row, where
               the natural row is in money or probability units, conditional on one's type
    """

    matrix: LinearProgram
    stages: tuple[Stage, ...]
    column_axis: Axis
    row_axis: Axis
    row_scale: tuple[IntArray, IntArray]

    def stage(self, index: int) -> LinearProgram:
        """The exact program of one stage: the prefix of the matrix with that stage's goal."""
        stage, whole = self.stages[index], self.matrix
        stop = int(whole.indptr[stage.rows])
        return LinearProgram(
            indptr=whole.indptr[: stage.rows + 1],
            indices=whole.indices[:stop],
            data=whole.data[:stop],
            row_lo=whole.row_lo.take(stage.rows),
            row_hi=whole.row_hi.take(stage.rows),
            col_lo=whole.col_lo.take(stage.columns),
            col_hi=whole.col_hi.take(stage.columns),
            col_den=whole.col_den,
            cost=stage.cost,
            integer=whole.integer[: stage.columns],
            cost_den=stage.cost_den,
            cost_const=stage.cost_const,
            sense=stage.sense,
        )

    def first(self, count: int) -> Program:
        """The program of the first `count` stages alone, without the pin of the last."""
        last = self.stages[count - 1]
        return Program(
            matrix=self.stage(count - 1),
            stages=self.stages[:count],
            column_axis=self.column_axis.take(last.columns),
            row_axis=self.row_axis.take(last.rows),
            row_scale=(self.row_scale[0][: last.rows], self.row_scale[1][: last.rows]),
        )
