"""All minimal sets of demand groups that collide, and all maximal sets that can hold.

The enumeration follows Liffiton, Previti, Malik & Marques-Silva (2016), "Fast, flexible MUS
enumeration", Constraints 21:223-250 (MARCO): take an unexplored set of groups, shrink it to
a minimal collision if it is impossible, grow it to a maximal possible set if not, and mark
everything above the one, below the other, as explored. Shrinking starts from the groups a
certificate blames, growing from the table that was found.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from designer.demands.terms import Terms
from designer.weighing.groups import without
from designer.weighing.oracle import Oracle

Groups = frozenset[str]


@dataclass(frozen=True)
class GroupSet:
    """A minimal collision or a maximal possible set; proved as every verdict is."""

    collides: bool
    groups: tuple[str, ...]
    proved: bool


def explore(oracle: Oracle, terms: Terms, groups: tuple[str, ...]) -> Iterator[GroupSet]:
    """Every minimal collision and every maximal possible set, as they are found."""
    everything = frozenset(groups)
    collisions: list[Groups] = []
    possible: list[Groups] = []

    def holds(kept: Groups) -> bool:
        """Whether the kept groups can hold together, by what is known or by posing it."""
        if any(kept <= known for known in possible):
            return True
        if any(known <= kept for known in collisions):
            return False
        return oracle.ask(without(terms, everything - kept)).possible

    def proved(kept: Groups) -> bool:
        return oracle.ask(without(terms, everything - kept)).proved

    while (seed := _unexplored(groups, collisions, possible)) is not None:
        if holds(seed):
            grown = seed
            for group in groups:
                if group not in grown and holds(grown | {group}):
                    grown = grown | {group}
            possible.append(grown)
            yield GroupSet(False, _ordered(groups, grown), proved(grown))
            continue
        core = seed
        finding = oracle.ask(without(terms, everything - seed))
        blamed = _chances_as_one(finding.blamed, seed)
        if not finding.possible and blamed and blamed < core and not holds(blamed):
            core = blamed
        for group in groups:
            if group in core and not holds(core - {group}):
                core = core - {group}
        collisions.append(core)
        yield GroupSet(True, _ordered(groups, core), proved(core))


def _ordered(groups: tuple[str, ...], kept: Groups) -> tuple[str, ...]:
    return tuple(group for group in groups if group in kept)


def _chances_as_one(blamed: Groups, seed: Groups) -> Groups:
    """Side chances are numbered anew when some are dropped: blame all of them or none."""
    if any(group.startswith("side:chance") for group in blamed):
        blamed = blamed | {group for group in seed if group.startswith("side:chance")}
    return blamed & seed


def _unexplored(
    groups: tuple[str, ...], collisions: list[Groups], possible: list[Groups]
) -> Groups | None:
    """A largest-first set that contains no known collision and lies in no known possible set.

    Each possible set M asks for one group outside M; each collision C for one group of C left
    out. Backtracking over the groups, keeping before leaving out.
    """

    def search(place: int, kept: Groups, left: Groups) -> Groups | None:
        if any(collision <= kept for collision in collisions):
            return None
        if any(not (frozenset(groups) - left - known) for known in possible):
            return None
        if place == len(groups):
            return kept
        group = groups[place]
        found = search(place + 1, kept | {group}, left)
        return found if found is not None else search(place + 1, kept, left | {group})

    return search(0, frozenset(), frozenset())
