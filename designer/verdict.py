"""The answer, frozen: a status, whether it is proved, the table and the proof."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from fractions import Fraction
from functools import cached_property
from typing import TYPE_CHECKING, Any

from designer.demands.terms import Terms
from designer.program.program import Program
from designer.proof.derivation import Derivation, derive
from designer.proof.outcome import GoalResult
from designer.proof.vector import Vector
from designer.setting.setting import Setting
from designer.table import OnDemand, Table

if TYPE_CHECKING:
    import pandas as pd

    from designer.auditing import Audit
    from designer.auditing.outcome import Standing


WRITTEN_OUT = 1_000_000
"""Profiles up to which a table on demand is made into a frame."""


@dataclass(frozen=True, eq=False)
class Verdict:
    """What `pose` returns.

    status   "possible", "impossible", "unbounded" or "undecided"
    proved   True only when exact arithmetic confirmed the status and every goal's value
    goals    one result per goal, in order; the tidy stage last, marked as such
    mechanism  computes the table on demand, where the road gives one (see `pays`)
    table    the decision and transfer rule (possible), else None
    proof    the proof document (format designer.proof/1), {} when undecided
    claims   what the checker found the document to prove, in words
    path     the road that decided
    reason   why nothing was decided, and what to try
    seconds  wall time by part of the work
    """

    setting: Setting
    terms: Terms
    status: str
    proved: bool
    goals: tuple[GoalResult, ...]
    path: str
    program: Program
    table: Table | None = None
    mechanism: OnDemand | None = None
    primal: Vector | None = None
    farkas: Vector | None = None
    ray: Vector | None = None
    proof: dict[str, Any] = field(default_factory=dict)
    claims: tuple[str, ...] = ()
    reason: str = ""
    engine: str = ""
    seconds: dict[str, float] = field(default_factory=dict)

    @property
    def goal_value(self) -> Fraction | None:
        """The exact value of the first goal; None unless the verdict is `possible`."""
        return self.goals[0].value if self.status == "possible" else None

    @property
    def goal_values(self) -> dict[str, Fraction | None]:
        """Every goal's exact value, the tidy stage apart."""
        return {goal.goal: goal.value for goal in self.goals if not goal.tidy}

    @cached_property
    def audit(self) -> Audit | None:
        """The table held against every demand by independent code; None without a table."""
        from designer.auditing import audit

        if self.table is None:
            return None
        terms = self.terms
        return audit(
            self.setting,
            self.table,
            subsidy=self.subsidy,
            slack=terms.slack,
            shortfall=terms.shortfall,
            compelled=terms.compelled,
            limits=terms.limits,
            side=terms.side,
            even_handed=terms.even_handed,
        )

    @cached_property
    def standings(self) -> tuple[Standing, ...]:
        """What each type of each party can expect; from the table, or from interim quantities."""
        if self.audit is not None:
            return self.audit.standings
        if self.path == "interim" and self.primal is not None and self.status == "possible":
            from designer.roads.interim.standing import standings

            return standings(self.setting, self.program, self.primal)
        if self.path == "likeness" and self.mechanism is not None:
            from designer.roads.likeness.mechanism import LikenessMechanism
            from designer.roads.likeness.standing import standings as of_orbits

            if isinstance(self.mechanism, LikenessMechanism):
                return of_orbits(self.mechanism)
        if self.path == "type-graph" and self.mechanism is not None:
            from designer.roads.typegraph import standing
            from designer.roads.typegraph.mechanism import GraphMechanism

            if isinstance(self.mechanism, GraphMechanism):
                return standing.standings(self.mechanism)
        return ()

    @property
    def subsidy(self) -> Fraction:
        """The outside money of the table: what was asked for, or the least that was found."""
        least = self.goal_values.get("outside-money")
        return self.terms.subsidy if least is None else least

    def pays(self, profile: Sequence[str]) -> tuple[Fraction, ...]:
        """What every party pays at a profile given by type labels, exact, in party order.

        Raises ValueError if there is no table, KeyError for a label a party does not have.
        """
        positions = []
        for party, label in zip(self.setting.parties, profile, strict=True):
            labels = [type_.label for type_ in party.types]
            if label not in labels:
                raise KeyError(label)
            positions.append(labels.index(label))
        if self.mechanism is not None:
            return self.mechanism.pays(positions)
        if self.table is None:
            raise ValueError(f"the verdict is {self.status}: there is no table")
        place = self.setting.profile_of(tuple(positions))
        return tuple(self.table.payment(i, place) for i in range(len(positions)))

    @property
    def transfers(self) -> pd.DataFrame:
        """The table, one row per profile, exact; columns as in transfers.csv.

        `type:NAME` per party, `probability`, `decides:OPTION` per option, `pays:NAME` per
        party (money units, paid BY the party) and `pot`. Empty without a table. A table on
        demand is written out here up to 1,000,000 profiles; ValueError beyond: use `pays`.
        """
        import pandas as pd

        from designer.tablefile import columns, rows

        table = self.table
        if table is None and self.mechanism is not None:
            if self.setting.profiles > WRITTEN_OUT:
                raise ValueError(
                    f"{self.setting.profiles:,} profiles are too many for a frame; "
                    "pays(profile) computes any of them"
                )
            table = self.mechanism.table()
        found = [] if table is None else rows(self.setting, table)
        return pd.DataFrame(found, columns=columns(self.setting))

    @property
    def interim(self) -> pd.DataFrame:
        """Per party and type: expected payment, utility, gain, closest lie and its margin."""
        import pandas as pd

        from designer.auditing.outcome import Standing

        fields = list(Standing.__dataclass_fields__)
        rows = [[getattr(standing, name) for name in fields] for standing in self.standings]
        return pd.DataFrame(rows, columns=fields)

    @cached_property
    def derivation(self) -> Derivation | None:
        """The impossibility line by line; None unless a linear program was proved empty."""
        if self.status != "impossible" or self.farkas is None:
            return None
        return derive(self.program, self.farkas)
