"""Programs of the kind the tool poses: interim payments, lies, participation, balance.

A public project: n parties with T types each, decision "build" when the worths cover the
outlay. Columns: t_i(theta), then m_i(a) = the interim payment, then one subsidy column S.
"""

from __future__ import annotations

from itertools import product
from typing import Literal

import numpy as np

from designer.program.linear import Bound, LinearProgram
from designer.setting.setting import integers


def interim_program(
    types: list[list[int]],
    weights: list[list[int]] | None,
    outlay: int,
    *,
    joint: list[int] | None = None,
    subsidy: tuple[int, int] | None = None,
    goal: Literal["subsidy", "any"] = "subsidy",
    denominator: int = 1,
) -> LinearProgram:
    """Bayesian honesty, interim participation, exact balance in every case.

    types[i]    worths of party i; weights[i] its prior's integer weights
    joint       weights over profiles instead, for correlated types
    subsidy     fixed at p/q when given as (p, q); otherwise the column S is free
    """
    n, shape = len(types), tuple(len(worths) for worths in types)
    profiles = list(product(*(range(size) for size in shape)))
    number = len(profiles)
    if joint is None:
        assert weights is not None
        joint = [int(np.prod([weights[i][p[i]] for i in range(n)], dtype=object)) for p in profiles]
    build = [int(sum(types[i][p[i]] for i in range(n)) >= outlay) for p in profiles]
    start = np.cumsum([0, *shape])
    interim = n * number
    money = interim + int(start[-1])
    columns = money + 1
    indptr, indices, data = [0], list[int](), list[int]()
    lo, hi = list[int | None](), list[int | None]()

    def row(entries: list[tuple[int, int]], low: int | None, high: int | None) -> None:
        for column, value in sorted(entries):
            if value:
                indices.append(column)
                data.append(value)
        indptr.append(len(indices))
        lo.append(low)
        hi.append(high)

    # W(a) m_i(a) = sum over profiles with theta_i = a of w t_i
    mass = [[0] * size for size in shape]
    wins = [[[0] * size for _ in range(size)] for size in shape]
    for p, w, built in zip(profiles, joint, build, strict=True):
        for i in range(n):
            mass[i][p[i]] += w
            wins[i][p[i]][p[i]] += w * built
    for i in range(n):
        for a in range(shape[i]):
            entries = [(i * number + k, joint[k]) for k, p in enumerate(profiles) if p[i] == a]
            row([*entries, (interim + int(start[i]) + a, -mass[i][a])], 0, 0)
    correlated = weights is None
    position = {p: k for k, p in enumerate(profiles)}
    for i in range(n):
        for a in range(shape[i]):
            worth = types[i][a]
            row(
                [(interim + int(start[i]) + a, -mass[i][a])],
                -worth * wins[i][a][a],
                None,
            )
            for b in range(shape[i]):
                if a == b:
                    continue
                gain, told = 0, list[tuple[int, int]]()
                for k, p in enumerate(profiles):
                    if p[i] != a:
                        continue
                    lie = position[(*p[:i], b, *p[i + 1 :])]
                    gain += joint[k] * (build[lie] - build[k]) * worth
                    told.append((i * number + lie, joint[k]))
                if not correlated:
                    # the same sum is mass(a) m_i(b)
                    told = [(interim + int(start[i]) + b, mass[i][a])]
                row([(interim + int(start[i]) + a, -mass[i][a]), *told], gain, None)
    paid, q = subsidy or (0, 1)
    for k, built in enumerate(build):
        target = built * outlay * q
        entries = [(i * number + k, q) for i in range(n)]
        if subsidy is None:
            row([*entries, (money, q)], target, target)
        else:
            row(entries, target - paid, target - paid)
    cost = np.zeros(columns, dtype=np.int64)
    cost[money] = int(goal == "subsidy" and subsidy is None)
    free = Bound(np.zeros(columns, dtype=np.int64), np.zeros(columns, dtype=bool))
    return LinearProgram(
        np.array(indptr, dtype=np.int64),
        np.array(indices, dtype=np.int64),
        integers(data),
        _bound(lo),
        _bound(hi),
        free,
        free,
        1,
        cost,
        np.zeros(columns, dtype=bool),
        cost_den=denominator,
    )


def _bound(values: list[int | None]) -> Bound:
    return Bound(
        integers([0 if value is None else value for value in values]),
        np.array([value is not None for value in values], dtype=bool),
    )
