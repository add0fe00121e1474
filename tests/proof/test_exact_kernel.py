"""Integer systems solved exactly three ways, held against each other and against FLINT."""

# ruff: noqa: S311 - repeatable test data, nothing secret

from __future__ import annotations

import random
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from designer.engines.watch import TimeUp, Watch
from designer.proof.kernel import Crowded, Kernel, Peeled, Singular, eliminate
from designer.proof.lifting import Lifting, NotLifted, reconstruct
from designer.proof.sparse import Matrix, dot, largest, narrow, plus, scaled
from designer.setting.setting import IntArray, integers


def matrix(rows: list[dict[int, int]]) -> Matrix:
    indptr = np.cumsum([0, *(len(row) for row in rows)]).astype(np.int64)
    indices = np.array([k for row in rows for k in sorted(row)], dtype=np.int64)
    data = integers([row[k] for row in rows for k in sorted(row)])
    return Matrix(indptr, indices, data, len(rows))


def sparse(size: int, seed: int, big: int = 9, each: int = 3) -> Matrix:
    """A regular-looking sparse matrix: a permuted diagonal and a few entries more."""
    rng = random.Random(seed)
    shift = rng.sample(range(size), size)
    rows = []
    for i in range(size):
        columns = {shift[i], *(rng.randrange(size) for _ in range(each))}
        rows.append({k: rng.choice([-1, 1]) * rng.randint(1, big) for k in columns})
    return matrix(rows)


def fractions(found: tuple[IntArray, int]) -> list[Fraction]:
    return [Fraction(int(number), found[1]) for number in found[0]]


def flint(kernel: Matrix, b: IntArray) -> list[Fraction]:
    import flint as library

    table = [[0] * kernel.rows for _ in range(kernel.rows)]
    for i, j, value in zip(kernel.row_of, kernel.indices, kernel.data, strict=True):
        table[int(i)][int(j)] = int(value)
    solved = library.fmpz_mat(table).solve(library.fmpz_mat([[int(value)] for value in b]))
    return [Fraction(int(solved[k, 0].p), int(solved[k, 0].q)) for k in range(kernel.rows)]


@pytest.mark.parametrize("size", [200, 400, 600])
def test_lifting_agrees_with_flint(size: int) -> None:
    # python-flint 0.9: fmpz_mat.solve, an independent exact solver
    kernel = sparse(size, size)
    b = integers([random.Random(7).randint(-50, 50) for _ in range(size)])
    lifting = Lifting(kernel, Watch())
    assert fractions(lifting.solve(b)) == flint(kernel, b)
    assert fractions(lifting.solve(b, transposed=True)) == flint(kernel.transposed, b)


@pytest.mark.parametrize("big", [2**40, 2**70, 2**200])
def test_lifting_with_numbers_beyond_64_bits(big: int) -> None:
    kernel = sparse(60, 3, big=big)
    for top in (5, 2**40, 2**90):
        b = integers([random.Random(k).randint(-top, top) for k in range(60)])
        assert fractions(Lifting(kernel, Watch()).solve(b)) == flint(kernel, b)


@settings(max_examples=80, deadline=None)
@given(st.integers(1, 25), st.integers(0, 10**6), st.sampled_from([3, 9, 2**70]))
def test_all_ways_agree(size: int, seed: int, big: int) -> None:
    kernel = sparse(size, seed, big, each=2)
    b = integers([random.Random(seed + 1).randint(-big, big) for _ in range(size)])
    for transposed in (False, True):
        turned = kernel.transposed if transposed else kernel
        try:
            expected = flint(turned, b)
        except ZeroDivisionError:
            # FLINT finds it singular: none of the others may find a regular core solvable
            continue
        peeled = Peeled(kernel, Watch())
        assert fractions(peeled.solve(b.tolist(), transposed)) == expected
        assert fractions(peeled.solve(b.tolist(), transposed, dense=True)) == expected
        assert fractions(Lifting(kernel, Watch()).solve(b, transposed)) == expected
        whole = Kernel(kernel)
        solve = whole.solve_transposed if transposed else whole.solve
        assert fractions(solve(b)) == expected


def test_triangles_are_peeled_to_nothing() -> None:
    rng = random.Random(1)
    order = rng.sample(range(50), 50)
    rows: list[dict[int, int]] = [{} for _ in range(50)]
    for place, i in enumerate(order):
        rows[i] = {
            order[k]: rng.randint(1, 9)
            for k in {place, *(rng.randrange(place + 1) for _ in range(3))}
        }
    kernel = matrix(rows)
    peeled = Peeled(kernel, Watch())
    assert peeled.core_rows == []
    b = integers(list(range(50)))
    assert fractions(peeled.solve(b.tolist(), False)) == flint(kernel, b)
    assert fractions(peeled.solve(b.tolist(), True)) == flint(kernel.transposed, b)


@pytest.mark.parametrize(
    "rows",
    [
        [{0: 1, 1: 1}, {0: 2, 1: 2}],
        [{0: 1}, {0: 2}],
        [{0: 1, 1: 2, 2: 3}, {0: 4, 1: 5, 2: 6}, {0: 7, 1: 8, 2: 9}],
    ],
)
def test_singular_kernels_are_found_out(rows: list[dict[int, int]]) -> None:
    with pytest.raises(Singular):
        Kernel(matrix(rows)).solve(integers(list(range(1, len(rows) + 1))))


def test_singular_beyond_the_small_sizes() -> None:
    rows = [dict(enumerate(random.Random(i).choices(range(1, 9), k=80))) for i in range(79)]
    rows.append({k: rows[0][k] + rows[1][k] for k in range(80)})
    with pytest.raises(Singular):
        Kernel(matrix(rows)).solve(integers([1] * 80))


def test_a_kernel_that_is_not_square() -> None:
    with pytest.raises(Singular, match="1 rows against 2 columns"):
        Kernel(Matrix(np.array([0, 1]), np.array([0]), np.array([1]), 2))


def test_elimination_gives_up_when_the_core_fills_in() -> None:
    rows = [dict(enumerate(random.Random(i).choices(range(1, 99), k=40))) for i in range(40)]
    with pytest.raises(Crowded):
        eliminate(rows, [1] * 40, Watch(), work=1_000)
    kernel = matrix(rows)
    b = integers([1] * 40)
    assert fractions(Kernel(kernel).solve(b)) == flint(kernel, b)


def test_ill_conditioned_kernels() -> None:
    # Hilbert matrices times the common multiple of their denominators; for size 10 the
    # condition number is about 1e13, for size 20 beyond 1e28 (well known)
    from math import lcm

    for size in (10, 20):
        common = lcm(*range(1, 2 * size))
        kernel = matrix([{j: common // (i + j + 1) for j in range(size)} for i in range(size)])
        b = integers([1] * size)
        assert fractions(Kernel(kernel).solve(b)) == flint(kernel, b)
        try:
            lifted = Lifting(kernel, Watch()).solve(b)
        except NotLifted:
            continue  # allowed to give up, not to be wrong
        assert fractions(lifted) == flint(kernel, b)


def test_a_deadline_stops_every_method() -> None:
    kernel, b = sparse(40, 5), integers([1] * 40)
    late = Watch(limit=0.0)
    with pytest.raises(TimeUp):
        Lifting(kernel, late).solve(b)
    with pytest.raises(TimeUp):
        Kernel(kernel, late).solve(b)


@settings(max_examples=200, deadline=None)
@given(
    st.lists(st.fractions(max_denominator=999), min_size=1, max_size=6),
    st.integers(40, 200),
)
def test_reconstruction_never_invents(values: list[Fraction], shift: int) -> None:
    total = np.array([round(value * 2**shift) for value in values], dtype=object)
    found = reconstruct(total, shift, shift - 1)
    if found is None:
        return
    for value, got in zip(values, fractions(found), strict=True):
        assert abs(got - value) <= Fraction(2, 2**shift) * 2
    if shift > 2 * (10 * len(values) + 10):
        assert fractions(found) == values


def test_sums_leave_int64_in_time() -> None:
    top = 2**61
    assert plus(np.array([top]), np.array([top])).tolist() == [2 * top]
    assert scaled(np.array([top, 1]), 8).tolist() == [8 * top, 8]
    assert scaled(np.array([0]), 2**80).tolist() == [0]
    assert dot(np.array([top, top]), np.array([4, 4])) == 8 * top
    assert largest(np.array([-5, 3])) == 5
    assert largest(np.array([], dtype=np.int64)) == 0
    assert narrow(np.array([2**61], dtype=object)).dtype == np.int64
    assert narrow(np.array([2**62], dtype=object)).dtype == object
    line = Matrix(np.array([0, 3]), np.array([0, 1, 2]), np.array([top, top, top]), 3)
    assert line.times(np.array([1, 1, 1])).tolist() == [3 * top]


def test_parts_of_a_matrix() -> None:
    whole = matrix([{0: 1, 2: 2}, {1: 3}, {0: 4, 1: 5, 2: 6}])
    part = whole.part(np.array([2, 0]), np.array([2, 0]))
    assert part.entries() == [[(1, 4), (0, 6)], [(1, 1), (0, 2)]]
    assert whole.transposed.entries() == [[(0, 1), (2, 4)], [(1, 3), (2, 5)], [(0, 2), (2, 6)]]
