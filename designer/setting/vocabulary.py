"""The words of the [demands] table and the values each may take."""

from __future__ import annotations

DECISIONS = ("efficient", "table", "randomized", "deterministic")
HONESTY = ("none", "bayesian", "dominant")
PARTICIPATION = ("none", "ex-ante", "interim", "ex-post")
BALANCE = ("none", "ex-ante", "ex-post")
BUDGET = ("exact", "no-deficit")
TIDY = ("swing", "none")
GOALS = (
    "any",
    "outside-money",
    "revenue",
    "welfare",
    "parties",
    "floor",
    "swing",
    "margin",
    "worst-pot",
    "returned-share",
    "blend",
)
CHOICES: dict[str, tuple[str, ...]] = {
    "decision": DECISIONS,
    "ic": HONESTY,
    "ir": PARTICIPATION,
    "balance": BALANCE,
    "budget": BUDGET,
    "tidy": TIDY,
}
"""Keys of [demands] whose value is one word of a fixed list."""

AMOUNTS = ("subsidy", "slack")
"""Keys of [demands] whose value is an exact amount of money."""

SWITCHES = ("even_handed",)
"""Keys of [demands] that are true or false."""
