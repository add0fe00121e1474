"""What an audit finds, as frozen values."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from fractions import Fraction
from types import MappingProxyType
from typing import TYPE_CHECKING

from designer.setting.setting import IntArray, Party, Setting
from designer.table import Table

if TYPE_CHECKING:
    import pandas as pd

HONESTY = ("ic-bayesian", "ic-dominant")
PARTICIPATION = ("ir-ex-ante", "ir-interim", "ir-ex-post")
BALANCE = (
    "balance-ex-ante-exact",
    "balance-ex-ante-no-deficit",
    "balance-ex-post-exact",
    "balance-ex-post-no-deficit",
)
DEMANDS = (*HONESTY, *PARTICIPATION, *BALANCE)
"""The demands that every audit judges, in the order they are listed in."""


@dataclass(frozen=True)
class Finding:
    """How closely one demand is kept, and where it is kept worst.

    margin   the smallest margin: negative = broken by that much, positive or 0 = kept with
             that much to spare; money (probability for lotteries and chances). None where
             there is nothing to judge: no lie to tell, nobody asked to take part.
    party, type, lie   whose, of which true type, told as which, where that applies
    profile  the types by party where it happens; for a dominant demand the party's own
             true type stands beside the others' reports
    """

    demand: str
    holds: bool
    margin: Fraction | None
    party: str | None = None
    type: str | None = None
    lie: str | None = None
    option: str | None = None
    profile: Mapping[str, str] | None = None

    @property
    def violation(self) -> Fraction:
        """By how much the demand is broken at worst, 0 if it is not."""
        return max(Fraction(0), -self.margin) if self.margin is not None else Fraction(0)


@dataclass(frozen=True)
class Standing:
    """What one type of one party can expect from honest reports; money units.

    pays      E[t_i | type]             worth    E[sum_k x_k v_i | type]
    utility   worth - pays              outside  E[outside option | type]
    gain      utility - outside
    lie       the lie that comes closest, and `margin`, what it loses against honesty;
              both None where the party has no other type
    """

    party: str
    type: str
    probability: Fraction
    pays: Fraction
    worth: Fraction
    utility: Fraction
    outside: Fraction
    gain: Fraction
    lie: str | None
    margin: Fraction | None

    @classmethod
    def of(
        cls,
        party: Party,
        a: int,
        probability: Fraction,
        worth: Sequence[Fraction],
        pays: Sequence[Fraction],
        outside: Fraction,
    ) -> Standing:
        """What type a can expect, from the worth and the payment of each report, honest ones too.

        worth, pays  by told type, given the true type a
        """
        utility = worth[a] - pays[a]
        lies = [(utility - worth[b] + pays[b], b) for b in range(party.size) if b != a]
        margin, lie = min(lies) if lies else (None, None)
        return cls(
            party=party.name,
            type=party.types[a].label,
            probability=probability,
            pays=pays[a],
            worth=worth[a],
            utility=utility,
            outside=outside,
            gain=utility - outside,
            lie=None if lie is None else party.types[lie].label,
            margin=margin,
        )


@dataclass(frozen=True)
class Payment:
    """One payment: by whom (negative: to whom, convention 1), money, at which profile."""

    party: str
    amount: Fraction
    profile: Mapping[str, str]


@dataclass(frozen=True, eq=False)
class Pot:
    """The pot by profile (convention 1): num / den, money left over where positive.

    `least` and `most` leave out the profiles that convention 5 lets a scenario leave out.
    """

    num: IntArray
    den: int
    expected: Fraction
    least: Fraction
    most: Fraction
    least_at: Mapping[str, str]
    most_at: Mapping[str, str]

    def __getitem__(self, profile: int) -> Fraction:
        """Look up the pot at a profile number."""
        return Fraction(int(self.num[profile]), self.den)


@dataclass(frozen=True)
class Decisions:
    """What the table decides, judged apart from who pays.

    lottery     the probabilities of every profile are nonnegative and sum to 1
    certain     every profile has one decision for sure
    efficient   the welfare-maximising decisions, and only those, at every profile
                (conventions 2 and 6); its margin is minus the welfare lost at worst
    follows     the scenario's own rule is kept; None where it gives none
    welfare     E[sum_k x_k W_k]       lost  the expected welfare forgone against the best
    """

    lottery: Finding
    certain: bool
    efficient: Finding
    follows: Finding | None
    welfare: Fraction
    lost: Fraction


@dataclass(frozen=True, eq=False)
class Audit:
    """A table held against every demand of a setting.

    exact      whether every entry of the table was taken at its word
    tolerance  money (and probability) by which a demand may be missed and still hold
    subsidy    outside money S: the pot is held against -S
    slack      tolerated gain from a lie, beside the tolerance
    worst      the finding of each of the nine demands, by name
    excused    shortfalls of parties of whom participation is not asked; they count nowhere
    limits     the scenario's limits and side demands, by name
    largest    the largest payment in size, where it is made
    """

    setting: Setting
    table: Table
    exact: bool
    tolerance: Fraction
    subsidy: Fraction
    slack: Fraction
    worst: Mapping[str, Finding]
    excused: tuple[Finding, ...]
    standings: tuple[Standing, ...]
    pot: Pot
    decisions: Decisions
    largest: Payment
    compelled: frozenset[str] = frozenset()
    limits: Mapping[str, Finding] = field(default_factory=lambda: MappingProxyType({}))

    @property
    def holds(self) -> Mapping[str, bool]:
        """Whether each of the nine demands holds, by name."""
        return MappingProxyType({name: finding.holds for name, finding in self.worst.items()})

    @property
    def interim(self) -> pd.DataFrame:
        """The standings as a pandas frame of Fractions, a row per party and type."""
        import pandas as pd

        return pd.DataFrame([vars(standing) for standing in self.standings])

    @property
    def pots(self) -> pd.DataFrame:
        """The pot of every profile as a pandas frame: `type:NAME` per party, and `pot`."""
        import pandas as pd

        setting = self.setting
        rows = [setting.labels_at(profile) for profile in range(setting.profiles)]
        columns: dict[str, list[object]] = {
            f"type:{party.name}": [row[i] for row in rows]
            for i, party in enumerate(setting.parties)
        }
        columns["pot"] = [Fraction(top, self.pot.den) for top in self.pot.num.tolist()]
        return pd.DataFrame(columns)
