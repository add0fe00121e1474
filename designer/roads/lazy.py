"""Lazy lies: the far lies that a plain program can do without until one of them pays.

Where types lie on a line, the lies to a neighbouring type mostly imply all others. With one
or two parties the lies are most of the program, and leaving far ones out pays even off the
line; with more the lies of Bayesian honesty are few beside the profiles, but those of dominant
honesty still are most of it. A row left out wrongly costs a round, never the answer
(`proof/lazily.py`).
"""

from __future__ import annotations

from fractions import Fraction

import numpy as np

from designer.demands.formulate import Formulation
from designer.program.linear import BoolArray
from designer.setting.setting import IntArray, Party

PARTIES = 2
"""Parties up to which leaving lies out pays whatever the types and the honesty."""
LATE_FROM = 1_000
"""Far lies from which leaving them out pays: below, the program takes milliseconds anyway."""


def late_lies(work: Formulation) -> BoolArray | None:
    """The rows of lies that are not told to a neighbour; None where leaving them out is no gain.

    bool per row written so far. Neighbours are by `ranks`.
    """
    setting, terms, draft = work.setting, work.terms, work.draft
    if terms.ic == "none":
        return None
    if len(setting.parties) > PARTIES and (
        terms.ic == "bayesian" or any(line(party) is None for party in setting.parties)
    ):
        return None
    late = np.zeros(sum(block.count for block in draft.row_blocks), dtype=bool)
    blocks = []
    start = 0
    for block in draft.row_blocks:
        if block.family == "honest":
            blocks.append(slice(start, start + block.count))
        start += block.count
    tempted = [
        (index, setting.parties[index])
        for index in draft.judged
        if setting.parties[index].name not in terms.trusted and setting.parties[index].size > 1
    ]
    for (index, party), rows in zip(tempted, blocks, strict=True):
        true, told = draft.lies(index)
        rank = ranks(party)
        far = np.abs(rank[true] - rank[told]) > 1
        if terms.ic == "dominant":
            # one row for each profile of the others at which honesty is asked
            fiber = draft.fiber(index)
            far = np.repeat(far, fiber.shape[1])[draft.in_scope(fiber[true].ravel())]
        late[rows] = far
    return late if int(late.sum()) >= LATE_FROM else None


def ranks(party: Party) -> IntArray:
    """The place of each type in the party's order, int (T,).

    By worth where the types lie on a line, else by number where every type has one, else as
    the scenario lists them.
    """
    at: list[int] | list[Fraction] | None = line(party)
    if at is None:
        numbers = [kind.number for kind in party.types if kind.number is not None]
        at = numbers if len(numbers) == party.size else list(range(party.size))
    place = np.zeros(party.size, dtype=np.int64)
    place[sorted(range(party.size), key=at.__getitem__)] = np.arange(party.size)
    return place


def line(party: Party) -> list[int] | None:
    """Where each type lies if v(k, a) = base(k) + slope(k) * place(a) for all k and a."""
    if party.depends:
        return None
    steps = (party.value - party.value[:1]).astype(object)
    moved = np.argwhere(steps != 0)
    if not len(moved):
        return [0] * party.size
    a, k = moved[0]
    if np.any(steps * steps[a, k] != np.multiply.outer(steps[:, k], steps[a])):
        return None
    return [int(step) for step in steps[:, k]]
