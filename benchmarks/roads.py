"""What the interim road does at sizes where the program over all profiles stops.

    python -m benchmarks.roads [NAME ...] [--against SECONDS]

Each problem is posed as a library call, proof and check included, and printed with its time.
With --against the plain program's engine runs beside it in the same process, by simplex and
by interior point (without crossover), each for at most so many seconds; the ratio is over the
better of them.
"""

from __future__ import annotations

import argparse
import resource
import time
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from designer.demands.formulate import formulate
from designer.demands.terms import Terms
from designer.engines.floats import floats
from designer.engines.model import load, quiet_highs
from designer.posing import pose_terms
from designer.setting.setting import IntArray, Party, Setting, Type, integers


@dataclass(frozen=True)
class Sized:
    """A setting, what is asked of it, and whether the plain program can be built beside it."""

    setting: Callable[[], Setting]
    terms: Terms
    against: bool = False


def _party(
    index: int, rows: IntArray, weights: list[int], outside: list[int] | None = None
) -> Party:
    size = len(rows)
    return Party(
        f"party {index + 1}",
        tuple(Type(f"t{a}") for a in range(size)),
        tuple(weights),
        integers(rows),
        integers(outside or [0] * size),
    )


def _setting(parties: list[Party], options: int, outlay: list[int] | None = None) -> Setting:
    return Setting(
        "Drawn",
        tuple(f"option {k + 1}" for k in range(options)),
        tuple(parties),
        integers(outlay or [0] * options),
        integers([0] * options),
        1,
        digest="0" * 64,
    )


def general(parties: int, size: int, options: int, high: int = 1000) -> Setting:
    """Any worth for any option: vector types, even odds."""
    rng = np.random.default_rng(5)
    drawn = [rng.integers(0, high, (size, options)) for _ in range(parties)]
    return _setting([_party(i, rows, [1] * size) for i, rows in enumerate(drawn)], options)


def project(parties: int, size: int, high: int = 100, ties: bool = True) -> Setting:
    """Build or leave, whole worths; an outlay between two whole sums leaves no tie."""
    rng = np.random.default_rng(5)
    step = 1 if ties else 2
    found = []
    for i in range(parties):
        worth = step * np.sort(rng.choice(high, size, replace=False))
        found.append(_party(i, np.stack([worth, 0 * worth], axis=1), [1] * size))
    return _setting(found, 2, [step * (parties * high // 2) + (0 if ties else 1), 0])


def trade(size: int) -> Setting:
    """One buyer, one seller, overlapping grids, uneven odds."""
    weights = [1 + 2 * a % 3 for a in range(size)]
    buyer = np.array([[3 * (a + 1), 0] for a in range(size)])
    seller = np.array([[0, 3 * a + 1] for a in range(size)])
    return _setting(
        [
            _party(0, buyer, weights),
            _party(1, seller, weights, [3 * a + 1 for a in range(size)]),
        ],
        2,
    )


def item(bidders: int, size: int) -> Setting:
    """One item or nobody's, uneven odds."""
    rng = np.random.default_rng(5)
    found = []
    for i in range(bidders):
        rows = np.zeros((size, bidders + 1), dtype=np.int64)
        rows[:, i + 1] = np.sort(rng.choice(np.arange(1, 10_000), size, replace=False))
        found.append(_party(i, rows, [int(w) for w in rng.integers(1, 4, size)]))
    return _setting(found, bidders + 1)


MONEY = Terms(goals=("outside-money",), tidy="none")
SECOND = Terms(decision="randomized", goals=("welfare",), tidy="none")
RENT = Terms(decision="randomized", balance="none", goals=("revenue",), tidy="none")

PROBLEMS = {
    "efficient-9x10x3": Sized(lambda: general(9, 10, 3), MONEY),
    "efficient-10x10x3": Sized(lambda: general(10, 10, 3), MONEY),
    "efficient-9x10x4": Sized(lambda: general(9, 10, 4), MONEY),
    "project-8x9": Sized(lambda: project(8, 9), MONEY),
    "project-12x10": Sized(lambda: project(12, 10), MONEY),
    "project-12x10-wide": Sized(lambda: project(12, 10, 10**7), MONEY),
    "project-20x10": Sized(lambda: project(20, 10, ties=False), MONEY),
    "trade-200": Sized(lambda: trade(200), SECOND, against=True),
    "trade-1000": Sized(lambda: trade(1000), SECOND),
    "free-project-6x60": Sized(lambda: project(6, 60, 1000), SECOND),
    "item-4x12": Sized(lambda: item(4, 12), RENT, against=True),
    "item-50x20": Sized(lambda: item(50, 20), RENT),
    "general-4x12x4": Sized(lambda: general(4, 12, 4, 100), RENT, against=True),
    "general-6x10x4": Sized(lambda: general(6, 10, 4, 100), RENT),
}


def engine_alone(setting: Setting, terms: Terms, limit: float) -> dict[str, float | None]:
    """Seconds of HiGHS on the plain program by solver; None where it did not finish."""
    program = floats(formulate(setting, terms).stage(0))
    found: dict[str, float | None] = {}
    for solver in ("ipm", "simplex"):
        model = quiet_highs()
        load(model, program)
        model.setOptionValue("solver", solver)
        model.setOptionValue("run_crossover", "off")
        model.setOptionValue("time_limit", limit)
        since = time.perf_counter()
        model.run()
        spent = time.perf_counter() - since
        done = "Optimal" in model.modelStatusToString(model.getModelStatus())
        found[solver] = spent if done else None
    return found


def main() -> None:
    """Pose the named problems, or all."""
    reading = argparse.ArgumentParser(description=__doc__)
    reading.add_argument("names", nargs="*", choices=[*PROBLEMS, []], default=[])
    reading.add_argument("--against", type=float, default=0.0, metavar="SECONDS")
    asked = reading.parse_args()
    pose_terms(general(2, 2, 3), RENT, path="interim")  # imports are not what is measured
    for name in asked.names or PROBLEMS:
        sized = PROBLEMS[name]
        setting = sized.setting()
        since = time.perf_counter()
        verdict = pose_terms(setting, sized.terms, path="interim")
        spent = time.perf_counter() - since
        peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 2**20
        line = f"{name:20} {setting.profiles:8.1e} profiles  {verdict.status}"
        line += f"{' proved' if verdict.proved else ''}  {spent:7.2f} s  peak {peak:.2f} GiB"
        if asked.against and sized.against:
            others = engine_alone(setting, sized.terms, asked.against)
            for solver, seconds in others.items():
                took = f"over {asked.against:.0f}" if seconds is None else f"{seconds:.1f}"
                line += f"  {solver} {took} s"
            known = [seconds for seconds in others.values() if seconds is not None]
            if known:
                line += f"  ratio {min(known) / spent:.0f}"
        print(line, flush=True)


if __name__ == "__main__":
    main()
