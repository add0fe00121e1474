"""A road: a way to decide a design, with what it needs and what it gives back.

Three verbs: does it apply (and if not, why, in words); map down to a smaller question and
settle that; map back, so that the answer is a table on demand and the certificate a proof
about the full program. The plain road `full` is the reference: where two roads can go, they
must give the same exact value.
"""

from __future__ import annotations

from typing import Protocol

from designer.demands.terms import Terms
from designer.engines.report import Engine
from designer.engines.watch import Watch
from designer.roads.settled import Settled
from designer.setting.setting import Setting


class Road(Protocol):
    """One way to decide."""

    @property
    def name(self) -> str:
        """The word after --path."""

    def applies(self, setting: Setting, terms: Terms) -> str | None:
        """None if the road can go there, else why not, in words that complete 'because'."""

    def travel(self, setting: Setting, terms: Terms, engine: Engine, watch: Watch) -> Settled:
        """Down, settle, and back."""
