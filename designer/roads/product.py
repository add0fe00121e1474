"""A joint prior that is exactly a product of its marginals counts as independent."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from designer.setting.setting import Setting


def as_independent(setting: Setting) -> Setting | None:
    """The setting with independent priors, if its joint prior is a product; else None.

    Exact: weight(theta) * prod_i total_i must equal total * prod_i weight_i(theta_i) at every
    profile, in integers, with total_i the sum of party i's own weights.
    """
    if setting.joint is None:
        return setting
    product = np.ones(1, dtype=object)
    for party in setting.parties:
        product = np.multiply.outer(product, np.array(party.weights, dtype=object)).ravel()
    scale = math.prod(sum(party.weights) for party in setting.parties)
    if not np.array_equal(setting.joint.astype(object) * scale, product * setting.total_weight):
        return None
    return replace(setting, joint=None, support_only=False)
