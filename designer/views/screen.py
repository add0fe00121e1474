"""The whole screen of a verdict."""

from __future__ import annotations

from designer.verdict import Verdict
from designer.views.amounts import counted
from designer.views.impossible import impossible
from designer.views.page import Page, heading, listed, paragraph
from designer.views.posed import posed
from designer.views.possible import goal_lines, possible
from designer.views.unbounded import unbounded


def screen(verdict: Verdict, rows: int | None = None, scenario: bool = True) -> Page:
    """What was posed, the verdict, and all that goes with it.

    rows      rows shown of either table; None for the usual numbers
    scenario  whether to begin with what was posed
    """
    page = posed(verdict.setting, verdict.terms) if scenario else []
    if verdict.status == "possible":
        return page + possible(verdict, rows)
    if verdict.status == "impossible":
        return page + impossible(verdict)
    if verdict.status == "unbounded":
        return page + unbounded(verdict)
    return page + undecided(verdict)


def undecided(verdict: Verdict) -> Page:
    """Why nothing was decided, what is settled all the same, and what to try."""
    why = verdict.reason or "no reason was given"
    page: Page = [heading("UNDECIDED."), paragraph(f"Why: {why}.")]
    settled = goal_lines(verdict)
    if settled:
        page += [paragraph(f"Before that, {counted(len(settled), 'goal')} had a value:")]
        page.append(listed(settled))
    tries = [
        ("time", "--time-limit SECONDS with more of them, or without the option."),
        ("engine", "--engine pulp:NAME asks any other engine that PuLP finds."),
        ("less", "Fewer types a party, fewer goals, or --tidy none."),
    ]
    return [*page, heading("What to try"), listed(tries)]
