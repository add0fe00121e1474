"""Is a proof's program the scenario's? Rebuild it from the scenario and compare.

The checker shows that a document's verdict about its own program is right. This shows that
the program is what the scenario and the stated terms say, by the same formulation code.
"""

from __future__ import annotations

from typing import Any

from designer.demands.plain import from_plain
from designer.errors import ProofError
from designer.proof import compare
from designer.roads.checking import check
from designer.setting.setting import Setting


def rebuild(setting: Setting, document: dict[str, Any]) -> list[str]:
    """What differs between a proof document and the scenario it claims to be about.

    Empty when the digest, the program and every stage are the scenario's own. The document
    must have passed the checker; one that has not may be reported as different for any reason.
    """
    named, own = document["scenario"]["digest"], setting.digest
    differences = []
    if named != own:
        differences.append(f"the proof names the scenario {named[:12]}…, this one is {own[:12]}…")
    if "reduction" in document:
        return differences + check(setting, document)
    try:
        terms = from_plain(document["terms"], setting)
        program = compare.rebuild(document, setting, terms)
        return differences + compare.same_program(document, program)
    except (ValueError, ProofError) as error:
        return [*differences, f"the stated terms cannot be posed of this scenario: {error}"]
