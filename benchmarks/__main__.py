"""`python -m benchmarks`: measure everything in one run and print it.

Ends with 1 if a way fails or answers differently, whatever the times are.
"""

from __future__ import annotations

import argparse
import sys
import time
from concurrent.futures import ThreadPoolExecutor
from functools import partial
from pathlib import Path

from benchmarks import report
from benchmarks.growth import FAMILIES, reduced
from benchmarks.measure import measure
from benchmarks.registry import PROBLEMS
from benchmarks.startup import starts
from benchmarks.targets import targets

RESULTS = Path(__file__).with_name("RESULTS.md")


def main(words: list[str] | None = None) -> int:
    """Run the benchmarks the options ask for; the exit code."""
    asked = _parser().parse_args(words)
    if asked.list:
        for one in PROBLEMS:
            print(f"{one.name:16} {', '.join(one.ways):44} {one.says}")
        return 0
    chosen = [
        one for one in PROBLEMS if _wanted(one.name, asked) and (one.smoke or not asked.smoke)
    ]
    if not chosen and not (asked.only and any(_wanted(one.name, asked) for one in FAMILIES)):
        print("No problem of that name; --list shows them all.", file=sys.stderr)
        return 2
    rounds = 1 if asked.smoke else asked.rounds
    budget = 30.0 if asked.smoke else asked.budget
    families = [reduced(one, 2) for one in FAMILIES[1:3]] if asked.smoke else list(FAMILIES)
    if asked.only:
        families = [one for one in families if _wanted(one.name, asked)]
    began = time.monotonic()

    def tell(doing: str) -> None:
        print(f"{time.monotonic() - began:6.0f} s  {doing}", file=sys.stderr, flush=True)

    start = [] if asked.only else starts(1 if asked.smoke else max(3, rounds), tell)
    until = began + asked.within
    run = partial(measure, rounds=rounds, budget=budget, once=asked.smoke, tell=tell, until=until)
    # A smoke run's times mean nothing, so there both cores may work at once.
    with ThreadPoolExecutor(2 if asked.smoke else 1) as workers:
        grown = [(one, list(workers.map(run, one.problems()))) for one in families]
        measured = list(workers.map(run, chosen))
    every = [*measured, *(one for _, found in grown for one in found)]
    faults = [fault for one in every for fault in one.faults]
    text = report.document(measured, start, targets(measured, start), faults, grown)
    print(text)
    if asked.write and faults:
        print("RESULTS.md is not written: see Answers above.", file=sys.stderr)
    elif asked.write:
        RESULTS.write_text(text, encoding="utf-8")
    return 1 if faults else 0


def _wanted(name: str, asked: argparse.Namespace) -> bool:
    return not asked.only or any(name.startswith(word) for word in asked.only)


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        prog="python -m benchmarks", description="Time designer beside other ways, in one run."
    )
    parser.add_argument("--only", nargs="+", metavar="NAME", help="problems whose name starts so")
    parser.add_argument("--smoke", action="store_true", help="smallest sizes, once each (CI)")
    parser.add_argument(
        "--write", action="store_true", help="write benchmarks/RESULTS.md as well, if all is well"
    )
    parser.add_argument("--list", action="store_true", help="name the problems and stop")
    parser.add_argument("--rounds", type=int, default=1, help="turns per way (default 1)")
    parser.add_argument(
        "--budget", type=float, default=20.0, help="seconds per answer before a way is stopped"
    )
    parser.add_argument(
        "--within",
        type=float,
        default=465.0,
        help="seconds in all; what does not fit is left out and said to be",
    )
    return parser


if __name__ == "__main__":
    sys.exit(main())
