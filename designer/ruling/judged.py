"""A table in the columns of the comparison: what it keeps, what it costs, whom it hurts."""

from __future__ import annotations

import os
from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from types import MappingProxyType

from designer.auditing import Audit, Finding, audit, judge
from designer.demands.terms import Terms
from designer.setting.setting import Setting
from designer.table import Table

HONEST = (("ic-dominant", "dominant"), ("ic-bayesian", "bayesian"))
JOINED = (("ir-ex-post", "ex-post"), ("ir-interim", "interim"), ("ir-ex-ante", "ex-ante"))
BALANCED = (
    ("balance-ex-post-exact", "ex-post exact"),
    ("balance-ex-post-no-deficit", "ex-post no-deficit"),
    ("balance-ex-ante-exact", "ex-ante exact"),
    ("balance-ex-ante-no-deficit", "ex-ante no-deficit"),
)
STRONGEST = {"ic": HONEST, "ir": JOINED, "balance": BALANCED}


@dataclass(frozen=True, eq=False)
class Judged:
    """An audited table; all amounts exact money of the scenario.

    failing  the demands asked for that it breaks, by the audit's names; empty: it keeps all
    """

    audit: Audit
    failing: tuple[str, ...]

    @property
    def table(self) -> Table:
        """The table itself."""
        return self.audit.table

    @property
    def expected_pot(self) -> Fraction:
        """E[pot], positive when money is left over (convention 1)."""
        return self.audit.pot.expected

    @property
    def worst_pot(self) -> Fraction:
        """The pot of the worst profile."""
        return self.audit.pot.least

    @property
    def lie_gain_bayesian(self) -> Fraction:
        """The most a type of a party can expect from a lie; 0 where honesty is best."""
        return self.lie("bayesian").violation

    @property
    def lie_gain_dominant(self) -> Fraction:
        """The most a lie gains at any profile; 0 where honesty is dominant."""
        return self.lie("dominant").violation

    @property
    def interim_shortfall(self) -> Fraction:
        """By how much the worst-off type of a party would rather have stayed out, else 0."""
        return self.shortfall("interim").violation

    @property
    def expost_shortfall(self) -> Fraction:
        """The same at the worst profile."""
        return self.shortfall("ex-post").violation

    @property
    def largest_payment(self) -> Fraction:
        """The largest payment in size, negative when received."""
        return self.audit.largest.amount

    def lie(self, kind: str) -> Finding:
        """Where the closest lie is told, 'bayesian' or 'dominant'."""
        return self.audit.worst[f"ic-{kind}"]

    def shortfall(self, kind: str) -> Finding:
        """Who fares worst by taking part, 'ex-ante', 'interim' or 'ex-post'."""
        return self.audit.worst[f"ir-{kind}"]

    @property
    def keeps(self) -> Mapping[str, str]:
        """The strongest form kept of honesty, participation and balance; 'none' if none is."""
        return MappingProxyType(
            {
                demand: next((word for name, word in forms if self.audit.holds[name]), "none")
                for demand, forms in STRONGEST.items()
            }
        )


def judged(setting: Setting, table: Table | str | os.PathLike[str], terms: Terms) -> Judged:
    """Audit a table, or the CSV file of one, and hold it to the terms."""
    found = _audited(setting, table, terms, terms.subsidy)
    if "outside-money" in terms.goals and not terms.subsidy:
        # The outside money is what the goal leaves open: a table may take what it needs.
        needed = found.pot.least if terms.balance == "ex-post" else found.pot.expected
        found = _audited(setting, table, terms, -needed)
    asked = {
        "decision": terms.decision,
        "ic": terms.ic,
        "ir": terms.ir,
        "balance": terms.balance,
        "budget": terms.budget,
    }
    return Judged(found, tuple(judge(found, asked)))


def _audited(
    setting: Setting, table: Table | str | os.PathLike[str], terms: Terms, subsidy: Fraction
) -> Audit:
    return audit(
        setting,
        table,
        subsidy=subsidy,
        slack=terms.slack,
        shortfall=terms.shortfall,
        compelled=terms.compelled,
        limits=terms.limits,
        side=terms.side,
    )
