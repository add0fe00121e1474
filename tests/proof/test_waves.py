"""Kernels solved wave by wave, held against FLINT and against one row at a time."""

# ruff: noqa: S311 - repeatable test data, nothing secret

from __future__ import annotations

import random
from unittest.mock import patch

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from designer.engines.watch import Watch
from designer.proof import waves as module
from designer.proof.kernel import Kernel, Peeled, Singular
from designer.proof.sparse import Matrix
from designer.proof.waves import waves
from designer.setting.setting import integers
from tests.proof.test_exact_kernel import flint, fractions, matrix, sparse


def shallow(size: int, seed: int, big: int, core: int = 0) -> Matrix:
    """Mostly triangular: every row needs a few of the first, and `core` rows need each other."""
    rng = random.Random(seed)
    turn, across = rng.sample(range(size), size), rng.sample(range(size), size)
    rows: list[dict[int, int]] = [{} for _ in range(size)]
    for i in range(size):
        head = range(core) if i < core else range(rng.choice([0, min(i, 12)]))
        columns = {i, *(rng.choice(head) for _ in range(3 if head else 0))}
        entries = {across[k]: rng.choice([-1, 1]) * rng.randint(1, big) for k in columns}
        rows[turn[i]] = entries
    return matrix(rows)


@settings(max_examples=200, deadline=None)
@given(st.integers(1, 25), st.integers(0, 10**6), st.sampled_from([1, 9, 2**20]), st.booleans())
def test_waves_agree_with_flint(size: int, seed: int, big: int, wild: bool) -> None:
    # python-flint 0.9: fmpz_mat.solve, an independent exact solver
    kernel = sparse(size, seed, big, each=1) if wild else shallow(size, seed, big, min(size, 4))
    b = integers([random.Random(seed + 1).randint(-9, 9) for _ in range(size)])
    with patch.object(module, "SHALLOW", 1), patch.object(module, "CORE", 1):
        found = waves(kernel)
    if found is None:  # two rows alike, or a core with everything in it
        return
    inner = Kernel(found.core_matrix)
    for transposed in (False, True):
        turned = kernel.transposed if transposed else kernel
        try:
            expected = flint(turned, b)
        except ZeroDivisionError:
            expected = None
        try:
            solved = found.solve(
                b, transposed, inner.solve_transposed if transposed else inner.solve
            )
        except Singular:
            assert expected is None
            continue
        if solved is None:
            assert big > 1
        elif expected is not None:
            assert fractions(solved) == expected
            assert solved[1] > 0
            assert int(np.gcd.reduce([solved[1], *solved[0].tolist()])) == 1


@pytest.mark.parametrize("core", [0, 30])
@pytest.mark.parametrize("big", [1, 3])
def test_large_kernels_take_waves_and_get_what_one_row_at_a_time_gets(core: int, big: int) -> None:
    kernel = shallow(2000, 5, big, core)
    b = integers([random.Random(3).randint(-5, 5) for _ in range(2000)])
    found = waves(kernel)
    assert found is not None
    assert len(found.core[0]) <= max(core, 1)
    peeled, whole = Peeled(kernel, Watch()), Kernel(kernel)
    for transposed in (False, True):
        expected = peeled.solve(b.tolist(), transposed, dense=True)
        solved = whole.solve_transposed(b) if transposed else whole.solve(b)
        assert solved[1] == expected[1]
        assert solved[0].tolist() == expected[0].tolist()


def test_what_waves_cannot_do_is_left_to_others() -> None:
    chain = matrix([{0: 1}] + [{i - 1: 1, i: 1} for i in range(1, 500)])
    assert waves(chain) is None  # one row per wave
    assert waves(matrix([{0: 1}, {0: 1, 1: 1}, {0: 2}])) is None  # two rows for one column
    wide = shallow(1000, 1, 2**20)
    found = waves(wide)
    b = integers([1] * 1000)
    assert found is not None
    assert found.solve(b, False, Kernel(found.core_matrix).solve) is None  # beyond 64 bits
    assert fractions(Kernel(wide).solve(b)) == fractions(
        Peeled(wide, Watch()).solve(b.tolist(), False, dense=True)
    )
