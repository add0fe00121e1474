"""The demands as plain sentences."""

from __future__ import annotations

from fractions import Fraction

from designer.demands.registry import GOALS
from designer.demands.terms import Terms
from designer.setting.setting import Chance, Setting
from designer.views.amounts import amount


def sentences(terms: Terms, setting: Setting) -> list[tuple[str, str]]:
    """What is asked: pairs of a short heading and a sentence, goals last."""
    asked = [
        ("decision", _decision(terms)),
        ("honesty", _honesty(terms, setting)),
        ("taking part", _participation(terms, setting)),
        ("pot", _pot(terms, setting)),
    ]
    asked += [("limit", text) for text in _limits(terms, setting)]
    asked += [("also", text) for text in _side(terms, setting)]
    if terms.even_handed:
        asked.append(("also", "Parties with equal data are treated alike."))
    if setting.support_only and setting.joint is not None:
        asked.append(("cases", "What holds in every case need hold only in cases that can occur."))
    asked.append(("goal", _goals(terms)))
    return asked


def _decision(terms: Terms) -> str:
    return {
        "efficient": "In every case the decision that is worth most, net of the outlay.",
        "table": "In every case what the scenario's own rule decides.",
        "randomized": "Free: a decision or a lottery over decisions, case by case.",
        "deterministic": "Free: one sure decision, case by case.",
    }[terms.decision]


def _honesty(terms: Terms, setting: Setting) -> str:
    if terms.ic == "none":
        return "Not asked."
    gains = "gains" if not terms.slack else f"gains more than {amount(terms.slack, setting.money)}"
    if terms.ic == "bayesian":
        text = f"On average over the others, no type of any party {gains} by a lie."
    elif setting.interdependent:
        text = f"Whatever the types, if the others are honest no party {gains} by a lie."
    else:
        text = f"Whatever the others report, no party {gains} by a lie."
    return text + _excused(terms.trusted, "is trusted", "are trusted")


def _participation(terms: Terms, setting: Setting) -> str:
    if terms.ir == "none":
        return "Not asked: every party is in."
    short = f" by more than {amount(terms.shortfall, setting.money)}" if terms.shortfall else ""
    text = {
        "ex-ante": f"Not yet knowing its type, no party expects to lose{short} by taking part.",
        "interim": f"Knowing its type, no party expects to lose{short} by taking part.",
        "ex-post": f"When all is known, no party has lost{short} by taking part.",
    }[terms.ir]
    return text + _excused(terms.compelled, "is compelled", "are compelled")


def _excused(names: frozenset[str], one: str, several: str) -> str:
    return f" ({', '.join(sorted(names))} {one if len(names) == 1 else several}.)" if names else ""


def _pot(terms: Terms, setting: Setting) -> str:
    if terms.balance == "none":
        return "Not asked: it may be anything."
    when = {"ex-post": "In every case", "ex-ante": "On average"}[terms.balance]
    how = {"exact": "come to exactly", "no-deficit": "come to at least"}[terms.budget]
    return f"{when} the payments {how} the outlay{_outside_money(terms, setting)}."


def _outside_money(terms: Terms, setting: Setting) -> str:
    if "outside-money" in terms.goals:
        return " less the outside money"
    if terms.subsidy > 0:
        return f" less {amount(terms.subsidy, setting.money)} of outside money"
    if terms.subsidy < 0:
        return f" and {amount(-terms.subsidy, setting.money)} to hand out"
    return ""


def _limits(terms: Terms, setting: Setting) -> list[str]:
    limits, found = terms.limits, []
    if limits.pays_at_most is not None:
        found.append(f"No payment is above {amount(limits.pays_at_most, setting.money)}.")
    if limits.pays_at_least is not None:
        found.append(f"No payment is below {amount(limits.pays_at_least, setting.money)}.")
    if limits.only_when_served:
        found.append("A party pays only when the decision is worth something to it.")
    if limits.within_worth:
        found.append("No party pays more than the decision is worth to it.")
    return found


def _side(terms: Terms, setting: Setting) -> list[str]:
    side, found = terms.side, []
    if side.welfare_at_least is not None:
        welfare = amount(side.welfare_at_least, setting.money)
        found.append(f"Expected welfare is at least {welfare}.")
    if side.revenue_at_least is not None:
        pot = amount(side.revenue_at_least, setting.money)
        found.append(f"The expected pot is at least {pot}.")
    return found + [_chance(chance, setting) for chance in side.chances]


def _chance(chance: Chance, setting: Setting) -> str:
    party, option = setting.parties[chance.party], setting.options[chance.option]
    when = f"{party.name} is {party.types[chance.type].label}"
    return f"When {when}, the chance of {option} is {_between(chance.at_least, chance.at_most)}."


def _between(low: Fraction | None, high: Fraction | None) -> str:
    if low is not None and low == high:
        return f"exactly {amount(low)}"
    parts = [f"at least {amount(low)}"] if low is not None else []
    parts += [f"at most {amount(high)}"] if high is not None else []
    return " and ".join(parts)


def _goals(terms: Terms) -> str:
    if terms.goals == ("any",):
        return "None: any table that does this will do."
    reads = "; then ".join(_reads(name) for name in terms.goals)
    return f"{reads[0].upper()}{reads[1:]}."


def _reads(name: str) -> str:
    return "nothing more" if name == "any" else f"the {GOALS[name].reads}"
