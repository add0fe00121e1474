"""A party's base as JSON values, and back: trees in a short list, runs of which is whose."""

from __future__ import annotations

import itertools
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np

from designer.roads.typegraph.bases import OWN, ZERO, Base, Flow, Root
from designer.roads.typegraph.decided import Indices, distinct
from designer.roads.typegraph.fibers import Fibers
from designer.roads.typegraph.lotteries import Bound, Lies, Opened
from designer.roads.typegraph.mechanism import runs, unrolled
from designer.roads.typegraph.torn import Torn
from designer.setting.exact import number, text


@dataclass(frozen=True, eq=False)
class Claim:
    """What a document says of a party: trees, or payments with a flow."""

    root: Root
    tree: Indices | None
    pays: tuple[tuple[Fraction, ...], ...] = ()
    flow: Flow | None = None


def plain_base(found: Base) -> dict[str, Any]:
    """The paths behind a table; or the table and the flow that bounds it."""
    if found.tree is not None:
        trees, of = distinct(found.tree, found.tree.shape[1])
        return {"root": found.root, "trees": trees.tolist(), "of": runs(of)}
    if found.flow is None:
        raise AssertionError("a table without paths has a flow")
    return {
        "pays": [[text(Fraction(value)) for value in row] for row in found.pays],
        "den": text(found.flow.den),
        "roots": [text(share) for share in found.flow.roots],
        "lies": [[*lie[:3], text(lie[3])] for lie in found.flow.lies],
    }


def read_claim(plain: Any, work: Fibers) -> Claim:
    """The claim about one party. Raises ValueError or TypeError for anything else."""
    classes, types = work.classes, work.types
    if "trees" in plain:
        trees = np.array(plain["trees"], dtype=np.int64)
        if trees.ndim != 2 or trees.shape[1] != types:
            raise ValueError("the trees do not fit the party's types")
        if trees.min() < 0 or trees.max() >= types:
            raise ValueError("a tree names a type that is not there")
        of = unrolled(plain["of"], classes)
        if of.max() >= len(trees):
            raise ValueError("a class names a tree that is not there")
        root = plain["root"]
        if root not in (OWN, ZERO) and not (type(root) is int and 0 <= root < types):
            raise ValueError("the trees have no root")
        return Claim(root, trees[of])
    pays = tuple(tuple(number(value) for value in row) for row in plain["pays"])
    if len(pays) != classes or any(len(row) != types for row in pays):
        raise ValueError("the payments do not fit the party's types")
    lies = []
    for g, true, told, amount in plain["lies"]:
        places = (g, true, told)
        if any(type(place) is not int for place in places) or not (
            0 <= g < classes and 0 <= true < types and 0 <= told < types
        ):
            raise ValueError("a lie names a type that is not there")
        lies.append((g, true, told, _whole(amount)))
    roots = tuple(_whole(share) for share in plain["roots"])
    flow = Flow(_whole(plain["den"]), roots, tuple(lies))
    if flow.den < 1 or len(roots) != types or min(roots) < 0 or any(a < 0 for *_, a in lies):
        raise ValueError("the multipliers do not fit")
    return Claim(0, None, pays, flow)


def plain_part(part: list[Bound] | Lies) -> Any:
    """What a document lists of one party while lotteries at ties are open."""
    if not isinstance(part, Lies):
        return [_plain_bound(bound) for bound in part]
    sets: dict[tuple[tuple[int, ...], ...], int] = {}
    of, graph = [], part.listed[:, 0]
    cuts = np.searchsorted(graph, np.arange(int(graph.max(initial=-1)) + 2))
    pairs = [tuple(pair) for pair in part.listed[:, 1:].tolist()]
    for start, stop in itertools.pairwise(cuts.tolist()):
        of.append(sets.setdefault(tuple(sorted(pairs[start:stop])), len(sets)))
    return {
        "lies": [[list(pair) for pair in pairs] for pairs in sets],
        "of": runs(np.array(of, dtype=np.int64)),
    }


def read_part(plain: Any, opened: Opened, party: int) -> list[Bound] | Lies:
    """What `plain_part` wrote. Raises ValueError or TypeError for anything else."""
    if isinstance(plain, list):
        return [_read_bound(bound, opened.torn[party]) for bound in plain]
    found = opened.spelled(party)
    types = found.work.types
    sets = []
    for lies in plain["lies"]:
        pairs = [(_place(a, types), _place(b, types)) for a, b in lies]
        if any(a == b for a, b in pairs):
            raise ValueError("a lie is the truth")
        sets.append(pairs)
    size = sum(count for _, count in plain["of"])
    if size > len(found.others):
        raise ValueError("there are more graphs than the others have reports")
    of = [_place(place, len(sets)) for place in unrolled(plain["of"], size).tolist()]
    lines = [(g, a, b) for g, place in enumerate(of) for a, b in sets[place]]
    return Lies(np.array(lines, dtype=np.int64).reshape(-1, 3))


def _plain_bound(bound: Bound) -> dict[str, Any]:
    """Paths listed while lotteries at ties are open; per torn profile a bundle of trees."""
    both = np.concatenate([bound.even, bound.trees])
    trees, of = distinct(both, both.shape[1])
    even, cuts = of[: len(bound.even)], of[len(bound.even) :]
    bundles: dict[tuple[int, ...], int] = {}
    torn = []
    for part in np.split(cuts, np.flatnonzero(np.diff(bound.graph)) + 1) if len(cuts) else ():
        torn.append(bundles.setdefault(tuple(part.tolist()), len(bundles)))
    return {
        "root": bound.root,
        "trees": trees.tolist(),
        "even": runs(even),
        "bundles": [list(bundle) for bundle in bundles],
        "torn": runs(np.array(torn, dtype=np.int64)),
    }


def _read_bound(plain: Any, found: Torn) -> Bound:
    """The paths that `_plain_bound` wrote. Raises ValueError or TypeError for anything else."""
    types, root = found.work.types, plain["root"]
    if root != OWN and not (type(root) is int and 0 <= root < types):
        raise ValueError("the trees have no root")
    trees = np.array(plain["trees"], dtype=np.int64).reshape(-1, types)
    if len(trees) and (trees.min() < 0 or trees.max() >= types):
        raise ValueError("a tree names a type that is not there")
    bundles = [[_place(tree, len(trees)) for tree in bundle] for bundle in plain["bundles"]]
    if not all(bundles):
        raise ValueError("some of the others' reports have no paths")
    even = [_place(tree, len(trees)) for tree in unrolled(plain["even"], len(found.even)).tolist()]
    torn = unrolled(plain["torn"], len(found.others)).tolist()
    torn = [_place(bundle, len(bundles)) for bundle in torn]
    cuts = [tree for bundle in torn for tree in bundles[bundle]]
    graph = np.repeat(np.arange(len(torn)), [len(bundles[bundle]) for bundle in torn])
    return Bound(
        root,
        trees[np.array(even, dtype=np.int64)],
        graph.astype(np.int64),
        trees[np.array(cuts, dtype=np.int64)],
    )


def _place(value: Any, size: int) -> int:
    if type(value) is not int or not 0 <= value < size:
        raise ValueError("a list names what is not there")
    return value


def _whole(written: Any) -> int:
    value = number(written)
    if value.denominator != 1:
        raise ValueError("a multiplier is no integer")
    return value.numerator
