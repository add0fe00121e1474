"""What the tests of the rules share: build a rule, audit it, and settings of known shape."""

from __future__ import annotations

import itertools
from fractions import Fraction

import numpy as np

from designer import Audit, Table, audit
from designer.ruling.registry import RULES
from designer.setting.setting import Setting
from tests.published.corpus import as_setting
from tests.published.families import Data, agent, even


def table_of(name: str, setting: Setting) -> Table:
    """The table of a rule that must apply."""
    rule = RULES[name]
    refusal = rule.applies(setting)
    assert refusal is None, str(refusal)
    return rule.build(setting).table


def audit_of(name: str, setting: Setting) -> Audit:
    """The audit of a rule that must apply."""
    return audit(setting, table_of(name, setting))


def expect(setting: Setting, by_profile: list[Fraction]) -> Fraction:
    """E of an amount per profile, by plain summation."""
    return sum(
        (setting.probability(p) * amount for p, amount in enumerate(by_profile)), Fraction(0)
    )


def gathered(bidders: int, grid: list[Fraction]) -> Data:
    """One seller and n buyers, all on one grid; option 0 leaves the unit with the seller.

    The seller's worth is minus her cost where she sells.
    """
    buyers = [
        agent(grid, [int(k == i + 1) for k in range(bidders + 1)], even(len(grid)))
        for i in range(bidders)
    ]
    seller = agent(grid, [0, *([-1] * bidders)], even(len(grid)))
    return {
        "agents": [*buyers, seller],
        "decisions": ["keep", *(f"sell to {i + 1}" for i in range(bidders))],
    }


def market(grid: list[Fraction]) -> Data:
    """Two buyers and two sellers of one unit each: who buys and who sells."""
    deals: list[tuple[set[int], set[int]]] = [(set(), set())]
    deals += [({i}, {j}) for i in range(2) for j in range(2)]
    deals.append(({0, 1}, {0, 1}))
    buyers = [agent(grid, [int(i in b) for b, _ in deals], even(len(grid))) for i in range(2)]
    sellers = [agent(grid, [-int(j in s) for _, s in deals], even(len(grid))) for j in range(2)]
    return {"agents": [*buyers, *sellers], "decisions": [str(k) for k in range(len(deals))]}


def identical_units(count: int, units: int, grid: list[Fraction]) -> Data:
    """So many bidders, each wanting one of so many units; every unit is sold."""
    sets = list(itertools.combinations(range(count), units))
    return {
        "agents": [
            agent(grid, [int(i in group) for group in sets], even(len(grid))) for i in range(count)
        ],
        "decisions": [" ".join(map(str, group)) for group in sets],
    }


def joint_project(count: int, cost: Fraction) -> str:
    """A project worth 0 or 1 to each of so many parties, even odds, as a scenario."""
    party = 'types = [0, 1]\nweights = [1, 1]\nvalue = { build = "type", leave = 0 }\n'
    return (
        'title = "A joint project"\n[decisions]\noptions = ["leave", "build"]\n'
        f'[designer]\noutlay = {{ build = "{cost}" }}\n'
        + "".join(f'[[party]]\nname = "Town {i}"\n{party}' for i in range(count))
    )


def with_rule(setting: Setting, table: Table) -> Setting:
    """The setting with a table's decisions as its given rule."""
    from dataclasses import replace

    return replace(setting, rule=np.asarray(table.decides), rule_den=table.decides_den)


__all__ = [
    "as_setting",
    "audit_of",
    "expect",
    "gathered",
    "identical_units",
    "joint_project",
    "market",
    "table_of",
    "with_rule",
]
