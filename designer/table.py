"""A payment table: what is decided and who pays what at every profile, exactly."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

from designer.setting.setting import IntArray


@dataclass(frozen=True, eq=False)
class Table:
    """A decision rule and a transfer rule over all N profiles, exact.

    decides  int, shape (N, K); the probability of option k at profile theta is
             decides[theta, k] / decides_den
    pays     int, shape (n, N); t_i(theta) = pays[i, theta] / pays_den in money units,
             paid BY party i (convention 1)
    """

    decides: IntArray
    decides_den: int
    pays: IntArray
    pays_den: int

    def payment(self, party: int, profile: int) -> Fraction:
        """t_i(theta)."""
        return Fraction(int(self.pays[party, profile]), self.pays_den)

    def chance(self, profile: int, option: int) -> Fraction:
        """x_k(theta)."""
        return Fraction(int(self.decides[profile, option]), self.decides_den)
