"""Families of instances by size, for claims that hold at every size.

Each function returns instance data as `corpus.as_setting` reads it.
"""

from __future__ import annotations

import itertools
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


def units(parties: int, count: int, grid: list[Fraction]) -> Data:
    """So many identical units, one to a party, all uniform; an option per set that is served."""
    sets = list(itertools.combinations(range(parties), count))
    return {
        "agents": [
            agent(grid, [int(i in served) for served in sets], even(len(grid)))
            for i in range(parties)
        ],
        "decisions": [f"to {' '.join(str(i + 1) for i in served)}" for served in sets],
    }


def exchange(buyers: int, sellers: int, grid: list[Fraction]) -> Data:
    """Buyers without a unit and sellers with one, all uniform; an option per set of owners."""
    parties = buyers + sellers
    owners = list(itertools.combinations(range(parties), sellers))
    prior = even(len(grid))
    return {
        "agents": [
            agent(grid, [int(i in own) - int(i >= buyers) for own in owners], prior)
            for i in range(parties)
        ],
        "decisions": [f"owned by {' '.join(str(i + 1) for i in own)}" for own in owners],
    }


def project(parties: int, share: Fraction) -> Data:
    """A joint project worth 0 or 1 to each at even odds, at a cost of `share` a head."""
    return {
        "agents": [agent([Fraction(0), Fraction(1)], [0, 1], even(2)) for _ in range(parties)],
        "decisions": ["leave", "build"],
        "decision_cost": ["0", str(share * parties)],
    }


def qualities(grid: list[Fraction], prior: list[Fraction], offered: list[Fraction]) -> Data:
    """One buyer, a quality q worth type * q to him and costing q**2 / 2."""
    return {
        "agents": [
            {
                "types": [str(v) for v in grid],
                "values": [[str(v * q) for q in offered] for v in grid],
                "prior": [str(p) for p in prior],
            }
        ],
        "decisions": [str(q) for q in offered],
        "decision_cost": [str(q * q / 2) for q in offered],
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
