"""Marginal product: each keeps all she adds to what the others can do without touching her.

    t_i(theta) = max over k in A_i of W_-i(k) - W_-i(k*(theta))

a Groves rule whose A_i holds only the decisions that leave the party exactly where staying out
would, whatever her type: a seller keeps her good, a town's absence leaves the project unbuilt.
Unlike pivotal, which lets the others decide over her head, it never makes taking part a loss.
In two-sided trade the pot lacks the whole gain from trade.

Source: L. Makowski and J. M. Ostroy (1987), Vickrey-Clarke-Groves mechanisms and perfect
competition, Journal of Economic Theory 42:244-261 (from memory).
"""

from __future__ import annotations

import numpy as np

from designer.ruling import checks
from designer.ruling.amounts import Amounts
from designer.ruling.groves import groves
from designer.ruling.kinds import Built, Refusal, Rule
from designer.ruling.profiles import TIES
from designer.setting.setting import Setting


def without(setting: Setting, party: int) -> list[int]:
    """List the decisions at which every type of the party is as if it had stayed out."""
    data = setting.parties[party]
    same = (data.value == data.outside[:, None]).all(axis=0)
    return [int(k) for k in np.flatnonzero(same)]


def escapable(setting: Setting) -> Refusal | None:
    """Check that the others can always decide without touching a party."""
    for i, party in enumerate(setting.parties):
        if not without(setting, i):
            return Refusal(
                "for every party a decision that leaves it where staying out would",
                f"none for {party.name}",
                "Add such a decision, or use pivotal.",
            )
    return None


def build(setting: Setting) -> Built:
    """Build the Groves rule whose offset is the best decision that leaves one out."""

    def best(party: int, rest: Amounts) -> Amounts:
        return Amounts(rest.num[:, without(setting, party)].max(axis=1), rest.den)

    return Built(groves(setting, best), (TIES,))


RULE = Rule(
    name="marginal-product",
    source="Makowski and Ostroy 1987",
    assumes="private worths; outside money is no object",
    checks=(checks.tabulated, checks.private, escapable),
    build=build,
)
