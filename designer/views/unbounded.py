"""The screen of an unbounded verdict: what may be repeated for ever."""

from __future__ import annotations

from fractions import Fraction
from typing import TYPE_CHECKING

from designer.demands.registry import GOALS
from designer.views.amounts import amount
from designer.views.direction import Change, direction
from designer.views.page import Page, heading, listed, paragraph
from designer.views.possible import goals

if TYPE_CHECKING:
    from designer.verdict import Verdict

MISSING = (
    "A demand is missing that holds the payments: participation (--ir), a balance "
    "(--balance), or pays_at_most and pays_at_least under [limits] in the scenario."
)
NO_LIE = (
    "No party has a second type, so there is no lie whose loss could be widened: leave out the "
    "goal margin."
)
UNKNOWNS = {
    "slack": "tolerated gain",
    "subsidy": "outside money",
    "shortfall": "tolerated loss",
}
"""What the program's free allowances are called on screen."""
SHOWN = 12
"""Parties whose changes are written out."""


def unbounded(verdict: Verdict) -> Page:
    """The word, the change that can be repeated, and what is usually missing."""
    page: Page = [heading(f"UNBOUNDED, {'proved' if verdict.proved else 'unproved'}.")]
    page += goals(verdict)
    if verdict.ray is not None:
        found = direction(verdict.program, verdict.ray, verdict.setting)
        known, unit = GOALS[found.goal], verdict.setting.money
        step = f"1 ({unit})" if known.money else "1"
        page.append(heading("How"))
        page.append(
            paragraph(
                "Some table does all that is asked; the change below keeps every demand, brings "
                f"the goal {found.goal} further by {step}, and can be made again and again:"
            )
        )
        rows = [(change.party, _in_words(change)) for change in found.changes[:SHOWN]]
        rows += [(UNKNOWNS.get(name, name), _more(value)) for name, value in found.unknowns]
        page.append(listed(rows, indent=4))
        left = len(found.changes) - SHOWN
        if left > 0:
            page.append(paragraph(f"… and {left} more: --save DIR writes the ray to proof.json."))
    page.append(heading("What now"))
    single = all(party.size == 1 for party in verdict.setting.parties)
    page.append(paragraph(NO_LIE if single and _goal(verdict) == "margin" else MISSING))
    return page


def _goal(verdict: Verdict) -> str:
    """The goal that grows for ever."""
    return verdict.program.stages[-1].goal


def _in_words(change: Change) -> str:
    if change.always:
        return f"pays {_more(change.expected)} in every case"
    least, most = ", ".join(change.least_at), ", ".join(change.most_at)
    return (
        f"pays {_more(change.expected)} on average: from {_more(change.least)} at ({least}) "
        f"to {_more(change.most)} at ({most})"
    )


def _more(value: Fraction) -> str:
    if not value:
        return "no more"
    return f"{amount(abs(value))} {'more' if value > 0 else 'less'}"
