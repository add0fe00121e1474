"""What every road that brings a table home must show of it, whatever the road."""

from __future__ import annotations

from designer.auditing import audit
from designer.demands.terms import Terms
from designer.setting.setting import Setting
from designer.table import OnDemand
from designer.verdict import Verdict


def assert_on_demand(setting: Setting, verdict: Verdict, back: OnDemand) -> None:
    """The mechanism, and what its file says, are the table at every profile."""
    mechanism, table = verdict.mechanism, verdict.table
    assert mechanism is not None
    assert table is not None
    for profile in range(setting.profiles):
        types = setting.types_at(profile)
        pays = tuple(table.payment(i, profile) for i in range(len(types)))
        chances = tuple(table.chance(profile, k) for k in range(len(setting.options)))
        assert mechanism.pays(types) == pays == back.pays(types)
        assert mechanism.decides(types) == chances == back.decides(types)


def assert_honest_and_balanced(setting: Setting, terms: Terms, verdict: Verdict) -> None:
    """The table keeps honesty whatever others report, and what is asked of taking part and pot."""
    assert verdict.table is not None
    found = audit(
        setting,
        verdict.table,
        subsidy=verdict.subsidy,
        slack=terms.slack,
        shortfall=terms.shortfall,
        compelled=terms.compelled,
    )
    words = {"ic-dominant", f"ir-{terms.ir}", f"balance-{terms.balance}-{terms.budget}"}
    judged = {name: finding for name, finding in found.worst.items() if name in words}
    assert "ic-dominant" in judged
    assert [name for name, finding in judged.items() if not finding.holds] == []
