"""What must be true of any verdict: proved, rechecked, the scenario's own, and audited."""

from __future__ import annotations

import json

from designer import Verdict, audit, recheck
from designer.auditing import judge
from designer.rebuilding import rebuild
from designer.views.documents import verdict_document
from designer.views.page import plain
from designer.views.screen import screen


def hold(verdict: Verdict) -> None:
    """Hold one decided verdict against everything that knows better."""
    assert verdict.proved, verdict.reason
    assert verdict.status in ("possible", "impossible", "unbounded")
    assert plain(screen(verdict), width=80)
    json.dumps(verdict_document(verdict, {}), allow_nan=False)
    document = json.loads(json.dumps(verdict.proof))
    finding = recheck(document)
    assert finding.holds, finding.faults
    assert not rebuild(verdict.setting, document)
    if verdict.status != "possible":
        assert verdict.table is None
        return
    table = verdict.table
    if table is None:
        assert verdict.mechanism is not None
        table = verdict.mechanism.table()
    terms = verdict.terms
    found = audit(
        verdict.setting,
        table,
        subsidy=verdict.subsidy,
        slack=terms.slack,
        compelled=terms.compelled,
        limits=terms.limits,
        side=terms.side,
    )
    asked = {key: getattr(terms, key) for key in ("decision", "ic", "ir", "balance", "budget")}
    failing = judge(found, asked)
    if not terms.even_handed:  # the audit looks at it wherever the scenario asks it
        failing = [name for name in failing if name != "even-handed"]
    assert not failing
