"""The screen of an audit: each demand kept or broken, where, and by how much."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from fractions import Fraction

from rich.padding import Padding
from rich.table import Table as RichTable
from rich.text import Text

from designer.auditing.outcome import Audit, Finding
from designer.setting.setting import Setting
from designer.views.amounts import amount
from designer.views.page import INDENT, Page, caution, heading, paragraph
from designer.views.posed import scenario
from designer.views.possible import pots, standings

NAMES: dict[str, str] = {
    "ic-bayesian": "honesty, on average",
    "ic-dominant": "honesty, in every case",
    "ir-ex-ante": "taking part, before types are known",
    "ir-interim": "taking part, type by type",
    "ir-ex-post": "taking part, in every case",
    "balance-ex-ante-exact": "pot exact, on average",
    "balance-ex-ante-no-deficit": "no deficit, on average",
    "balance-ex-post-exact": "pot exact, in every case",
    "balance-ex-post-no-deficit": "no deficit, in every case",
    "decision-efficient": "efficient decisions",
    "decision-table": "the scenario's own decisions",
    "decision-deterministic": "one sure decision, in every case",
    "lottery": "chances that add up to 1",
    "pays_at_most": "the cap on payments",
    "pays_at_least": "the floor on payments",
    "only_when_served": "paying only when served",
    "within_worth": "paying no more than the decision is worth",
    "welfare_at_least": "the floor on expected welfare",
    "revenue_at_least": "the floor on the expected pot",
    "even-handed": "parties with equal data alike",
}
"""Findings in the words of the screen, by the names the audit gives them."""


def audited(
    audit: Audit, asked: Sequence[str], failing: Sequence[str], rows: int | None = None
) -> Page:
    """The whole screen.

    asked    names of the demands the table is held to; the others are listed all the same
    failing  those of them that it breaks
    """
    page = scenario(audit.setting)
    if failing:
        names = "; ".join(name_of(name) for name in failing)
        page += [heading("DOES NOT HOLD."), paragraph(f"Broken: {names}.")]
    else:
        page += [heading("HOLDS."), paragraph("The table does all that is asked.")]
    page += _measure(audit)
    page += [heading("Demand by demand"), _findings(audit, asked)]
    page += [paragraph(text) for text in _excused(audit)]
    page += standings(audit.standings, rows, saved=False)
    page += pots(audit.setting, audit.pot)
    page.append(caution())
    return page


def name_of(name: str) -> str:
    """A finding's name in words."""
    return NAMES.get(name, f"side demand {name}")


def _measure(audit: Audit) -> Page:
    """What the table was held against, where that is not simply zero."""
    money, notes = audit.setting.money, []
    if not audit.exact:
        notes.append("Some entries look rounded.")
    if audit.tolerance:
        notes.append(f"Tolerance: {amount(audit.tolerance, money)}.")
    if audit.subsidy:
        notes.append(f"Outside money: {amount(audit.subsidy, money)}.")
    if audit.slack:
        notes.append(f"Tolerated gain from a lie: {amount(audit.slack, money)}.")
    return [paragraph(" ".join(notes))] if notes else []


def _findings(audit: Audit, asked: Sequence[str]) -> Padding:
    decisions = audit.decisions
    found = [*audit.worst.values(), decisions.efficient]
    if decisions.follows is not None:
        found.append(decisions.follows)
    found += [decisions.lottery, *audit.limits.values()]
    table = RichTable.grid(padding=(0, 2, 0, 0))
    table.add_column(no_wrap=True)
    table.add_column(no_wrap=True)
    table.add_column(ratio=1, overflow="fold")
    for finding in found:
        words = f"{name_of(finding.demand)}{_worst(finding, audit.setting)}"
        table.add_row(
            "asked" if finding.demand in asked else "",
            "kept" if finding.holds else "BROKEN",
            Text(words),
        )
    if not decisions.certain:
        word = "asked" if "decision-deterministic" in asked else ""
        table.add_row(word, "BROKEN", Text(name_of("decision-deterministic")))
    return Padding(table, (0, 0, 0, INDENT))


def _worst(finding: Finding, setting: Setting) -> str:
    """Who comes closest to breaking a demand, or breaks it worst, and by how much."""
    margin, money = finding.margin, setting.money
    if margin is None:
        return ""
    who = finding.party or ""
    being = f"{who}, being {finding.type}," if finding.type else who
    at = f" at {_at(finding.profile)}" if finding.profile else ""
    match finding.demand.partition("-")[0]:
        case "ic":
            does = f"loses {amount(margin, money)}" if margin >= 0 else _by("gains", margin, money)
            return f": {being} saying {finding.lie}{at} {does}"
        case "ir":
            does = _by("gains" if margin >= 0 else "loses", margin, money)
            return f": {being} {does} against staying out{at}"
        case "balance" if "no-deficit" in finding.demand:
            does = "left over" if margin >= 0 else "missing"
            return f": {amount(abs(margin), money)} {does}{at}"
        case "balance":
            return f": off by {amount(abs(margin), money)}{at}" if margin else ""
    if not margin:
        return ""
    if finding.demand == "decision-efficient":
        return f": welfare {amount(abs(margin), money)} short{at}"
    unit = money if finding.demand in _MONEY else ""
    subject = f"{being.rstrip(',')} " if being else ""
    does = "to spare" if margin > 0 else "short"
    return f": {subject}{amount(abs(margin), unit)} {does}{at}"


_MONEY = frozenset(
    {
        "pays_at_most",
        "pays_at_least",
        "only_when_served",
        "within_worth",
        "welfare_at_least",
        "revenue_at_least",
    }
)


def _by(verb: str, margin: Fraction, money: str) -> str:
    return f"{verb} {amount(abs(margin), money)}"


def _at(profile: Mapping[str, str]) -> str:
    return ", ".join(f"{name} {kind}" for name, kind in profile.items())


def _excused(audit: Audit) -> list[str]:
    """Compelled parties: what they would have lost, though nobody asks."""
    lost = [f for f in audit.excused if f.demand == "ir-interim" and not f.holds]
    if not audit.compelled:
        return []
    names = ", ".join(sorted(audit.compelled))
    notes = [f"Compelled, so not asked to gain by taking part: {names}."]
    notes += [
        f"{f.party}, being {f.type}, loses {amount(f.violation, audit.setting.money)} by it."
        for f in lost
    ]
    return notes
