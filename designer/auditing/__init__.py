"""Holds any payment table against every demand, straight from the definitions."""

from designer.auditing.core import audit
from designer.auditing.outcome import Audit, Decisions, Finding, Payment, Pot, Standing
from designer.auditing.report import as_json, interim_csv, judge

__all__ = [
    "Audit",
    "Decisions",
    "Finding",
    "Payment",
    "Pot",
    "Standing",
    "as_json",
    "audit",
    "interim_csv",
    "judge",
]
