"""One memory of what was posed: feasibility of terms, each verdict proved."""

from __future__ import annotations

from dataclasses import dataclass, field, replace

from designer.demands.terms import Terms
from designer.engines.report import Engine
from designer.engines.watch import Watch
from designer.setting.setting import Setting
from designer.table import Table
from designer.weighing.groups import group_of
from designer.weighing.relaxed import Answer, Relaxed


@dataclass(frozen=True, eq=False)
class Finding:
    """Whether terms can be met, proved or not; the groups blamed, or a table that meets them."""

    possible: bool
    proved: bool
    blamed: frozenset[str] = frozenset()
    table: Table | None = None


class Unsettled(Exception):  # noqa: N818 - the engine gave up: no mistake of anyone's
    """Neither possible nor impossible could be shown."""


@dataclass
class Oracle:
    """Answers about one setting, remembered by terms."""

    setting: Setting
    engine: Engine
    watch: Watch
    known: dict[Terms, Finding] = field(default_factory=dict)
    posed: int = 0

    def ask(self, terms: Terms) -> Finding:
        """Whether a table meets the terms. Raises Unsettled if that could not be decided."""
        terms = replace(terms, goals=("any",), tidy="none", blend=())
        if terms not in self.known:
            self.watch.check()
            self.posed += 1
            relaxed = Relaxed(self.setting, terms, {}, self.engine, self.watch)
            answer = relaxed.feasible()
            if answer.status not in ("optimal", "infeasible"):
                self.watch.check()
                raise Unsettled(answer.reason)
            self.known[terms] = Finding(
                answer.status == "optimal",
                answer.proved,
                _blamed(relaxed, answer),
                relaxed.table(answer),
            )
        return self.known[terms]


def _blamed(relaxed: Relaxed, answer: Answer) -> frozenset[str]:
    """The groups whose rows or bounds the certificate of impossibility uses."""
    if answer.farkas is None:
        return frozenset()
    groups = {group_of(relaxed.row_axis.label(row)) for row in answer.farkas.idx}
    found = {group for group in groups if group is not None}
    terms = relaxed.terms
    # Bounds on payments have no row: a certificate that leaves a payment over uses one.
    for key in ("pays_at_most", "pays_at_least"):
        if getattr(terms.limits, key) is not None:
            found.add(f"limit:{key}")
    if terms.decision != "randomized":
        found.add("decision")
    return frozenset(found)
