"""Why, in expected terms: where the money goes, line by line, summing to the gap exactly.

Whatever the payments, in expectation

    pot = sum_i E[worth_i] - E[outlay] - sum_i E[u_i],

and each party's expected utility is what staying out is worth to it plus what it gains over
that, E[u_i] = sum_a P(a) (outside_i(a) + gain_i(a)); the gain is the type's information rent
where participation binds somewhere. The ledger fills this identity with the table that leaves
the most in the pot: honesty and participation allow no payments that leave more. What is then
missing is the gap. If the pot is asked for more than its expectation (balance in every case
with correlated types or dominant honesty), one line says what that adds.

The designer's own worth decides what is efficient, but it is no money and has no line.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from fractions import Fraction

import numpy as np

from designer.setting.setting import IntArray, Setting
from designer.weighing.mix import Mix
from designer.weighing.prices import Price
from designer.weighing.relaxed import Answer, Relaxed

ZERO, ONE = Fraction(0), Fraction(1)


@dataclass(frozen=True)
class Entry:
    """One line: the expected money it brings (positive) or takes.

    kind    "worth" of the decision to a party, "outlay", "outside": what staying out is worth
            to a type, "rent": what the type gains over that, "in-every-case"
    chance  the probability of the type, 1 without one; amount = chance * each
    """

    kind: str
    party: str
    type: str
    chance: Fraction
    each: Fraction

    @property
    def amount(self) -> Fraction:
        """The expected money."""
        return self.chance * self.each


@dataclass(frozen=True)
class Ledger:
    """Entries, the outside money allowed, and the gap: allowed + sum of entries = -gap.

    `entries` is empty where no expected money is missing; `reason` then says what the matter
    is instead. A gap of 0 or less means that money, on average, is not what is missing.
    """

    entries: tuple[Entry, ...]
    allowed: Fraction
    gap: Fraction
    proved: bool
    reason: str = ""

    @property
    def total(self) -> Fraction:
        """What the entries and the allowed money come to; minus the gap."""
        return self.allowed + sum((entry.amount for entry in self.entries), ZERO)


def ledger(mix: Mix, needed: Price | None) -> Ledger:
    """The ledger of the most the pot can hold, down to the outside money that is missing.

    `needed` is the price "outside-money", if it is known.
    """
    terms = replace(mix.terms, balance="none")
    relaxed = Relaxed(mix.setting, terms, {}, mix.engine, mix.watch)
    answer = relaxed.minimise({"pot": Fraction(-1)})
    allowed = mix.terms.subsidy
    if answer.status != "optimal" or answer.at is None:
        reason = {
            "infeasible": "no payments meet the other demands, balanced or not",
            "unbounded": "on average the pot can hold any amount: what is missing is not money",
        }.get(answer.status, answer.reason)
        return Ledger((), allowed, ZERO, answer.proved, reason)
    entries = _entries(mix.setting, relaxed, answer)
    proved, missing, reason = answer.proved, -answer.at["pot"], ""
    if needed is not None and needed.becomes is not None:
        proved = proved and needed.proved
        extra = needed.becomes - max(missing, allowed)
        if extra > 0:
            taken = needed.becomes - missing
            entries.append(Entry("in-every-case", "", "", ONE, -taken))
            missing = needed.becomes
    if missing <= allowed:
        reason = "on average there is money enough: what is missing is not money"
    return Ledger(tuple(entries), allowed, missing - allowed, proved, reason)


def _entries(setting: Setting, relaxed: Relaxed, answer: Answer) -> list[Entry]:
    """Worths and outlay, then what each type is left with."""
    chances, den = relaxed.decisions(answer)
    draft, primal = relaxed.draft, answer.primal
    if primal is None:
        raise ValueError("no optimum, no ledger")
    weights = setting.weights.astype(object)
    total, grain = setting.total_weight, setting.grain
    paid = primal.fractions()
    entries, standings = [], []
    for i, party in enumerate(setting.parties):
        worth = (chances * draft.value_at(i, draft.everywhere).astype(object)).sum(axis=1) * weights
        outside = draft.outside_at(i, draft.everywhere).astype(object) * weights
        columns = draft.expected_pay(i)
        own = draft.type_at(i, draft.everywhere)
        entries.append(
            Entry("worth", party.name, "", ONE, Fraction(int(worth.sum()), total * den * grain))
        )
        for a, kind in enumerate(party.types):
            mine = own == a
            mass = int(weights[mine].sum())
            staying = Fraction(_sum(outside[mine]), mass * grain)
            taking = Fraction(_sum(worth[mine]), mass * den * grain)
            gain = taking - paid.get(int(columns[a]), ZERO) - staying
            chance = Fraction(mass, total)
            standings.append((party.name, kind.label, chance, staying, gain))
    outlay = int(((chances * setting.outlay.astype(object)).sum(axis=1) * weights).sum())
    if outlay:
        entries.append(Entry("outlay", "", "", ONE, -Fraction(outlay, total * den * grain)))
    for what, place in (("outside", 3), ("rent", 4)):
        for row in standings:
            amount = row[place]
            if isinstance(amount, Fraction) and amount:
                entries.append(Entry(what, row[0], row[1], row[2], -amount))
    return entries


def _sum(values: IntArray) -> int:
    return int(np.sum(values)) if len(values) else 0
