"""Families of instances by size, for claims that hold at every size.

Each function returns instance data as `corpus.as_setting` reads it.
"""

from __future__ import annotations

from fractions import Fraction
from typing import Any

from designer.setting.setting import Chance

Data = dict[str, Any]


def midpoints(size: int) -> list[Fraction]:
    """(2k-1)/(2K) for k = 1..K."""
    return [Fraction(2 * k - 1, 2 * size) for k in range(1, size + 1)]


def endpoints(size: int) -> list[Fraction]:
    """k/(K-1) for k = 0..K-1."""
    return [Fraction(k, size - 1) for k in range(size)]


def even(size: int) -> list[Fraction]:
    """Equal chances."""
    return [Fraction(1, size)] * size


def agent(
    grid: list[Fraction],
    factors: list[int],
    prior: list[Fraction] | None = None,
    share: Fraction = Fraction(0),
) -> Data:
    """A party to whom option k is worth factors[k] * type, and staying out share * type."""
    data: Data = {
        "types": [str(v) for v in grid],
        "values": [[str(v * factor) for factor in factors] for v in grid],
    }
    if prior is not None:
        data["prior"] = [str(p) for p in prior]
    if share:
        data["reservation"] = [str(v * share) for v in grid]
    return data


def trade(grid: list[Fraction]) -> Data:
    """One buyer, one seller, both worths uniform on the grid; option 1 is the sale."""
    prior = even(len(grid))
    return {
        "agents": [agent(grid, [0, 1], prior), agent(grid, [0, -1], prior)],
        "decisions": ["keep", "sell"],
    }


def one_item(grids: list[list[Fraction]], priors: list[list[Fraction]] | None = None) -> Data:
    """One item; option 0 withholds it, option i gives it to party i."""
    count = len(grids)
    given = priors or [even(len(grid)) for grid in grids]
    return {
        "agents": [
            agent(grid, [int(k == i + 1) for k in range(count + 1)], prior)
            for i, (grid, prior) in enumerate(zip(grids, given, strict=True))
        ],
        "decisions": ["nobody", *(f"party {i + 1}" for i in range(count))],
    }


def market(buyers: int, grid: list[Fraction]) -> Data:
    """One unit, a seller (last) and several buyers, all uniform; option i: buyer i gets it."""
    prior = even(len(grid))
    return {
        "agents": [
            *(agent(grid, [int(k == i) for k in range(buyers + 1)], prior) for i in range(buyers)),
            agent(grid, [-1] * buyers + [0], prior),
        ],
        "decisions": [*(f"buyer {i + 1}" for i in range(buyers)), "seller"],
    }


def partnership(grid: list[Fraction], prior: list[Fraction], shares: list[Fraction]) -> Data:
    """An asset owned in shares goes whole to one party; staying out keeps one's share."""
    count = len(shares)
    return {
        "agents": [
            agent(grid, [int(k == i) for k in range(count)], prior, share)
            for i, share in enumerate(shares)
        ],
        "decisions": [f"party {i + 1}" for i in range(count)],
    }


def interim_chances(count: int, chances: list[Fraction]) -> tuple[Chance, ...]:
    """P(party i gets the item | its type a) = chances[a], for every party and type."""
    return tuple(
        Chance(party=i, type=a, option=i + 1, at_least=q, at_most=q)
        for i in range(count)
        for a, q in enumerate(chances)
    )
