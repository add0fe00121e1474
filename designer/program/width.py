"""How wide the integers of a program must be."""

from __future__ import annotations

from fractions import Fraction
from typing import Any

import numpy as np

from designer.setting.setting import Setting


def width(setting: Setting, amounts: tuple[Fraction, ...]) -> np.dtype[Any]:
    """int64 where no product or sum of a row can leave it, Python integers otherwise."""
    money = [setting.outlay, setting.worth]
    for party in setting.parties:
        money += [party.value, party.outside]
    largest = max((int(abs(array).max()) for array in money if array.size), default=1)
    reach = (largest + 1) * (len(setting.parties) + len(setting.options) + 2) * setting.grain
    for amount in amounts:
        reach *= amount.denominator
        reach = max(reach, abs(amount.numerator) * setting.grain)
    reach *= setting.total_weight * setting.rule_den
    return np.dtype(np.int64) if reach < 2**58 else np.dtype(object)
