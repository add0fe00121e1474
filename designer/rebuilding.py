"""Is a proof's program the scenario's? Rebuild it from the scenario and compare.

The checker shows that a document's verdict about its own program is right. This shows that
the program is what the scenario and the stated terms say, by the same formulation code.
"""

from __future__ import annotations

from typing import Any

from designer.demands.formulate import Formulation
from designer.demands.plain import from_plain
from designer.program.program import Program
from designer.proof.compare import same_program
from designer.roads.interim.check import check
from designer.setting.exact import number
from designer.setting.setting import Setting


def rebuild(setting: Setting, document: dict[str, Any]) -> list[str]:
    """What differs between a proof document and the scenario it claims to be about.

    Empty when the digest, the program and every stage are the scenario's own. The document
    must have passed the checker; one that has not may be reported as different for any reason.
    """
    differences = []
    named = document["scenario"]["digest"]
    if named != setting.digest:
        differences.append(
            f"the proof names the scenario {named[:12]}…, this one is {setting.digest[:12]}…"
        )
    if "reduction" in document:
        return differences + check(setting, document)
    try:
        program = _program(setting, document)
    except (ValueError, KeyError, TypeError) as error:
        return [*differences, f"the stated terms cannot be posed of this scenario: {error}"]
    return differences + same_program(document, program)


def _program(setting: Setting, document: dict[str, Any]) -> Program:
    """The program of the document's stages, goal by goal, each pinned at its stated value."""
    work = Formulation(setting, from_plain(document["terms"], setting))
    program = None
    for place, stage in enumerate(document["stages"]):
        if place and work.stages[-1].cost.any():
            work.pin(number(document["stages"][place - 1]["value"]))
        program = work.pose(stage["goal"])
    if program is None:
        raise ValueError("no stages")
    return program
