"""Widest margin: the largest amount by which every lie loses, uniformly."""

from __future__ import annotations

from designer.demands.kinds import Goal
from designer.demands.terms import Terms
from designer.program.affine import Affine
from designer.program.draft import Draft


def _prepare(draft: Draft, terms: Terms) -> None:
    """The slack of the lie rows becomes an unknown, at most what the terms tolerate."""
    draft.free_allowance("slack", None, terms.slack)


def _objective(draft: Draft, terms: Terms) -> Affine:
    """The margin is minus the slack: honest less lying >= margin."""
    return -draft.allowance("slack", terms.slack)


GOAL = Goal("margin", "max", "largest loss that every lie brings", _objective, _prepare)
