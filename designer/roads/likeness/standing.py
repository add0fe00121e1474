"""What each type can expect, summed over representatives instead of read off a table."""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction

import numpy as np

from designer.auditing.outcome import Standing
from designer.roads.likeness.mechanism import LikenessMechanism


def standings(mechanism: LikenessMechanism) -> tuple[Standing, ...]:
    """Expected payment, worth, utility, gain and closest lie, per party and type."""
    found: dict[int, list[Standing]] = {}
    for group in mechanism.orbits.likeness.groups:
        first = _of_party(mechanism, group[0])
        for party in group:
            name = mechanism.setting.parties[party].name
            found[party] = [replace(standing, party=name) for standing in first]
    return tuple(standing for party in sorted(found) for standing in found[party])


def _of_party(mechanism: LikenessMechanism, index: int) -> list[Standing]:
    setting = mechanism.setting
    party = setting.parties[index]
    weights = mechanism.orbits.beliefs(index)
    total = int(weights.sum())
    paid, likely = [], []
    for profiles in mechanism.orbits.fiber(index):
        chances, pays = mechanism.at(profiles)
        paid.append(
            Fraction(
                int((weights * pays[:, index].astype(object)).sum()), total * mechanism.paid_den
            )
        )
        likely.append((weights[:, None] * chances.astype(object)).sum(axis=0))
    standing = []
    for a in range(party.size):
        worths = [
            Fraction(
                int(np.dot(party.value[a].astype(object), chances)),
                total * mechanism.chances_den * setting.grain,
            )
            for chances in likely
        ]
        outside = Fraction(int(party.outside[a]), setting.grain)
        standing.append(Standing.of(party, a, party.marginal[a], worths, paid, outside))
    return standing
