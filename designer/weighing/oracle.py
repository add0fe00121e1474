"""One memory of what was posed: feasibility of terms, each verdict proved."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from fractions import Fraction

from designer.demands.terms import Terms
from designer.engines.report import Engine
from designer.engines.watch import Watch
from designer.setting.setting import Setting
from designer.weighing.mix import Unsettled
from designer.weighing.relaxed import allowed


@dataclass(frozen=True)
class Finding:
    """Whether terms can be met, and whether that is proved."""

    possible: bool
    proved: bool


@dataclass
class Oracle:
    """Answers about one setting, remembered by terms."""

    setting: Setting
    engine: Engine
    watch: Watch
    known: dict[Terms, Finding] = field(default_factory=dict)
    posed: int = 0

    def learn(self, terms: Terms, possible: bool, proved: bool) -> None:
        """Take in what was found elsewhere."""
        self.known[plain(terms, self.setting)] = Finding(possible, proved)

    def ask(self, terms: Terms) -> Finding:
        """Whether a table meets the terms.

        Raises Unsettled if that could not be decided and Stopped if it was not to be.
        """
        terms = plain(terms, self.setting)
        if terms not in self.known:
            self.watch.check()
            self.posed += 1
            relaxed = allowed(self.setting, terms, self.engine, self.watch)
            answer = relaxed.feasible(relaxed.columns)
            if answer.status not in ("optimal", "infeasible"):
                raise Unsettled(answer.reason)
            self.known[terms] = Finding(answer.status == "optimal", answer.proved)
        return self.known[terms]


def plain(terms: Terms, setting: Setting) -> Terms:
    """The same demands without goals, and written alike wherever they mean the same."""
    names = {party.name for party in setting.parties}
    if names <= terms.trusted:
        terms = replace(terms, ic="none")
    if names <= terms.compelled:
        terms = replace(terms, ir="none")
    if terms.ic == "none":
        terms = replace(terms, trusted=frozenset(), slack=Fraction(0))
    if terms.ir == "none":
        terms = replace(terms, compelled=frozenset(), shortfall=Fraction(0))
    if terms.balance == "none":
        terms = replace(terms, budget="exact", subsidy=Fraction(0))
    return replace(terms, goals=("any",), tidy="none", blend=())
