"""The main job: from a setting and its demands to a proved verdict."""

from __future__ import annotations

import time
from pathlib import Path
from typing import Any

from designer.demands.plain import as_plain
from designer.demands.terms import Demands, Terms
from designer.engines.choose import engine_named
from designer.engines.watch import Progress, Watch
from designer.proof.recheck import recheck
from designer.roads.checking import CLAIMS, check
from designer.roads.registry import choose
from designer.roads.settled import Settled, build
from designer.setting.setting import Setting
from designer.verdict import Verdict


def pose(
    setting: Setting | str | Path,
    demands: Demands | None = None,
    *,
    engine: str = "highs",
    time_limit: float | None = None,
    progress: Progress | None = None,
    path: str | None = None,
) -> Verdict:
    """Whether a transfer table exists that meets every demand, and the best one if so.

    setting     a Setting, or the path of a scenario file
    demands     overrides of the scenario's own demands; None: none
    engine      "highs", or "pulp:NAME" for any engine PuLP finds; its word is only a hint
    time_limit  seconds after which the verdict is `undecided`
    path        the road to take ("interim", "type-graph", "likeness", "full"); None: the first
                that applies
    progress    called with what is being done, seconds so far and a step count

    Raises ScenarioError for a scenario that cannot be read and UsageError for demands that
    cannot be asked of it.

    >>> from designer import Demands, pose
    >>> pose("scenarios/lock-sale.toml", Demands(ir="none")).status
    'possible'
    """
    if not isinstance(setting, Setting):
        from designer.setting.scenario import read_scenario

        setting = read_scenario(setting)
    terms = (demands or Demands()).over(setting)
    return pose_terms(
        setting, terms, engine=engine, time_limit=time_limit, progress=progress, path=path
    )


def pose_terms(
    setting: Setting,
    terms: Terms,
    *,
    engine: str = "highs",
    time_limit: float | None = None,
    progress: Progress | None = None,
    path: str | None = None,
) -> Verdict:
    """As `pose`, with the terms already settled."""
    watch = Watch(time_limit, progress)
    road = choose(setting, terms, path).road
    settled = road.travel(setting, terms, engine_named(engine), watch)
    since = time.perf_counter()
    verdict = judge(setting, terms, settled, watch)
    verdict.seconds["check"] = time.perf_counter() - since
    return verdict


def judge(setting: Setting, terms: Terms, settled: Settled, watch: Watch) -> Verdict:
    """Let the checker, which trusts nothing, say what the road's certificates prove."""
    document: dict[str, Any] = {}
    holds = False
    claims: tuple[str, ...] = ()
    faults: tuple[str, ...] = ()
    if settled.status != "undecided":
        document = build(setting, as_plain(terms), settled)
        finding = recheck(document)
        holds, claims, faults = finding.holds, finding.claims, finding.faults
        if holds and "reduction" in document:
            faults = tuple(check(setting, document, watch))
            holds = not faults
            claims = (*claims, CLAIMS[settled.path])
    goals = settled.goals
    reason = settled.reason
    status = settled.status
    if document and not holds:
        reason = f"the checker rejects the certificate: {'; '.join(faults[:3])}"
        status = "undecided" if status != "possible" else status
    return Verdict(
        setting=setting,
        terms=terms,
        status=status,
        proved=holds and (status != "possible" or all(g.proved for g in goals if not g.tidy)),
        goals=goals,
        path=settled.path,
        program=settled.program,
        table=settled.table,
        mechanism=settled.mechanism,
        primal=settled.primal,
        farkas=settled.farkas,
        ray=settled.ray,
        proof=document if holds else {},
        claims=claims,
        reason=reason,
        engine=settled.engine,
        seconds=settled.seconds,
    )
