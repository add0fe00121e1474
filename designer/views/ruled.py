"""The screen and the document of `designer rules`."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from designer.ruling.profiles import TIES
from designer.ruling.report import RuleResult, RulesReport
from designer.views.amounts import amount
from designer.views.audited import name_of
from designer.views.beside import LEGEND, amounts_of, grid, manners, whose, worst
from designer.views.caution import CAUTION
from designer.views.documents import verdict_document
from designer.views.page import INDENT, Page, caution, heading, paragraph
from designer.views.posed import posed

FORMAT = "designer.rules/1"
OPTIMUM = "the optimum (pose)"


def ruled(report: RulesReport) -> Page:
    """The whole screen: one table, then each rule in words, then those that do not apply."""
    money = report.setting.money
    page = posed(report.setting, report.terms)
    rows = [(r.name, r.judged) for r in report.results if r.judged is not None]
    if report.beside is not None:
        rows.append((OPTIMUM, report.beside))
    if rows:
        page += [heading("The rules, audited"), grid("rule", rows, money), paragraph(LEGEND)]
    page += _optimum(report)
    applied = [result for result in report.results if result.applies]
    if applied:
        page.append(heading("Rule by rule"))
    if any(TIES in result.notes for result in applied):
        page.append(paragraph(f"{TIES} Where a rule does otherwise, it says so."))
    for result in applied:
        page += _rule(result, money)
    refused = [result for result in report.results if not result.applies]
    if refused:
        page.append(heading("Rules that do not apply here"))
    for reason, results in _by_reason(refused).items():
        titles = ", ".join(_title(result) for result in results)
        page += [paragraph(titles), paragraph(reason, 2 * INDENT)]
    page.append(caution())
    return page


def _by_reason(refused: list[RuleResult]) -> dict[str, list[RuleResult]]:
    """Rules that fail for the same reason together, so that it is said once."""
    found: dict[str, list[RuleResult]] = {}
    for result in refused:
        found.setdefault(str(result.why_not), []).append(result)
    return found


def _title(result: RuleResult) -> str:
    return f"{result.name} ({result.rule.source})"


def _rule(result: RuleResult, money: str) -> Page:
    found = result.judged
    if found is None:
        return []
    breaks = "; ".join(name_of(name) for name in found.failing)
    words = [
        f"Assumes {result.rule.assumes}.",
        manners(found, money),
        f"Asked and broken: {breaks}." if breaks else "Does all that is asked.",
        worst(found, money),
        *(note for note in result.notes if note != TIES),
    ]
    return [
        paragraph(_title(result)),
        paragraph(" ".join(word for word in words if word), 2 * INDENT),
    ]


def _optimum(report: RulesReport) -> Page:
    verdict = report.optimum
    if verdict is None:
        return []
    proved = "proved" if verdict.proved else "unproved"
    words = f"Under the same demands, pose says: {verdict.status.upper()}, {proved}."
    if verdict.goal_value is not None and verdict.goals[0].goal != "any":
        value = amount(verdict.goal_value, report.setting.money)
        words += f" The best value of the goal {verdict.goals[0].goal} is {value}."
    elif verdict.status == "impossible":
        words += " No table does all that is asked, so no rule can; each gives something up."
    elif verdict.reason:
        words += f" {verdict.reason}."
    return [heading("The optimum"), paragraph(words)]


def rules_document(report: RulesReport, files: Mapping[str, str] | None = None) -> dict[str, Any]:
    """The report as JSON-ready values, format designer.rules/1; every number exact as text."""
    empty = dict.fromkeys(
        (
            "expected_pot",
            "worst_pot",
            "lie_gain_bayesian",
            "lie_gain_dominant",
            "interim_shortfall",
            "expost_shortfall",
            "largest_payment",
        )
    )
    from designer.demands.plain import as_plain

    return {
        "format": FORMAT,
        "scenario": {"title": report.setting.title, "digest": report.setting.digest},
        "money": report.setting.money,
        "demands": as_plain(report.terms),
        "rules": [
            {
                "name": result.name,
                "applies": result.applies,
                "why_not": None if result.why_not is None else str(result.why_not),
                **(amounts_of(result.judged) if result.judged else empty),
            }
            for result in report.results
        ],
        "details": [
            {
                "name": result.name,
                "source": result.rule.source,
                "assumes": result.rule.assumes,
                "notes": list(result.notes),
                **(whose(result.judged) if result.judged else {}),
            }
            for result in report.results
        ],
        "optimum": None if report.optimum is None else verdict_document(report.optimum),
        "optimum_table": None if report.beside is None else amounts_of(report.beside),
        "files": dict(files or {}),
        "caution": CAUTION,
    }
