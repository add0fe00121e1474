"""What a demand and a goal are: a name, when it is asked, and the rows it writes."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

from designer.demands.terms import Terms
from designer.program.affine import Affine
from designer.program.draft import Draft


@dataclass(frozen=True)
class Demand:
    """One row family: `asked` tells from the terms whether to call `rows`."""

    name: str
    asked: Callable[[Terms], bool]
    rows: Callable[[Draft, Terms], None]


def _nothing(draft: Draft, terms: Terms) -> None:
    """Most goals free no allowance."""


@dataclass(frozen=True)
class Goal:
    """One goal: what to optimise, and how.

    `prepare` frees allowances before the demands are written; `objective` adds the goal's own
    columns and rows, if any, and returns the form to optimise.
    `reads` completes the sentence "the … is" on the screen; `money` tells whether the value
    is an amount of money.
    """

    name: str
    sense: Literal["min", "max"]
    reads: str
    objective: Callable[[Draft, Terms], Affine]
    prepare: Callable[[Draft, Terms], None] = _nothing
    money: bool = True
