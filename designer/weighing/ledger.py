"""Why, in expected terms: where the money goes, line by line, summing to the gap exactly.

Whatever the payments, in expectation

    pot = sum_i E[worth_i] - E[outlay] - sum_i E[u_i],

and each party's expected utility is what staying out is worth to it plus its information
rent, E[u_i] = sum_a P(a) * (outside_i(a) + rent_i(a)). The ledger fills this identity with the
table that leaves the parties as little as honesty and participation allow: no payment rule
leaves more in the pot. What is then still missing is the gap. If the demands ask more of the
pot than its expectation (balance in every case with correlated types, dominant honesty), the
last line is what that adds.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from fractions import Fraction

from designer.auditing import audit
from designer.demands.terms import Terms
from designer.setting.setting import Setting
from designer.table import Table
from designer.weighing.oracle import Oracle
from designer.weighing.prices import Price
from designer.weighing.relaxed import Relaxed


@dataclass(frozen=True)
class Entry:
    """One line: what it is, whose, and the expected money it adds (positive) or takes."""

    kind: str
    party: str
    type: str
    chance: Fraction
    each: Fraction
    amount: Fraction


@dataclass(frozen=True)
class Ledger:
    """Entries that sum to `balance`; with the outside money allowed, minus the gap."""

    entries: tuple[Entry, ...]
    allowed: Fraction
    gap: Fraction
    proved: bool
    reason: str = ""


def ledger(oracle: Oracle, terms: Terms, prices: Sequence[Price]) -> Ledger:
    """The ledger of what the pot can hold at most, down to the outside money that is missing."""
    alone = replace(terms, balance="none")
    relaxed = Relaxed(oracle.setting, alone, {}, oracle.engine, oracle.watch)
    answer = relaxed.minimise({"pot": Fraction(-1)})
    table = relaxed.table(answer)
    if answer.status != "optimal" or answer.at is None or table is None:
        reason = {
            "infeasible": "no payments meet the other demands, balanced or not",
            "unbounded": "the pot can be filled without end: nothing is missing in expectation",
        }.get(answer.status, answer.reason)
        return Ledger((), terms.subsidy, Fraction(0), answer.proved, reason)
    entries = _entries(oracle, relaxed, table)
    pot = answer.at["pot"]
    needed = next((p for p in prices if p.relax == "outside-money"), None)
    proved = answer.proved
    if needed is not None and needed.amount is not None:
        proved = proved and needed.proved
        extra = needed.amount + pot
        if needed.amount > 0 and extra > 0:
            entries.append(Entry("in-every-case", "", "", Fraction(1), -extra, -extra))
            pot -= extra
    return Ledger(tuple(entries), terms.subsidy, max(Fraction(0), -pot - terms.subsidy), proved)


def _entries(oracle: Oracle, relaxed: Relaxed, table: Table) -> list[Entry]:
    setting, one = oracle.setting, Fraction(1)
    standings = audit(setting, table).standings
    worth: dict[str, Fraction] = {}
    for s in standings:
        worth[s.party] = worth.get(s.party, Fraction(0)) + s.probability * s.worth
    entries = [Entry("worth", party, "", one, total, total) for party, total in worth.items()]
    outlay = _expected_outlay(setting, table)
    if outlay:
        entries.append(Entry("outlay", "", "", one, -outlay, -outlay))
    for s in standings:
        if s.outside:
            entries.append(
                Entry(
                    "outside",
                    s.party,
                    s.type,
                    s.probability,
                    -s.outside,
                    -s.probability * s.outside,
                )
            )
    for s in standings:
        if s.gain:
            entries.append(
                Entry("rent", s.party, s.type, s.probability, -s.gain, -s.probability * s.gain)
            )
    return entries


def _expected_outlay(setting: Setting, table: Table) -> Fraction:
    weights = setting.weights.astype(object)
    spent = (table.decides.astype(object) * setting.outlay.astype(object)).sum(axis=1)
    total = int((spent * weights).sum())
    return Fraction(total, setting.total_weight * table.decides_den * setting.grain)
