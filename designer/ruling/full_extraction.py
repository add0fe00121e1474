"""Full extraction by side bets: correlated types let the designer take every gain.

    t_i(theta) = pivotal payment + z_i(theta_-i),     E[z_i | theta_i = a] = U_i(a) for every a

U_i(a) is what the pivotal rule leaves type a over staying out. The bet z_i depends on the
others' reports alone, so truth stays dominant; beliefs that differ from type to type make it
cost each type exactly its own gain. With w(a, theta_-i) the joint weights as a matrix P of
T_i rows, the smallest such bet is z = P' (P P')^-1 (w U): a rational linear system, solvable
for every U exactly if the rows of P are linearly independent: the spanning condition. Bets can
dwarf the gains they take: their size is shown, and interim participation is all they respect.

Source: J. Cremer and R. P. McLean (1988), Full extraction of the surplus in Bayesian and dominant
strategy auctions, Econometrica 56:1247-1257, Theorem 1 (from memory). Their Theorem 2 asks less
for Bayesian honesty: bayesian_full_extraction.py.
"""

from __future__ import annotations

from fractions import Fraction
from typing import Any

import numpy as np

from designer.ruling import checks
from designer.ruling.amounts import Amounts, stacked
from designer.ruling.groves import others
from designer.ruling.kinds import Built, Refusal, Rule
from designer.ruling.pivotal import best_without
from designer.ruling.profiles import (
    TIES,
    certain,
    chosen,
    efficient,
    independent,
    outside,
    split,
    total_worth,
)
from designer.setting.exact import decimal, text
from designer.setting.setting import IntArray, Setting
from designer.table import Table, held, largest


def beliefs(setting: Setting, party: int) -> IntArray:
    """Joint weights by own type and the others' profile: int, (T_i, N/T_i)."""
    before, own, after = split(setting, party)
    cube = setting.weights.reshape(before, own, after)
    return np.ascontiguousarray(np.moveaxis(cube, 1, 0)).reshape(own, before * after)


def _gram(rows: IntArray) -> Any:
    """P P' as an exact FLINT matrix."""
    from flint import fmpz_mat

    bound = (largest(rows) + 1) ** 2 * rows.shape[1]
    product = held(rows, bound) @ held(rows, bound).T
    return fmpz_mat(product.tolist())


def spanning(setting: Setting) -> Refusal | None:
    """Check that every party's beliefs are linearly independent across its types."""
    for i, party in enumerate(setting.parties):
        rank = int(_gram(beliefs(setting, i)).rank())
        if rank < party.size:
            return Refusal(
                "beliefs about the others that are linearly independent across types",
                f"{party.name}'s, of rank {rank} for {party.size} types",
                "Independent types never meet it: use optimal-auction or "
                "revenue-greatest-efficient."
                if independent(setting)
                else "Use bayesian-full-extraction, which asks less of the beliefs.",
            )
    return None


def bet(setting: Setting, party: int, gain: Amounts) -> Amounts:
    """Find z_i with E[z_i | a] = E[gain | a] for every type a, smallest in squares: (N,)."""
    from flint import fmpz_mat

    rows = beliefs(setting, party)
    before, own, after = split(setting, party)
    gains = np.moveaxis(gain.num.reshape(before, own, after), 1, 0).reshape(own, -1)
    bound = (largest(gains) + 1) * (largest(rows) + 1) * gains.shape[1]
    owed = (held(gains, bound) * held(rows, bound)).sum(axis=1)
    solution = _gram(rows).solve(fmpz_mat([[int(value)] for value in owed]))
    y = Amounts.of(
        [Fraction(int(entry.p), int(entry.q)) for entry in (solution[a, 0] for a in range(own))]
    )
    bound = (largest(y.num) + 1) * (largest(rows) + 1) * own
    z = (held(y.num, bound) @ held(rows, bound)).reshape(before, 1, after)
    over_all = np.broadcast_to(z, (before, own, after)).reshape(-1)
    return Amounts(over_all, y.den * gain.den).lowest()


def sized(setting: Setting, party: str, bets: Amounts) -> str:
    """Say how large a party's bets are."""
    size = Fraction(largest(bets.num), bets.den)
    if len(text(size)) >= 20:
        return f"{party} bets up to about {decimal(size)} {setting.money} on the others."
    beside = "" if size.denominator == 1 else f" (about {decimal(size)})"
    return f"{party} bets up to {text(size)} {setting.money}{beside} on the others."


def build(setting: Setting) -> Built:
    """Build the pivotal rule with the bets that take its gains back."""
    choice = efficient(setting)
    welfare = total_worth(setting)
    reached = chosen(welfare, choice)
    pays, notes = [], [TIES]
    for i, party in enumerate(setting.parties):
        rest = others(setting, welfare, i)
        best = best_without(rest)
        bets = bet(setting, i, reached - best - outside(setting, i))
        notes.append(sized(setting, party.name, bets))
        pays.append(best - chosen(rest, choice) + bets)
    return Built(Table(certain(setting, choice), 1, *stacked(pays)), tuple(notes))


RULE = Rule(
    name="full-extraction",
    source="Cremer and McLean 1988",
    assumes="private worths; beliefs that differ enough from type to type; risk is no object",
    checks=(checks.tabulated, checks.private, spanning),
    build=build,
)
