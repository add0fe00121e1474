"""What a ray of the program does, as values: who pays ever more, and what it gains."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

from designer.program.labels import OnAverage, Pays, Unknown
from designer.program.program import Program
from designer.proof.vector import Vector
from designer.setting.setting import Setting


@dataclass(frozen=True)
class Change:
    """How a party's payments change for each unit that the goal gains; money units.

    expected  the prior mean       least, most  over all profiles, with the first where it is
    """

    party: str
    expected: Fraction
    least: Fraction
    most: Fraction
    least_at: tuple[str, ...]
    most_at: tuple[str, ...]

    @property
    def always(self) -> bool:
        """Whether the change is the same at every profile."""
        return self.least == self.most


@dataclass(frozen=True)
class Direction:
    """A change that may be repeated for ever, per unit of the goal."""

    goal: str
    changes: tuple[Change, ...]
    unknowns: tuple[tuple[str, Fraction], ...]


def direction(program: Program, ray: Vector, setting: Setting) -> Direction:
    """The ray divided by what the last goal gains along it: |cost . ray| / cost_den.

    Raises ValueError for a ray along which the goal does not move.
    """
    stage = program.stages[-1]
    entries = ray.fractions()
    gain = sum((int(stage.cost[column]) * value for column, value in entries.items()), Fraction(0))
    if not gain:
        raise ValueError("the goal does not move along the ray")
    scale = abs(Fraction(stage.cost_den) / gain)
    moved: dict[str, dict[int, Fraction]] = {}
    always: dict[str, Fraction] = {}
    unknowns: list[tuple[str, Fraction]] = []
    positions = [{kind.label: a for a, kind in enumerate(party.types)} for party in setting.parties]
    for column, value in entries.items():
        label = program.column_axis.label(column)
        if isinstance(label, Pays):
            at = tuple(known[kind] for known, kind in zip(positions, label.at, strict=True))
            moved.setdefault(label.party, {})[setting.profile_of(at)] = value * scale
        elif isinstance(label, OnAverage) and label.what == "pays":
            always[str(label.party)] = value * scale
        elif isinstance(label, Unknown):
            unknowns.append((label.name, value * scale))
    first = setting.labels_at(0)
    changes = [
        _change(setting, party.name, moved[party.name])
        if party.name in moved
        else Change(party.name, *(always[party.name],) * 3, first, first)
        for party in setting.parties
        if party.name in moved or party.name in always
    ]
    return Direction(stage.goal, tuple(changes), tuple(unknowns))


def _change(setting: Setting, party: str, by_profile: dict[int, Fraction]) -> Change:
    expected = sum(
        (value * setting.probability(profile) for profile, value in by_profile.items()),
        Fraction(0),
    )
    if len(by_profile) < setting.profiles:  # elsewhere nothing changes
        still = next(p for p in range(setting.profiles) if p not in by_profile)
        by_profile = {**by_profile, still: Fraction(0)}
    least = min(by_profile, key=lambda profile: (by_profile[profile], profile))
    most = max(by_profile, key=lambda profile: (by_profile[profile], -profile))
    return Change(
        party,
        expected,
        by_profile[least],
        by_profile[most],
        setting.labels_at(least),
        setting.labels_at(most),
    )
