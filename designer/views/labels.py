"""A label of the program as a term in a sum, and as the sentence of the demand it names."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from fractions import Fraction

from designer.program.labels import (
    AtMost,
    Balances,
    Clause,
    Covered,
    Decides,
    ExpectedDecision,
    ExpectedPay,
    Honest,
    Label,
    Lottery,
    OnAverage,
    Paths,
    Pays,
    PaysAgainst,
    Pin,
    Share,
    Slice,
    TakesPart,
    Unknown,
)
from designer.program.program import Axis
from designer.setting import exact

MOST_TERMS = 12
"""Terms of one sum that are written out."""

LEGEND: dict[type[Label], str] = {
    ExpectedPay: "E[P pays | a]  what P pays on average when it reports a",
    Pays: "[P pays | a, b, …]  what P pays when the reports are a, b, … in the parties' order",
    PaysAgainst: "E[P pays | ·, b, …]  what P pays on average when the others report b, …",
    ExpectedDecision: "Pr[d | P a]  how likely d is when P reports a",
    Decides: "Pr[d | a, b, …]  how likely d is when the reports are a, b, … in the parties' order",
}


def term(label: Label) -> str:
    """A column of the program, as it stands in a sum."""
    match label:
        case Pays(party, at):
            return f"[{party} pays | {', '.join(at)}]"
        case ExpectedPay(party, kind):
            return f"E[{party} pays | {kind}]"
        case Decides(option, at):
            return f"Pr[{option} | {', '.join(at)}]"
        case ExpectedDecision(party, kind, option, others):
            return f"Pr[{_or(option, others)} | {party} {kind}]"
        case Share(kind, rule):
            return f"[share of rule {rule} | {kind}]"
        case OnAverage(what, None):
            return f"E[{what}]"
        case OnAverage(what, party):
            return f"E[{party} pays]" if what == "pays" else f"E[{what} of {party}]"
        case PaysAgainst(party, at, worst):
            return f"E[{party} pays | {', '.join(at)}{_held(worst)}]"
        case Unknown(name):
            return f"[{name}]"
    return f"[{label}]"


def addends(terms: Sequence[tuple[Label, Fraction]], most: int = MOST_TERMS) -> list[str]:
    """The parts of a sum of coefficients times terms, each with its sign; "0" for none.

    >>> addends([(Unknown("floor"), Fraction(-1)), (Unknown("swing"), Fraction(1, 2))])
    ['-[floor]', '+ 1/2·[swing]']
    """
    parts: list[str] = []
    for label, coefficient in terms[:most]:
        size = "" if abs(coefficient) == 1 else f"{exact.text(abs(coefficient))}·"
        sign = "-" if coefficient < 0 else "+"
        lead = ("-" if sign == "-" else "") if not parts else f"{sign} "
        parts.append(f"{lead}{size}{term(label)}")
    if len(terms) > most:
        parts.append(f"+ {len(terms) - most:,} more terms")
    return parts or ["0"]


def legend(labels: Iterable[Label]) -> list[str]:
    """What the kinds of terms in use mean, in a fixed order."""
    used = {type(label) for label in labels}
    return [meaning for kind, meaning in LEGEND.items() if kind in used]


def axis_names(axis: Axis) -> list[str]:
    """A name for every label of an axis, for files that name rows and columns."""
    return [axis_name(axis.label(position)) for position in range(len(axis))]


def axis_name(label: Label) -> str:
    """The kind of a label and what it says, in one word.

    >>> axis_name(Pays("Suth", ("20", "50")))
    'Pays_Suth_20_50'
    """
    parts = [type(label).__name__]
    for value in vars(label).values():
        if isinstance(value, tuple):
            parts += value
        elif value is not None:
            parts.append(str(value))
    return "_".join(parts)


def sentence(label: Label | None, folds: int = 1) -> str:
    """The demand a row stands for; `folds` rows of a family may be folded into one line."""
    match label:
        case Slice(kind):
            return f"the shares of the rules where the leading party is {kind} add up to 1"
        case Share(kind, rule):
            return f"the share of rule {rule} where the leading party is {kind} is at least 0"
        case None | Lottery():
            return "the chances of the decisions are at least 0 and add up to 1"
        case Honest(party, true, told, at):
            gain = f"{party}, being {true}, gains nothing by reporting {told}"
            return f"{gain}{_where(at)}"
        case TakesPart(party, None, None):
            return f"{party} takes part, before it knows its type"
        case TakesPart(party, kind, at):
            return f"{party}, being {kind}, takes part{_where(at)}"
        case Balances(None) if folds > 1:
            return f"the pot balances in every case ({folds:,} rows, each weighed as likely)"
        case Balances(None):
            return "the pot balances on average"
        case Balances(at):
            return f"the pot balances{_where(at)}"
        case Covered(at):
            return f"what paths of lies let the parties pay covers the outlay{_where(at)}"
        case Clause(group, key, party, at):
            return f"{_clause(group, key, party)}{_where(at)}"
        case AtMost(party, worst):
            bounded = "is bounded by honesty and participation"
            return f"what {party} pays on average {bounded}{_held(worst)}"
        case Paths(party, at, number, worst):
            bounded = f"is bounded by its paths of lies no. {number}"
            return f"{term(PaysAgainst(party, at, worst))} {bounded}"
        case PaysAgainst():
            return f"{term(label)} is an average"
        case OnAverage():
            return f"the rule fixes {term(label)}"
        case Pin(goal):
            return f"the goal {goal} keeps its value"
        case ExpectedPay(party, kind):
            return f"what {party} pays on average when it reports {kind} is an average"
        case ExpectedDecision(party, kind, option, others):
            chance = _or(option, others)
            return f"how likely {chance} is when {party} reports {kind} is an average"
        case Unknown(name):
            return f"the {name} keeps its sign"
    return "a chance is at least 0"


def _held(worst: str | None) -> str:
    """The type that participation holds, where several bounds are told apart."""
    return "" if worst is None else f", {worst} at its outside option"


def _or(option: str, others: int) -> str:
    """An option, and how many more are counted with it."""
    if not others:
        return option
    return f"{option} or {others} other{'s' if others > 1 else ''} all one to it"


def family(label: Label | None) -> str:
    """The kind of demand a row belongs to, for saying what collides."""
    match label:
        case Honest():
            return "honesty"
        case TakesPart():
            return "taking part"
        case AtMost() | Paths():
            return "honesty and taking part together"
        case OnAverage():
            return "the decision rule"
        case Balances() | Covered():
            return "the pot"
        case Clause("limit"):
            return "the limits on payments"
        case Clause("side"):
            return "the side demands"
        case Clause("even-handed"):
            return "even-handedness"
        case Clause("goal") | Pin() | Unknown():
            return "the goal"
    return "what a lottery is"


def _where(at: tuple[str, ...] | None) -> str:
    return "" if at is None else f", when the types are ({', '.join(at)})"


def _clause(group: str, key: str, party: str | None) -> str:
    who = party or "nobody"
    match group, key:
        case "limit", "pays_at_most":
            return f"{who} pays no more than the cap"
        case "limit", "pays_at_least":
            return f"{who} pays no less than the floor"
        case "limit", "only_when_served":
            return f"{who} pays only when it is served"
        case "limit", "within_worth":
            return f"{who} pays no more than the decision is worth to it"
        case "side", "welfare_at_least":
            return "expected welfare reaches its floor"
        case "side", "revenue_at_least":
            return "the expected pot reaches its floor"
        case "side", _:
            return f"the demand on how likely a decision is, {key}, is met for {who}"
        case "even-handed", _:
            return f"{key} are treated alike" + (f" in what {party} pays" if party else "")
        case "goal", _:
            return f"the row that defines the goal {key}" + (f", for {party}" if party else "")
    return f"{group} {key}"
