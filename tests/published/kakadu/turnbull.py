"""From interval answers to a prior: Turnbull's nonparametric maximum likelihood.

Each respondent's worth lies in (lower, upper], no more is known. The likelihood of chances
p over the innermost intervals is prod_j (sum_{k in j} p_k) ** count_j. Turnbull (1976, 'The
empirical distribution function with arbitrarily grouped, censored and truncated data',
Journal of the Royal Statistical Society B 38:290-295) shows that only innermost intervals
can carry chance and that the self-consistency step

    p_k  <-  (1/n) sum_j count_j [k in j] p_k / P_j,        P_j = sum_{k in j} p_k

climbs to a maximum. The bracket in `slopes`, D_k = (1/n) sum_j count_j [k in j] / P_j, is at
most 1 everywhere at the maximum, and for any p the log-likelihood is within n * (max D - 1)
of the best (concavity), which bounds what rounding costs, exactly.

A type stands at the LOWER end of its interval: nobody is credited with more than they said
yes to. That is cautious, and usual for this kind of survey (common practice, no source).

Run it as a program for the prior of the scenario beside it:

    python -m tests.published.kakadu.turnbull
"""

from __future__ import annotations

import csv
import sys
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path
from typing import TypeVar

Number = TypeVar("Number", float, Fraction)

ANSWERS = Path(__file__).with_name("answers.csv")
PARTS = 10_000
"""The estimate is rounded to this many equal parts (it is no rational number itself)."""


@dataclass(frozen=True)
class Answer:
    """How many respondents' worth lies in (lower, upper]; None: no upper end is known."""

    lower: int
    upper: int | None
    count: int


def read_answers(path: Path = ANSWERS) -> tuple[Answer, ...]:
    """The counts of a CSV with columns lower, upper (empty: unbounded) and count."""
    with path.open(encoding="utf-8", newline="") as lines:
        return tuple(
            Answer(
                int(row["lower"]), int(row["upper"]) if row["upper"] else None, int(row["count"])
            )
            for row in csv.DictReader(lines)
        )


def innermost(answers: Sequence[Answer]) -> list[tuple[int, int | None]]:
    """The intervals (a lower end, the next upper end) with no other lower end inside."""
    lowers = sorted({answer.lower for answer in answers})
    uppers = sorted({answer.upper for answer in answers if answer.upper is not None})
    found: list[tuple[int, int | None]] = []
    for place, lower in enumerate(lowers):
        upper = next((end for end in uppers if end > lower), None)
        following = lowers[place + 1] if place + 1 < len(lowers) else None
        if following is None or (upper is not None and upper <= following):
            found.append((lower, upper))
    return found


def members(answer: Answer, intervals: Sequence[tuple[int, int | None]]) -> list[int]:
    """The positions of the innermost intervals inside an answer's interval."""
    return [
        k
        for k, (lower, upper) in enumerate(intervals)
        if answer.lower <= lower
        and (answer.upper is None or (upper is not None and upper <= answer.upper))
    ]


def slopes(answers: Sequence[Answer], chances: Sequence[Number]) -> list[Number]:
    """D_k for every innermost interval; exact if the chances are Fractions."""
    intervals = innermost(answers)
    total = sum(answer.count for answer in answers)
    zero = chances[0] - chances[0]
    result = [zero for _ in intervals]
    for answer in answers:
        inside = members(answer, intervals)
        mass = sum((chances[k] for k in inside), zero)
        for k in inside:
            result[k] += answer.count / (mass * total)
    return result


def estimate(answers: Sequence[Answer], tolerance: float = 1e-14) -> list[float]:
    """The maximum-likelihood chances of the innermost intervals, by self-consistency."""
    chances = [1.0 / len(innermost(answers))] * len(innermost(answers))
    for _ in range(100_000):
        step = [p * d for p, d in zip(chances, slopes(answers, chances), strict=True)]
        if max(abs(new - old) for new, old in zip(step, chances, strict=True)) < tolerance:
            return step
        chances = step
    raise RuntimeError("self-consistency did not settle")


def rounded(chances: Sequence[float], parts: int = PARTS) -> list[int]:
    """Whole parts summing to `parts`, by largest remainders."""
    whole = [int(p * parts) for p in chances]
    remainders = sorted(range(len(whole)), key=lambda k: whole[k] - chances[k] * parts)
    for k in remainders[: parts - sum(whole)]:
        whole[k] += 1
    return whole


def prior(answers: Sequence[Answer]) -> tuple[list[int], list[int]]:
    """The types (lower ends) and their integer weights."""
    return [lower for lower, _ in innermost(answers)], rounded(estimate(answers))


def main() -> None:
    """Print the two lines of the scenario that come from the survey."""
    types, weights = prior(read_answers())
    sys.stdout.write(f"types   = {types}\nweights = {weights}\n")


if __name__ == "__main__":
    main()
