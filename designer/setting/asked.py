"""What the scenario asks: [limits], [side], [demands] and [goal]."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from fractions import Fraction
from types import MappingProxyType

from designer.setting import exact
from designer.setting.parties import TAKEN, Roster
from designer.setting.reading import Section, describe, listing, unknown_keys
from designer.setting.setting import Chance, Limits, Side
from designer.setting.vocabulary import AMOUNTS, CHOICES, GOALS, SWITCHES

DEMANDS = (*CHOICES, *AMOUNTS, *SWITCHES, "goal")


def read_limits(root: Section) -> Limits:
    """Floor and cap on payments, and the two common clauses."""
    section = root.section("limits")
    if section is None:
        return Limits()
    section.only("pays_at_most", "pays_at_least", "only_when_served", "within_worth")
    limits = Limits(
        section.number("pays_at_most"),
        section.number("pays_at_least"),
        section.flag("only_when_served"),
        section.flag("within_worth"),
    )
    _ordered(limits.pays_at_least, limits.pays_at_most, section, "pays_at_least", "pays_at_most")
    return limits


def read_side(root: Section, roster: Roster, options: Sequence[str]) -> Side:
    """Floors on expected welfare and revenue, and fixed or bounded interim probabilities."""
    section = root.section("side")
    if section is None:
        return Side()
    section.only("welfare_at_least", "revenue_at_least", "chance")
    chances = [_chance(entry, roster, options) for entry in section.sections("chance")]
    return Side(
        section.number("welfare_at_least"),
        section.number("revenue_at_least"),
        tuple(chance for chance in chances if chance is not None),
    )


def _chance(section: Section, roster: Roster, options: Sequence[str]) -> Chance | None:
    section.only("party", "type", "option", "at_least", "at_most", "exactly")
    party = _one_of(section, "party", roster.names, "a party")
    option = _one_of(section, "option", options, "an option")
    position = None
    if "type" not in section:
        section.wrong("type", "a type of the party", "Write type = TYPE.")
    elif party is not None:
        position = roster.position(
            party, section.values["type"], section.at("type"), section.report
        )
    bounds = {key: _probability(section, key) for key in ("at_least", "at_most", "exactly")}
    given = [key for key in bounds if key in section]
    if not given or ("exactly" in given and len(given) > 1):
        section.report.add(
            section.place,
            " and ".join(given) or "no bound",
            "at_least, at_most, or exactly alone",
            'Write exactly = "1/2", or at_least and at_most.',
        )
    low = bounds["at_least"] if "exactly" not in given else bounds["exactly"]
    high = bounds["at_most"] if "exactly" not in given else bounds["exactly"]
    _ordered(low, high, section, "at_least", "at_most")
    if party is None or position is None or option is None:
        return None
    return Chance(party, position, option, low, high)


def _one_of(section: Section, key: str, known: Sequence[str | None], what: str) -> int | None:
    value = section.values.get(key)
    if isinstance(value, str) and value in known:
        return known.index(value)
    names = [name for name in known if name is not None]
    if len(names) == len(known) and names:
        section.wrong(key, listing(names), section.report.near(value, names) or f"Name {what}.")
    return None


def _probability(section: Section, key: str) -> Fraction | None:
    value = section.number(key)
    if value is not None and not 0 <= value <= 1:
        section.wrong(key, "a probability", "Write a number from 0 to 1.")
        return None
    return value


def _ordered(
    low: Fraction | None, high: Fraction | None, section: Section, low_key: str, high_key: str
) -> None:
    if low is not None and high is not None and low > high:
        section.report.add(
            section.at(low_key),
            exact.text(low),
            f"at most {high_key}, which is {exact.text(high)}",
            "Exchange or mend them.",
        )


def read_asked(root: Section, roster: Roster) -> Mapping[str, object]:
    """The scenario's own demands, as plain values: words, Fractions, booleans, names."""
    asked: dict[str, object] = {}
    section = root.section("demands")
    if section is not None:
        section.only(*DEMANDS)
        for key in DEMANDS:
            if key not in section:
                continue
            value: object
            if key in CHOICES:
                value = section.word(key, CHOICES[key], CHOICES[key][0])
            elif key in AMOUNTS:
                value = section.number(key)
            elif key in SWITCHES:
                value = section.flag(key)
            else:
                value = _goals(section)
            asked[key] = value
    blend = _blend(root, roster)
    if blend is not None:
        asked["blend"] = blend
    return MappingProxyType(asked)


def _goals(section: Section) -> tuple[str, ...]:
    raw = section.values["goal"]
    names = [name.strip() for name in raw.split(",")] if isinstance(raw, str) else raw
    if not isinstance(names, list) or not names:
        section.wrong("goal", "a goal, or a list of goals", 'Write goal = "any".')
        return ()
    for index, name in enumerate(names):
        if not isinstance(name, str) or name not in GOALS:
            place = section.at("goal") if isinstance(raw, str) else f"{section.at('goal')}[{index}]"
            remedy = section.report.near(name, GOALS) or "Pick from the list."
            section.report.add(place, describe(name), f"one of {', '.join(GOALS)}", remedy)
        elif name in names[:index]:
            section.report.add(
                section.at("goal"), f"{name!r} twice", "each goal once", "Drop the repeated goal."
            )
    return tuple(name for name in names if isinstance(name, str))


def _blend(root: Section, roster: Roster) -> Mapping[str, Fraction] | None:
    section = root.section("goal")
    if section is None:
        return None
    section.only("blend")
    table = section.section("blend")
    if table is None or not table.values:
        if table is not None or "blend" not in section:
            section.wrong("blend", "weights by name", "Write blend = { worth = 1, pot = -1 }.")
        return None
    if roster.complete:
        known = (*TAKEN, *roster.known_names())
        unknown_keys(table.values, known, table.place, root.report, "name")
    weights = {key: table.number(key) for key in table.values}
    return MappingProxyType(
        {key: weight for key, weight in sorted(weights.items()) if weight is not None}
    )
