"""The one line under whatever compels, charges or allocates."""

from __future__ import annotations

CAUTION = (
    "This is analysis under the stated priors and types, not legal or financial advice. "
    "Local law, procurement and competition rules, and licensed advisers decide."
)
