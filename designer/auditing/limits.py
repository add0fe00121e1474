"""The scenario's limits on payments, and its side demands on interim probabilities."""

from __future__ import annotations

from collections.abc import Iterator
from fractions import Fraction

import numpy as np

from designer.auditing.outcome import Finding
from designer.auditing.view import View
from designer.setting.setting import IntArray, Limits, Party, Setting, Side
from designer.table import Table, held, largest


def judge_limits(
    view: View, table: Table, limits: Limits, party: Party, tolerance: Fraction
) -> Iterator[Finding]:
    """Judge every limit that is set, at every profile.

    pays_at_most      t_i <= cap            pays_at_least   t_i >= floor
    within_worth      t_i <= sum_k x_k v_i(k), worth as reported
    only_when_served  t_i <= cap P(served), served by k when v_i(k) > 0; without a cap,
                      t_i <= 0 where the party is surely not served
    """
    cap, floor = limits.pays_at_most, limits.pays_at_least
    if cap is not None:
        a, o = divmod(int(view.pays.argmax()), view.others)
        margin = cap - Fraction(int(view.pays[a, o]), view.den)
        yield _finding("pays_at_most", view, party, margin, tolerance, a, o)
    if floor is not None:
        a, o = divmod(int(view.pays.argmin()), view.others)
        margin = Fraction(int(view.pays[a, o]), view.den) - floor
        yield _finding("pays_at_least", view, party, margin, tolerance, a, o)
    if limits.within_worth:
        a, o = divmod(int(view.truthful.argmin()), view.others)
        margin = Fraction(int(view.truthful[a, o]), view.den)
        yield _finding("within_worth", view, party, margin, tolerance, a, o)
    if limits.only_when_served:
        yield _served(view, table, party, cap, tolerance)


def _served(
    view: View, table: Table, party: Party, cap: Fraction | None, tolerance: Fraction
) -> Finding:
    served: IntArray = (view.chosen * (view.value > 0)).sum(axis=2)
    if cap is None:
        rest = np.where(served == 0, -view.pays, view.bound)
        den = view.den
    else:
        den = view.den * table.decides_den * cap.denominator
        per_chance, per_pay = cap.numerator * view.den, table.decides_den * cap.denominator
        bound = (largest(served) + 1) * abs(per_chance) + (largest(view.pays) + 1) * per_pay
        rest = held(served, bound) * per_chance - held(view.pays, bound) * per_pay
    a, o = divmod(int(rest.argmin()), view.others)
    if cap is None and served[a, o] != 0:
        return Finding("only_when_served", True, None, party.name)
    margin = Fraction(int(rest[a, o]), den)
    return _finding("only_when_served", view, party, margin, tolerance, a, o)


def judge_side(
    setting: Setting, index: int, side: Side, view: View, table: Table, tolerance: Fraction
) -> Iterator[Finding]:
    """Judge the demands on P(option | party has type) that concern the viewing party."""
    for number, chance in enumerate(side.chances):
        if chance.party != index:
            continue
        cells = view.chosen[chance.type, :, chance.option]
        odds = view.odds[0 if len(view.odds) == 1 else chance.type]
        given = view.given[chance.type]
        bound = (largest(cells) + 1) * given
        total = int((held(cells, bound) * held(odds, bound)).sum())
        value = Fraction(total, given * table.decides_den)
        margins = []
        if chance.at_least is not None:
            margins.append(value - chance.at_least)
        if chance.at_most is not None:
            margins.append(chance.at_most - value)
        if margins:
            yield Finding(
                f"chance[{number}]",
                min(margins) >= -tolerance,
                min(margins),
                setting.parties[index].name,
                setting.parties[index].types[chance.type].label,
                option=setting.options[chance.option],
            )


def _finding(
    name: str, view: View, party: Party, margin: Fraction, tolerance: Fraction, a: int, o: int
) -> Finding:
    kind = party.types[a].label
    return Finding(name, margin >= -tolerance, margin, party.name, kind, profile=view.at(a, o))
