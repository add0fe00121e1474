"""The classic closed-form rules, one file each, built exactly and held to the same audit.

    from designer.ruling import rules, compare
    report = rules("scenarios/breakwater.toml")      report["posted-price"].judged.worst_pot

A rule is one file with its published source in the docstring and a `RULE` at its end (kinds.py):
a name, what it assumes, the checks that say so in code, and `build`, which makes the table in
closed form over whole arrays of profiles, in whole numbers, never by a linear program.

To add one: write the file; take checks from checks.py, or write one that returns a Refusal with
a remedy; put its RULE into registry.py; hold it in tests/ruling/ against a number or a property
that its source gives. The audit, the screen, the JSON and `--only` follow by themselves.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from designer.ruling.comparing import Comparison, compare
    from designer.ruling.registry import RULES
    from designer.ruling.report import RulesReport, rules

_HOMES = {
    "Comparison": "designer.ruling.comparing",
    "RULES": "designer.ruling.registry",
    "RulesReport": "designer.ruling.report",
    "compare": "designer.ruling.comparing",
    "rules": "designer.ruling.report",
}

__all__ = ["RULES", "Comparison", "RulesReport", "compare", "rules"]


def __getattr__(name: str) -> Any:
    """Load a public name from its home module."""
    if name not in _HOMES:
        raise AttributeError(f"module 'designer.ruling' has no attribute {name!r}")
    return getattr(import_module(_HOMES[name]), name)
