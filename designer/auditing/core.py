"""The audit: nine demands, the limits, and what the table means for each party."""

from __future__ import annotations

import os
from collections.abc import Iterable, Mapping
from fractions import Fraction
from types import MappingProxyType

import numpy as np
import numpy.typing as npt

from designer.auditing import honesty
from designer.auditing.decisions import judge_decisions
from designer.auditing.even import even_handed as judge_likeness
from designer.auditing.limits import judge_limits, judge_side
from designer.auditing.outcome import (
    BALANCE,
    HONESTY,
    PARTICIPATION,
    Audit,
    Finding,
    Payment,
    Pot,
    Standing,
)
from designer.auditing.view import View, labels, see
from designer.errors import Mistake, TableError
from designer.setting.setting import IntArray, Limits, Setting, Side
from designer.table import Table, held, largest, pot

Bools = npt.NDArray[np.bool_]
ZERO = Fraction(0)


def audit(
    setting: Setting,
    table: Table | str | os.PathLike[str],
    *,
    tolerance: Fraction | None = None,
    subsidy: Fraction = ZERO,
    slack: Fraction = ZERO,
    shortfall: Fraction = ZERO,
    compelled: Iterable[str] | None = None,
    limits: Limits | None = None,
    side: Side | None = None,
    even_handed: bool | None = None,
) -> Audit:
    """Hold a payment table against every demand, exactly and from the definitions alone.

    table      a `Table`, or the path of a CSV file such as `transfers.csv`
    tolerance  by how much a demand may be missed and still hold: money, and probability
               for lotteries. None: 0, or what rounding explains when the file looks rounded
    subsidy    outside money S: the pot is held against -S (exact) or at least -S (no-deficit)
    slack      tolerated gain from a lie; `shortfall`: tolerated loss from taking part
    compelled, limits, side, even_handed   instead of the scenario's own, where given

    Margins are minima over parties, true types, lies and profiles of (conventions 1, 4, 8)
        ic-bayesian  E[u_i | truth] - E[u_i | lie]      ic-dominant  the same at each profile
        ir-*         utility - outside option, in expectation, per type, per profile
        balance-*    -|pot + S| (exact) or pot + S (no-deficit), in expectation, per profile
    Ex-post and dominant demands range over all profiles, or over those of positive
    probability where the scenario says profiles = "support" (convention 5).

    Raises TableError for a file that cannot be read or a table of another shape.
    """
    exact, chance_tolerance = True, tolerance or ZERO
    if not isinstance(table, Table):
        from designer.tablefile import read_table

        file = read_table(table, setting)
        table, exact = file.table, file.exact
        if tolerance is None:
            tolerance, chance_tolerance = file.tolerance, file.chance_tolerance
    tolerance = tolerance or ZERO
    _refuse_misshapen(table, setting)
    excused = frozenset(compelled if compelled is not None else _compelled(setting))
    limits, side = limits or setting.limits, side or setting.side

    support: Bools | None = None
    if setting.support_only and setting.joint is not None:
        support = np.asarray(setting.joint > 0, dtype=bool)
    findings: list[Finding] = []
    standings: list[Standing] = []
    for index, party in enumerate(setting.parties):
        view = see(setting, table, index)
        counts = None if support is None else _own_counts(view)
        closest = honesty.bayesian(view)
        findings += _lies(view, "ic-bayesian", closest, tolerance + slack)
        findings += _lies(view, "ic-dominant", honesty.dominant(view, counts), tolerance + slack)
        rows = _standings(view, closest)
        standings += rows
        findings += _participation(view, rows, counts, tolerance + shortfall)
        findings += judge_limits(view, table, limits, party, tolerance)
        findings += judge_side(setting, index, side, view, table, chance_tolerance)

    pots = _pot(table, setting, support)
    findings += _balance(pots, setting, support, tolerance, subsidy)
    decisions = judge_decisions(setting, table, tolerance, chance_tolerance)
    floors = {
        "welfare_at_least": (side.welfare_at_least, decisions.welfare),
        "revenue_at_least": (side.revenue_at_least, pots.expected),
    }
    for name, (floor, value) in floors.items():
        if floor is not None:
            findings.append(Finding(name, value - floor >= -tolerance, value - floor))
    if setting.asked.get("even_handed") if even_handed is None else even_handed:
        findings.append(judge_likeness(setting, table, tolerance, chance_tolerance))

    asked = [f for f in findings if not (f.party in excused and f.demand in PARTICIPATION)]
    others = {f.demand for f in findings} - {*HONESTY, *PARTICIPATION, *BALANCE}
    return Audit(
        setting=setting,
        table=table,
        exact=exact,
        tolerance=tolerance,
        subsidy=subsidy,
        slack=slack,
        worst=_worst(asked, (*HONESTY, *PARTICIPATION, *BALANCE)),
        excused=tuple(
            _worst((f for f in findings if f.party == name), (demand,))[demand]
            for name in sorted(excused)
            for demand in PARTICIPATION
        ),
        standings=tuple(standings),
        pot=pots,
        decisions=decisions,
        largest=_largest(table, setting),
        compelled=excused,
        limits=_worst(asked, sorted(others)),
    )


def _compelled(setting: Setting) -> list[str]:
    return [party.name for party in setting.parties if party.compelled]


def _refuse_misshapen(table: Table, setting: Setting) -> None:
    wanted = {
        "decides": (setting.profiles, len(setting.options)),
        "pays": (len(setting.parties), setting.profiles),
    }
    mistakes = [
        Mistake(
            f"table.{name}",
            f"shape {getattr(table, name).shape}",
            f"{shape}, (profiles, options) or (parties, profiles) of the scenario",
            "Give the table that belongs to this scenario.",
        )
        for name, shape in wanted.items()
        if getattr(table, name).shape != shape
    ]
    if min(table.decides_den, table.pays_den) < 1:
        mistakes.append(
            Mistake("table", "a denominator below 1", "positive denominators", "Change the signs.")
        )
    if mistakes:
        raise TableError(mistakes)


def _own_counts(view: View) -> Bools:
    """Which profiles have positive probability: (T, O)."""
    return np.broadcast_to(view.odds > 0, view.pays.shape)


def _lies(view: View, demand: str, lies: list[honesty.Lie], allowed: Fraction) -> list[Finding]:
    """Give the closest of a party's lies as a finding; none where it has no lie to tell."""
    if not lies:
        return []
    worst = min(lies, key=lambda lie: lie.margin)
    party = view.setting.parties[view.index]
    return [
        Finding(
            demand,
            worst.margin >= -allowed,
            worst.margin,
            party.name,
            party.types[worst.true].label,
            party.types[worst.told].label,
            profile=None if worst.others is None else view.at(worst.true, worst.others),
        )
    ]


def _standings(view: View, closest: list[honesty.Lie]) -> list[Standing]:
    party = view.setting.parties[view.index]
    total = Fraction(view.setting.total_weight)
    if view.setting.joint is None:
        odds = list(party.marginal)
    else:
        odds = [given / total for given in view.given]
    pays = view.mean(view.pays)
    utility = view.mean(view.truthful)
    outside = view.mean(view.outside)
    lies = {lie.true: lie for lie in closest}
    return [
        Standing(
            party=party.name,
            type=kind.label,
            probability=odds[a],
            pays=pays[a],
            worth=utility[a] + pays[a],
            utility=utility[a],
            outside=outside[a],
            gain=utility[a] - outside[a],
            lie=party.types[lies[a].told].label if a in lies else None,
            margin=lies[a].margin if a in lies else None,
        )
        for a, kind in enumerate(party.types)
    ]


def _participation(
    view: View, rows: list[Standing], counts: Bools | None, allowed: Fraction
) -> list[Finding]:
    """Judge the three participation demands for a party."""
    name = rows[0].party
    average = sum((row.probability * row.gain for row in rows), ZERO)
    lowest = min(rows, key=lambda row: row.gain)
    found = [
        Finding("ir-ex-ante", average >= -allowed, average, name),
        Finding("ir-interim", lowest.gain >= -allowed, lowest.gain, name, lowest.type),
    ]
    gains: IntArray = view.truthful - view.outside
    if counts is not None:
        gains = np.where(counts, gains, view.bound)
    a, o = divmod(int(gains.argmin()), view.others)
    least = Fraction(int(gains[a, o]), view.den)
    found.append(
        Finding("ir-ex-post", least >= -allowed, least, name, rows[a].type, profile=view.at(a, o))
    )
    return found


def _pot(table: Table, setting: Setting, support: Bools | None) -> Pot:
    """Add up the pot; least and most are over the cases in which demands are to hold."""
    num, den = pot(table, setting)
    where = np.arange(setting.profiles) if support is None else np.flatnonzero(support)
    bound = (largest(num) + 1) * setting.total_weight
    mean = (held(num, bound) * held(setting.weights, bound)).sum()
    low, high = int(where[num[where].argmin()]), int(where[num[where].argmax()])
    return Pot(
        num=num,
        den=den,
        expected=Fraction(int(mean), den * setting.total_weight),
        least=Fraction(int(num[low]), den),
        most=Fraction(int(num[high]), den),
        least_at=labels(setting, low),
        most_at=labels(setting, high),
    )


def _balance(
    pots: Pot, setting: Setting, support: Bools | None, tolerance: Fraction, subsidy: Fraction
) -> list[Finding]:
    """Judge the four balance demands, against a pot of -subsidy."""
    where = np.arange(setting.profiles) if support is None else np.flatnonzero(support)
    num = pots.num[where]
    low, high = int(where[num.argmin()]), int(where[num.argmax()])
    off = low if abs(pots[low] + subsidy) >= abs(pots[high] + subsidy) else high
    found = []
    for kind, exact_at, least_at in (("ex-ante", None, None), ("ex-post", off, low)):
        for budget, at in (("exact", exact_at), ("no-deficit", least_at)):
            rest = (pots.expected if at is None else pots[at]) + subsidy
            margin = -abs(rest) if budget == "exact" else rest
            found.append(
                Finding(
                    f"balance-{kind}-{budget}",
                    margin >= -tolerance,
                    margin,
                    profile=None if at is None else labels(setting, at),
                )
            )
    return found


def _largest(table: Table, setting: Setting) -> Payment:
    """Find the largest payment in size, made or received."""
    low, high = int(table.pays.argmin()), int(table.pays.argmax())
    place = low if abs(int(table.pays.flat[low])) > abs(int(table.pays.flat[high])) else high
    index, profile = divmod(place, setting.profiles)
    amount = table.payment(index, profile)
    return Payment(setting.parties[index].name, amount, labels(setting, profile))


def _worst(findings: Iterable[Finding], names: Iterable[str]) -> Mapping[str, Finding]:
    """Keep the finding of smallest margin for each name, or one that holds idly."""
    worst = {name: Finding(name, True, None) for name in names}
    for finding in findings:
        so_far = worst.get(finding.demand)
        if so_far is None or finding.margin is None:
            continue
        if so_far.margin is None or finding.margin < so_far.margin:
            worst[finding.demand] = finding
    return MappingProxyType(worst)
