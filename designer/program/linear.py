"""The exact linear program: integers in flat arrays, no labels, no floats.

    optimise   (cost . x) / cost_den + cost_const
    such that  row_lo <= A x <= row_hi,   col_lo <= x <= col_hi

A is an integer matrix in compressed rows. Row bounds are integers (each row was scaled for
that); column bounds are integers over `col_den`. Infinite bounds are marked in the masks.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from typing import Literal

import numpy as np
import numpy.typing as npt

from designer.setting.setting import IntArray

BoolArray = npt.NDArray[np.bool_]
IndexArray = npt.NDArray[np.int64]


@dataclass(frozen=True, eq=False)
class Bound:
    """One side of the bounds of an axis: `num` where `finite`, infinite elsewhere."""

    num: IntArray
    finite: BoolArray

    def take(self, stop: int) -> Bound:
        """The first `stop` entries."""
        return Bound(self.num[:stop], self.finite[:stop])


@dataclass(frozen=True, eq=False)
class LinearProgram:
    """An exact linear (or mixed-integer) program; see the module docstring.

    indptr   int64, shape (rows + 1,)         indices  int64, shape (nonzeros,)
    data     int, shape (nonzeros,), nonzero  cost     int, shape (columns,)
    integer  bool, shape (columns,): columns that must be whole numbers
    sense    "min" or "max"
    Duplicate entries of a row are not allowed.
    """

    indptr: IndexArray
    indices: IndexArray
    data: IntArray
    row_lo: Bound
    row_hi: Bound
    col_lo: Bound
    col_hi: Bound
    col_den: int
    cost: IntArray
    integer: BoolArray
    cost_den: int = 1
    cost_const: Fraction = Fraction(0)
    sense: Literal["min", "max"] = "min"

    @property
    def rows(self) -> int:
        """The number of rows."""
        return len(self.indptr) - 1

    @property
    def columns(self) -> int:
        """The number of columns."""
        return len(self.cost)

    @property
    def nonzeros(self) -> int:
        """The number of stored coefficients."""
        return len(self.indices)
