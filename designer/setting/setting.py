"""What is known before anything is asked: parties, types, priors, decisions, worths.

A `Setting` is frozen and exact. Money is held as integers over one denominator, the
setting's *grain*, and probability as integer weights, so that every later stage can work
with whole arrays of integers and never meets a float (convention 7).

Index sets used throughout
    i in 0..n-1   parties in file order (the designer, party 0 of convention 2, is apart)
    a, b          positions in a party's list of types
    k             positions in `options`
    theta         a profile: one type of each party; numbered row-major, last party fastest
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from fractions import Fraction
from functools import cached_property
from types import MappingProxyType
from typing import Any

import numpy as np
import numpy.typing as npt

IntArray = npt.NDArray[Any]
"""Integers: int64 where every entry and product in sight fits, Python ints otherwise."""

SMALL = 2**31
"""Entries below this may meet in a product without leaving int64."""


def integers(values: object, shape: tuple[int, ...] | None = None) -> IntArray:
    """Exact integers as an array: int64 when all are below 2**31, Python ints otherwise."""
    array = np.array(values, dtype=object)
    if shape is not None:
        array = array.reshape(shape)
    if all(-SMALL < value < SMALL for value in array.flat):
        return array.astype(np.int64)
    return array


@dataclass(frozen=True)
class Type:
    """One type of a party: its label, its number if it has one, and its named fields."""

    label: str
    number: Fraction | None = None
    fields: Mapping[str, Fraction] = field(default_factory=lambda: MappingProxyType({}))


@dataclass(frozen=True, eq=False)
class Party:
    """A party: its name, types, marginal prior, worths and outside option.

    `value` is int, shape (T_i, K) when private and (N, K) over all profiles when
    interdependent (`depends` tells which); `outside` is int, shape (T_i,) or (N,) likewise
    (`outside_depends`). Both are money in units of 1/grain. `weights` are positive integers;
    the marginal probability of type a is weights[a] / sum(weights).
    """

    name: str
    types: tuple[Type, ...]
    weights: tuple[int, ...]
    value: IntArray
    outside: IntArray
    depends: bool = False
    outside_depends: bool = False
    compelled: bool = False

    @property
    def size(self) -> int:
        """The number of types, T_i."""
        return len(self.types)

    @property
    def marginal(self) -> tuple[Fraction, ...]:
        """P(theta_i = a) for each type a."""
        total = sum(self.weights)
        return tuple(Fraction(weight, total) for weight in self.weights)


@dataclass(frozen=True)
class Chance:
    """A side demand on the interim probability P(option | party has type)."""

    party: int
    type: int
    option: int
    at_least: Fraction | None = None
    at_most: Fraction | None = None


@dataclass(frozen=True)
class Limits:
    """Floor and cap on every payment t_i(theta), and two common clauses. None: no limit."""

    pays_at_most: Fraction | None = None
    pays_at_least: Fraction | None = None
    only_when_served: bool = False
    within_worth: bool = False


@dataclass(frozen=True)
class Side:
    """Side demands: floors on expected welfare and expected pot, interim probabilities."""

    welfare_at_least: Fraction | None = None
    revenue_at_least: Fraction | None = None
    chances: tuple[Chance, ...] = ()


@dataclass(frozen=True, eq=False)
class Setting:
    """Everything a scenario file states, validated, exact and frozen.

    outlay, worth  the designer's, int, shape (K,), money in units of 1/grain
    grain          the common denominator of all money in the setting
    joint          int weights over all N profiles when types are correlated, else None
    rule           the given decision rule: int, shape (N, K), each row summing to
                   `rule_den`; None unless the scenario gives one
    support_only   convention 5: ex-post and dominant demands on the support only
    asked          the scenario's own [demands], already validated, as plain values
    digest         SHA-256 (hex) of the canonical text of the scenario
    """

    title: str
    options: tuple[str, ...]
    parties: tuple[Party, ...]
    outlay: IntArray
    worth: IntArray
    grain: int
    joint: IntArray | None = None
    rule: IntArray | None = None
    rule_den: int = 1
    support_only: bool = False
    limits: Limits = Limits()
    side: Side = Side()
    asked: Mapping[str, object] = field(default_factory=lambda: MappingProxyType({}))
    money: str = "money units"
    note: str = ""
    digest: str = ""

    @cached_property
    def shape(self) -> tuple[int, ...]:
        """(T_1, ..., T_n)."""
        return tuple(party.size for party in self.parties)

    @cached_property
    def profiles(self) -> int:
        """N, the number of profiles in the product space (a Python int of any size)."""
        return math.prod(self.shape)

    @property
    def independent(self) -> bool:
        """Whether the scenario gives each party a prior of its own."""
        return self.joint is None

    @property
    def interdependent(self) -> bool:
        """Whether some party's worth depends on other parties' types (convention 4)."""
        return any(party.depends for party in self.parties)

    @cached_property
    def weights(self) -> IntArray:
        """Profile weights, int, shape (N,): P(theta) = weights[theta] / total_weight."""
        if self.joint is not None:
            return self.joint
        total = math.prod(sum(party.weights) for party in self.parties)
        dtype = np.int64 if total < 2**62 else object
        product = np.ones(1, dtype=dtype)
        for party in self.parties:
            product = np.multiply.outer(product, np.array(party.weights, dtype=dtype)).ravel()
        return product

    @cached_property
    def total_weight(self) -> int:
        """The sum of the profile weights."""
        if self.joint is not None:
            return int(sum(int(weight) for weight in self.joint))
        return math.prod(sum(party.weights) for party in self.parties)

    def probability(self, profile: int) -> Fraction:
        """P(theta) for one profile number."""
        return Fraction(int(self.weights[profile]), self.total_weight)

    def types_at(self, profile: int) -> tuple[int, ...]:
        """The position of each party's type at a profile number."""
        positions = []
        for size in reversed(self.shape):
            profile, position = divmod(profile, size)
            positions.append(position)
        return tuple(reversed(positions))

    def labels_at(self, profile: int) -> tuple[str, ...]:
        """The type label of each party at a profile number."""
        positions = self.types_at(profile)
        return tuple(party.types[a].label for party, a in zip(self.parties, positions, strict=True))

    def profile_of(self, positions: tuple[int, ...]) -> int:
        """The profile number of one type position per party."""
        number = 0
        for size, position in zip(self.shape, positions, strict=True):
            number = number * size + position
        return number

    def party_index(self, name: str) -> int:
        """The position of the party of that name; KeyError if there is none."""
        for index, party in enumerate(self.parties):
            if party.name == name:
                return index
        raise KeyError(name)
