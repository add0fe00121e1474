"""The efficient rule with the most expected pot that participation allows.

Interim payments are the largest that honesty and participation leave (type_graph.py), and
lift.py then makes the pot the same in every case, outlay paid:

    t_i from m_i with target(theta) = outlay(k*(theta)) + sum_j E[m_j] - E[outlay(k*)].

A pot below 0 is what efficiency lacks, at the least, in outside money; one at or above 0 means
that efficiency, honesty, participation and balance go together. On a grid of types the largest
payments exceed the pivotal ones, which are greatest only for types on a continuum. Parties that
the scenario compels are treated as free to stay out.

Sources: V. Krishna and M. Perry (1998), Efficient mechanism design; S. R. Williams (1999), A
characterization of efficient, Bayesian incentive compatible mechanisms, Economic Theory
14:155-180 (both from memory); the form for finitely many types is the shortest-path one.

Ties move the pot. Where worths are one-way (one_way.py) the efficient decision with the largest
virtual worth is taken, which no other choice among ties beats; elsewhere the first in the order
of the options.
"""

from __future__ import annotations

import numpy as np

from designer.ruling import checks, one_way
from designer.ruling.amounts import Amounts, stacked, total
from designer.ruling.kinds import Built, Refusal, Rule
from designer.ruling.lift import balanced
from designer.ruling.profiles import (
    TIES,
    by_profile,
    certain,
    chosen,
    efficient,
    expected,
    outlay,
    total_worth,
)
from designer.ruling.type_graph import largest_payments
from designer.setting.exact import text
from designer.setting.setting import IntArray, Setting
from designer.table import Table

POT_TIES = "Of equally efficient decisions the one best for the pot is taken."


def greatest(setting: Setting, decides: IntArray) -> list[Amounts]:
    """Find the largest interim payments of an efficient rule: (T_i,) each."""
    found = []
    for i in range(len(setting.parties)):
        payments = largest_payments(setting, i, decides, 1)
        if payments is None:
            raise AssertionError("an efficient rule with private worths can be made honest")
        found.append(payments)
    return found


def decision(setting: Setting) -> tuple[IntArray, str]:
    """Choose among the efficient decisions: (N,), and how ties were broken."""
    lines = one_way.lines(setting)
    if isinstance(lines, Refusal):
        return efficient(setting), TIES
    worths = total_worth(setting)
    best = worths.num == worths.num.max(axis=1, keepdims=True)
    parts = [one_way.scores(setting, i, line, line.virtual) for i, line in enumerate(lines)]
    pots = total(parts) - outlay(setting)
    floor = int(pots.num.min()) - 1
    return np.where(best, pots.num, floor).argmax(axis=1), POT_TIES


def build(setting: Setting) -> Built:
    """Build the efficient rule, the pot the same in every case."""
    choice, ties = decision(setting)
    decides = certain(setting, choice)
    cost = chosen(outlay(setting), choice)
    interim = greatest(setting, decides)
    flat = [by_profile(setting, i, part) for i, part in enumerate(interim)]
    pot = expected(setting, total(flat) - cost)
    notes = [ties, f"The pot is {text(pot)} in every case."]
    if len(setting.parties) == 1:
        notes[1] = f"The pot is {text(pot)} on average; one party's payments cannot even it out."
        return Built(Table(decides, 1, *stacked(flat)), tuple(notes))
    pays = balanced(setting, interim, cost + Amounts.of([pot]))
    return Built(Table(decides, 1, *stacked(pays)), tuple(notes))


RULE = Rule(
    name="revenue-greatest-efficient",
    source="Krishna and Perry 1998, Williams 1999",
    assumes="private worths, independent types; everyone may stay out",
    checks=(checks.tabulated, checks.private, checks.independent_types),
    build=build,
)
