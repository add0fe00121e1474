"""One mix of demand groups, any of which can be left out: what was learnt is kept.

Two programs hold all groups, one with the decision as demanded and one with it free; a subset
is posed by letting the rows and bounds of the other groups go. A certificate of impossibility
blames the groups whose rows it uses, and these alone collide; a point that was found is held
against the rows it was not asked to keep, and shows that these can be kept as well.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any, cast

import numpy as np

from designer.demands.terms import Terms
from designer.engines.report import Engine
from designer.engines.watch import Watch
from designer.program.linear import Bound, LinearProgram
from designer.proof.exact import Exact, Point
from designer.proof.vector import Vector
from designer.setting.setting import IntArray, Setting
from designer.weighing.bounds import without_rows
from designer.weighing.groups import CAPS, group_of, groups_of
from designer.weighing.relaxed import Answer, Relaxed, allowed

Groups = frozenset[str]


class Unsettled(Exception):  # noqa: N818 - the engine gave up: no mistake of anyone's
    """Neither possible nor impossible could be shown."""


@dataclass(frozen=True)
class Known:
    """A set of groups that collides, or one that can be kept; and whether that is proved."""

    groups: Groups
    proved: bool


class Mix:
    """Answers about the subsets of one mix of demand groups."""

    def __init__(self, setting: Setting, terms: Terms, engine: Engine, watch: Watch) -> None:
        """Nothing is known yet."""
        self.setting, self.terms = setting, terms
        self.engine, self.watch = engine, watch
        self.groups = groups_of(setting, terms)
        self.possible: list[Known] = []
        self.collisions: list[Known] = []
        self.posed = 0
        self._programs: dict[bool, Relaxed] = {}
        self._masked: dict[bool, _Masked] = {}

    def known(self, kept: Groups) -> Known | None:
        """What is known of a set without posing it."""
        for one in self.possible:
            if kept <= one.groups:
                return one
        for one in self.collisions:
            if one.groups <= kept:
                return one
        return None

    def holds(self, kept: Groups) -> bool:
        """Whether the groups can be kept together. Raises Unsettled or Stopped."""
        return self.ask(kept) in self.possible

    def ask(self, kept: Groups) -> Known:
        """What is known of a set, posing it if nothing is."""
        known = self.known(kept)
        if known is not None:
            return known
        self.watch.check()
        self.posed += 1
        masked = self._mask("decision" in kept)
        answer = masked.pose(kept)
        if answer.status == "optimal" and answer.primal is not None:
            known = Known(kept | masked.kept_as_well(answer), answer.proved)
            self.possible.append(known)
        elif answer.status == "infeasible":
            blamed = kept if answer.farkas is None else masked.blamed(answer.farkas) & kept
            known = Known(blamed, answer.proved)
            self.collisions.append(known)
        else:
            raise Unsettled(answer.reason)
        return known

    def program(self, decided: bool) -> Relaxed:
        """All groups with every allowance freed; the decision as demanded, or free."""
        decided = decided or "decision" not in self.groups
        if decided not in self._programs:
            terms = self.terms if decided else replace(self.terms, decision="randomized")
            self._programs[decided] = allowed(self.setting, terms, self.engine, self.watch)
        return self._programs[decided]

    def _mask(self, decided: bool) -> _Masked:
        decided = decided or "decision" not in self.groups
        if decided not in self._masked:
            self._masked[decided] = _Masked(self.program(decided), self.terms, decided)
        return self._masked[decided]


class _Masked:
    """All groups in one program, to be posed in part."""

    def __init__(self, relaxed: Relaxed, terms: Terms, decided: bool) -> None:
        self.relaxed, self.terms, self.decided = relaxed, terms, decided
        blocks = [block for block in relaxed.program.row_axis.blocks if block.count]
        names = [group_of(block.label(0)) or "" for block in blocks]  # one group a block
        self.names = sorted(set(names))
        self.of_row = np.repeat(
            np.array([self.names.index(name) for name in names], dtype=np.int64),
            [block.count for block in blocks],
        )
        self.exact = Exact(relaxed.matrix)

    def pose(self, kept: Groups) -> Answer:
        """Whether the kept groups can be met."""
        dropped = [name for name in self.names if name and name not in kept]
        mask = np.isin(self.of_row, [self.names.index(name) for name in dropped])
        elastic = {"money"} if "balance" in kept else set()
        if any(group.startswith("ir:") for group in kept):
            elastic.add("shortfall")
        return self.relaxed.feasible(
            elastic, lambda lp: self._unbounded(without_rows(lp, mask), kept)
        )

    def _unbounded(self, lp: LinearProgram, kept: Groups) -> LinearProgram:
        """The program with the bounds on payments let go whose limits are not kept."""
        for key, side in zip(CAPS, ("col_hi", "col_lo"), strict=True):
            if getattr(self.terms.limits, key) is not None and f"limit:{key}" not in kept:
                bound: Bound = getattr(lp, side)
                finite = bound.finite.copy()
                finite[: self._payments] = False
                open_to = Bound(bound.num, finite)
                lp = replace(lp, **cast(Any, {side: open_to}))
        return lp

    @property
    def _payments(self) -> int:
        """The payment columns, which come first."""
        setting = self.relaxed.setting
        return 0 if self.relaxed.averaged else setting.profiles * len(setting.parties)

    def blamed(self, farkas: Vector) -> Groups:
        """The groups whose rows or bounds a certificate of impossibility uses."""
        found = {self.names[self.of_row[row]] for row in farkas.idx} - {""}
        if self.decided:
            found.add("decision")  # its chances are constants of the program
        weights = np.zeros(self.exact.matrix.rows, dtype=object)
        weights[list(farkas.idx)] = farkas.num
        pull = -self.exact.matrix.transposed.times(weights)[: self._payments]
        if (pull < 0).any():
            found.add("limit:pays_at_most")
        if (pull > 0).any():
            found.add("limit:pays_at_least")
        return frozenset(found)

    def kept_as_well(self, answer: Answer) -> Groups:
        """The groups that a point keeps, asked for or not."""
        primal = answer.primal
        if primal is None:
            return frozenset()
        lp = self.relaxed.matrix
        numbers: IntArray = np.array(primal.numerators(), dtype=object) * lp.col_den
        columns, rows = self.exact.outside(Point(numbers, primal.den))
        missed = {self.names[k] for k in np.unique(self.of_row[rows])}
        found = {name for name in self.names if name and name not in missed}
        pays = columns[: self._payments]
        for key, side in zip(CAPS, (lp.col_hi, lp.col_lo), strict=True):
            if getattr(self.terms.limits, key) is None or self.relaxed.averaged:
                continue
            bound = side.num[: self._payments].astype(object) * primal.den
            over = numbers[: self._payments] - bound
            broken = (over > 0) if key == "pays_at_most" else (over < 0)
            if not (pays & np.asarray(broken, dtype=bool)).any():
                found.add(f"limit:{key}")
        if self.decided or self._decides_as_asked(answer):
            found.add("decision")
        return frozenset(found)

    def _decides_as_asked(self, answer: Answer) -> bool:
        """Whether a point with the decision free decides as demanded after all."""
        chances, den = self.relaxed.decisions(answer)
        draft = self.relaxed.draft
        if self.terms.decision == "efficient":
            efficient = draft.welfare == draft.welfare.max(axis=1, keepdims=True)
            return not bool((chances[~efficient] != 0).any())
        setting = self.relaxed.setting
        if self.terms.decision == "table" and setting.rule is not None:
            asked = setting.rule.astype(object) * den
            return bool((asked == chances * setting.rule_den).all())
        return bool(((chances == 0) | (chances == den)).all())  # deterministic
