"""The screen of a possible verdict: the goals' values, the table, and what it means."""

from __future__ import annotations

import itertools
from collections.abc import Mapping, Sequence
from dataclasses import replace
from fractions import Fraction

from designer.auditing.outcome import Pot, Standing
from designer.demands.registry import GOALS
from designer.proof.outcome import GoalResult
from designer.setting.setting import Setting
from designer.table import OnDemand, Table
from designer.verdict import Verdict
from designer.views.amounts import ROUNDED, amount, cell
from designer.views.grid import Column, Grid
from designer.views.numbered import runs, span
from designer.views.page import Page, caution, heading, listed, paragraph

CASES = 12
"""Rows of the case-by-case table shown unless asked otherwise."""
STANDINGS = 40
"""Rows of the type-by-type table shown unless asked otherwise."""
SLIP = 2
"""A table longer by so few rows is shown whole: 'and 2 more' would take a line as well."""


def possible(verdict: Verdict, rows: int | None = None) -> Page:
    """The values, the table, type by type, the pot; `rows` limits either table."""
    page: Page = [heading(f"POSSIBLE, {'proved' if verdict.proved else 'unproved'}.")]
    page += goals(verdict)
    audit = verdict.audit
    if verdict.table is not None and audit is not None:
        page += cases(verdict.setting, verdict.table, audit.pot, rows)
    elif verdict.mechanism is not None:
        page += on_demand(verdict.setting, verdict.mechanism, rows)
    page += standings(verdict.standings, rows)
    if audit is not None:
        page += pots(verdict.setting, audit.pot)
    page.append(caution())
    return page


def goals(verdict: Verdict) -> Page:
    """A sentence for every goal, and how far it is proved."""
    lines = goal_lines(verdict)
    page: Page = [listed(lines)] if lines else []
    if verdict.proved:
        page.append(paragraph(f"Proved in exact arithmetic: {'; '.join(verdict.claims)}."))
        page += road(verdict)
    elif verdict.reason:
        page.append(paragraph(f"Unproved: {verdict.reason}"))
    elif verdict.claims:
        page.append(paragraph(f"Proved so far: {'; '.join(verdict.claims)}."))
    return page


def road(verdict: Verdict) -> Page:
    """How it was decided, where that was not the plain program."""
    if verdict.path == "full":
        return []
    joint = verdict.setting.joint is not None and verdict.path == "interim"
    product = " The joint prior is exactly a product: types count as independent." if joint else ""
    return [paragraph(f"Decided by the road '{verdict.path}' (--why-path).{product}")]


def goal_lines(verdict: Verdict) -> list[tuple[str, str]]:
    """A name and a sentence for every goal that has a value, and for the tidy stage."""
    return [
        ("tidy" if goal.tidy else goal.goal, line)
        for goal in verdict.goals
        if (line := _goal(goal, verdict.setting))
    ]


def _goal(goal: GoalResult, setting: Setting) -> str:
    if goal.tidy:
        if goal.value is None:
            return f"Not tidied: {goal.reason or 'among the best tables any was taken'}."
        return (
            "Among such tables this one has the smallest largest payment, "
            f"{amount(goal.value, setting.money)}.{_doubt(goal, setting)}"
        )
    if goal.goal == "any" or goal.value is None:
        return ""
    known = GOALS[goal.goal]
    value = amount(goal.value, setting.money if known.money else "")
    more = ""
    if goal.goal == "outside-money" and goal.value < 0:
        more = " Negative: so much can be handed out."
    return f"The {known.reads} is {value}.{more}{_doubt(goal, setting)}"


def _doubt(goal: GoalResult, setting: Setting) -> str:
    if goal.proved:
        return ""
    if goal.bound is None:
        return " Unproved: a better one may exist."
    return f" Unproved: the engine says that nothing beyond {goal.bound:.6g} exists."


def cases(setting: Setting, table: Table, pot: Pot, rows: int | None = None) -> Page:
    """The table case by case, the first rows of it."""
    shown = _shown(setting.profiles, CASES if rows is None else rows)
    page: Page = [heading("Case by case")]
    columns = [Column(party.name, group="reported") for party in setting.parties]
    columns += [Column("chance", right=True), Column("decided")]
    columns += [Column(party.name, right=True, group="pays") for party in setting.parties]
    columns.append(Column("pot", right=True))
    lines, stacked = [], []
    for profile in range(shown):
        labels = setting.labels_at(profile)
        pays = [cell(table.payment(i, profile)) for i in range(len(setting.parties))]
        chance, decided = cell(setting.probability(profile)), decision(setting, table, profile)
        rest = cell(pot[profile])
        lines.append([*labels, chance, decided, *pays, rest])
        opening = f"{_paired(setting, labels)} (chance {chance}): {decided}"
        stacked.append((opening, f"pays: {_paired(setting, pays)}; pot {rest}"))
    if shown:
        page.append(Grid(columns, lines, stacked))
    page += _rest(setting.profiles - shown, "case", "transfers.csv", lines)
    return page


def on_demand(setting: Setting, table: OnDemand, rows: int | None = None) -> Page:
    """The first cases of a table too large to write out, and where the others are."""
    shown = _shown(setting.profiles, CASES if rows is None else rows)
    page: Page = [heading("Case by case")]
    columns = [Column(party.name, group="reported") for party in setting.parties]
    columns.append(Column("decided"))
    columns += [Column(party.name, right=True, group="pays") for party in setting.parties]
    lines, stacked = [], []
    for profile in range(shown):
        types = setting.types_at(profile)
        labels = setting.labels_at(profile)
        pays = [cell(payment) for payment in table.pays(types)]
        decided = lottery(setting, table.decides(types))
        lines.append([*labels, decided, *pays])
        stacked.append((f"{_paired(setting, labels)}: {decided}", _paired(setting, pays)))
    if shown:
        page.append(Grid(columns, lines, stacked))
    page.append(
        paragraph(
            f"… {setting.profiles:,} cases in all, each computed when asked for: --save DIR writes "
            "table.json, from which every payment follows exactly."
        )
    )
    return page


def decision(setting: Setting, table: Table, profile: int) -> str:
    """What is decided at a profile: the option, or the lottery in a few words."""
    options = range(len(setting.options))
    return lottery(setting, tuple(table.chance(profile, k) for k in options))


def lottery(setting: Setting, found: Sequence[Fraction]) -> str:
    """The option that is sure, or the lottery in a few words."""
    chances = list(zip(found, setting.options, strict=True))
    drawn = [(chance, option) for chance, option in chances if chance]
    if len(drawn) == 1 and drawn[0][0] == 1:
        return drawn[0][1]
    return ", ".join(f"{cell(chance)} {option}" for chance, option in drawn)


def standings(found: Sequence[Standing], rows: int | None = None, saved: bool = True) -> Page:
    """What each type of each party can expect, and the lie that comes closest.

    saved  whether --save is there to write the rest of a long list
    """
    found = alike_once(found)
    shown = _shown(len(found), STANDINGS if rows is None else rows)
    page: Page = [heading("Type by type, on average when everyone is honest")]
    columns = [
        Column("party"),
        Column("type"),
        Column("pays", right=True),
        Column("utility", right=True),
        Column("gain over out", right=True),
        Column("nearest lie"),
        Column("it loses", right=True),
    ]
    lines, stacked = [], []
    for one in found[:shown]:
        amounts = [cell(one.pays), cell(one.utility), cell(one.gain)]
        lie, loses = one.lie or "none", "" if one.margin is None else cell(one.margin)
        lines.append([one.party, one.type, *amounts, lie, loses])
        told = f"nearest lie {lie}, which loses {loses}" if one.lie else "no lie to tell"
        stacked.append(
            (
                f"{one.party}, {one.type}:",
                f"pays {amounts[0]}; utility {amounts[1]}; "
                f"gain over staying out {amounts[2]}; {told}",
            )
        )
    if shown:
        page.append(Grid(columns, lines, stacked))
    page += _rest(len(found) - shown, "type", "interim.csv" if saved else "", lines)
    return page


def alike_once(found: Sequence[Standing]) -> list[Standing]:
    """Numbered parties in a row with the same lines are shown once, under one name."""
    parties = [list(lines) for _, lines in itertools.groupby(found, lambda one: one.party)]
    once: list[Standing] = []
    for run in runs(
        parties,
        lambda lines: lines[0].party,
        lambda lines: [replace(line, party="") for line in lines],
    ):
        name = span(run[0][0].party, run[-1][0].party)
        once += [replace(line, party=name) for line in run[0]]
    return once


def pots(setting: Setting, pot: Pot) -> Page:
    """The pot in a sentence: what is left over when the outlay is paid."""
    cases = "every case that can occur" if setting.support_only else "every case"
    if pot.least == pot.most:
        return [heading("Pot"), paragraph(f"{amount(pot.least, setting.money)} in {cases}.")]
    rows = [
        ("least", f"{amount(pot.least, setting.money)}, at {_at(pot.least_at)}"),
        ("most", f"{amount(pot.most, setting.money)}, at {_at(pot.most_at)}"),
        ("expected", amount(pot.expected, setting.money)),
    ]
    return [heading("Pot, what is left when the outlay is paid"), listed(rows)]


def _at(profile: Mapping[str, str]) -> str:
    return ", ".join(f"{name} {kind}" for name, kind in profile.items())


def _paired(setting: Setting, cells: Sequence[str]) -> str:
    names = [party.name for party in setting.parties]
    found = runs(list(zip(names, cells, strict=True)), lambda one: one[0], lambda one: one[1])
    return ", ".join(f"{span(run[0][0], run[-1][0])} {run[0][1]}" for run in found)


def _shown(count: int, limit: int) -> int:
    return count if count <= limit + SLIP and limit else min(count, limit)


def _rest(left: int, noun: str, file: str, lines: Sequence[Sequence[str]]) -> Page:
    """What the table leaves out, and what its marks mean."""
    notes = []
    if any(text.startswith(ROUNDED) for line in lines for text in line):
        notes.append(f"{ROUNDED} marks a rounded number.")
    if left:
        plural = "" if left == 1 else "s"
        more = f"… and {left:,} more {noun}{plural}: --rows N shows more of them"
        notes.append(f"{more}, --save DIR writes all, exact, to {file}." if file else f"{more}.")
    return [paragraph(" ".join(notes))] if notes else []
