"""The second best: the most worth that honesty, participation and the pot leave room for.

Where efficiency needs outside money, the best that does without takes, at each profile, a
decision with the largest

    sum_i (q_ik psi_i + r_ik) - outlay(k) + (1 - z) worth(k),    psi_i = (1 - z) x_i + z phi_i

ironed to rise with x_i (one_way.py), at the one multiplier z at which the pot is 0 on average; at
that z two rules are equally good and a lottery between them spends the pot exactly (hull.py).
The payments are then evened out to a pot of 0 in every case (lift.py). If efficiency itself is
affordable, z = 0 and what is left in the pot is handed back in equal parts.

Source: R. B. Myerson and M. A. Satterthwaite (1983), Efficient mechanisms for bilateral trading,
Journal of Economic Theory 29:265-281, Theorem 2 (from memory), for trade between two; for joint
projects W. Guth and M. Hellwig (1986), The private supply of a public good, Journal of
Economics Suppl. 5:121-159 (from memory).
"""

from __future__ import annotations

from fractions import Fraction

from designer.ruling import checks, one_way
from designer.ruling.amounts import Amounts, stacked, total
from designer.ruling.hull import Mixture, Point, best_mixture
from designer.ruling.kinds import Built, Refusal, Rule
from designer.ruling.lift import balanced
from designer.ruling.profiles import (
    certain,
    chosen,
    designers,
    expected,
    expected_by_type,
    first_best,
    outlay,
    total_worth,
)
from designer.setting.exact import decimal, text
from designer.setting.setting import IntArray, Setting
from designer.table import Table, held, largest


class Search:
    """The rules of one setting, by multiplier."""

    def __init__(self, setting: Setting) -> None:
        """Lay out what does not change with the multiplier."""
        self.setting = setting
        self.lines = one_way.known(setting)
        self.virtual = [line.virtual for line in self.lines]
        self.worth = total_worth(setting)
        self.pot = self._score(self.virtual) - outlay(setting)

    def _score(self, by_type: list[list[Fraction]]) -> Amounts:
        return total(
            [one_way.scores(self.setting, i, line, by_type[i]) for i, line in enumerate(self.lines)]
        )

    def best(self, z: Fraction) -> Point:
        """Find the rule that maximises (1 - z) worth + z pot, both on average.

        Net worths count staying out as 0, which moves every rule's worth by one amount.
        """
        psi = [
            line.ironed([(1 - z) * x + z * p for x, p in zip(line.level, phi, strict=True)])
            for line, phi in zip(self.lines, self.virtual, strict=True)
        ]
        fixed = designers(self.setting).times(1 - z) - outlay(self.setting).times(z)
        choice = first_best(self._score(psi) + fixed)
        return Point(choice, *(self._mean(part, choice) for part in (self.worth, self.pot)))

    def _mean(self, amounts: Amounts, choice: IntArray) -> Fraction:
        return expected(self.setting, chosen(amounts, choice))


def solve(setting: Setting) -> Mixture | None:
    """Find the mixture of rules; None if no honest rule with participation pays for itself."""
    return best_mixture(Search(setting).best)


def affordable(setting: Setting) -> Refusal | None:
    """Check that some rule pays for itself."""
    best = Search(setting).best(Fraction(1))
    if best.pot >= 0:
        return None
    return Refusal(
        "some decision rule that pays for itself",
        f"a pot of {text(best.pot)} at the most",
        "Add a decision that costs nothing and leaves everyone as they are.",
    )


def mixed(setting: Setting, mixture: Mixture) -> tuple[IntArray, int]:
    """Write the mixture as lotteries: int (N, K), and the denominator."""
    top, den = mixture.share.numerator, mixture.share.denominator
    over, under = (
        held(certain(setting, point.choice), den) for point in (mixture.over, mixture.under)
    )
    return over * top + under * (den - top), den


def build(setting: Setting) -> Built:
    """Build the best mixture, with a pot of 0 in every case."""
    mixture = solve(setting)
    if mixture is None:
        raise ValueError(str(affordable(setting)))
    decides, den = mixed(setting, mixture)
    n = len(setting.parties)
    lines = one_way.known(setting)
    pays = [one_way.envelope(setting, i, line, decides, den) for i, line in enumerate(lines)]
    cost = _cost(setting, decides, den)
    left = expected(setting, total(pays) - cost)
    notes = [_note(mixture)]
    if n == 1:
        if left:
            notes.append(f"One party's payments cannot be evened out; {text(left)} is left.")
        return Built(Table(decides, den, *stacked(pays)), tuple(notes))
    back = Amounts.of([left]).times(Fraction(1, n))
    interim = [expected_by_type(setting, i, part) - back for i, part in enumerate(pays)]
    even = balanced(setting, interim, cost)
    return Built(Table(decides, den, *stacked(even)), tuple(notes))


def _cost(setting: Setting, decides: IntArray, den: int) -> Amounts:
    bound = (largest(decides) + 1) * (largest(setting.outlay) + 1) * len(setting.options)
    return Amounts(held(decides, bound) @ held(setting.outlay, bound), den * setting.grain)


def _note(mixture: Mixture) -> str:
    if mixture.multiplier == 0:
        return "Efficiency itself is affordable; what it leaves is handed back in equal parts."
    note = f"The multiplier on the pot is {text(mixture.multiplier)}"
    if mixture.share == 1:
        return f"{note}; no lottery is needed."
    return (
        f"{note}; where two decisions tie there, the one kinder to the pot is taken with "
        f"chance {text(mixture.share)} (about {decimal(mixture.share)})."
    )


RULE = Rule(
    name="second-best",
    source="Myerson and Satterthwaite 1983",
    assumes="private, one-dimensional worths and independent types; everyone may stay out",
    checks=(
        checks.tabulated,
        checks.private,
        checks.independent_types,
        one_way.fits,
        affordable,
    ),
    build=build,
)
