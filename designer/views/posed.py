"""The top of a screen: what was posed."""

from __future__ import annotations

from fractions import Fraction

from designer.demands.terms import Terms
from designer.setting import exact
from designer.setting.setting import Setting
from designer.views.amounts import counted
from designer.views.numbered import runs, span
from designer.views.page import Page, heading, listed, paragraph
from designer.views.sentences import sentences


def posed(setting: Setting, terms: Terms) -> Page:
    """The scenario in a few lines, and every demand as a sentence."""
    return [*scenario(setting), heading("Asked"), listed(sentences(terms, setting))]


def scenario(setting: Setting) -> Page:
    """Title, parties, cases, decisions, money and note."""
    from rich.text import Text

    names = ", ".join(
        f"{span(run[0].name, run[-1].name)} ({run[0].size}{' each' if len(run) > 1 else ''})"
        for run in runs(setting.parties, lambda party: party.name, lambda party: party.size)
    )
    rows = [
        ("parties", f"{names}: {counted(setting.profiles, 'case')}, {_nature(setting)}"),
        ("decisions", _decisions(setting)),
        ("money", f"{setting.money}; in payments + is paid and - is received"),
    ]
    page: Page = [Text(setting.title, style="bold"), listed(rows)]
    if setting.note:
        page.append(paragraph(setting.note))
    return page


def _nature(setting: Setting) -> str:
    types = "types independent" if setting.independent else "types correlated"
    return f"{types}, worths interdependent" if setting.interdependent else types


def _decisions(setting: Setting) -> str:
    parts = []
    for k, option in enumerate(setting.options):
        outlay = Fraction(int(setting.outlay[k]), setting.grain)
        worth = Fraction(int(setting.worth[k]), setting.grain)
        notes = [f"outlay {exact.text(outlay)}"] if outlay else []
        notes += [f"worth {exact.text(worth)} to the designer"] if worth else []
        parts.append((option, notes))
    found = []
    for run in runs(parts, lambda part: part[0], lambda part: part[1]):
        (first, notes), (last, _) = run[0], run[-1]
        more = f" ({', '.join(notes)}{' each' if len(run) > 1 else ''})" if notes else ""
        found.append(span(first, last) + more)
    return ", ".join(found)
