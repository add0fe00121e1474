"""The best mixture of two rules: most worth, the pot kept, by one exact multiplier.

Over rules with worth w and pot p one wants the most w with p >= 0 on average. The answer lies
on the upper hull of the points (w, p): a rule with p < 0, a rule with p >= 0 and the edge
between them. Each edge names a multiplier, the rules that maximise (1 - z) w + z p at that z are
found anew, and the search ends when no rule lies beyond the edge. All numbers are rational.

Source: M. J. Eisner and D. G. Severance (1976), Mathematical techniques for efficient record
segmentation in large shared databases, Journal of the ACM 23:619-635, for the search (from
memory).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from fractions import Fraction

from designer.setting.setting import IntArray


@dataclass(frozen=True, eq=False)
class Point:
    """A decision rule with its expected worth and its expected pot at the largest payments."""

    choice: IntArray
    worth: Fraction
    pot: Fraction


@dataclass(frozen=True, eq=False)
class Mixture:
    """Rule `over` with probability `share`, else rule `under`; `multiplier` is z above."""

    over: Point
    under: Point
    share: Fraction
    multiplier: Fraction


def best_mixture(best: Callable[[Fraction], Point]) -> Mixture | None:
    """Find the most worth whose pot is at least 0; None if no rule has such a pot.

    best   the rule that maximises (1 - z) worth + z pot, for 0 <= z <= 1
    """
    under = best(Fraction(0))
    if under.pot >= 0:
        return Mixture(under, under, Fraction(1), Fraction(0))
    over = best(Fraction(1))
    if over.pot < 0:
        return None
    while True:
        dearer, safer = under.worth - over.worth, over.pot - under.pot
        z = dearer / (dearer + safer)
        found = best(z)
        if (1 - z) * found.worth + z * found.pot <= (1 - z) * over.worth + z * over.pot:
            break
        if found.pot >= 0:
            over = found
        else:
            under = found
    share = Fraction(1) if dearer == 0 else -under.pot / safer
    # share * over.pot + (1 - share) * under.pot = 0
    return Mixture(over, under, min(share, Fraction(1)), z)
