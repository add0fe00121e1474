"""Baseline (b): the program in whole sparse arrays, for scipy's `linprog`.

Written from the definitions with numpy alone, sharing nothing with `designer.program`: floats,
a payment and an option's probability as columns at every profile, and every incentive row
spelled out over the others' types, so that n types cost n*T**(n+1) nonzeros. This is what
somebody who knows numpy well writes in an afternoon.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
import numpy.typing as npt

from designer.demands.terms import Terms
from designer.setting.setting import Setting

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]


@dataclass
class _Side:
    """Rows of one relation, as coordinate triples: A x <= b, or A x = b."""

    count: int = 0
    row: list[Ints] = field(default_factory=list)
    col: list[Ints] = field(default_factory=list)
    val: list[Floats] = field(default_factory=list)
    right: list[Floats] = field(default_factory=list)

    def add(self, size: int, entries: list[tuple[Any, Any, Any]], right: Any) -> None:
        """Add `size` rows with these (row, column, value) entries, broadcast together."""
        for row, col, val in entries:
            r, c, v = np.broadcast_arrays(row, col, np.asarray(val, dtype=np.float64))
            self.row.append(r.ravel() + self.count)
            self.col.append(c.ravel())
            self.val.append(v.ravel())
        self.right.append(np.broadcast_to(np.asarray(right, dtype=np.float64), (size,)))
        self.count += size

    def arrays(self, columns: int) -> tuple[Any, Floats | None]:
        """The sparse matrix and the right-hand side, None without rows."""
        from scipy.sparse import csr_matrix

        if not self.count:
            return None, None
        val, row, col = (np.concatenate(p) for p in (self.val, self.row, self.col))
        return csr_matrix((val, (row, col)), (self.count, columns)), np.concatenate(self.right)


class Naive:
    """The rows of one setting and its terms; one goal."""

    def __init__(self, setting: Setting, terms: Terms) -> None:
        """Write every demand, then the goal."""
        if terms.even_handed or setting.limits != type(setting.limits)():
            raise NotImplementedError("even-handedness and limits")
        self.setting, self.terms = setting, terms
        self.n, self.size, self.options = (
            len(setting.parties),
            setting.profiles,
            len(setting.options),
        )
        weight = setting.weights.astype(np.float64)
        self.chance: Floats = weight / weight.sum()
        self.outlay = setting.outlay.astype(np.float64) / setting.grain
        grid = np.arange(self.size, dtype=np.int64).reshape(setting.shape)
        self.fibers: list[Ints] = [
            np.moveaxis(grid, i, 0).reshape(t, -1) for i, t in enumerate(setting.shape)
        ]
        self.worth = [self._at_profiles(i, "value", "depends") for i in range(self.n)]
        self.outside = [self._at_profiles(i, "outside", "outside_depends") for i in range(self.n)]
        self.columns = self.size * (self.n + self.options)
        self.extra: list[tuple[float, float]] = []
        self.most, self.equal = _Side(), _Side()
        everywhere = np.arange(self.size)
        self.scope = np.flatnonzero(self.chance > 0) if setting.support_only else everywhere
        lotteries = (everywhere[:, None], self.x(everywhere), 1.0)
        self.equal.add(self.size, [lotteries], 1.0)
        self.money = self._unknown() if "outside-money" in terms.goals else None
        self._honesty()
        self._participation()
        self._balance()
        self.cost = self._goal(terms.goals[0])

    def _at_profiles(self, i: int, what: str, depends: str) -> Floats:
        party = self.setting.parties[i]
        table: Floats = np.asarray(getattr(party, what)).astype(np.float64) / self.setting.grain
        if getattr(party, depends):
            return table
        own = np.empty(self.size, dtype=np.int64)
        own[self.fibers[i]] = np.arange(party.size)[:, None]
        return table[own]

    def _unknown(self, low: float = -np.inf) -> int:
        self.extra.append((low, np.inf))
        return self.columns + len(self.extra) - 1

    def t(self, i: int, profiles: Ints) -> Ints:
        """Payment columns, paid BY party i."""
        return profiles + i * self.size

    def x(self, profiles: Ints) -> Ints:
        """Columns of the options' probabilities, one axis more than `profiles`."""
        return profiles[..., None] * self.options + np.arange(self.options) + self.n * self.size

    def utility(self, i: int, true: Ints, told: Ints, share: Any) -> list[tuple[Any, Any, Any]]:
        """Entries of share * u_i, one row per first index; profiles are (rows, runs)."""
        row = np.arange(len(true))[:, None]
        paid = (row, self.t(i, told), -share)
        won = (row[..., None], self.x(told), np.asarray(share)[..., None] * self.worth[i][true])
        return [paid, won]

    def pot(self, profiles: Ints, share: Any, together: bool) -> list[tuple[Any, Any, Any]]:
        """Entries of share * pot, one row per profile or one row in all."""
        row = np.zeros(len(profiles), dtype=np.int64) if together else np.arange(len(profiles))
        paid = [(row, self.t(i, profiles), share) for i in range(self.n)]
        spent = -np.asarray(share)[..., None] * self.outlay
        return [*paid, (row[:, None], self.x(profiles), spent)]

    def belief(self, i: int) -> Floats:
        """P(theta_-i | own type), shape (T_i, N / T_i)."""
        mass: Floats = self.chance[self.fibers[i]]
        total: Floats = mass.sum(axis=1, keepdims=True)
        return mass / total

    def _honesty(self) -> None:
        """Honest minus lying >= -slack."""
        slack = float(self.terms.slack)
        for i, fiber in enumerate(self.fibers):
            a, b = np.nonzero(~np.eye(len(fiber), dtype=bool))
            if not len(a):
                continue
            if self.terms.ic == "bayesian":
                true, told, share = fiber[a], fiber[b], self.belief(i)[a]
            elif self.terms.ic == "dominant":
                true, told = fiber[a].reshape(-1, 1), fiber[b].reshape(-1, 1)
                asked = np.isin(true[:, 0], self.scope)
                true, told = true[asked], told[asked]
                share = np.ones(true.shape)
            else:
                return
            gain = [*self.utility(i, true, told, share), *self.utility(i, true, true, -share)]
            self.most.add(len(true), gain, slack)

    def _gains(self, i: int, level: str) -> tuple[list[tuple[Any, Any, Any]], Floats]:
        """Utility entries and the outside option, one row per case of the level."""
        if level == "interim":
            fiber, share = self.fibers[i], self.belief(i)
        elif level == "ex-ante":
            fiber, share = np.arange(self.size)[None, :], self.chance[None, :]
        else:
            fiber, share = self.scope[:, None], np.ones((len(self.scope), 1))
        return self.utility(i, fiber, fiber, share), (share * self.outside[i][fiber]).sum(axis=1)

    def _participation(self) -> None:
        """Gain over staying out >= -shortfall."""
        for i, party in enumerate(self.setting.parties):
            if self.terms.ir == "none" or party.name in self.terms.compelled:
                continue
            gain, outside = self._gains(i, self.terms.ir)
            lost = [(row, col, -val) for row, col, val in gain]
            self.most.add(len(outside), lost, float(self.terms.shortfall) - outside)

    def _balance(self) -> None:
        """The pot is, or is at least, minus the outside money."""
        if self.terms.balance == "none":
            return
        together = self.terms.balance == "ex-ante"
        scope = np.arange(self.size) if together else self.scope
        size = 1 if together else len(scope)
        share = self.chance if together else np.ones(size)
        pot = self.pot(scope, share, together)
        if self.money is not None:
            pot.append((np.arange(size), self.money, 1.0))
        need = 0.0 if self.money is not None else -float(self.terms.subsidy)
        if self.terms.budget == "exact":
            self.equal.add(size, pot, need)
        else:
            self.most.add(size, [(row, col, -np.asarray(val)) for row, col, val in pot], -need)

    def _goal(self, name: str) -> list[tuple[Any, Any, Any]]:
        """The goal as the entries of one row, to be minimised."""
        everywhere = np.arange(self.size)
        if name == "any":
            return []
        if name == "outside-money":
            return [(0, self.money, 1.0)]
        if name == "revenue":
            pot = self.pot(everywhere, self.chance, together=True)
            return [(row, col, -val) for row, col, val in pot]
        if name == "welfare":
            net = sum(self.worth) + (self.setting.worth / self.setting.grain - self.outlay)
            return [(0, self.x(everywhere), -self.chance[:, None] * net)]
        if name == "floor":
            bound = self._unknown()
            for i in range(self.n):
                gain, outside = self._gains(i, "interim")
                lost = [(row, col, -val) for row, col, val in gain]
                lost.append((np.arange(len(outside)), bound, 1.0))
                self.most.add(len(outside), lost, -outside)
            return [(0, bound, -1.0)]
        raise NotImplementedError(name)

    def bounds(self) -> Floats:
        """Payments free; probabilities in [0, 1], 0 for what an efficient rule never takes."""
        top = np.ones((self.size, self.options))
        if self.terms.decision == "efficient":
            net = sum(self.worth) + (self.setting.worth / self.setting.grain - self.outlay)
            top[net < net.max(axis=1, keepdims=True) - 1e-9] = 0.0
        elif self.terms.decision == "table":
            raise NotImplementedError("given rules")
        bounds = np.full((self.columns + len(self.extra), 2), (-np.inf, np.inf))
        bounds[self.n * self.size : self.columns] = np.stack([0 * top, top], axis=2).reshape(-1, 2)
        bounds[self.columns :] = self.extra or np.empty((0, 2))
        return bounds

    def solve(self) -> tuple[str, float | None]:
        """Status and value of the goal, by scipy's interface to HiGHS."""
        from scipy.optimize import linprog

        columns = self.columns + len(self.extra)
        cost = np.zeros(columns)
        for _, col, val in self.cost:
            c, v = np.broadcast_arrays(col, val)
            np.add.at(cost, c.ravel(), v.ravel())
        whole = None
        if self.terms.decision == "deterministic":
            whole = np.zeros(columns)
            whole[self.n * self.size : self.columns] = 1
        a_ub, b_ub = self.most.arrays(columns)
        a_eq, b_eq = self.equal.arrays(columns)
        answer = linprog(
            cost, a_ub, b_ub, a_eq, b_eq, self.bounds(), method="highs", integrality=whole
        )
        words = {0: "possible", 2: "impossible", 3: "unbounded"}
        status = words.get(answer.status, "undecided")
        if status != "possible" or self.terms.goals[0] == "any":
            return status, None
        minimised = self.terms.goals[0] == "outside-money"
        return status, float(answer.fun if minimised else -answer.fun)
