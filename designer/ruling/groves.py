"""Any Groves rule, and the one without an offset: each is left with the others' whole worth.

    t_i(theta) = h_i(theta_-i) - W_-i(k*(theta))
    W_-i(k) = sum over j != i of v_j(k, theta_j) + worth(k) - outlay(k)

The designer counts among 'the others' as party 0 (convention 2). Whatever the offset h_i, which
one's own report cannot move, u_i = W(k*(theta)) - h_i, so that truth is a dominant strategy.

Source: T. Groves (1973), Incentives in teams, Econometrica 41:617-631, Theorem 1 (from memory).
"""

from __future__ import annotations

from collections.abc import Callable

from designer.ruling import checks
from designer.ruling.amounts import Amounts, stacked
from designer.ruling.kinds import Built, Rule
from designer.ruling.profiles import TIES, certain, chosen, first_best, total_worth, worth
from designer.setting.setting import Setting
from designer.table import Table


def others(setting: Setting, welfare: Amounts, party: int) -> Amounts:
    """W_-i(k, theta), which the party's own type does not move: (N, K).

    welfare  total_worth(setting)
    """
    return welfare - worth(setting, party)


def groves(setting: Setting, offset: Callable[[int, Amounts], Amounts] | None = None) -> Table:
    """Build the Groves rule of any offsets.

    offset  h_i over profiles, (N,), from the party and W_-i, (N, K); None: all 0. It is for
            the caller to see that h_i does not move with the party's own type.
    """
    welfare = total_worth(setting)
    choice = first_best(welfare)
    pays = []
    for i in range(len(setting.parties)):
        rest = others(setting, welfare, i)
        due = chosen(rest, choice).times(-1)
        pays.append(due if offset is None else due + offset(i, rest))
    return Table(certain(setting, choice), 1, *stacked(pays))


def build(setting: Setting) -> Built:
    """Build the rule without offsets."""
    return Built(groves(setting), (TIES,))


RULE = Rule(
    name="groves",
    source="Groves 1973",
    assumes="private worths; outside money is no object",
    checks=(checks.tabulated, checks.private),
    build=build,
)
