"""A joint prior that is exactly a product of its marginals counts as independent."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from designer.setting.setting import Setting


def as_independent(setting: Setting) -> Setting | None:
    """The setting with independent priors, if its joint prior is a product; else None.

    Exact: weight(theta) * total^(n-1) must equal the product of the marginal weights at every
    profile, in integers.
    """
    if setting.joint is None:
        return setting
    product = np.ones(1, dtype=object)
    for party in setting.parties:
        product = np.multiply.outer(product, np.array(party.weights, dtype=object)).ravel()
    scale = 1
    for _ in setting.parties[1:]:
        scale *= setting.total_weight
    if not np.array_equal(setting.joint.astype(object) * scale, product):
        return None
    return replace(setting, joint=None, support_only=False)
