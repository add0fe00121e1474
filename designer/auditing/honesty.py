"""Incentive margins from the definitions: what the closest lie loses against the truth."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import numpy.typing as npt

from designer.auditing.view import View
from designer.setting.setting import IntArray
from designer.table import held, largest


@dataclass(frozen=True)
class Lie:
    """The closest lie of a true type: what is told, what it loses, at which others' report."""

    true: int
    told: int
    margin: Fraction
    others: int | None = None


def bayesian(view: View) -> list[Lie]:
    """Find the closest lie of every type, in expectation over the others given that type.

    margin(a) = min over b != a of
        sum_o P(o | a) [ sum_k (x_k(a, o) - x_k(b, o)) v(k, a, o) - t(a, o) + t(b, o) ]

    Worth is of the true types, decision and payment of the reported ones (convention 4).
    Empty when the party has one type.
    """
    if view.types == 1:
        return []
    told = _told(view)
    truth = told.diagonal()
    lies = []
    for a in range(view.types):
        row = truth[a] - told[a]
        rest = np.delete(row, a)
        b = int(rest.argmin())
        margin = Fraction(int(rest[b]), view.given[a] * view.den)
        lies.append(Lie(a, b + (b >= a), margin))
    return lies


def _told(view: View) -> IntArray:
    """U[a, b] = given[a] den E[utility of a saying b | a]: (T, T)."""
    bound = view.bound * max(view.given)
    odds = held(view.odds, bound)
    chosen, pays, value = (held(part, bound) for part in (view.chosen, view.pays, view.value))
    private, blind = value.shape[1] == 1, odds.shape[0] == 1
    total: IntArray = held(-(pays @ odds.T).T, bound)
    if blind:
        # The same expected payment and decision whoever tells the lie.
        total = total + np.zeros((view.types, 1), dtype=np.int64)
    for k in range(chosen.shape[2]):
        worth, lottery = value[..., k], chosen[..., k]
        if not worth.any() or not lottery.any():
            continue
        if private and blind:
            total = total + worth * (lottery @ odds[0])[None, :]
        elif private:
            total = total + worth * (odds @ lottery.T)
        else:
            total = total + (odds * worth) @ lottery.T
    return total


def dominant(view: View, counts: npt.NDArray[np.bool_] | None) -> list[Lie]:
    """Find the closest lie of every type at any report of the others.

    margin(a) = min over b != a and o of
        sum_k (x_k(a, o) - x_k(b, o)) v(k, a, o) - t(a, o) + t(b, o)

    counts  bool, (T, O): the true profiles that matter (convention 5); None for all

    What a lie brings depends on what is told only through the lottery and the payment it
    leads to. So where there are few lotteries it is enough to know, for each lottery and
    report of the others, the cheapest way to it, and the next cheapest, in case the
    cheapest is the truth itself.
    """
    if view.types == 1:
        return []
    which, lotteries = _lotteries(view.chosen)
    if 3 * len(lotteries) < view.types:
        margins, told = _by_lottery(view, which, lotteries)
    else:
        margins, told = _by_type(view)
    if counts is not None:
        margins = np.where(counts, margins, 4 * view.bound)
    lies = []
    for a in range(view.types):
        o = int(margins[a].argmin())
        if counts is not None and not counts[a, o]:
            continue
        lies.append(Lie(a, int(told[a, o]), Fraction(int(margins[a, o]), view.den), o))
    return lies


def _by_type(view: View) -> tuple[IntArray, npt.NDArray[np.int64]]:
    """Find the smallest margin over all lies b, and that b, for each (a, o)."""
    margins = np.empty_like(view.pays)
    told = np.empty(view.pays.shape, dtype=np.int64)
    for a in range(view.types):
        here: IntArray = view.truthful[a] + view.pays
        for k in range(view.chosen.shape[2]):
            if view.value[a, :, k].any():
                here = here - view.chosen[..., k] * view.value[a, :, k]
        here[a] = 4 * view.bound
        told[a] = here.argmin(axis=0)
        margins[a] = here.min(axis=0)
    return margins, told


def _by_lottery(
    view: View, which: npt.NDArray[np.int64], lotteries: IntArray
) -> tuple[IntArray, npt.NDArray[np.int64]]:
    """Find the same by way of the lotteries that the lies lead to."""
    never = view.bound
    everyone = np.arange(view.types)[:, None]
    at = np.arange(view.others)
    best: IntArray = np.full_like(view.pays, 4 * never)
    told = np.zeros(view.pays.shape, dtype=np.int64)
    for number, lottery in enumerate(lotteries):
        price = np.where(which == number, view.pays, never)
        first = price.argmin(axis=0)
        cheapest = price[first, at]
        price[first, at] = never
        second = price.argmin(axis=0)
        next_cheapest = price[second, at]
        honest = everyone == first
        lie = np.where(honest, second, first)
        cost = np.where(honest, next_cheapest, cheapest)
        worth = view.worth(lottery.reshape(1, 1, -1))
        margin = np.where(cost == never, 4 * never, view.truthful - worth + cost)
        closer = margin < best
        best = np.where(closer, margin, best)
        told = np.where(closer, lie, told)
    return best, told


def _lotteries(chosen: IntArray) -> tuple[npt.NDArray[np.int64], IntArray]:
    """List the distinct lotteries, and which of them each cell holds: (T, O) and (C, K)."""
    cells = chosen.reshape(-1, chosen.shape[-1])
    if cells.dtype == np.int64 and int(cells.min()) >= 0:
        base = largest(cells) + 1
        if base ** cells.shape[1] < 2**62:  # a lottery packs into one number
            packed = np.zeros(len(cells), dtype=np.int64)
            for k in range(cells.shape[1]):
                packed = packed * base + cells[:, k].astype(np.int64)
            _, first, inverse = np.unique(packed, return_index=True, return_inverse=True)
            return inverse.reshape(chosen.shape[:-1]), cells[first]
    known: dict[tuple[int, ...], int] = {}
    ids = [known.setdefault(tuple(row), len(known)) for row in cells.tolist()]
    rows = np.array(list(known), dtype=object).reshape(len(known), -1)
    which = np.array(ids, dtype=np.int64).reshape(chosen.shape[:-1])
    return which, rows if cells.dtype == object else rows.astype(np.int64)
