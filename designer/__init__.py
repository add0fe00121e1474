"""designer: payment rules for shared decisions, proved before anyone signs.

The public names are loaded when first used, so that the proof checker can be imported with
the standard library alone.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from designer.auditing import Audit
    from designer.demands.terms import Demands, Terms
    from designer.holding import audit
    from designer.posing import pose
    from designer.proof.recheck import recheck
    from designer.ruling.comparing import compare
    from designer.ruling.report import RulesReport, rules
    from designer.setting.scenario import parse_scenario, read_scenario
    from designer.setting.setting import Limits, Setting, Side
    from designer.table import Table
    from designer.tablefile import read_table
    from designer.verdict import Verdict
    from designer.weighing.tradeoff import Tradeoff
    from designer.weighing.weigh import weigh

_HOMES = {
    "Audit": "designer.auditing",
    "Demands": "designer.demands.terms",
    "Limits": "designer.setting.setting",
    "Setting": "designer.setting.setting",
    "Side": "designer.setting.setting",
    "Table": "designer.table",
    "Terms": "designer.demands.terms",
    "Tradeoff": "designer.weighing.tradeoff",
    "Verdict": "designer.verdict",
    "RulesReport": "designer.ruling.report",
    "audit": "designer.holding",
    "compare": "designer.ruling.comparing",
    "parse_scenario": "designer.setting.scenario",
    "pose": "designer.posing",
    "read_scenario": "designer.setting.scenario",
    "read_table": "designer.tablefile",
    "recheck": "designer.proof.recheck",
    "rules": "designer.ruling.report",
    "weigh": "designer.weighing.weigh",
}

__all__ = [
    "Audit",
    "Demands",
    "Limits",
    "RulesReport",
    "Setting",
    "Side",
    "Table",
    "Terms",
    "Tradeoff",
    "Verdict",
    "audit",
    "compare",
    "parse_scenario",
    "pose",
    "read_scenario",
    "read_table",
    "recheck",
    "rules",
    "weigh",
]


def __getattr__(name: str) -> Any:
    """Load a public name from its home module."""
    if name not in _HOMES:
        raise AttributeError(f"module 'designer' has no attribute {name!r}")
    return getattr(import_module(_HOMES[name]), name)


def __dir__() -> list[str]:
    """Every public name, loaded or not: what completion offers."""
    return sorted({*globals(), *__all__})
