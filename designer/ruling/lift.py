"""From payments that are right on average to a pot that is right in every case.

With independent types, interim payments m_i(a) whose sum is the target on average are turned
into payments that meet it at every profile, each party expecting what she did:

    D(theta)   = target(theta) - sum_j m_j(theta_j),     D_j(a) = E[D | theta_j = a],   E[D] = 0
    t_i(theta) = m_i(theta_i) + (D - sum_j D_j)/n + sum over j != i of D_j/(n-1)

Then sum_i t_i = target and E[t_i | theta_i] = m_i(theta_i). One party (convention 9) can only
be asked for m_1, so the target must be met by it.

Source: the device of d'Aspremont and Gerard-Varet 1979 and of Arrow 1979; that balance on
average then suffices is, for example, Borgers and Norman (2009), A note on budget balance under
interim participation constraints, Economic Theory 39:477-489 (from memory).
"""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction

from designer.ruling.amounts import Amounts, total
from designer.ruling.profiles import by_profile, expected, expected_by_type
from designer.setting.setting import Setting


def balanced(setting: Setting, interim: Sequence[Amounts], target: Amounts) -> list[Amounts]:
    """Find t_i over profiles, (N,) each, from m_i over types and the target of the pot (N,).

    Types must be independent and the target met on average; ValueError if it is not met.
    """
    n = len(setting.parties)
    flat = [by_profile(setting, i, part) for i, part in enumerate(interim)]
    rest = target - total(flat)
    if expected(setting, rest) != 0:
        raise ValueError("the payments do not meet the target on average")
    if n == 1:
        if rest.num.any():
            raise ValueError("one party cannot be asked for more than its own payment")
        return flat
    effects = [by_profile(setting, j, expected_by_type(setting, j, rest)) for j in range(n)]
    together = total(effects)
    common = (rest - together).times(Fraction(1, n)) + together.times(Fraction(1, n - 1))
    return [
        part + common - effect.times(Fraction(1, n - 1))
        for part, effect in zip(flat, effects, strict=True)
    ]
