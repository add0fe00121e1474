"""Labels are values: the same label names a row, its multiplier and the sentence about it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass


@dataclass(frozen=True)
class Label:
    """The name of a row or a column. `at` is one type label per party, in party order."""


def always(label: Label) -> Callable[[int], Label]:
    """The labels of rows that share one."""
    return lambda _: label


# -- columns -----------------------------------------------------------------------------


@dataclass(frozen=True)
class Pays(Label):
    """t_i(theta): what a party pays at a profile."""

    party: str
    at: tuple[str, ...]


@dataclass(frozen=True)
class Decides(Label):
    """x_k(theta): the probability of an option at a profile."""

    option: str
    at: tuple[str, ...]


@dataclass(frozen=True)
class ExpectedPay(Label):
    """m_i(a): a party's expected payment when it reports a type (column or defining row)."""

    party: str
    type: str


@dataclass(frozen=True)
class ExpectedDecision(Label):
    """q_i(k, a): the probability of an option when a party reports a type.

    others  how many options beside it, all one to the party, are counted in
    """

    party: str
    type: str
    option: str
    others: int = 0


@dataclass(frozen=True)
class Share(Label):
    """The share of a listed rule among the profiles where the lead party has a type."""

    type: str
    rule: int


@dataclass(frozen=True)
class OnAverage(Label):
    """An expectation over all profiles: what a party "pays", or a worth that the rule fixes.

    what  "pays" or "worth" (of a party), "outlay" or "designer's worth"
    """

    what: str
    party: str | None = None


@dataclass(frozen=True)
class PaysAgainst(Label):
    """What a party pays on average over its own types, the others' reports given.

    at     one type label per party, the party's own left as "·"
    worst  the type at which participation holds it, where that is asked type by type
    """

    party: str
    at: tuple[str, ...]
    worst: str | None = None


@dataclass(frozen=True)
class Unknown(Label):
    """A scalar unknown: outside money, a floor, the largest payment, a margin."""

    name: str


# -- rows --------------------------------------------------------------------------------


@dataclass(frozen=True)
class Honest(Label):
    """A party of a true type does not gain by reporting another; at a profile if dominant."""

    party: str
    true: str
    told: str
    at: tuple[str, ...] | None = None


@dataclass(frozen=True)
class TakesPart(Label):
    """A party is no worse off than outside: on average, per type, or at a profile."""

    party: str
    type: str | None = None
    at: tuple[str, ...] | None = None


@dataclass(frozen=True)
class AtMost(Label):
    """Honesty and participation together bound what a party can pay on average.

    worst  the type at which participation holds it, where several bounds are told apart
    """

    party: str
    worst: str | None = None


@dataclass(frozen=True)
class Paths(Label):
    """Paths of lies bound what a party pays over its own types, the others' reports given.

    `at` and `worst` as in `PaysAgainst`; number  which of the paths listed there
    """

    party: str
    at: tuple[str, ...]
    number: int
    worst: str | None = None


@dataclass(frozen=True)
class Balances(Label):
    """The pot covers the outlay: on average (at is None) or at a profile."""

    at: tuple[str, ...] | None = None


@dataclass(frozen=True)
class Covered(Label):
    """What paths of lies let the parties pay at a profile covers the outlay there."""

    at: tuple[str, ...]


@dataclass(frozen=True)
class Lottery(Label):
    """The probabilities of the options sum to one at a profile."""

    at: tuple[str, ...]


@dataclass(frozen=True)
class Slice(Label):
    """The shares of the rules sum to one where the lead party has a type."""

    type: str


@dataclass(frozen=True)
class Clause(Label):
    """A limit, a side demand, an even-handedness row or a goal's own row."""

    group: str
    key: str
    party: str | None = None
    at: tuple[str, ...] | None = None


@dataclass(frozen=True)
class Pin(Label):
    """An earlier goal keeps its optimal value."""

    goal: str
