"""A deal or nothing: two decisions, one of which leaves everyone where staying out would.

Trade between two and a joint project are of this shape. Each party's net worth of the deal is
one number d_i(a), its worth of the deal less its worth of staying out.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from designer.ruling.amounts import Amounts, stacked
from designer.ruling.kinds import Refusal
from designer.ruling.profiles import by_profile
from designer.setting.setting import IntArray, Setting
from designer.table import Table


@dataclass(frozen=True, eq=False)
class Deal:
    """The positions of the two decisions, the outlay of the deal, and d_i(a) by type."""

    off: int
    on: int
    cost: Fraction
    net: tuple[Amounts, ...]


def deal(setting: Setting) -> Deal | Refusal:
    """Recognise a deal; a Refusal where the setting has another shape."""
    if len(setting.options) == 2:
        for off in (0, 1):
            same = all((party.value[:, off] == party.outside).all() for party in setting.parties)
            if same and not setting.outlay[off]:
                on = 1 - off
                return Deal(
                    off,
                    on,
                    Fraction(int(setting.outlay[on]), setting.grain),
                    tuple(
                        Amounts(party.value[:, on] - party.outside, setting.grain)
                        for party in setting.parties
                    ),
                )
        found = "two, neither of which does that at no cost"
    else:
        found = str(len(setting.options))
    return Refusal(
        "two decisions, one of which costs nothing and leaves everyone where staying out would",
        found,
        "Cut the question down to one deal or nothing, or ask `designer pose`.",
    )


def a_deal(setting: Setting) -> Refusal | None:
    """Check that the setting is a deal or nothing."""
    found = deal(setting)
    return found if isinstance(found, Refusal) else None


def a_trade(setting: Setting) -> Refusal | None:
    """Check that the deal is a trade: one gives up what the other takes, at no cost."""
    found = deal(setting)
    if isinstance(found, Refusal):
        return found
    if len(found.net) == 2 and not found.cost and buyer(found) is not None:
        return None
    return Refusal(
        "a trade between two: one never loses by it, the other never gains, and it costs nothing",
        "another kind of deal",
        "Use posted-price or equal-shares-with-unanimity, which take any deal.",
    )


def buyer(found: Deal) -> int | None:
    """Find who buys: 0 or 1; None where it is no trade."""
    for i in (0, 1):
        if (found.net[i].num >= 0).all() and (found.net[1 - i].num <= 0).all():
            return i
    return None


def recognised(setting: Setting) -> Deal:
    """Give the deal of a setting that is known to have one."""
    found = deal(setting)
    if isinstance(found, Refusal):
        raise ValueError(str(found))
    return found


def nets(setting: Setting, found: Deal) -> tuple[IntArray, int]:
    """d_i at every profile: int (n, N), and the denominator."""
    return stacked([by_profile(setting, i, net) for i, net in enumerate(found.net)])


def priced(setting: Setting, found: Deal, prices: list[Fraction]) -> Table:
    """Do the deal where everyone's net worth covers her price, and charge the prices then."""
    accepts = np.ones(setting.profiles, dtype=bool)
    for i, price in enumerate(prices):
        enough = Amounts.of([price]).times(-1) + found.net[i]
        accepts &= by_profile(setting, i, enough).num >= 0
    agreed = accepts.astype(np.int64)
    decides = np.zeros((setting.profiles, 2), dtype=np.int64)
    decides[:, found.on] = agreed
    decides[:, found.off] = 1 - agreed
    return Table(decides, 1, *stacked([Amounts(agreed).times(price) for price in prices]))
