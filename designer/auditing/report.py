"""What an audit says against given demands, and its plain forms for files."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable, Mapping
from fractions import Fraction
from typing import Any

from designer.auditing.outcome import Audit, Finding, Standing
from designer.setting.exact import decimal, text

FORMAT = "designer.audit/1"
MOST_POTS = 1000
"""Most profiles whose pots are listed one by one in the JSON document."""

INTERIM = (
    "party",
    "type",
    "expected payment",
    "expected utility",
    "gain over staying out",
    "closest lie",
    "margin",
)
"""The columns of interim.csv."""


def judge(audit: Audit, asked: Mapping[str, object]) -> list[str]:
    """Name the demands of `asked` that the table fails; an empty list if it keeps them all.

    asked   ic, ir, balance, budget, decision: the words of the scenario's [demands] (others
            are ignored); one that is missing is not asked, a missing budget means "exact"

    The decisions must be lotteries whatever is asked, and the scenario's limits and side
    demands are asked always. Raises ValueError for a word that is no such demand.
    """
    names = []
    if asked.get("ic", "none") != "none":
        names.append(f"ic-{asked['ic']}")
    if asked.get("ir", "none") != "none":
        names.append(f"ir-{asked['ir']}")
    if asked.get("balance", "none") != "none":
        names.append(f"balance-{asked['balance']}-{asked.get('budget', 'exact')}")
    unknown = [name for name in names if name not in audit.worst]
    if unknown:
        raise ValueError(f"no such demands: {', '.join(unknown)}")
    failing = [name for name in names if not audit.worst[name].holds]
    decisions = audit.decisions
    if not decisions.lottery.holds:
        failing.append("lottery")
    decision = asked.get("decision", "randomized")
    if decision == "efficient" and not decisions.efficient.holds:
        failing.append("decision-efficient")
    elif decision == "table" and decisions.follows is not None and not decisions.follows.holds:
        failing.append("decision-table")
    elif decision == "deterministic" and decisions.lottery.holds and not decisions.certain:
        failing.append("decision-deterministic")
    elif decision not in ("efficient", "table", "randomized", "deterministic"):
        raise ValueError(f"no such demand: decision {decision!r}")
    failing += [name for name, finding in audit.limits.items() if not finding.holds]
    return failing


def as_json(audit: Audit) -> dict[str, Any]:
    """Give the audit as JSON-ready values, every number exact as text, format designer.audit/1.

    `approx` stands beside the money people look at first and is for the eye only.
    """
    setting, pot, decisions = audit.setting, audit.pot, audit.decisions
    pots: dict[str, Any] = {
        "expected": _both(pot.expected),
        "least": {**_both(pot.least), "profile": dict(pot.least_at)},
        "most": {**_both(pot.most), "profile": dict(pot.most_at)},
    }
    if setting.profiles <= MOST_POTS:
        pots["by_profile"] = [
            {"types": list(setting.labels_at(profile)), "pot": text(pot[profile])}
            for profile in range(setting.profiles)
        ]
    return {
        "format": FORMAT,
        "scenario": {"title": setting.title, "digest": setting.digest},
        "money": setting.money,
        "exact": audit.exact,
        "tolerance": text(audit.tolerance),
        "subsidy": text(audit.subsidy),
        "slack": text(audit.slack),
        "holds": dict(audit.holds),
        "worst": {name: _finding(finding) for name, finding in audit.worst.items()},
        "compelled": sorted(audit.compelled),
        "excused": [{"demand": f.demand, **_finding(f)} for f in audit.excused],
        "interim": [
            {
                name: text(value) if isinstance(value, Fraction) else value
                for name, value in vars(standing).items()
            }
            for standing in audit.standings
        ],
        "pot": pots,
        "decisions": {
            "lottery": _finding(decisions.lottery),
            "certain": decisions.certain,
            "efficient": _finding(decisions.efficient),
            "follows_rule": None if decisions.follows is None else _finding(decisions.follows),
            "welfare": _both(decisions.welfare),
            "welfare_lost": _both(decisions.lost),
        },
        "limits": {name: _finding(finding) for name, finding in audit.limits.items()},
        "largest_payment": {
            "party": audit.largest.party,
            "amount": _both(audit.largest.amount),
            "profile": dict(audit.largest.profile),
        },
    }


def interim_csv(standings: Iterable[Standing]) -> bytes:
    """Give standings as the content of `interim.csv`, a row per party and type, exact.

    The closest lie and its margin are empty for a party of one type.
    """
    lines = io.StringIO(newline="")
    out = csv.writer(lines, lineterminator="\n")
    out.writerow(INTERIM)
    for row in standings:
        amounts = [text(amount) for amount in (row.pays, row.utility, row.gain)]
        margin = "" if row.margin is None else text(row.margin)
        out.writerow([row.party, row.type, *amounts, row.lie or "", margin])
    return lines.getvalue().encode()


def _both(value: Fraction) -> dict[str, str]:
    return {"exact": text(value), "approx": decimal(value)}


def _finding(finding: Finding) -> dict[str, Any]:
    plain: dict[str, Any] = {"holds": finding.holds, "margin": None}
    if finding.margin is not None:
        plain |= {"margin": text(finding.margin), "approx": decimal(finding.margin)}
    for name in ("party", "type", "lie", "option"):
        value = getattr(finding, name)
        if value is not None:
            plain[name] = value
    if finding.profile is not None:
        plain["profile"] = dict(finding.profile)
    return plain
