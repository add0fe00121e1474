"""Pots that are asked case by case while lotteries at ties are open.

What every party can be made to pay at one profile is at most the length of any path of lies
that ends at a room; that these lengths cover the outlay is a row in the chances at ties alone.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from designer.program.affine import Affine
from designer.program.labels import Covered
from designer.roads.typegraph.bases import Base
from designer.roads.typegraph.fibers import Fibers
from designer.roads.typegraph.paths import trail
from designer.setting.profiles import strides
from designer.setting.setting import IntArray

if TYPE_CHECKING:
    from designer.roads.typegraph.lotteries import LotteryDraft


@dataclass(frozen=True)
class Pot:
    """A profile, and per party the types of its path, from its own to one that keeps its room."""

    profile: int
    trails: tuple[tuple[int, ...], ...]


def pot_at(works: Sequence[Fibers], bases: Sequence[Base], profile: int) -> Pot:
    """The shortest paths behind the pot of one profile."""
    trails = []
    for work, found in zip(works, bases, strict=True):
        if found.tree is None:
            raise AssertionError("participation in every case gives each type its own room")
        step, size = strides(work.setting.shape)[work.party], work.types
        other = profile // (step * size) * step + profile % step
        trails.append(tuple(trail(found.tree[work.of[other]], profile // step % size)))
    return Pot(profile, tuple(trails))


def pot_fault(work: Fibers, pots: Sequence[Pot]) -> str | None:
    """Why some paths of a party do not bound what it pays where pots are listed, or None."""
    setting = work.setting
    name = setting.parties[work.party].name
    step, size = strides(setting.shape)[work.party], work.types
    weights = setting.joint if setting.support_only else None
    for pot in pots:
        own, path = pot.profile // step % size, pot.trails[work.party]
        if path[0] != own or len(set(path)) != len(path):
            return f"a path of {name} into a pot does not begin at its own type"
        if name in work.terms.trusted and len(path) > 1:
            return f"{name} is trusted and tells no lies"
        at = [pot.profile + (a - own) * step for a in path]
        if weights is not None and any(not weights[p] for p in at):
            return f"a path of {name} passes where nothing is asked"
    return None


def pot_rows(draft: LotteryDraft, pots: Sequence[Pot]) -> None:
    """sum_i length of path - outlay + subsidy >= 0 at every listed profile."""
    if not pots:
        return
    opened, setting, terms = draft.opened, draft.setting, draft.opened.terms
    den = opened.works[0].den
    const = np.zeros(len(pots), dtype=object)
    rows: list[int] = []
    told: list[int] = []
    worths: list[IntArray] = []
    outlay = setting.outlay.astype(object)
    for j, pot in enumerate(pots):
        rows.append(j)
        told.append(pot.profile)
        worths.append(-outlay)
        for i, path in enumerate(pot.trails):
            party, step = setting.parties[i], strides(setting.shape)[i]
            own = path[0]
            at = [pot.profile + (a - own) * step for a in path]
            for n, a in enumerate(path):
                value = party.value[a].astype(object)
                rows.append(j)
                told.append(at[n])
                worths.append(value)
                if n + 1 < len(path):
                    rows.append(j)
                    told.append(at[n + 1])
                    worths.append(-value)
            last = at[-1] if party.outside_depends else path[-1]
            const[j] += int(terms.slack * den) * (len(path) - 1) + int(terms.shortfall * den)
            const[j] -= int(party.outside[last]) * (den // setting.grain)
    _require(draft, pots, (np.array(rows), np.array(told), np.array(worths, dtype=object)), const)


def _require(
    draft: LotteryDraft,
    pots: Sequence[Pot],
    terms: tuple[IntArray, IntArray, IntArray],
    const: IntArray,
) -> None:
    """The rows, from worths of what is decided at profiles."""
    opened, setting = draft.opened, draft.setting
    decided, den = opened.decided, opened.works[0].den
    rows, told, worths = terms
    place = np.searchsorted(decided.tied, told)
    place[place == len(decided.tied)] = 0
    tied = decided.tied[place] == told
    scale = den // setting.grain
    taken = np.where(tied, 0, decided.at[told]).astype(np.int64)
    settled = np.where(tied, 0, worths[np.arange(len(rows)), taken]) * scale
    np.add.at(const, rows, settled)
    column = np.where(tied[:, None], opened.column[place], -1)
    line, option = np.nonzero((column >= 0) & (worths != 0))
    form = Affine(
        rows[line].astype(np.int64),
        draft.chances_at[column[line, option]],
        worths[line, option] * scale,
        const,
        np.full(len(pots), den, dtype=object),
    )
    draft.require(
        form.plus(opened.terms.subsidy),
        ">=",
        "pots",
        lambda j: Covered(setting.labels_at(pots[j].profile)),
    )
