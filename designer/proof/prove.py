"""From an exact program to an exact answer: clever, and trusted by nobody.

An engine solves the program in floats. Its basis, not its numbers, is the hint: the exact
point and multipliers of that basis are computed in integers and checked against every row
and bound. Where they do not prove each other the basis is repaired; infeasibility is proved
by the elastic program, unboundedness by an exact point and an exact ray (`settle.py`).
"""

from __future__ import annotations

import time
from dataclasses import replace
from types import MappingProxyType

from designer.engines.highs import HIGHS
from designer.engines.report import Engine
from designer.engines.watch import Stopped, Watch
from designer.program.linear import BoolArray, LinearProgram
from designer.proof.exact import Exact
from designer.proof.lazily import settle_part
from designer.proof.outcome import Outcome
from designer.proof.settle import Effort, Settled, settle
from designer.setting.setting import IntArray

BRANCHING = 60.0
"""Seconds our own branch and bound may take by default."""


def prove(
    lp: LinearProgram,
    *,
    engine: Engine = HIGHS,
    watch: Watch | None = None,
    scale: IntArray | None = None,
    branch_seconds: float = BRANCHING,
    late: BoolArray | None = None,
) -> Outcome:
    """Solve a program and prove the answer exactly; see `Outcome` for what comes back.

    scale           positive int per row, for the elastic program of an infeasible one
    late            bool per row: rows to leave out as long as they hold (continuous programs)
    branch_seconds  how long our own branch and bound may take to prove an integer optimum

    Never raises for a limit or Ctrl-C: the outcome is then undecided and says so.
    """
    watch = watch or Watch()
    began, effort = time.monotonic(), Effort()
    exact = Exact(lp)
    try:
        crossed = exact.crossing()
        if crossed:
            outcome = Outcome("infeasible", reason=f"{crossed}.")
        elif lp.integer.any():
            from designer.proof.branch import prove_mixed

            outcome = prove_mixed(lp, engine, watch, effort, scale, branch_seconds)
        elif late is not None:
            outcome = _lazily(lp, late, engine, watch, effort)
        else:
            outcome = outcome_of(exact, settle(lp, engine, watch, effort, scale))
    except Stopped as stop:
        outcome = Outcome("undecided", reason=f"{stop.reason}; {stop.remedy}")
    except KeyboardInterrupt:
        outcome = Outcome("undecided", reason="interrupted; run it again to go on")
    spent = time.monotonic() - began
    solving = min(effort.engine_seconds, spent)
    return replace(
        outcome,
        engine=engine.name,
        seconds=MappingProxyType({"solve": solving, "prove": spent - solving}),
        effort=MappingProxyType(dict(effort.counts)),
    )


def _lazily(
    lp: LinearProgram, late: BoolArray, engine: Engine, watch: Watch, effort: Effort
) -> Outcome:
    part = settle_part(lp, late, engine, watch, effort)
    if part is None:
        return outcome_of(Exact(lp), settle(lp, engine, watch, effort))
    outcome = outcome_of(Exact(part.lp), part.settled)
    return replace(
        outcome,
        dual=part.widened(outcome.dual, lp.rows),
        farkas=part.widened(outcome.farkas, lp.rows),
    )


def outcome_of(exact: Exact, settled: Settled) -> Outcome:
    """Turn the exact answer about a continuous program into its outcome."""
    corner = settled.corner
    if settled.farkas is not None:
        return Outcome("infeasible", proved=True, farkas=exact.farkas_vector(settled.farkas))
    if corner is not None:
        outcome = Outcome(
            "optimal",
            proved=True,
            table_proved=True,
            value=exact.value(corner.x),
            primal=exact.primal_vector(corner.x),
            reason=settled.reason,
        )
        if settled.ray is not None:
            return replace(outcome, status="unbounded", ray=exact.primal_vector(settled.ray))
        return replace(outcome, dual=exact.dual_vector(corner.y))
    said = settled.said
    if said is not None and said.status in ("optimal", "infeasible", "unbounded"):
        outcome = Outcome(said.status, reason=settled.reason)
        if said.status == "optimal" and said.x is not None:
            return replace(outcome, bound=exact.rough_value(said.x))
        return outcome
    return Outcome("undecided", reason=settled.reason)
