"""Lifting with right-hand sides far larger than the kernel: one step may be all there is."""

from __future__ import annotations

import numpy as np
import pytest

from designer.engines.watch import Watch
from designer.proof.lifting import Lifting
from designer.proof.sparse import Matrix


@pytest.mark.parametrize("power", [3, 20, 39, 50, 90])
@pytest.mark.parametrize("transposed", [False, True])
def test_a_first_step_that_is_exact_is_the_answer(power: int, transposed: bool) -> None:
    """K x = 2**power K (1, …, 1) / 4: the float step leaves no residual at all."""
    size = 30
    dense = np.diag(np.full(size, 4)) + np.diag(np.full(size - 1, 2), 1)
    rows, columns = np.nonzero(dense)
    indptr = np.searchsorted(rows, np.arange(size + 1))
    matrix = Matrix(indptr, columns, dense[rows, columns], size)
    turned = dense.T if transposed else dense
    right = turned.astype(object) @ np.full(size, 2**power, dtype=object) // 2
    numerators, den = Lifting(matrix, Watch()).solve(right, transposed)
    assert (turned.astype(object) @ numerators.astype(object) == right * den).all()
    assert all(2 * int(n) == 2**power * den for n in numerators)
