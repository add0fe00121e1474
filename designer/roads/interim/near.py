"""From an interior point to the rules that carry the optimum, and the corner they form.

At the prices of the interior point one option is best at all profiles but a few. Those few,
and some that come close, become unknowns of a small program of their own: the chance of each
other option there. A corner of it mixes options at few profiles, by one common random number:
an option is taken while the number lies in its stretch of [0, 1]. Between two ends of
stretches nothing changes, so a slice with R ends needs R + 1 rules, all alike but for
exceptions, and what they take is known without another pass.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from designer.engines.highs import HIGHS
from designer.engines.report import BASIC, UPPER, Basis, Report
from designer.engines.watch import Watch
from designer.program.linear import LinearProgram
from designer.roads.interim.barrier import Interior
from designer.roads.interim.live import Duals
from designer.roads.interim.master import Column, Master, rough_rule
from designer.roads.interim.rule import Listed, Move, Rule
from designer.roads.interim.small import Other, Small

FINE = 40
"""Bits of the prices as integers."""
CLOSE = 1e-2
"""Share of the money at stake that an option may lack and still be looked at."""
AWAY = 1e-9
"""Share of it by which another option must be better to join the small program."""
JOIN = 1_000
"""Profiles that join it at once."""
ROUNDS = 50
"""Times that some do, at most."""
MOST = 10_000
"""Options in it with which it has grown too large."""


@dataclass(frozen=True, eq=False)
class Corner:
    """The columns of the master to keep, in order, and the basis they come with, if any."""

    columns: list[Column]
    basis: Basis | None


@dataclass(frozen=True)
class Hinted:
    """Says what basis to look at first, and leaves the rest to HiGHS."""

    basis: Basis

    @property
    def name(self) -> str:
        """HiGHS's: the basis is its own."""
        return HIGHS.name

    def solve(
        self,
        lp: LinearProgram,
        watch: Watch,
        *,
        basis: Basis | None = None,
        tolerance: float | None = None,
    ) -> Report:
        """The basis, as if it were optimal: `prove` repairs one that is not."""
        return Report("optimal", self.name, basis=basis or self.basis)


@dataclass(eq=False)
class _Slice:
    """The others of one slice, profile by profile."""

    at: dict[tuple[int, ...], list[Other]] = field(default_factory=dict)

    def rules(self) -> list[list[Other]]:
        """Per stretch of the random number what differs from the first rule."""
        ends: list[tuple[float, int]] = []
        for others in self.at.values():
            level = 0.0
            for other in others:
                level += other.chance
                if other.ends:
                    ends.append((level, other.column))
        order = [column for _, column in sorted(ends)]
        found = []
        for step in range(len(order) + 1):
            gone = set(order[:step])
            taken = (self._taken(others, gone) for others in self.at.values())
            found.append([other for other in taken if other is not None])
        return found

    def _taken(self, others: list[Other], gone: set[int]) -> Other | None:
        """The first other whose stretch has not ended; None for the first rule's option."""
        for other in others:
            if other.basic:
                if other.column not in gone:
                    return other
            elif other.chance > 0.5:
                return other
        return None


def corner_near(master: Master, found: Interior, watch: Watch) -> Corner | None:
    """List rules near an interior point; None where the small program has no optimum.

    Raises Stopped as `watch` says.
    """
    setting = master.setting
    prices = Duals(found.prices, np.zeros(0), 0.0)
    rule = rough_rule(setting, master.first(), prices, FINE)
    counts = master.count(rule)
    master.add(Listed(rule, counts), [])
    first = len(master.listed) - 1
    draft, program = master.program([(g, first) for g in range(master.slices)])
    small = Small(master, draft.merged, program)
    small.add(_others(master, found, rule))
    small.hint(found.tight)
    if not _grown(small, found, rule, watch):
        return None
    columns_at, rows_at = small.read()
    slices = [_Slice() for _ in range(master.slices)]
    for other in small.others:
        g = 0 if master.lead is None else other.types[master.lead]
        slices[g].at.setdefault(other.types, []).append(other)
    kept: list[Column] = []
    for g, own in enumerate(slices):
        for differs in own.rules():
            if not differs:
                kept.append((g, first))
                master.columns.append((g, first))
                continue
            moves: list[Move] = [(one.types, one.before, one.after) for one in differs]
            other_rule = Rule(rule.indices, tuple((one.types, one.after) for one in differs))
            listed = Listed(other_rule, counts.moved(setting, master.lead, moves))
            kept += [master.columns[j] for j in master.add(listed, [g])]
    base = columns_at[master.slices :]
    status = np.concatenate([np.full(len(kept), BASIC, dtype=np.int8), base])
    return Corner(kept, Basis(status, rows_at))


def _grown(small: Small, found: Interior, rule: Rule, watch: Watch) -> bool:
    """Solve the small program until no profile speaks for an option that is not in it.

    Whether it comes to that.
    """
    setting, cube = small.master.setting, found.cube
    index = rule.indices[-1]
    tables = [np.asarray(table, dtype=np.float64) for table in index.parties]
    tables[0] = tables[0] + np.asarray(index.options, dtype=np.float64)
    taken = cube.taken(np.vstack(tables))
    for _ in range(ROUNDS):
        if not small.solve(watch):
            return False
        types, best = cube.better(taken, small.prices(), AWAY * found.money, small.codes(), JOIN)
        if not len(types):
            return True
        if len(small.others) > MOST:
            return False
        takes = rule.decides(setting, types)[0].argmax(axis=1)
        small.add(
            [
                Other(tuple(at), int(before), int(after))
                for at, before, after in zip(types.tolist(), takes, best, strict=True)
                if before != after
            ]
        )
    return False


def _others(master: Master, found: Interior, rule: Rule) -> list[Other]:
    """What else may be taken at the profiles that come close to a tie."""
    takes = rule.decides(master.setting, found.profiles)[0].argmax(axis=1)
    # Chance times lack is about the same everywhere: the larger of the two says which is 0.
    taken_at = found.chances > found.lacks / found.money
    seen = taken_at | (found.lacks <= CLOSE * found.money)
    listed: list[Other] = []
    for row, taken in enumerate(takes):
        types = tuple(int(a) for a in found.profiles[row])
        for k in np.flatnonzero(seen[row]):
            if k != taken:
                other = Other(types, int(taken), int(k), float(found.chances[row, k]))
                if taken_at[row, k]:
                    other.stands = BASIC if taken_at[row, taken] else UPPER
                listed.append(other)
    return listed
