"""Numbered names in a row, said once: "Dairy 1 … Dairy 6" for six that are shown alike."""

from __future__ import annotations

import itertools
import re
from collections.abc import Callable, Sequence
from typing import TypeVar

FEWEST = 3
"""Fewer are as short written out."""

Item = TypeVar("Item")


def runs(
    items: Sequence[Item], name: Callable[[Item], str], shown: Callable[[Item], object]
) -> list[list[Item]]:
    """Neighbours whose names differ by a rising last number and that are shown alike.

    >>> runs(["a 1", "a 2", "a 3", "b 4"], str, len)
    [['a 1', 'a 2', 'a 3'], ['b 4']]
    """
    found: list[list[Item]] = []
    keyed = [(_split(name(item)), shown(item), item) for item in items]
    places = itertools.count()
    for _, group in itertools.groupby(
        zip(keyed, places, strict=False),
        # consecutive numbers keep their distance from the place in the list
        key=lambda pair: (pair[0][0][0], pair[0][0][1] - pair[1], pair[0][1]),
    ):
        members = [item for (_, _, item), _ in group]
        found += [members] if len(members) >= FEWEST else [[member] for member in members]
    return found


def span(first: str, last: str) -> str:
    """From the first name to the last."""
    return first if first == last else f"{first} … {last}"


def _split(name: str) -> tuple[str, int]:
    """The name without its last number, and that; a name without one stands alone."""
    found = re.fullmatch(r"(.*\s)([1-9]\d{0,8})", name)
    return (found[1], int(found[2])) if found else (name, 0)
