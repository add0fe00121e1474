"""Paths and multipliers of one party, followed step by step: what the checker trusts."""

from __future__ import annotations

from fractions import Fraction
from typing import Any

import numpy as np

from designer.engines.watch import Watch
from designer.roads.typegraph.bases import OWN, ZERO, Base, kind, outside_scope
from designer.roads.typegraph.evidence import Claim
from designer.roads.typegraph.fibers import Fibers, Lengths
from designer.roads.typegraph.paths import along
from designer.setting.setting import IntArray


class Rejected(ValueError):  # noqa: N818 - says what it means
    """What is wrong with the document, in words."""


def measured(work: Fibers, claim: Claim, watch: Watch) -> Base:
    """Follow the paths: the payments they give, the bound they prove, both as claimed."""
    held = kind(work)
    name = work.setting.parties[work.party].name
    trusted = name in work.terms.trusted
    if claim.flow is not None:
        if held != "types" or trusted:
            raise Rejected(f"{name} has multipliers of participation type by type")
        return flowing(work, claim, watch)
    roots = {"free": ZERO, "mean": ZERO, "cases": OWN, "types": OWN if trusted else "type"}[held]
    if (claim.root if isinstance(claim.root, str) else "type") != roots:
        raise Rejected(f"the paths of {name} do not end where participation holds it")
    if claim.tree is None:
        raise Rejected(f"{name} has neither paths nor multipliers")
    if trusted and (claim.tree != np.arange(work.types)[None, :]).any():
        raise Rejected(f"{name} is trusted and tells no lies")
    pays = np.zeros((work.classes, work.types), dtype=work.dtype)
    sums, rooms = [0] * work.types, [0] * work.types
    total = worth = room = 0
    for start, lengths in work.blocks():
        watch.tell(f"following the paths of {name}", start)
        stop = start + len(lengths.room)
        pays[start:stop] = part = followed(work, lengths, claim.root, claim.tree[start:stop])
        total += work.sum(lengths.sinks, part)
        worth += work.sum(lengths.sinks, lengths.worth)
        room += work.sum(lengths.sinks, lengths.room)
        if isinstance(claim.root, int):
            sums = added(sums, work.shared(start, stop, part))
            rooms = added(rooms, work.shared(start, stop, lengths.room))
    den = work.den * work.total
    average, mean = Fraction(total, den), Fraction(room, den)
    most: Fraction | None = {"free": None, "mean": mean}.get(held, average)
    if isinstance(claim.root, int):
        lift = rooms[claim.root]
        if any(s + lift > r for s, r in zip(sums, rooms, strict=True)):
            raise Rejected(f"a type of {name} would rather stay out")
        most = average + Fraction(lift, work.den * (work.total // int(work.own.sum())))
    return Base(pays, average, most, claim.root, claim.tree, None, Fraction(worth, den), mean)


def followed(work: Fibers, lengths: Lengths, root: str | int, tree: IntArray) -> IntArray:
    """The lengths of the paths, held against every lie and every room."""
    name = work.setting.parties[work.party].name
    begin = lengths.room if root == OWN else np.zeros_like(lengths.room)
    pays, loops = along(lengths.cost, tree, begin)
    scope = lengths.scope
    if loops.any():
        raise Rejected(f"the paths of {name} go round in circles")
    if isinstance(root, int):
        at_root = tree == np.arange(work.types)[None, :]
        if (at_root.sum(axis=1) != 1).any() or not at_root[:, root].all():
            raise Rejected(f"the paths of {name} do not all start at one type")
    if scope is not None:
        inside = np.take_along_axis(scope, tree, axis=1)
        if (scope & ~inside).any():
            raise Rejected(f"a path of {name} passes where nothing is asked")
        pays[~scope] = work.far
        outside_scope(pays, lengths.cost, scope, work.far)
    honest(work, lengths, pays)
    asked = np.ones(pays.shape, dtype=bool) if scope is None else scope
    if root == OWN and (asked & (pays > lengths.room).astype(bool)).any():
        raise Rejected(f"{name} would rather stay out in some case")
    return pays


def honest(work: Fibers, lengths: Lengths, pays: IntArray) -> None:
    """pays[a] <= pays[b] + cost[a, b]; costs of what is not asked are out of reach."""
    if (pays[:, :, None] > pays[:, None, :] + lengths.cost).any():
        name = work.setting.parties[work.party].name
        raise Rejected(f"{name} gains by a lie at the stated payments")


def flowing(work: Fibers, claim: Claim, watch: Watch) -> Base:
    """Payments and multipliers over classes: conservation, honesty, and equal values."""
    flow, name = claim.flow, work.setting.parties[work.party].name
    if flow is None:
        raise Rejected(f"{name} has no multipliers")
    pays = np.array(claim.pays, dtype=object).reshape(work.classes, work.types)
    own = int(work.own.sum())
    # Net flow into (g, a), times own: what its sink takes less what its root gives.
    net = np.zeros((work.classes, work.types), dtype=object)
    costs = 0
    by_class: dict[int, list[tuple[int, int, int]]] = {}
    for g, true, told, amount in flow.lies:
        net[g, true] += amount
        net[g, told] -= amount
        by_class.setdefault(g, []).append((true, told, amount))
    sums: list[Any] = [0] * work.types
    rooms = [0] * work.types
    worth = room = 0
    for start, lengths in work.blocks():
        watch.tell(f"following the multipliers of {name}", start)
        stop = start + len(lengths.room)
        honest(work, lengths, pays[start:stop])
        mass = work.mass[start:stop].astype(object)[:, None]
        given = mass * np.array(flow.roots, dtype=object)[None, :] * own
        if (net[start:stop] * own + given != mass * work.own[None, :] * flow.den).any():
            raise Rejected(f"the multipliers of {name} do not add up at some type")
        for g in range(start, stop):
            for true, told, amount in by_class.get(g, ()):
                costs += amount * int(lengths.cost[g - start, true, told])
        sums = [s + p for s, p in zip(sums, (mass * pays[start:stop]).sum(axis=0), strict=True)]
        rooms = added(rooms, work.shared(start, stop, lengths.room))
        worth += work.sum(lengths.sinks, lengths.worth)
        room += work.sum(lengths.sinks, lengths.room)
    if any(s > r for s, r in zip(sums, rooms, strict=True)):
        raise Rejected(f"a type of {name} would rather stay out")
    whole = work.total // own
    bound = sum(share * r for share, r in zip(flow.roots, rooms, strict=True)) + costs
    most = Fraction(bound, flow.den * work.den * whole)
    average = sum(Fraction(int(o)) * s for o, s in zip(work.own, sums, strict=True))
    average /= work.den * work.total
    if average != most:
        raise Rejected(f"the payments of {name} do not reach what the multipliers admit")
    den = work.den * work.total
    return Base(pays, most, most, 0, None, flow, Fraction(worth, den), Fraction(room, den))


def added(one: list[int], two: list[int]) -> list[int]:
    """Sums place by place."""
    return [a + b for a, b in zip(one, two, strict=True)]


def at(value: Any, size: int) -> int:
    """A place in a list of some size; raises Rejected otherwise."""
    if type(value) is not int or not 0 <= value < size:
        raise Rejected("a listed row names what is not there")
    return value


def whole(value: int | str) -> int:
    """An integer, as a proof document writes it."""
    return int(value, 16) if isinstance(value, str) else value
