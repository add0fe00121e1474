"""The optimal auction: the most expected pot, by ironed virtual worths.

    phi_i(a) = x_i(a) - (x_i(a+) - x_i(a)) P(x_i > x_i(a)) / P(x_i = x_i(a))

Each profile takes a decision with the largest sum_i (q_ik phi_i + r_ik) - outlay(k), phi ironed
to rise with x (one_way.py); of equal ones the first in the order of the options. Payments leave
the lowest type what staying out is worth and every other type what it could have got by saying
the next one down, so that truth is dominant and taking part pays in every case. The expected
pot is the mean of that maximum, more than which no honest table with participation yields. The
designer's own worth is no money and does not count.

Source: R. B. Myerson (1981), Optimal auction design, Mathematics of Operations Research
6:58-73; the discrete form after E. Elkind (2007), Designing and learning optimal finite support
auctions, SODA 2007 (both from memory). It holds for any decisions whose worths are one-way.
"""

from __future__ import annotations

from designer.ruling import checks, one_way
from designer.ruling.amounts import Amounts, stacked, total
from designer.ruling.kinds import Built, Rule
from designer.ruling.profiles import certain, first_best, outlay
from designer.setting.setting import Setting
from designer.table import Table


def build(setting: Setting) -> Built:
    """Build the rule that the ironed virtual worths point to."""
    lines = one_way.known(setting)
    virtual = [line.virtual for line in lines]
    ironed = [line.ironed(phi) for line, phi in zip(lines, virtual, strict=True)]
    parts = [one_way.scores(setting, i, lines[i], ironed[i]) for i in range(len(lines))]
    choice = first_best(total(parts) - outlay(setting))
    decides = certain(setting, choice)
    pays: list[Amounts] = [
        one_way.envelope(setting, i, line, decides, 1) for i, line in enumerate(lines)
    ]
    notes = ["Of decisions with equal virtual worth the first in the order of options is taken."]
    bent = [
        party.name
        for party, phi, flat in zip(setting.parties, virtual, ironed, strict=True)
        if phi != flat
    ]
    if bent:
        notes.append(f"Virtual worths were ironed for {', '.join(bent)}.")
    if any(setting.worth):
        notes.append("The designer's own worth is no money and was not counted.")
    return Built(Table(decides, 1, *stacked(pays)), tuple(notes))


RULE = Rule(
    name="optimal-auction",
    source="Myerson 1981",
    assumes="private, one-dimensional worths and independent types",
    checks=(checks.tabulated, checks.private, checks.independent_types, one_way.fits),
    build=build,
)
