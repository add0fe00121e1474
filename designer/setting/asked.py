"""What the scenario asks: [limits], [side], [demands] and [goal]."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from fractions import Fraction
from types import MappingProxyType

from designer.setting import exact
from designer.setting.options import Options, named
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


def read_side(root: Section, roster: Roster, options: Options) -> Side:
    """Floors on expected welfare and revenue, and fixed or bounded interim probabilities."""
    section = root.section("side")
    if section is None:
        return Side()
    section.only("welfare_at_least", "revenue_at_least", "chance")
    chances = [
        chance
        for entry in section.sections("chance")
        for chance in _chances(entry, roster, options)
    ]
    return Side(
        section.number("welfare_at_least"), section.number("revenue_at_least"), tuple(chances)
    )


def _chances(section: Section, roster: Roster, options: Options) -> list[Chance]:
    """What one entry demands: of a party, or of every member of a group."""
    section.only("party", "type", "option", "at_least", "at_most", "exactly")
    parties = _parties(section, roster)
    chosen = _options(section, roster, parties, options)
    position = None
    if "type" not in section:
        section.wrong("type", "a type of the party", "Write type = TYPE.")
    elif parties:
        position = roster.position(
            parties[0], section.values["type"], section.at("type"), section.report
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
    if position is None:
        return []
    pairs = zip(parties, chosen, strict=False)  # no option, where it is mistaken
    return [Chance(party, position, option, low, high) for party, option in pairs]


def _parties(section: Section, roster: Roster) -> tuple[int, ...]:
    """The party or the group that an entry names; none where it is mistaken."""
    value = section.values.get("party")
    parties = roster.called(value) if isinstance(value, str) else ()
    if not parties and None not in roster.names and roster.names:
        names = [*roster.known_names(), *roster.groups]
        remedy = section.report.near(value, names) or "Name a party."
        section.wrong("party", listing(roster.known_names()), remedy)
    return parties


def _options(
    section: Section, roster: Roster, parties: Sequence[int], options: Options
) -> list[int]:
    """The option of each party; {name} in it is the party's own name."""
    value = section.values.get("option")
    found = []
    known = isinstance(value, str) and value in options.names
    own = [roster.names[party] if party in roster.group_of else None for party in parties]
    for name in own or [None]:
        option = named(value, name) if isinstance(value, str) and name and not known else value
        if not isinstance(option, str) or option not in options.names:
            if options.names:
                remedy = section.report.near(value, options.names) or "Name an option."
                section.wrong("option", listing(options.names), remedy)
            return []
        found.append(options.names.index(option))
    return found


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
        known = (*TAKEN, *roster.known_names(), *roster.groups)
        unknown_keys(table.values, known, table.place, root.report, "name")
    weights: dict[str, Fraction | None] = {}
    for key in sorted(table.values, key=lambda key: key not in roster.groups):
        members = [str(roster.names[i]) for i in roster.groups.get(key, ())] or [key]
        weights |= dict.fromkeys(members, table.number(key))  # a member's own goes before
    return MappingProxyType(
        {key: weight for key, weight in sorted(weights.items()) if weight is not None}
    )
