"""The settled decision rule, profile by profile, and the profiles where efficiency is torn.

One pass in blocks: the inner parties' worths are summed once, the outer parties' types add
their worths to them. A profile where several options are equally efficient is *tied*; there
a choice among them is a parameter of the rule.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
import numpy.typing as npt

from designer.engines.watch import Watch
from designer.setting.setting import IntArray, Setting, integers

INNER = 1 << 16
"""Profiles of the inner parties held at once."""
ROOM = 2**61

Indices = npt.NDArray[np.int64]
Mask = npt.NDArray[np.bool_]


@dataclass(frozen=True, eq=False)
class Decided:
    """What is decided at every profile.

    palette  int, shape (P, K): the lotteries in use, numerators over `den`; a choice at a tie
             has an entry of its own, by what else is efficient there
    at       int, shape (N,): which of them, by profile
    tied     int, shape (M,): the tied profiles, ascending
    torn     bool, shape (M, K): the options that are efficient there
    choices  int, shape (M,): the option taken there, the likeliest one of a lottery
    kinds    int, shape (P - K, 1 + K): behind the palette's entries for ties, the option taken
             and which are efficient; empty with lotteries
    mixed    whether lotteries are taken at tied profiles: an entry is then one lottery
    """

    palette: IntArray
    den: int
    at: IntArray
    tied: Indices
    torn: Mask
    choices: Indices
    kinds: Indices
    mixed: bool = False

    def choosing(self, choices: IntArray) -> Decided:
        """The same rule with other choices at the tied profiles.

        Raises ValueError for a choice that is not efficient there.
        """
        rows = np.arange(len(self.tied))
        if choices.shape != self.tied.shape or not self.torn[rows, choices].all():
            raise ValueError("a choice at a tied profile is not efficient there")
        if not len(rows):
            return self
        options = self.torn.shape[1]
        kinds, place = distinct(np.column_stack([choices, self.torn]).astype(np.int64), options + 1)
        certain = np.eye(options, dtype=np.int64)
        at = self.at.astype(np.min_scalar_type(options + len(kinds)))
        at[self.tied] = options + place.ravel()
        palette = np.concatenate([certain, certain[kinds[:, 0]]])
        return Decided(palette, 1, at, self.tied, self.torn, choices.astype(np.int64), kinds)

    def mixing(self, lotteries: IntArray, den: int, of: IntArray) -> Decided:
        """The same rule with lotteries at the tied profiles.

        lotteries  int, shape (L, K), over den      of  int, shape (M,): which one is taken

        Raises ValueError for what is no lottery over the options that are efficient there.
        """
        options = self.torn.shape[1]
        if lotteries.shape[1:] != (options,) or of.shape != self.tied.shape:
            raise ValueError("the lotteries do not fit the tied profiles")
        if len(of) and not 0 <= int(of.min()) <= int(of.max()) < len(lotteries):
            raise ValueError("a tied profile names a lottery that is not there")
        if den < 1 or (lotteries < 0).any() or (lotteries.sum(axis=1) != den).any():
            raise ValueError("the chances of a lottery do not add up to one")
        if ((lotteries[of] != 0) & ~self.torn).any():
            raise ValueError("a lottery at a tied profile is not efficient there")
        held = integers(lotteries)
        certain = np.eye(options, dtype=held.dtype) * den
        likeliest = held.argmax(axis=1).astype(np.int64)
        # A lottery that is certain is the option itself, as at profiles without ties.
        sure = held.max(axis=1) == den
        entry = np.where(sure, likeliest, options + np.arange(len(held)))
        at = self.at.astype(np.min_scalar_type(options + len(held)))
        at[self.tied] = entry[of]
        none = np.zeros((0, options + 1), dtype=np.int64)
        palette = np.concatenate([certain, held])
        return Decided(palette, den, at, self.tied, self.torn, likeliest[of], none, True)

    def leaning(self, part: int) -> Decided:
        """One part in `part` of every choice at a tie given to the other options there.

        Shortest paths under it are shortest paths under the rule itself once `part` is large,
        and among those the ones that stay shortest when choices give way: the paths whose
        multipliers can prove a choice best.
        """
        options = self.torn.shape[1]
        torn = self.kinds[:, 1:]
        counts = torn.sum(axis=1) - 1
        shared = math.lcm(*(int(count) for count in counts))
        den = part * shared
        palette = self.palette.astype(object) * den
        for j, count in enumerate(counts):
            row = np.zeros(options, dtype=object)
            row[np.flatnonzero(torn[j])] = shared // int(count)
            row[int(self.kinds[j, 0])] = den - shared
            palette[options + j] = row
        return replace(self, palette=palette, den=den)


def decide(setting: Setting, decision: str, watch: Watch) -> Decided:
    """The given table, or the efficient rule that takes the first option listed where tied."""
    if decision == "table":
        return _given(setting)
    options, total = len(setting.options), setting.profiles
    at = np.zeros(total, dtype=np.min_scalar_type(options))
    tied: list[Indices] = []
    torn: list[Mask] = []
    for start, worth in _worths(setting, watch):
        best, pick = worth[0].copy(), np.zeros(len(worth[0]), dtype=at.dtype)
        torn_here = np.zeros(len(best), dtype=bool)
        for k in range(1, options):
            more, same = worth[k] > best, worth[k] == best
            pick[more] = k
            torn_here &= ~more
            torn_here |= same
            np.maximum(best, worth[k], out=best)
        at[start : start + len(pick)] = pick
        here = np.flatnonzero(torn_here)
        if len(here):
            tied.append(here.astype(np.int64) + start)
            torn.append(np.stack([w[here] == best[here] for w in worth], axis=1).astype(bool))
    where = np.concatenate(tied) if tied else np.zeros(0, dtype=np.int64)
    decided = Decided(
        np.eye(options, dtype=np.int64),
        1,
        at,
        where,
        np.concatenate(torn) if torn else np.zeros((0, options), dtype=bool),
        at[where].astype(np.int64),
        np.zeros((0, options + 1), dtype=np.int64),
    )
    return decided.choosing(decided.choices) if len(where) else decided


def _given(setting: Setting) -> Decided:
    if setting.rule is None:
        raise ValueError("the setting gives no decision rule")
    key = np.zeros(setting.profiles, dtype=np.int64)
    for column in setting.rule.T:
        values, place = np.unique(column, return_inverse=True)
        _, key = np.unique(key * len(values) + place, return_inverse=True)
    _, first = np.unique(key, return_index=True)
    return Decided(
        setting.rule[first],
        setting.rule_den,
        key.astype(np.min_scalar_type(len(first))),
        np.zeros(0, dtype=np.int64),
        np.zeros((0, len(setting.options)), dtype=bool),
        np.zeros(0, dtype=np.int64),
        np.zeros((0, len(setting.options) + 1), dtype=np.int64),
    )


def distinct(rows: Indices, base: int) -> tuple[Indices, Indices]:
    """The distinct rows of small numbers, ascending, and which of them each row is.

    base  more than any entry: rows are read as numbers in it where these stay below 2**62
    """
    if base ** rows.shape[1] >= 2**62:
        found, place = np.unique(rows, axis=0, return_inverse=True)
        return found, place.ravel()
    key = np.zeros(len(rows), dtype=np.int64)
    for column in rows.T:
        key = key * base + column
    _, first, place = np.unique(key, return_index=True, return_inverse=True)
    return rows[first], place


def _worths(setting: Setting, watch: Watch) -> Any:
    """Per block of consecutive profiles: the first profile, and total worth by option."""
    shape, options = setting.shape, len(setting.options)
    split, size = len(shape), 1
    while split and (size * shape[split - 1] <= INNER or split == len(shape)):
        split -= 1
        size *= shape[split]
    private = {i: p.value - p.value[:, :1] for i, p in enumerate(setting.parties) if not p.depends}
    shared = [p.value - p.value[:, :1] for p in setting.parties if p.depends]
    own = setting.worth - setting.outlay
    reach = sum(int(abs(v).max()) for v in (*private.values(), *shared, own - own[0]))
    dtype = np.int64 if reach < ROOM else object
    inner = []
    for k in range(options):
        total = np.full(1, own[k] - own[0], dtype=dtype)
        for i in range(split, len(shape)):
            add = private[i][:, k] if i in private else np.zeros(shape[i], dtype=np.int64)
            total = np.add.outer(total, add.astype(dtype)).ravel()
        inner.append(total)
    for block in range(math.prod(shape[:split])):
        start, rest = block * size, block
        offset = [0] * options
        for i in range(split - 1, -1, -1):
            rest, a = divmod(rest, shape[i])
            if i in private:
                offset = [o + int(v) for o, v in zip(offset, private[i][a], strict=True)]
        worth = [total + add for total, add in zip(inner, offset, strict=True)]
        for value in shared:
            part = value[start : start + size].astype(dtype)
            worth = [total + part[:, k] for k, total in enumerate(worth)]
        watch.tell(f"deciding {setting.profiles:,} profiles", start)
        yield start, worth
