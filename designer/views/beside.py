"""Tables side by side: the columns that `rules` and `compare` share, on screen and in JSON."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from designer.ruling.judged import Judged
from designer.setting.exact import text
from designer.views.amounts import amount, cell
from designer.views.grid import Column, Grid

LEGEND = (
    "asked: whether the table does all that the scenario asks. pot: money left over, expected "
    "and in the worst case. lie: the most a party can expect from a lie. short: what the "
    "worst-off type would rather have kept away for. pays: the largest single payment, "
    "negative when received. ~ stands before a rounded number."
)

COLUMNS = (
    Column("asked"),
    Column("pot", right=True),
    Column("at worst", right=True),
    Column("lie", right=True),
    Column("short", right=True),
    Column("pays", right=True),
)

HONEST = {
    "dominant": "honesty pays whatever the others say",
    "bayesian": "honesty pays on average",
    "none": "a lie can pay",
}
JOINED = {
    "ex-post": "nobody ever loses by taking part",
    "interim": "no type expects to lose by taking part",
    "ex-ante": "no party expects to lose before it knows its type",
    "none": "some party does better by staying out",
}
BALANCED = {
    "ex-post exact": "the pot is even in every case",
    "ex-post no-deficit": "the pot is never short",
    "ex-ante exact": "the pot is even on average only",
    "ex-ante no-deficit": "the pot is short in some cases, not on average",
    "none": "the pot is short",
}


def amounts_of(found: Judged) -> dict[str, str]:
    """The columns as exact text, by the keys of the JSON documents."""
    return {
        "expected_pot": text(found.expected_pot),
        "worst_pot": text(found.worst_pot),
        "lie_gain_bayesian": text(found.lie_gain_bayesian),
        "lie_gain_dominant": text(found.lie_gain_dominant),
        "interim_shortfall": text(found.interim_shortfall),
        "expost_shortfall": text(found.expost_shortfall),
        "largest_payment": text(found.largest_payment),
    }


def whose(found: Judged) -> dict[str, Any]:
    """Whose lies and shortfalls the columns speak of, and what the table keeps and breaks."""
    places = {
        "lie_gain_bayesian": found.lie("bayesian"),
        "lie_gain_dominant": found.lie("dominant"),
        "interim_shortfall": found.shortfall("interim"),
        "expost_shortfall": found.shortfall("ex-post"),
    }
    return {
        "keeps": dict(found.keeps),
        "failing": list(found.failing),
        "whose": {
            key: {
                part: dict(value) if part == "profile" else value
                for part in ("party", "type", "lie", "profile")
                if (value := getattr(finding, part)) is not None
            }
            for key, finding in places.items()
            if finding.violation
        },
    }


def grid(first: str, rows: Sequence[tuple[str, Judged]], money: str) -> Grid:
    """The shared columns, one table a row; `first` heads the names."""
    return Grid(
        columns=[Column(first), *COLUMNS],
        rows=[[name, *_cells(found)] for name, found in rows],
        stacked=[(name, _sentence(found, money)) for name, found in rows],
    )


def _cells(found: Judged) -> list[str]:
    return [
        "no" if found.failing else "yes",
        cell(found.expected_pot),
        cell(found.worst_pot),
        cell(found.lie_gain_bayesian),
        cell(found.interim_shortfall),
        cell(found.largest_payment),
    ]


def _sentence(found: Judged, money: str) -> str:
    return (
        f"{'misses something asked' if found.failing else 'does all that is asked'}; "
        f"pot {amount(found.expected_pot, money)}, at worst {amount(found.worst_pot, money)}; "
        f"a lie wins {amount(found.lie_gain_bayesian, money)}; "
        f"short by {amount(found.interim_shortfall, money)}; "
        f"pays up to {amount(found.largest_payment, money)}"
    )


def manners(found: Judged, money: str) -> str:
    """What the table keeps, in a sentence, and the worth it gives up against efficiency."""
    keeps, lost = found.keeps, found.audit.decisions.lost
    given_up = f" It gives up {amount(lost, money)} of expected worth." if lost else ""
    return (
        f"{HONEST[keeps['ic']].capitalize()}; {JOINED[keeps['ir']]}; "
        f"{BALANCED[keeps['balance']]}.{given_up}"
    )


def worst(found: Judged, money: str) -> str:
    """Whose lie gains most and who is shortest, in sentences; empty where nobody is."""
    said = []
    for kind, at in (("bayesian", "on average"), ("dominant", "at worst")):
        lie = found.lie(kind)
        if lie.violation:
            said.append(
                f"{lie.party}, being {lie.type}, gains {amount(lie.violation, money)} {at} by "
                f"saying {lie.lie}."
            )
    for kind, at in (("interim", "can expect to lose"), ("ex-post", "can lose")):
        short = found.shortfall(kind)
        if short.violation:
            said.append(
                f"{short.party}, being {short.type}, {at} {amount(short.violation, money)} "
                "against staying out."
            )
    payment = found.audit.largest
    if payment.amount:
        does = "pays" if payment.amount > 0 else "receives"
        said.append(
            f"The largest payment: {payment.party} {does} {amount(abs(payment.amount), money)}."
        )
    return " ".join(said)
