"""Is a likeness proof the scenario's? Rebuild its program from the scenario and compare.

The plain checker shows that the document's program has the stated verdict. Here the parties
that are alike are found anew, the program over representatives is written anew, and both must
be the document's to the letter. That it then speaks for the full program is a theorem: the
full program is unchanged when alike parties trade places, so the average of a table over all
trades meets the same linear demands with the same value, and is one of the tables that the
program over representatives describes; and each of those meets every row of the full program,
since each row is a written one after a trade.
"""

from __future__ import annotations

from typing import Any

from designer.demands.formulate import amounts_of
from designer.demands.plain import from_plain
from designer.engines.watch import Watch
from designer.errors import ProofError
from designer.proof import compare
from designer.roads.likeness.draft import LikenessDraft
from designer.roads.likeness.road import reduced, reduction
from designer.setting.setting import Setting


def check(setting: Setting, document: dict[str, Any], watch: Watch | None = None) -> list[str]:
    """What keeps the document's verdict from being one about the full program; empty if nothing.

    The document must have passed the plain checker.
    """
    try:
        terms = from_plain(document["terms"], setting)
        found = reduced(setting, terms)
        if isinstance(found, str):
            return [f"the likeness road does not apply: {found}"]
        orbits, own = found
        if document["reduction"] != reduction(orbits.likeness, orbits.setting):
            return ["other parties are alike in the scenario than in the proof"]
        (watch or Watch()).check()
        draft = LikenessDraft(orbits, own.decision, amounts_of(own))
        program = compare.rebuild(document, orbits.setting, own, draft)
        return compare.same_program(document, program)
    except ProofError as fault:
        return [str(fault)]
    except (KeyError, TypeError, ValueError, IndexError, OverflowError) as error:
        return [f"the reduction cannot be read: {error}"]
