"""Which way to count what a rule takes: the cheapest of six, all exact.

blocks   a pass over all profiles              any setting
halves   pairs of half-profiles                two to four options
sums     distributions of sums                 two options, sums of small range
items    products of cumulative weights        every option concerns at most one party
units    sums of such products                 options are all sets of some sizes of parties
alike    one party for several, by multisets   parties of equal index and weights
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from designer.engines.watch import Stopped, Watch
from designer.roads.interim import alike, blocks, halves, items, sums, units
from designer.roads.interim.additive import additive, words
from designer.roads.interim.rule import Counts, Index, Rule, welfare_index
from designer.setting.setting import Setting

MOST = 600.0
"""Seconds that one count may be expected to take."""
QUICK = 0.01
"""Seconds below which the two general ways are taken without looking further."""
SLICED = 0.5
"""Seconds up to which counts are split by the lead party's types."""
CELLS = 50_000
"""Numbers that the split counts of one rule may have."""


class TooMany(Stopped):
    """No way of counting is quick enough for a rule."""

    reason = "there are too many profiles to count by any of the ways that are known"
    remedy = "take fewer types, coarser worths or another decision demand"


def count(setting: Setting, rule: Rule, lead: int | None, watch: Watch) -> Counts:
    """The exact counts of a rule, slice by slice of the lead party's types (None: one slice).

    Raises TooMany where that would take longer than MOST, and Stopped as `watch` says.
    """
    if rule.exceptions:
        return counts_of(setting, [rule], lead, watch)[0]
    way = _way(setting, rule, lead)
    if way == "alike":
        return alike.count(setting, rule, lead, watch)
    if way == "units":
        return units.count(setting, rule, watch)
    if way == "items":
        return items.count(setting, rule, watch)
    if way == "sums":
        return sums.count(setting, rule, watch)
    if way == "halves":
        return halves.count(setting, rule, lead, watch)
    return blocks.count(setting, rule, lead, watch)


def counts_of(
    setting: Setting, rules: Sequence[Rule], lead: int | None, watch: Watch
) -> list[Counts]:
    """The exact counts of several rules: those that differ in exceptions alone in one pass."""
    passes: dict[int, Counts] = {}
    found = []
    for rule in rules:
        plain = Rule(rule.indices)
        if id(rule.indices) not in passes:
            passes[id(rule.indices)] = count(setting, plain, lead, watch)
        counts = passes[id(rule.indices)]
        if rule.exceptions:
            types = np.array([at for at, _ in rule.exceptions], dtype=np.int64)
            before = plain.decides(setting, types)[0].argmax(axis=1)
            moves = [
                (at, int(old), new)
                for (at, new), old in zip(rule.exceptions, before, strict=True)
                if old != new
            ]
            counts = counts.moved(setting, lead, moves)
        found.append(counts)
    return found


def _way(setting: Setting, rule: Rule, lead: int | None) -> str:
    if not rule.indices:
        return "blocks"
    ways = {"blocks": blocks.work(setting), "halves": halves.work(setting, lead)}
    if ways["blocks"] > QUICK:
        ways["blocks"] *= 3 * len(words(np.zeros(1, dtype=object), additive(rule).reach)) - 2
    if min(ways.values()) > QUICK and lead is None:
        ways |= {"sums": sums.work(setting, rule), "items": items.work(setting, rule)}
        ways["units"] = units.work(setting, rule)
    if min(ways.values()) > QUICK:
        ways["alike"] = alike.work(setting, rule, lead)
    way = min(ways, key=lambda name: ways[name])
    if ways[way] > MOST:
        raise TooMany
    return way


def structured(setting: Setting, rule: Rule) -> bool:
    """Whether only the rule's own numbers make its count quick.

    A second index, which matters at ties alone, may do away with that: better to know first
    whether anything is tied.
    """
    if _way(setting, rule, None) not in ("sums", "items", "units"):
        return False
    ways = blocks.work(setting), halves.work(setting, None), alike.work(setting, rule, None)
    return min(ways) > SLICED


def tied(setting: Setting, rule: Rule, counts: Counts, watch: Watch) -> bool:
    """Whether the rule leaves a tie at some profile that only the order of options settles.

    The same rule with the order reversed takes, at every tied profile, an option that is
    listed later, and nothing else at any other: the totals agree if and only if no profile
    is tied.
    """
    if not rule.indices:
        return False
    if _way(setting, rule, None) == "units":
        return units.count(setting, rule, watch, last=True).totals() != counts.totals()
    options = len(setting.options)
    nothing = tuple(np.zeros((n, options), dtype=np.int64) for n in setting.shape)
    later = Rule((*rule.indices, Index(nothing, np.arange(options, dtype=np.int64))))
    if _way(setting, later, None) == "halves":
        return halves.totals(setting, later, watch) != counts.totals()
    return count(setting, later, None, watch).totals() != counts.totals()


def lead_party(setting: Setting) -> int | None:
    """The party whose types split the counts; None where split counts would take long."""
    lead = setting.shape.index(max(setting.shape))
    cells = setting.shape[lead] * sum(setting.shape) * len(setting.options)
    quick = min(blocks.work(setting), halves.work(setting, lead)) <= SLICED
    return lead if quick and cells <= CELLS else None


def too_many(setting: Setting, decision: str) -> bool:
    """Whether no way of counting is quick enough, as far as the setting alone tells."""
    if decision == "table":
        return False
    if min(blocks.work(setting), halves.work(setting, None)) <= MOST:
        return False
    efficient = Rule((welfare_index(setting),))
    ways = [items.work(setting, efficient)]
    ways += [sums.work(setting, efficient), alike.work(setting, efficient, None)]
    ways.append(units.work(setting, efficient))
    return min(ways) > MOST
