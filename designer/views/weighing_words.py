"""Demand groups, forms, criteria and ways out, in words."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from fractions import Fraction

from designer.setting.setting import Setting, Side
from designer.views.amounts import amount, cell, counted
from designer.weighing.groups import CLAUSES
from designer.weighing.prices import Price
from designer.weighing.room import Room
from designer.weighing.tradeoff import Tradeoff

LIMITS = {
    "pays_at_most": "the cap on payments",
    "pays_at_least": "the floor under payments",
    "only_when_served": "paying only when served",
    "within_worth": "paying no more than one's worth",
    "welfare_at_least": "the floor under expected welfare",
    "revenue_at_least": "the floor under the expected pot",
}
CRITERIA = {
    "money": "outside money",
    "shortfall": "lowered floor",
    "lies": "tolerated gain from lies",
    "welfare": "welfare given up",
}
"""What a mix can pay with, as it stands beside an axis."""

FORMS = {
    "ic": {
        "dominant": "honesty whatever the others report",
        "bayesian": "honesty on average",
        "none": "no demand of honesty",
    },
    "ir": {
        "ex-post": "taking part pays in every case",
        "interim": "taking part pays for every type",
        "ex-ante": "taking part pays before types are known",
        "none": "everyone compelled",
    },
    "balance": {
        "ex-post": "the pot balances in every case",
        "ex-ante": "the pot balances on average",
        "none": "no demand on the pot",
    },
    "budget": {"exact": "the pot comes out exactly", "no-deficit": "the pot may be left over"},
    "decision": {
        "efficient": "the efficient decision",
        "table": "the given rule",
        "deterministic": "any decision, no lottery",
        "randomized": "any decision, lotteries too",
    },
}
DEMANDS = {
    "ic": "honesty",
    "ir": "taking part",
    "balance": "balance",
    "budget": "budget",
    "decision": "decision",
}
CASES = 4
"""Changed cases of a second best that are written out."""


def group(name: str, setting: Setting, side: Side) -> str:
    """A demand group in words; `side` holds the side demands by number."""
    kind, _, key = name.partition(":")
    if kind == "ic":
        return f"honesty of {key}"
    if kind == "ir":
        return f"{key} taking part"
    if kind == "limit" or key in LIMITS:
        return LIMITS[key]
    if kind == "side":
        chance = side.chances[int(key.removeprefix("chance[").removesuffix("]"))]
        party = setting.parties[chance.party]
        kind, option = party.types[chance.type].label, setting.options[chance.option]
        return f"the chance of {option} for {party.name} being {kind}"
    return {"decision": "the decision", "balance": "the pot"}.get(name, name)


def groups(names: Sequence[str], found: Tradeoff) -> str:
    """Several groups in words, with 'everyone's honesty' where all of a kind are there."""
    words, left = [], list(names)
    for kind, everyone in (("ic:", "everyone's honesty"), ("ir:", "everyone taking part")):
        every = [name for name in found.groups if name.startswith(kind)]
        if len(every) > 1 and set(every) <= set(left):
            place = left.index(every[0])
            left = [name for name in left if name not in every[1:]]
            left[place] = everyone
    known = set(found.groups)
    words = [group(n, found.setting, found.terms.side) if n in known else n for n in left]
    return joined(words, "and")


def joined(words: Sequence[str], last: str) -> str:
    """A list as people write it.

    >>> joined(["a", "b", "c"], "or")
    'a, b or c'
    """
    return f" {last} ".join(filter(None, [", ".join(words[:-1]), *words[-1:]]))


def form(demand: str, word: str) -> str:
    """A form of a demand in words."""
    return FORMS[demand][word]


def way(relax: str) -> str:
    """A way out as a short heading."""
    kind, _, key = relax.partition(":")
    if kind == "limit" and key not in CLAUSES:
        return {"pays_at_most": "a higher cap", "pays_at_least": "a lower least payment"}[key]
    if kind == "side":
        return {"welfare_at_least": "a lower welfare floor"}.get(key, "a lower pot floor")
    if kind == "shortfall" and key:
        return f"a lower floor for {key}"
    return {
        "outside-money": "outside money",
        "outside-money-on-average": "outside money, on average",
        "shortfall": "a lower floor for all",
        "compel": "compulsion",
        "lies": "tolerated lies",
        "welfare": "second best",
    }[relax]


def price(found: Price, setting: Setting) -> str:
    """What a way out costs and what a unit of it buys, in sentences."""
    if found.amount is None:
        text = found.reason or "Does not help alone, however much of it there is."
        return f"{text[0].upper()}{text[1:]}" if found.proved or found.reason else "Not settled."
    sentences = [_needs(found, setting), _buys(found, setting), _idle(found)]
    if not found.proved:
        sentences.append("Unproved.")
    return " ".join(filter(None, sentences))


def _needs(found: Price, setting: Setting) -> str:
    if found.amount is None:
        raise ValueError("no price, no need")
    much = amount(found.amount, setting.money)
    total = ""
    if found.asked and found.becomes is not None and found.relax != "welfare":
        total = f", {amount(found.becomes)} in all"
    kind, _, key = found.relax.partition(":")
    if kind == "outside-money":
        return f"{much}{total}, the same in every case."
    if kind == "outside-money-on-average":
        return f"{much}{total} in expectation, if it may differ from case to case."
    if kind == "shortfall" and key:
        return f"{much} below staying out may be asked of any type of {key}."
    if kind == "shortfall":
        return f"{much} below staying out may be asked of every type of every party."
    if kind == "lies":
        return f"{much}{total} gained by the best lie must be tolerated."
    if kind == "welfare":
        return _second_best(found, setting)
    if kind == "compel":
        return f"Compel {joined(found.parties, 'and')}."
    where = "" if found.becomes is None else f", to {amount(found.becomes, setting.money)}"
    return f"{much}{where}."


def _second_best(found: Price, setting: Setting) -> str:
    if found.amount is None or found.asked is None or found.becomes is None:
        raise ValueError("no second best")
    text = (
        f"{amount(found.amount, setting.money)} of expected welfare is given up: "
        f"{amount(found.becomes)} instead of {amount(found.becomes + found.amount)}."
    )
    count = len(found.changes)
    if not count:
        return text
    cases = "; ".join(
        f"({', '.join(at)}) {', '.join(_chance(*part) for part in lottery)}"
        for at, lottery in found.changes[:CASES]
    )
    more = "" if count <= CASES else f"; and {count - CASES:,} more"
    names = ", ".join(party.name for party in setting.parties)
    return (
        f"{text} The decision differs in {counted(count, 'case')} of {setting.profiles:,}, "
        f"by ({names}): {cases}{more}."
    )


def _chance(option: str, chance: Fraction) -> str:
    return option if chance == 1 else f"{cell(chance)} {option}"


def _buys(found: Price, setting: Setting) -> str:
    """What the last unit of a way out saves of others, with the unit."""
    if not found.buys:
        return ""
    worth = [f"{amount(much, setting.money)} of {CRITERIA[name]}" for name, much in found.buys]
    return f"Nearby, each unit of it saves {joined(worth, 'or')}."


def _idle(found: Price) -> str:
    if not found.idle:
        return ""
    names = joined([CRITERIA[name] for name in found.idle], "or")
    return f"A little {names} would take nothing off it."


def room(found: Room, setting: Setting) -> tuple[str, str]:
    """The room in one direction: a heading and a sentence."""
    kind = found.kind.partition(":")[0]
    heading = {
        "money": "hand back",
        "shortfall": "a higher floor",
        "lies": "a wider margin",
        "limit:pays_at_most": "a lower cap",
        "limit:pays_at_least": "a higher least payment",
        "side:welfare_at_least": "a higher welfare floor",
    }.get(found.kind, "a higher pot floor")
    if found.amount is None:
        endless = found.reason == "unbounded" and found.proved
        return heading, "Without end." if endless else "Not settled."
    much = amount(found.amount, setting.money)
    if not found.amount:
        text = "None: it is as tight as can be."
    elif kind == "money":
        text = f"{much} could be taken out of the pot in every case, and all be kept."
    elif kind == "shortfall":
        text = f"{much} more than staying out could be promised to every type of every party."
    elif kind == "lies":
        text = f"{much} more could every lie be made to cost."
    else:
        where = "" if found.becomes is None else f", to {amount(found.becomes, setting.money)}"
        text = f"{much}{where}."
    return heading, text + ("" if found.proved else " Unproved.")


def steps(forms: Iterable[tuple[str, str]]) -> str:
    """A combination of forms in words."""
    return joined([form(demand, word) for demand, word in forms], "and")
