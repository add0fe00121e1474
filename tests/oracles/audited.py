"""What the audit, which shares no rows with the program, must say of a table that was posed."""

from __future__ import annotations

from fractions import Fraction

from designer.auditing import Audit
from designer.demands.terms import Demands
from tests.oracles.brute import net_worth, worth


def demanded(demands: Demands) -> list[str]:
    """The audit's names of the demands made."""
    names = []
    if demands.ic not in (None, "none"):
        names.append(f"ic-{demands.ic}")
    if demands.ir not in (None, "none"):
        names.append(f"ir-{demands.ir}")
    if demands.balance not in (None, "none"):
        names.append(f"balance-{demands.balance}-{demands.budget}")
    return names


def shortcomings(audit: Audit, demands: Demands) -> list[str]:
    """The demands that a table breaks, its decision rule and limits included.

    Every word of the demands but the amounts must be given: None is not read as a default.
    """
    broken = [name for name in demanded(demands) if not audit.holds[name]]
    if not audit.decisions.lottery.holds:
        broken.append("lottery")
    if demands.decision == "efficient" and not audit.decisions.efficient.holds:
        broken.append("efficient")
    if demands.decision == "deterministic" and not audit.decisions.certain:
        broken.append("deterministic")
    follows = audit.decisions.follows
    if demands.decision == "table" and (follows is None or not follows.holds):
        broken.append("follows the rule")
    return broken + [name for name, finding in audit.limits.items() if not finding.holds]


def achieved(audit: Audit, goal: str) -> Fraction:
    """The value that a table attains, as the audit counts it."""
    if goal == "revenue":
        return audit.pot.expected
    if goal == "outside-money":
        return audit.subsidy
    if goal == "welfare":
        return audit.decisions.welfare
    if goal == "parties":
        return sum((s.probability * s.utility for s in audit.standings), Fraction(0))
    if goal == "floor":
        return min(standing.gain for standing in audit.standings)
    if goal == "worst-pot":
        return _least_in_scope(audit)
    if goal == "returned-share":
        return _returned(audit)
    if goal == "swing":
        return abs(audit.largest.amount)
    raise NotImplementedError(goal)


def _least_in_scope(audit: Audit) -> Fraction:
    """The least pot where demands 'in every case' are asked (convention 5)."""
    setting = audit.setting
    return min(
        audit.pot[p]
        for p in range(setting.profiles)
        if not setting.support_only or setting.probability(p)
    )


def _returned(audit: Audit) -> Fraction:
    """The least share handed back of what the pivotal rule takes, where it takes anything."""
    setting = audit.setting
    shares = []
    for p in range(setting.profiles):
        if setting.support_only and not setting.probability(p):
            continue
        worths = [net_worth(setting, k, p) for k in range(len(setting.options))]
        best = worths.index(max(worths))
        takings = Fraction(0)
        for i in range(len(setting.parties)):
            others = [total - worth(setting, i, k, p) for k, total in enumerate(worths)]
            takings += max(others) - others[best]
        if takings:
            shares.append(1 - audit.pot[p] / takings)
    return min(shares)
