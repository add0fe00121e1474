"""What each type can expect, read off interim quantities instead of a table."""

from __future__ import annotations

from fractions import Fraction

from designer.auditing.outcome import Standing
from designer.program.labels import ExpectedDecision, ExpectedPay, Share, Slice, Unknown
from designer.program.program import Program
from designer.proof.vector import Vector
from designer.setting.setting import Party, Setting


def standings(setting: Setting, program: Program, primal: Vector) -> tuple[Standing, ...]:
    """Expected payment, worth, utility, gain and closest lie, per party and type.

    With private worths and independent types the worth of a lie is sum_k v_i(k, true) q_i(k, told).
    """
    numbers = primal.numerators()
    pays: dict[tuple[str, str], Fraction] = {}
    chance: dict[tuple[str, str, str], Fraction] = {}
    place = 0
    for block in program.column_axis.blocks:
        for j in range(block.count):
            label = block.label(j)
            if isinstance(label, (Share, Slice, Unknown)):
                break
            value = Fraction(numbers[place + j], primal.den)
            if isinstance(label, ExpectedPay):
                pays[label.party, label.type] = value
            elif isinstance(label, ExpectedDecision):
                chance[label.party, label.type, label.option] = value
        place += block.count
    return tuple(
        standing
        for party in setting.parties
        for standing in _of_party(setting, party, pays, chance)
    )


def _of_party(
    setting: Setting,
    party: Party,
    pays: dict[tuple[str, str], Fraction],
    chance: dict[tuple[str, str, str], Fraction],
) -> list[Standing]:
    labels = [type_.label for type_ in party.types]

    def worth(a: int, b: int) -> Fraction:
        """What the decision is worth to the true type a when it reports b."""
        return sum(
            (
                Fraction(int(party.value[a, k]), setting.grain)
                * chance.get((party.name, labels[b], option), 0)  # those counted with another: 0
                for k, option in enumerate(setting.options)
            ),
            Fraction(0),
        )

    found = []
    paid = [pays.get((party.name, told), Fraction(0)) for told in labels]
    for a in range(len(labels)):
        outside = Fraction(int(party.outside[a]), setting.grain)
        worths = [worth(a, b) for b in range(len(labels))]
        found.append(Standing.of(party, a, party.marginal[a], worths, paid, outside))
    return found
