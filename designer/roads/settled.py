"""What a road brings home: a status, the table if there is one, and certificates."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any, Literal

from designer.program.program import Program
from designer.proof.document import compose
from designer.proof.outcome import GoalResult, Tree
from designer.proof.vector import Vector
from designer.setting.setting import Setting
from designer.table import OnDemand, Table

__all__ = ["GoalResult", "Settled", "Status", "build"]

Status = Literal["possible", "impossible", "unbounded", "undecided"]


@dataclass(frozen=True, eq=False)
class Settled:
    """The end of a road.

    primal  over all columns of `program` (possible, unbounded)
    farkas  over the rows of stage 0 (impossible), or `tree` for whole-number programs
    ray     over the columns of the last stage (unbounded)
    mechanism  computes the table on demand where a road gives one
    reduction  for a road that reduces: what stands behind the program's columns
    """

    status: Status
    path: str
    program: Program
    goals: tuple[GoalResult, ...]
    table: Table | None = None
    mechanism: OnDemand | None = None
    reduction: dict[str, object] | None = None
    primal: Vector | None = None
    farkas: Vector | None = None
    tree: Tree | None = None
    ray: Vector | None = None
    reason: str = ""
    engine: str = ""
    seconds: dict[str, float] = field(default_factory=dict)


def build(setting: Setting, terms: Mapping[str, object], settled: Settled) -> dict[str, Any]:
    """The proof document of what a road brought home.

    `terms` are the settled terms as plain values. A goal that is not proved is written as
    open: its value without a certificate. Raises ValueError for an undecided road.
    """
    return compose(
        settled.program,
        verdict=settled.status,
        scenario={"title": setting.title, "digest": setting.digest},
        terms=terms,
        path=settled.path,
        goals=settled.goals,
        primal=settled.primal,
        farkas=settled.farkas,
        tree=settled.tree,
        ray=settled.ray,
        reduction=settled.reduction,
    )
