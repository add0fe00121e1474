"""Dissolving a partnership: the asset to whoever values it most, and fixed fees.

Party i owns the share r_i and can stay with r_i s_i(a). The payments are those of expected
externality, plus a fee per party that does not depend on any report:

    fee_i = L_i - mean of all L_j,    L_i = min over types a of the gain over keeping the share

so that the fees add up to 0, large owners are compensated beforehand, and everyone's worst type
gains the same: mean L. The partnership is dissolved by this rule iff that mean is at least 0.
On a grid of types somewhat more is possible: revenue-greatest-efficient uses that room up.

Source: P. Cramton, R. Gibbons and P. Klemperer (1987), Dissolving a partnership efficiently,
Econometrica 55:615-632, Theorems 1 and 2 (abstract looked up; the rest from memory).
"""

from __future__ import annotations

from fractions import Fraction

from designer.ruling import checks
from designer.ruling.amounts import Amounts, stacked
from designer.ruling.expected_externality import payments
from designer.ruling.kinds import Built, Refusal, Rule
from designer.ruling.profiles import (
    TIES,
    certain,
    chosen,
    efficient,
    expected_by_type,
    outside,
    worth,
)
from designer.ruling.units import units
from designer.setting.exact import decimal, text
from designer.setting.setting import Setting
from designer.table import Table


def shares(setting: Setting) -> list[Fraction] | None:
    """Find r_i with outside_i(a) = r_i s_i(a) for every type; None where there are none."""
    found = units(setting)
    if isinstance(found, Refusal) or found.count != 1:
        return None
    owned = []
    for party, unit in zip(setting.parties, found.worth, strict=True):
        outs, units_ = party.outside.tolist(), unit.num.tolist()
        top = max(units_)
        r = Fraction(outs[units_.index(top)], top)
        if any(r * s != out for s, out in zip(units_, outs, strict=True)):
            return None
        owned.append(r)
    return owned


def owned(setting: Setting) -> Refusal | None:
    """Check that staying out is keeping a share of one asset, and the shares make up the whole."""
    found = shares(setting)
    if found is not None and sum(found) == 1 and min(found) >= 0:
        return None
    return Refusal(
        "one asset, and an outside option of r_i times its worth with shares that add up to 1",
        "other outside options" if found is None else f"shares of {text(sum(found, Fraction(0)))}",
        "State the outside options as shares, or use revenue-greatest-efficient.",
    )


def fees(setting: Setting, pays: list[Amounts]) -> tuple[list[Fraction], Fraction]:
    """Find the fees that make everyone's worst gain equal, and that gain."""
    choice = efficient(setting)
    floors = []
    for i, due in enumerate(pays):
        gain = chosen(worth(setting, i), choice) - due - outside(setting, i)
        floors.append(min(expected_by_type(setting, i, gain).fractions()))
    common = sum(floors, Fraction(0)) / len(floors)
    return [floor - common for floor in floors], common


def build(setting: Setting) -> Built:
    """Build expected externality with the fees."""
    choice = efficient(setting)
    pays = payments(setting, choice)
    found, common = fees(setting, pays)
    named = ", ".join(
        f"{party.name} {text(fee)}" for party, fee in zip(setting.parties, found, strict=True)
    )
    notes = (
        TIES,
        f"Fees paid beforehand: {named}.",
        f"Everyone's worst type gains {text(common)} (about {decimal(common)}).",
    )
    charged = [due + Amounts.of([fee]) for due, fee in zip(pays, found, strict=True)]
    return Built(Table(certain(setting, choice), 1, *stacked(charged)), notes)


RULE = Rule(
    name="partnership-split",
    source="Cramton, Gibbons and Klemperer 1987",
    assumes="one asset owned in shares, private worths, independent types",
    checks=(
        checks.tabulated,
        checks.private,
        checks.independent_types,
        checks.at_least(2),
        owned,
        checks.pure_transfer,
    ),
    build=build,
)
