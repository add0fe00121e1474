"""Expected externality: each is paid what she brings the others on average, by the others.

    g_i(a)     = E[ sum over j != i of v~_j(k*(theta)) + worth(k*(theta)) | theta_i = a ]
    t_i(theta) = outlay(k*(theta))/n - g_i(theta_i) + (1/(n-1)) sum over j != i of g_j(theta_j)

v~_j = v_j - outlay/n is the worth net of an equal share of the outlay (see shares.py). The
designer is party 0 (convention 2): her worth counts in every externality g_i, she pays and
receives nothing, and the redistribution runs over the parties 1..n with weights -1 on one's own
and 1/(n-1) on the others'. Hence

    sum_i t_i(theta) = outlay(k*(theta)) in every profile, and
    E[v_i - t_i | told b] = E[W(k*(b, .))] + what b does not move, largest at the truth.

With a joint prior the expectations are conditional on one's own reported type; honesty is then
a matter for the audit. One party has nobody to share with (convention 9): she pays the outlay,
which is honest where the designer's worth is the same for every decision.

Sources: C. d'Aspremont and L.-A. Gerard-Varet (1979), Incentives and incomplete information,
Journal of Public Economics 11:25-45; K. Arrow (1979), The property rights doctrine and demand
revelation under incomplete information (both from memory).
"""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction

from designer.ruling import checks
from designer.ruling.amounts import Amounts, stacked, total
from designer.ruling.kinds import Built, Refusal, Rule
from designer.ruling.profiles import (
    TIES,
    by_profile,
    certain,
    chosen,
    efficient,
    expected_by_type,
    independent,
    total_worth,
)
from designer.ruling.shares import absorbed_others, share
from designer.setting.setting import IntArray, Setting
from designer.table import Table


def externalities(setting: Setting, choice: IntArray) -> list[Amounts]:
    """Find g_i(a), what a party of type a brings the others on average: (T_i,) each."""
    welfare = total_worth(setting)
    return [
        expected_by_type(setting, i, chosen(absorbed_others(setting, welfare, i), choice))
        for i in range(len(setting.parties))
    ]


def redistributed(brought: Sequence[Amounts]) -> list[Amounts]:
    """Pay each what she brings, at the others' expense: -g_i + sum over j != i of g_j/(n-1).

    The table of weights, -1 on one's own and 1/(n-1) on the others', has columns that add up
    to 0, which is why the payments do.
    """
    n = len(brought)
    everyone = total(brought).times(Fraction(1, n - 1))
    # -g_i + sum over j != i of g_j/(n-1)  =  everyone - g_i (1 + 1/(n-1))
    return [everyone - gains.times(Fraction(n, n - 1)) for gains in brought]


def payments(setting: Setting, choice: IntArray) -> list[Amounts]:
    """Find t_i over all profiles: (N,) each, adding up to the outlay in every one."""
    due = chosen(share(setting), choice)
    if len(setting.parties) == 1:
        return [due]
    brought = [
        by_profile(setting, i, gains) for i, gains in enumerate(externalities(setting, choice))
    ]
    return [due + part for part in redistributed(brought)]


def alone(setting: Setting) -> Refusal | None:
    """Check that a single party has no externality on the designer (convention 9)."""
    if len(setting.parties) > 1 or len(set(setting.worth.tolist())) == 1:
        return None
    return Refusal(
        "two parties or more, or a designer to whom every decision is worth the same",
        "one party, whose decision matters to the designer",
        "Nobody is there to receive what she should pay: use pivotal, or ask `designer pose`.",
    )


def build(setting: Setting) -> Built:
    """Build the efficient decision with payments that add up to its outlay."""
    choice = efficient(setting)
    notes = [TIES]
    if any(setting.outlay):
        notes.append("The outlay is financed in equal shares, counted in every externality.")
    if not independent(setting):
        notes.append("Types are correlated: expectations follow one's own reported type.")
    table = Table(certain(setting, choice), 1, *stacked(payments(setting, choice)))
    return Built(table, tuple(notes))


RULE = Rule(
    name="expected-externality",
    source="d'Aspremont and Gerard-Varet 1979, Arrow 1979",
    assumes="private worths; independent types, else honesty may be lost",
    checks=(checks.tabulated, checks.private, alone),
    build=build,
)
