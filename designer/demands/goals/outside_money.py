"""Least outside money: the smallest subsidy under which the demands can be met."""

from __future__ import annotations

from fractions import Fraction

from designer.demands.kinds import Goal
from designer.demands.terms import Terms
from designer.program.affine import Affine
from designer.program.draft import Draft


def _prepare(draft: Draft, terms: Terms) -> None:
    """S becomes an unknown of either sign; the balance rows read pot = -S or pot >= -S."""
    draft.free_allowance("subsidy", None, None)


def _objective(draft: Draft, terms: Terms) -> Affine:
    return draft.allowance("subsidy", Fraction(0))


GOAL = Goal("outside-money", "min", "least outside money needed", _objective, _prepare)
