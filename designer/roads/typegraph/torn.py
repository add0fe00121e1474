"""The graphs that ties touch, each of the others' profiles apart, and sums along trees there.

Where the chances of the options at tied profiles are unknown, the length of a tree is linear
in them: every edge and every room is a worth of a lottery. So a tree is one linear bound on
what the party pays over its own types, the others' reports given.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from designer.roads.typegraph.bases import OWN, Root
from designer.roads.typegraph.decided import Decided, Indices, Mask
from designer.roads.typegraph.fibers import Fibers, Lengths, others_weights
from designer.roads.typegraph.paths import along, carried, shorten
from designer.setting.profiles import strides
from designer.setting.setting import IntArray

SAFE = 2**61


@dataclass(frozen=True, eq=False)
class Torn:
    """A party's graphs by what ties do to them.

    work    its classes under the options first listed where tied
    even    int (E,): the classes that no tie touches
    others  int (R,): the others' profiles that a tie touches and that have some weight
    place   int (R, T): the tied profile that each report leads to, -1 for none
    masses  int (R,): what the sinks of each are to be multiplied by
    """

    work: Fibers
    even: Indices
    others: Indices
    place: Indices
    masses: IntArray

    def alone(self, decided: Decided) -> Fibers:
        """These of the others' profiles, each a class of its own, under a rule."""
        work = self.work
        at = places(work, self.others)
        return Fibers(
            work.setting,
            work.terms,
            decided,
            work.party,
            decided.at[at],
            np.arange(len(at), dtype=np.int64),
            self.masses,
            False,
            self.others,
        )

    def sinks(self) -> IntArray:
        """The weight of each type, int (R, T), where `masses` are left out."""
        work = self.work
        if work.setting.joint is not None:
            found: IntArray = work.setting.joint[places(work, self.others)]
            return found
        return np.tile(work.own, (len(self.others), 1))


def torn(work: Fibers) -> Torn:
    """A party's graphs, told apart by whether a tie touches them."""
    decided = work.decided
    options = len(work.setting.options)
    ties: Mask = np.asarray(work.rows >= options, dtype=bool)
    touched: Mask = np.asarray(ties.any(axis=1), dtype=bool)
    others = np.flatnonzero(touched[work.of])
    at = places(work, others)
    if work.setting.joint is not None:
        inside: Mask = (work.setting.joint[at] != 0).astype(bool)
        weighty = np.flatnonzero(inside.any(axis=1))
        others, at = others[weighty], at[weighty]
        masses: IntArray = np.ones(len(others), dtype=np.int64)
    else:
        masses = others_weights(work.setting, work.party)[others]
    place = np.searchsorted(decided.tied, at).astype(np.int64)
    place[place == len(decided.tied)] = 0
    place[decided.tied[place] != at] = -1
    return Torn(work, np.flatnonzero(~touched), others, place, masses)


def spelled(found: Torn) -> Torn:
    """Every graph once: the classes that no tie touches, each by its first, then the torn ones.

    Independent types only: every profile has weight.
    """
    work = found.work
    first = np.unique(work.of, return_index=True)[1][found.even]
    none = np.full((len(first), work.types), -1, dtype=np.int64)
    return Torn(
        work,
        found.even[:0],
        np.concatenate([first, found.others]).astype(np.int64),
        np.concatenate([none, found.place]),
        np.concatenate([work.mass[found.even], found.masses]),
    )


def places(work: Fibers, others: IntArray) -> Indices:
    """The profile that each report leads to at listed others' profiles, int (R, T)."""
    step, size = strides(work.setting.shape)[work.party], work.types
    first = others // step * (step * size) + others % step
    found: Indices = first[:, None] + step * np.arange(size, dtype=np.int64)[None, :]
    return found


def starts(work: Fibers, lengths: Lengths, root: Root) -> IntArray:
    """Where paths begin: at the room of every type, or of one type alone."""
    if root == OWN:
        begin = lengths.room.copy()
    else:
        begin = np.full(lengths.room.shape, work.far, dtype=work.dtype)
        begin[:, int(root)] = lengths.room[:, int(root)]
    if lengths.scope is not None:
        begin[~lengths.scope] = work.far
    return begin


def shortest(work: Fibers, root: Root) -> tuple[IntArray, Indices]:
    """Distances from rooms and their trees, (G, T) each. Raises ValueError at a circle."""
    dist = np.zeros((work.classes, work.types), dtype=work.dtype)
    tree = np.zeros((work.classes, work.types), dtype=np.int64)
    for start, lengths in work.blocks():
        stop = start + len(lengths.room)
        dist[start:stop], tree[start:stop], bad = shorten(lengths.cost, starts(work, lengths, root))
        if bad.any():
            raise ValueError("some lies go round in a circle that no payments deter")
    return dist, tree


def fault(work: Fibers, trees: IntArray, root: Root, scope: Mask | None) -> str | None:
    """Why some trees do not bound what the party pays, or None; scope like trees."""
    size = np.arange(work.types)[None, :]
    name = work.setting.parties[work.party].name
    jump = trees
    for _ in range(work.types.bit_length()):
        jump = np.take_along_axis(jump, jump, axis=1)
    if (np.take_along_axis(trees, jump, axis=1) != jump).any():
        return f"the paths of {name} go round in circles"
    if name in work.terms.trusted and (trees != size).any():
        return f"{name} is trusted and tells no lies"
    at_root = trees == size
    if root != OWN and ((at_root.sum(axis=1) != 1).any() or not at_root[:, int(root)].all()):
        return f"the paths of {name} do not all start at one type"
    if scope is not None and (scope & ~np.take_along_axis(scope, trees, axis=1)).any():
        return f"a path of {name} passes where nothing is asked"
    return None


def scope_at(work: Fibers, others: IntArray) -> Mask | None:
    """Where honesty is asked at listed others' profiles, (R, T); None: everywhere."""
    setting = work.setting
    if not setting.support_only or setting.joint is None:
        return None
    inside: Mask = (setting.joint[places(work, others)] != 0).astype(bool)
    return inside


def even_sum(found: Torn, trees: IntArray) -> int:
    """Sum of weight * length of path over the classes without ties, in units of 1 / den.

    trees  int (E, T); their paths end where the party keeps its room
    """
    work = found.work
    whole = np.tile(np.arange(work.types, dtype=np.int64), (work.classes, 1))
    whole[found.even] = trees
    counted = np.zeros(work.classes, dtype=bool)
    counted[found.even] = True
    total = 0
    for start, lengths in work.blocks():
        stop = start + len(lengths.room)
        here = counted[start:stop]
        if not here.any():
            continue
        dist, _ = along(lengths.cost, whole[start:stop], lengths.room)
        sinks = lengths.sinks[here]
        # Paths end in scope where anything is weighed; elsewhere sinks are 0.
        total += work.sum(sinks, np.where(sinks != 0, dist[here], 0))
    return total


def even_scope(found: Torn) -> Mask | None:
    """Where honesty is asked in the classes without ties, (E, T); None: everywhere."""
    # With joint priors classes are the others' profiles themselves.
    return scope_at(found.work, found.even)


def sums(found: Torn, graph: IntArray, trees: IntArray) -> tuple[IntArray, IntArray]:
    """What trees say, as forms in the chances of the options: int (C, T, K) and (C,).

    graph  int (C,): which of the others' profiles      trees  int (C, T)

    Sum over types of sink * length of path = sum_a,k coef[a, k] x_k(a, others) + const at the
    reports a that lead to ties; the other reports are in the constant. Units of 1 / den.
    """
    work = found.work
    setting, terms = work.setting, work.terms
    party = setting.parties[work.party]
    if party.depends:
        raise ValueError("a worth that depends on the others' types has no value by type")
    sinks = found.sinks()[graph]
    weight = max(1, int(sinks.sum(axis=1).max(initial=0)))
    dtype = np.int64 if work.reach * weight * 4 < SAFE else object
    sinks = sinks.astype(dtype)
    scale = work.den // setting.grain
    value = party.value.astype(dtype) * scale
    carry = carried(trees, sinks)
    coef: IntArray = carry[:, :, None] * value[None]
    row = np.arange(len(trees))
    size = np.arange(work.types)[None, :]
    for a in range(work.types):
        lying = np.flatnonzero(trees[:, a] != a)
        coef[row[lying], trees[lying, a]] -= carry[lying, a][:, None] * value[a][None, :]
    roots = trees == size
    allowed = int(terms.shortfall * work.den)
    outside = party.outside.astype(dtype) * scale
    if party.outside_depends:
        outside = outside[places(work, found.others[graph])]
    else:
        outside = np.broadcast_to(outside, trees.shape)
    const = (np.where(roots, carry, 0) * (allowed - outside)).sum(axis=1)
    const = const + np.where(roots, 0, carry).sum(axis=1) * int(terms.slack * work.den)
    settled = found.place[graph] < 0
    taken = work.decided.at[places(work, found.others[graph])]
    fixed = np.take_along_axis(
        coef, np.where(settled, taken, 0).astype(np.int64)[:, :, None], axis=2
    )[:, :, 0]
    const = const + np.where(settled, fixed, 0).sum(axis=1)
    coef[settled] = 0
    return coef, const
