"""Large sparse integer systems by numeric-symbolic lifting.

A float LU gives each step about 40 correct bits; the residual is kept in exact integers, so
the bits add up; continued fractions on a running common denominator turn them into
rationals; K N = q b is then checked in integers, so that no rounding can survive.
Sources: Z. Wan, "An algorithm to solve integer linear systems exactly using numerical
methods", J. Symbolic Computation 41 (2006) 621-632; A. Gleixner, D. Steffy, K. Wolter,
"Iterative refinement for linear programming", INFORMS J. Computing 28 (2016) 449-464.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from designer.engines.floats import ldexp, parts
from designer.engines.watch import Watch
from designer.proof.sparse import Matrix, largest, narrow, scaled
from designer.setting.setting import IntArray

BITS = 46
"""Bits asked of one float solve; a worse LU only makes the steps shorter."""
FIRST = 40
"""Bits after which the first reconstruction is tried."""
MOST = 400_000
"""Bits after which lifting gives up."""
SLOW = 6
"""Steps of less than this many bits are a sign of an ill-conditioned kernel."""

Floats = npt.NDArray[np.float64]


class NotLifted(Exception):  # noqa: N818 - a finding: another method may still work
    """The float LU failed, or its steps did not converge."""


class Lifting:
    """A factored kernel K: solves K x = b and K' y = c exactly."""

    def __init__(self, matrix: Matrix, watch: Watch) -> None:
        """Factor; NotLifted when the float LU finds the kernel singular."""
        from scipy.sparse import csc_array
        from scipy.sparse.linalg import splu

        self.matrix, self.watch = matrix, watch
        mantissa, exponent = parts(matrix.data)
        row_of, column_of = matrix.row_of, matrix.indices
        self.row_exp = _balance(exponent, row_of, matrix.rows)
        self.column_exp = _balance(exponent + self.row_exp[row_of], column_of, matrix.columns)
        values = ldexp(mantissa, exponent + self.row_exp[row_of] + self.column_exp[column_of])
        sparse = csc_array((values, (row_of, column_of)), shape=(matrix.rows, matrix.columns))
        try:
            self.lu = splu(sparse)
        except RuntimeError as error:
            raise NotLifted(f"float factorisation failed: {error}") from error
        self.bits = 0

    def solve(self, b: IntArray, transposed: bool = False) -> tuple[IntArray, int]:
        """(N, q) with K N = q b (K' N = q b), q > 0, checked. Raises NotLifted."""
        matrix = self.matrix.transposed if transposed else self.matrix
        residual = narrow(b)
        if largest(residual) == 0:
            return np.zeros(matrix.rows, dtype=np.int64), 1
        total: IntArray = np.zeros(matrix.rows, dtype=object)
        shift, target, slow = 0, FIRST, 0
        step, top = self._step(residual, transposed)
        while True:
            self.watch.check()
            gain = BITS - top
            up = max(0, gain)
            digit = np.rint(ldexp(step, np.full(len(step), gain, dtype=np.int64)))
            delta: IntArray = digit.astype(np.int64)
            if gain < 0:  # the answer is larger than the step: leave its low bits for later
                delta = delta.astype(object) << -gain
            total = (total << up) + delta
            residual = _residual(matrix, residual, delta, up)
            shift += up
            slow = slow + 1 if gain < SLOW else 0
            if slow > 60 or shift > MOST:
                raise NotLifted("the float steps do not converge")
            if largest(residual) == 0:  # then K total = 2**shift b: nothing is left to guess
                self.bits = max(self.bits, shift)
                found = _lowest(total, shift)
                if _holds(matrix, found, b):
                    return found
                raise NotLifted("a vanished residual without a solution")
            step, top = self._step(residual, transposed)
            correct = shift - max(0, top) - 1
            if correct >= target:
                self.bits = max(self.bits, shift)
                guess = reconstruct(total, shift, correct)
                if guess is not None and _holds(matrix, guess, b):
                    return guess
                target = int(correct * 1.6)

    def _step(self, residual: IntArray, transposed: bool) -> tuple[Floats, int]:
        """A float solution of the residual, and the exponent of its largest entry."""
        mantissa, exponent = parts(residual)
        before, after = self.row_exp, self.column_exp
        if transposed:
            before, after = after, before
        # a common power of two keeps residuals of any size within the range of floats
        common = int(exponent[mantissa != 0].max(initial=0))
        right = ldexp(mantissa, exponent + before - common)
        solved = self.lu.solve(right, "T" if transposed else "N")
        step = ldexp(solved, after + common)
        size = float(np.abs(step).max(initial=0.0))
        if not np.isfinite(size) or size == 0.0:
            raise NotLifted("the float solution is not finite")
        return step, int(np.frexp(size)[1])


def _residual(matrix: Matrix, residual: IntArray, delta: IntArray, up: int) -> IntArray:
    """2**up r - K delta.

    In int64 this is exact modulo 2**64, hence exact when the true value is small, as it is
    unless the float step was wildly wrong; the final check K N = q b decides.
    """
    if matrix.data.dtype != object and residual.dtype != object and delta.dtype != object:
        if matrix.largest * matrix.widest < 2**50:
            return (residual << np.int64(up)) - matrix.wrapping(delta)
        delta = delta.astype(object)
    exact = (residual.astype(object) << up) - matrix.times(delta)
    return narrow(exact)


def _lowest(total: IntArray, shift: int) -> tuple[IntArray, int]:
    """Write total / 2**shift over the smallest power of two."""
    spare = min((int(n) & -int(n)).bit_length() - 1 for n in total if n) if shift else 0
    spare = min(spare, shift)
    return narrow(total >> spare), 1 << (shift - spare)


def _holds(matrix: Matrix, found: tuple[IntArray, int], b: IntArray) -> bool:
    numerators, q = found
    return bool(np.all(matrix.times(numerators) == scaled(b, q)))


def reconstruct(total: IntArray, shift: int, correct: int) -> tuple[IntArray, int] | None:
    """(N, q) with total / 2**shift within 2**-correct of N / q for a small q, or None.

    Each entry is first tried with the common denominator found so far; only when that
    fails are its continued fractions developed.
    """
    if correct < 4:
        return None
    half, slack = correct // 2 - 2, max(0, shift - correct)
    one, mask = 1 << shift, (1 << shift) - 1
    q = 1
    entries = total.tolist()
    for entry in entries:
        scaled_entry = q * entry
        off = scaled_entry & mask
        if min(off, one - off) <= q << slack:
            continue
        d = _denominator(off, shift, q << slack)
        q *= d
        if q.bit_length() > half:
            return None
    middle = one >> 1
    return narrow(np.array([(q * entry + middle) >> shift for entry in entries], dtype=object)), q


def _denominator(off: int, shift: int, error: int) -> int:
    """The first convergent's denominator k of off / 2**shift within error / 2**shift."""
    one = 1 << shift
    a, b = off, one
    k_before, k = 1, 0
    h_before, h = 0, 1
    while True:
        # convergents h / k of a / b, started at 1 / 0
        quotient, rest = divmod(a, b)
        h_before, h = h, quotient * h + h_before
        k_before, k = k, quotient * k + k_before
        if abs(off * k - h * one) <= error * k or rest == 0:
            return k
        a, b = b, rest


def _balance(
    exponents: npt.NDArray[np.int64], group: npt.NDArray[np.int64], size: int
) -> npt.NDArray[np.int64]:
    """Minus the largest exponent of each group, 0 for an empty one."""
    top = np.full(size, -(2**40), dtype=np.int64)
    np.maximum.at(top, group, exponents)
    top[top == -(2**40)] = 0
    return -top
