"""Finding rules: column generation in floats, every rule with exact counts.

Prices are smoothed (Wentges 1997): rules are looked for half-way between the master's
multipliers and those with the best bound so far. Nothing here is believed.
"""

from __future__ import annotations

import numpy as np

from designer.engines.watch import Watch
from designer.roads.interim.live import Duals, Live
from designer.roads.interim.master import COARSE, Master, rough_rule, rough_worth
from designer.roads.interim.rule import Listed
from designer.roads.interim.symmetry import alike_parties, even_tables

SMOOTHING = 0.5
FINE = 40
CLOSE = 1e-9
"""Relative distance of value and bound at which the exact stage takes over."""
NEAR = 1e-7
"""Relative reduced cost up to which a listed rule is handed to the exact stage."""


class Search:
    """A warm master and the rules it has asked for."""

    def __init__(self, master: Master, watch: Watch) -> None:
        """Load the master's rows; its listed rules come in as columns."""
        self.master, self.watch = master, watch
        posed = master.posed([])
        self.live = Live(
            master.setting, posed.program, posed.asked, master.lead, posed.draft.merged
        )
        self.columns: list[int] = []

    def run(self) -> list[int]:
        """Add rules until none improves; the columns worth an exact look.

        All of them where the engine has nothing to say.
        """
        centre: Duals | None = None
        bits, added = COARSE, False
        while True:
            for g, place in self.master.columns[len(self.columns) :]:
                self.columns.append(self.live.add(g, self.master.listed[place].counts))
            self.watch.tell("looking for better rules, listed", len(self.master.listed))
            if self.live.solve(self.watch) != "optimal":
                return list(range(len(self.columns)))
            if added and not self.live.moved:
                break  # what improves by less than the engine's tolerance moves nothing
            if self.live.standing and self.live.value <= CLOSE:
                self.live.release()
                centre, added = None, False
                continue
            out = self.live.duals()
            size = 1.0 + abs(out.bound)
            if centre is not None and out.bound - centre.bound <= CLOSE * size:
                break
            asked = [out] if centre is None else [out.mixed(centre, SMOOTHING), out]
            found = False
            for duals in asked:
                found, bound = self._price(duals, out, bits, size)
                if centre is None or bound.bound > centre.bound:
                    centre = bound
                if found:
                    break
            added = found
            if found:
                continue
            if bits == FINE:
                break
            bits = FINE
        return self._worth_keeping()

    def _price(self, duals: Duals, out: Duals, bits: int, size: float) -> tuple[bool, Duals]:
        """List the best rule at some multipliers where it improves at the master's own.

        Whether it does anywhere, and the multipliers with the slices at the best rule's prices.
        """
        master = self.master
        groups = alike_parties(master.setting, master.terms, master.lead)
        duals = Duals(even_tables(groups, duals.parties), duals.slices, duals.level)
        rule = rough_rule(master.setting, master.first(), duals, bits)
        counts = master.count(rule)
        gain = rough_worth(master.setting, out, counts) - out.slices
        better = [int(g) for g in np.flatnonzero(gain > 1e-2 * CLOSE * size)]
        if better:
            master.add(Listed(rule, counts), better)
        best = Duals(duals.parties, rough_worth(master.setting, duals, counts), duals.level)
        return bool(better), best

    def _worth_keeping(self) -> list[int]:
        """Shares in use, and those that could come into use at no cost."""
        reduced, levels = self.live.reduced(), self.live.levels()
        size = 1.0 + abs(self.live.value)
        return [
            j
            for j, column in enumerate(self.columns)
            if levels[column] > 0 or reduced[column] <= NEAR * size
        ]
