"""How time, size and memory grow as types or parties are added, beside what theory expects.

A family is posed at rising sizes by one road. The exponent fitted to a quantity q over sizes x
is the slope of the least-squares line of log q on log x; the last step's slope is given beside
it, because at small sizes fixed costs hide the growth. Along T, x is the number of types a
party has; along n, x is the number of profiles T^n, so an exponent of 1 is one look at every
profile and 1/2 is one look at every profile of half the parties.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from functools import partial

from benchmarks import invented
from benchmarks.invented import Asked, Files
from benchmarks.measure import Measured
from benchmarks.registry import CERTAIN, MEAN, MONEY, Problem


@dataclass(frozen=True)
class Family:
    """One road over joint projects of rising size.

    along   "T" or "n": what rises; "alike": n, of parties that are alike
    sizes   (parties, types) of each
    theory  for each quantity, the expected exponent and where it comes from
    """

    name: str
    way: str
    asked: Asked
    along: str
    sizes: tuple[tuple[int, int], ...]
    theory: dict[str, tuple[str, str]]
    made: Callable[[int, int, Asked], Files] = invented.joint_project

    def problems(self) -> list[Problem]:
        """A problem per size, answered in this family's one way."""
        return [
            Problem(
                f"{self.name}-{n}x{t}",
                f"growth along {self.along}",
                partial(self.made, n, t, self.asked),
                expected="",
                ways=(self.way,),
            )
            for n, t in self.sizes
        ]

    def x(self, size: tuple[int, int]) -> int:
        """What the exponent refers to: types, parties alike, or profiles."""
        if self.along == "alike":
            return size[0]
        return size[1] if self.along == "T" else size[1] ** size[0]


DOUBLING = tuple((3, t) for t in (5, 10, 20, 40))
PARTIES = tuple((n, 10) for n in range(2, 11))

FAMILIES = (
    Family(
        "full-T",
        "full",
        MONEY,
        "T",
        DOUBLING,
        {
            "seconds": ("≥ 3", "writing n·T^n nonzeros; the engine's steps come on top"),
            "nonzeros": ("3", "n·T^n + n·T², here n = 3"),
            "bytes": ("3", "n·T^n numbers, held exactly and as floats"),
        },
    ),
    Family(
        "interim-T",
        "interim",
        MONEY,
        "T",
        DOUBLING,
        {
            "seconds": ("2 to 3", "n·T² lie rows; a pass over profiles is at most T^n, n = 3"),
            "nonzeros": ("2", "n·T² lie rows of four numbers each"),
        },
    ),
    Family(
        "typegraph-T",
        "type-graph",
        MEAN,
        "T",
        DOUBLING,
        {
            "seconds": ("3 to 4", "n·T^n arcs at least; n·T^(n+1) if every lie is walked, n = 3"),
            "bytes": ("3", "a distance per party and profile, n·T^n"),
        },
    ),
    Family(
        "interim-n",
        "interim",
        MONEY,
        "n",
        PARTIES,
        {
            "seconds": ("1/2", "two decisions: sorted half sums, T^(n/2)·log T; less by adding up"),
            "bytes": ("1/2", "the half sums, T^(n/2)"),
        },
    ),
    Family(
        "typegraph-n",
        "type-graph",
        CERTAIN,
        "n",
        tuple((n, 10) for n in range(2, 7)),
        {
            "seconds": ("1", "a pass over the profiles, n·T^n"),
            "bytes": ("1", "a distance per party and profile, n·T^n"),
        },
    ),
    Family(
        "likeness-n",
        "likeness",
        CERTAIN,
        "alike",
        tuple((n, 4) for n in (2, 4, 8, 16, 32)),
        {
            "seconds": ("≥ 3", "rows as below; the engine's steps come on top"),
            "nonzeros": ("3", "T² lies at each of C(n+T-2, T-1) others' multisets, here T = 4"),
        },
        invented.alike_project,
    ),
)


def reduced(family: Family, upto: int) -> Family:
    """The same with only its first sizes: for a smoke run."""
    return replace(family, sizes=family.sizes[:upto])


def exponent(x: Sequence[float], q: Sequence[float]) -> float | None:
    """Slope of the least-squares line of log q on log x; None without two different sizes.

    Pairs in which either is not positive say nothing about growth and are left out.
    """
    logs = [(math.log(a), math.log(b)) for a, b in zip(x, q, strict=True) if a > 0 and b > 0]
    if len({a for a, _ in logs}) < 2:
        return None
    mean_x = math.fsum(a for a, _ in logs) / len(logs)
    mean_q = math.fsum(b for _, b in logs) / len(logs)
    across = math.fsum((a - mean_x) * (b - mean_q) for a, b in logs)
    return across / math.fsum((a - mean_x) ** 2 for a, _ in logs)


def rows(family: Family, measured: Sequence[Measured]) -> list[list[str]]:
    """A row per quantity: family, quantity, values by size, fitted, last step, theory, why.

    `measured` holds the family's problems in the order of its sizes; a size that was stopped
    or skipped shows as such and takes no part in the fit.
    """
    found = []
    for quantity, (expected, why) in family.theory.items():
        x, q, shown = [], [], []
        for size, one in zip(family.sizes, measured, strict=True):
            series = one.series[family.way]
            value = series.quantity(quantity)
            label = f"{size[0]}×{size[1]}"
            if value is None:
                over = f"> {series.over:.0f} s" if series.over else "not measured"
                shown.append(f"{label}: {over}")
                continue
            shown.append(f"{label}: {value:,.0f}" if value >= 100 else f"{label}: {value:.2g}")
            x.append(float(family.x(size)))
            q.append(value)
        fits = [exponent(x, q), exponent(x[-2:], q[-2:])]
        told = ["–" if fit is None else f"{fit:.2f}" for fit in fits]
        base = {"T": "T", "alike": "n"}.get(family.along, "T^n")
        found.append([family.name, f"{quantity} by {base}", "; ".join(shown), *told, expected, why])
    return found
