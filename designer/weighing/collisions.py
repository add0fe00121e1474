"""All minimal sets of demand groups that collide, and all maximal sets that can hold.

The enumeration follows Liffiton, Previti, Malik & Marques-Silva (2016), "Fast, flexible MUS
enumeration", Constraints 21:223-250 (MARCO, in its form that looks for collisions first): take
a largest set not yet explored; if it is impossible, shrink it to a minimal collision; if it is
possible, nothing larger is. What is unexplored is read off the minimal transversals of the
collisions known so far (hitting sets: Reiter 1987, Artificial Intelligence 32:57-95; Bailey &
Stuckey 2005, PADL, LNCS 3350:174-186), kept up to date collision by collision (Berge 1989,
Hypergraphs, section 2.1): the complement of each is a largest set that contains no known
collision, so that it is maximal as soon as it is possible. Shrinking starts from the groups
that a certificate blames.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from designer.weighing.mix import Groups, Mix, Unsettled

MOST = 5_000
"""Transversals kept at once before giving up: beyond, there is too much to read as well."""


@dataclass(frozen=True)
class GroupSet:
    """A minimal collision or a maximal possible set; proved as every verdict is."""

    collides: bool
    groups: tuple[str, ...]
    proved: bool


def explore(mix: Mix) -> Iterator[GroupSet]:
    """Every minimal collision and every maximal possible set, as they are found.

    Raises Unsettled where a verdict cannot be had or the sets are too many to list.
    """
    everything = frozenset(mix.groups)
    transversals: list[Groups] = [frozenset()]
    done: set[Groups] = set()
    while waiting := [left for left in transversals if left not in done]:
        left = waiting[0]
        seed = everything - left
        found = mix.ask(seed)
        if found in mix.possible:
            done.add(left)
            yield _listed(mix, False, seed, found.proved)
            continue
        core, proved = _shrunk(mix, found.groups & seed, found.proved)
        yield _listed(mix, True, core, proved)
        transversals = _hit(transversals, core)
        if len(transversals) > MOST:
            raise Unsettled(f"there are more than {MOST:,} ways to give way: not all are listed")


def _shrunk(mix: Mix, core: Groups, proved: bool) -> tuple[Groups, bool]:
    """A minimal collision inside one."""
    for group in mix.groups:
        if group not in core:
            continue
        found = mix.ask(core - {group})
        if found in mix.collisions:
            core = found.groups & core
        proved = proved and found.proved
    return core, proved


def _hit(transversals: list[Groups], core: Groups) -> list[Groups]:
    """The minimal sets that hit one collision more."""
    kept = [left for left in transversals if left & core]
    wider = {left | {group} for left in transversals if not left & core for group in core}
    return kept + sorted(
        (left for left in wider if not any(known <= left for known in kept)),
        key=lambda left: (len(left), sorted(left)),
    )


def _listed(mix: Mix, collides: bool, kept: Groups, proved: bool) -> GroupSet:
    return GroupSet(collides, tuple(group for group in mix.groups if group in kept), proved)
