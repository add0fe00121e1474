"""The published corpus: entries and instances read from our files, and made into settings.

`entries/ID.json` holds what one source claims, with the demands that put the claim to the
test and the exact answer; `instances.json` holds the data those demands are posed on. All
numbers are exact text. Parties carry `types`, `values[type][option]`, an optional
`reservation` per type (0 where absent) and an optional `prior` of their own; without it the
instance carries `joint`, one probability per profile, last party fastest.
"""

from __future__ import annotations

import hashlib
import itertools
import json
import math
from dataclasses import dataclass
from fractions import Fraction
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np

from designer.demands.terms import Demands
from designer.setting.setting import Party, Setting, Side, Type, integers

FOLDER = Path(__file__).parent
PARTIES = ("Aster", "Briar", "Clover", "Dock", "Elder", "Fern", "Gorse", "Heath")
"""Names for the first parties of an instance, which the sources only number."""


@dataclass(frozen=True)
class Query:
    """One posed question of an entry and its exact answer; `value` is None without a goal."""

    entry: str
    tag: str
    instance: str
    demands: Demands
    verdict: str
    value: Fraction | None

    @property
    def name(self) -> str:
        """A readable test id."""
        asked = self.demands
        words = (asked.decision, asked.ic, asked.ir, asked.balance, asked.budget, asked.goal)
        return "-".join([self.entry, self.tag, *(str(word) for word in words)])


@cache
def entries() -> dict[str, dict[str, Any]]:
    """Every entry by its id."""
    files = sorted((FOLDER / "entries").glob("*.json"))
    return {path.stem: json.loads(path.read_text(encoding="utf-8")) for path in files}


@cache
def instances() -> dict[str, dict[str, Any]]:
    """Every instance by its name."""
    found: dict[str, dict[str, Any]] = json.loads(
        (FOLDER / "instances.json").read_text(encoding="utf-8")
    )
    return found


def queries() -> list[Query]:
    """Every query of every entry, in file order."""
    return [
        Query(
            entry=name,
            tag=query["tag"],
            instance=query["instance"],
            demands=Demands(**query["demands"]),
            verdict=query["verdict"],
            value=Fraction(query["value"]) if "value" in query else None,
        )
        for name, entry in entries().items()
        for query in entry["queries"]
    ]


def denominator(numbers: list[Fraction]) -> int:
    """The least common denominator of exact numbers."""
    return math.lcm(1, *(number.denominator for number in numbers))


def scaled(numbers: list[Fraction], grain: int) -> list[int]:
    """The numbers in units of 1/grain, which must be whole."""
    whole = [number * grain for number in numbers]
    if any(number.denominator != 1 for number in whole):
        raise ValueError(f"1/{grain} is not a common unit")
    return [int(number) for number in whole]


def as_weights(chances: list[Fraction]) -> list[int]:
    """Integer weights in the proportions of the chances, lowest terms."""
    weights = scaled(chances, denominator(chances))
    common = math.gcd(*weights)
    return [weight // common for weight in weights]


def as_type(label: str) -> Type:
    """A type with its number, if its label is one."""
    try:
        return Type(label, Fraction(label))
    except ValueError:
        return Type(label)


def as_setting(data: dict[str, Any], title: str = "", side: Side | None = None) -> Setting:
    """The setting an instance states; money over the common denominator of all its amounts."""
    options = tuple(data["decisions"])
    agents = data["agents"]
    values = [[[Fraction(v) for v in row] for row in agent["values"]] for agent in agents]
    outside = [
        [Fraction(v) for v in agent.get("reservation", ["0"] * len(agent["types"]))]
        for agent in agents
    ]
    outlay = [Fraction(cost) for cost in data.get("decision_cost", ["0"] * len(options))]
    amounts = [v for table in values for row in table for v in row]
    grain = denominator(amounts + [v for row in outside for v in row] + outlay)
    shape = [len(agent["types"]) for agent in agents]
    joint = [Fraction(chance) for chance in data["joint"]] if "joint" in data else None
    priors = [
        [Fraction(chance) for chance in agent["prior"]]
        if joint is None
        else marginal(joint, shape, i)
        for i, agent in enumerate(agents)
    ]
    parties = tuple(
        Party(
            name=PARTIES[i] if i < len(PARTIES) else f"Party {i + 1}",
            types=tuple(as_type(label) for label in agent["types"]),
            weights=tuple(as_weights(priors[i])),
            value=integers([scaled(row, grain) for row in values[i]], (shape[i], len(options))),
            outside=integers(scaled(outside[i], grain)),
        )
        for i, agent in enumerate(agents)
    )
    rule, rule_den = given_rule(data, len(options)) if "given_rule" in data else (None, 1)
    text = json.dumps(data, sort_keys=True)
    return Setting(
        title=title,
        options=options,
        parties=parties,
        outlay=integers(scaled(outlay, grain)),
        worth=integers([0] * len(options)),
        grain=grain,
        joint=None if joint is None else integers(as_weights(joint)),
        rule=rule,
        rule_den=rule_den,
        side=side or Side(),
        digest=hashlib.sha256(text.encode()).hexdigest(),
    )


def marginal(joint: list[Fraction], shape: list[int], party: int) -> list[Fraction]:
    """P(theta_party = a) for each type a, from one probability per profile."""
    chances = [Fraction(0)] * shape[party]
    profiles = itertools.product(*(range(size) for size in shape))
    for chance, profile in zip(joint, profiles, strict=True):
        chances[profile[party]] += chance
    return chances


def given_rule(data: dict[str, Any], count: int) -> tuple[np.ndarray[Any, Any], int]:
    """A given rule (per profile an option's position, or a lottery) and its denominator."""
    rows = [
        {int(k): Fraction(p) for k, p in entry.items()}
        if isinstance(entry, dict)
        else {int(entry): Fraction(1)}
        for entry in data["given_rule"]
    ]
    den = denominator([p for row in rows for p in row.values()])
    table = [scaled([row.get(k, Fraction(0)) for k in range(count)], den) for row in rows]
    return integers(table, (len(rows), count)), den


@cache
def setting_of(instance: str) -> Setting:
    """The setting of a stored instance, by name."""
    return as_setting(instances()[instance], instance)
