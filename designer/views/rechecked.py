"""The screen of a rechecked proof. Its text comes from a file that nobody vouches for."""

from __future__ import annotations

from collections.abc import Sequence

from designer.proof.recheck import Finding
from designer.views.page import Page, heading, listed, paragraph


def rechecked(
    title: str, finding: Finding, compared: bool, differences: Sequence[str] = ()
) -> Page:
    """Whether the proof holds, what exactly it proves, and whether it is the scenario's.

    compared     whether a scenario was given to rebuild the program from
    differences  what the rebuilt program does differently
    """
    holds = finding.holds and not differences
    page: Page = [heading("HOLDS." if holds else "DOES NOT HOLD.")]
    rows = [("scenario", safe(title) or "no title"), ("verdict", finding.verdict or "none stated")]
    rows += [("proved", f"{safe(claim)}.") for claim in finding.claims]
    rows += [("open", f"nothing is claimed to be best for {safe(goal)}.") for goal in finding.open]
    rows += [("fault", f"{safe(fault)}.") for fault in finding.faults]
    rows += [("differs", f"{safe(text)}.") for text in differences]
    page.append(listed(rows))
    page.append(paragraph(_scope(finding, compared, differences)))
    return page


def _scope(finding: Finding, compared: bool, differences: Sequence[str]) -> str:
    if not finding.holds:
        return "Nothing is proved by this file."
    if differences:
        return "The proof is right about its own program, which is not this scenario's."
    if finding.reduced and compared:
        return (
            "The program is a reduced one. What stands behind it was recounted from the scenario "
            "and the program rebuilt: its answer is that of the scenario, over all its cases."
        )
    if finding.reduced:
        return (
            "Checked with whole numbers alone, no solver. The program is a reduced one: that its "
            "answer is also that of your scenario, over all its cases, is checked with --scenario "
            "FILE."
        )
    if compared:
        return "The program was rebuilt from the scenario and is the same, row by row."
    return (
        "Checked with whole numbers alone, no solver. Whether the program in the file says what "
        "your scenario says is checked with --scenario FILE."
    )


def safe(text: str, most: int = 400) -> str:
    """Printable characters only, and not too many of them."""
    shown = "".join(letter if letter.isprintable() else "?" for letter in text[:most])
    return shown if len(text) <= most else f"{shown}…"
