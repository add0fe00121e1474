"""What is known of the trade between criteria: points that can be had, bounds that hold.

The points a mix can reach, and everything worse, form a polyhedron P in the space of the
criteria. A solved program gives both sides of it: its optimum is a point of P, and its dual a
valid inequality: with y optimal for the weights w and d_c the reduced cost of an allowance c
that was held at l_c,

    sum_k w_k x_k + max(0, -d_c) (x_c - l_c) >= optimum        wherever x_c >= l_c.

So an edge found while one allowance is closed may already be known with another.
"""

from __future__ import annotations

from collections.abc import Collection, Mapping
from fractions import Fraction

import numpy as np

from designer.weighing.relaxed import Answer, Relaxed

Weights = tuple[Fraction, ...]
ZERO = Fraction(0)


class Surface:
    """One relaxed program, asked for the least of weighted sums; every answer is kept."""

    def __init__(self, relaxed: Relaxed) -> None:
        """Nothing is known yet."""
        self.relaxed = relaxed
        self.asked_for = 0
        self._known: dict[tuple[str, ...], dict[Weights, tuple[Fraction, bool]]] = {}
        self._entries: dict[str, tuple[list[int], list[int]]] = {}

    def closed(self, criteria: Collection[str]) -> list[str]:
        """The allowances that are not in play."""
        return [name for name in self.relaxed.columns if name not in criteria]

    def least(self, criteria: tuple[str, ...], weights: Weights, then: bool = False) -> Answer:
        """The least weighted sum of these criteria; `then` makes all of them small at once."""
        self.asked_for += 1
        closed = self.closed(criteria)
        answer = self.relaxed.minimise(
            dict(zip(criteria, weights, strict=True)),
            then=dict.fromkeys(criteria, Fraction(1)) if then else None,
            closed=closed,
        )
        if answer.status == "optimal":
            self._learn(answer, dict(zip(criteria, weights, strict=True)), closed)
        return answer

    def bound(self, criteria: tuple[str, ...], weights: Weights) -> tuple[Fraction, bool] | None:
        """The best known lower bound of a weighted sum, and whether it is proved."""
        total = sum(weights)
        found = self._known.setdefault(criteria, {}).get(tuple(w / total for w in weights))
        return None if found is None else (found[0] * total, found[1])

    def watch(self, criteria: tuple[str, ...]) -> None:
        """Keep what is learnt in a form that answers for these criteria."""
        self._known.setdefault(criteria, {})

    def _learn(self, answer: Answer, weights: Mapping[str, Fraction], closed: list[str]) -> None:
        if answer.value is None or answer.dual is None:
            return
        every, level = dict(weights), answer.value
        for name in closed:
            gain = max(ZERO, -self._reduced(answer, name))
            every[name] = gain
            level += gain * self.relaxed.asked(name)
        for criteria, known in self._known.items():
            part = [every.get(name, ZERO) for name in criteria]
            total, others = sum(part), {n: w for n, w in every.items() if w and n not in criteria}
            if not total or "welfare" in others:
                continue  # welfare can be held at no level
            rest = sum((w * self.relaxed.asked(name) for name, w in others.items()), ZERO)
            key = tuple(w / total for w in part)
            value = (level - rest) / total
            if key not in known or known[key][0] < value:
                known[key] = value, answer.proved

    def _reduced(self, answer: Answer, name: str) -> Fraction:
        """The reduced cost of an allowance that was held, its own cost being 0."""
        dual = answer.dual
        if dual is None:
            return ZERO
        if name not in self._entries:
            matrix, column = self.relaxed.matrix, self.relaxed.columns[name]
            places = np.flatnonzero(matrix.indices == column)
            rows = np.searchsorted(matrix.indptr, places, side="right") - 1
            self._entries[name] = rows.tolist(), [int(v) for v in matrix.data[places]]
        weights = dict(zip(dual.idx, dual.num, strict=True))
        rows_of, data = self._entries[name]
        pulled = sum(weights.get(row, 0) * value for row, value in zip(rows_of, data, strict=True))
        return -Fraction(pulled, dual.den)
