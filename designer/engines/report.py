"""What an engine says about a program: floats and a basis, a hint and never a verdict."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal, Protocol

import numpy as np
import numpy.typing as npt

from designer.engines.watch import Watch
from designer.program.linear import LinearProgram

LOWER, BASIC, UPPER, ZERO = 0, 1, 2, 3
"""Where a column or a row stands in a basis: at its lower bound, basic, at its upper bound,
nonbasic without a bound (a free column at 0)."""

StatusArray = npt.NDArray[np.int8]
FloatArray = npt.NDArray[np.float64]

Said = Literal[
    "optimal", "infeasible", "unbounded", "unclear", "time-limit", "interrupted", "failed"
]
"""An engine's word. `unclear`: infeasible or unbounded, it does not know which."""


@dataclass(frozen=True, eq=False)
class Basis:
    """A basis of a program: int8 of LOWER, BASIC, UPPER, ZERO per column and per row.

    As many entries are BASIC as there are rows. A row that is not basic holds with equality
    at the bound named.
    """

    columns: StatusArray
    rows: StatusArray


@dataclass(frozen=True, eq=False)
class Report:
    """An engine's answer, in the program's own units (scalings undone).

    x          float, shape (columns,), None if there is no point
    y          float, shape (rows,): multipliers of the MIN problem, y > 0 at a row's lower
               bound, in units of the integer cost; None if there are none
    basis      None if the engine gives none
    bound      for mixed-integer programs, the engine's bound on the integer cost (min sense)
    stopped    why it did not finish, in words; empty if it did
    """

    status: Said
    engine: str
    x: FloatArray | None = None
    y: FloatArray | None = None
    basis: Basis | None = None
    bound: float | None = None
    iterations: int = 0
    seconds: float = 0.0
    message: str = ""


class Engine(Protocol):
    """Anything that can be asked for a hint."""

    @property
    def name(self) -> str:
        """The engine's name, with its version where it has one."""

    def solve(
        self,
        lp: LinearProgram,
        watch: Watch,
        *,
        basis: Basis | None = None,
        tolerance: float | None = None,
    ) -> Report:
        """Solve `lp` in floats; `basis` is where to start, `tolerance` how strict to be."""
