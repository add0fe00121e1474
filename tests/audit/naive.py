"""The audit once more, as slowly and plainly as the definitions read: Fractions and loops."""

from __future__ import annotations

import itertools
from fractions import Fraction

from designer.setting.setting import Setting
from designer.table import Table

Profile = tuple[int, ...]


class Naive:
    """Everything an audit says about a small table, entry by entry."""

    def __init__(self, setting: Setting, table: Table) -> None:
        """Number the profiles anew, with the last party fastest."""
        self.setting = setting
        self.table = table
        self.all: list[Profile] = list(itertools.product(*map(range, setting.shape)))
        self.number = {profile: n for n, profile in enumerate(self.all)}
        self.options = range(len(setting.options))
        self.chance = {p: setting.probability(n) for p, n in self.number.items()}

    def replaced(self, profile: Profile, i: int, own: int) -> Profile:
        return (*profile[:i], own, *profile[i + 1 :])

    def value(self, i: int, k: int, truth: Profile) -> Fraction:
        party = self.setting.parties[i]
        row = self.number[truth] if party.depends else truth[i]
        return Fraction(int(party.value[row, k]), self.setting.grain)

    def outside(self, i: int, truth: Profile) -> Fraction:
        party = self.setting.parties[i]
        row = self.number[truth] if party.outside_depends else truth[i]
        return Fraction(int(party.outside[row]), self.setting.grain)

    def x(self, k: int, said: Profile) -> Fraction:
        return self.table.chance(self.number[said], k)

    def t(self, i: int, said: Profile) -> Fraction:
        return self.table.payment(i, self.number[said])

    def worth(self, i: int, truth: Profile, said: Profile) -> Fraction:
        return sum((self.x(k, said) * self.value(i, k, truth) for k in self.options), Fraction(0))

    def u(self, i: int, truth: Profile, said: Profile) -> Fraction:
        return self.worth(i, truth, said) - self.t(i, said)

    def given(self, i: int, own: int) -> dict[Profile, Fraction]:
        """P(theta | theta_i = own)."""
        met = {p: chance for p, chance in self.chance.items() if p[i] == own}
        total = sum(met.values(), Fraction(0))
        return {p: chance / total for p, chance in met.items()}

    def counted(self) -> list[Profile]:
        if self.setting.support_only:
            return [p for p in self.all if self.chance[p] > 0]
        return self.all

    def bayesian(self, i: int, own: int) -> dict[int, Fraction]:
        """Margin of each lie of a type."""
        margins = {}
        for lie in range(self.setting.shape[i]):
            if lie != own:
                margins[lie] = sum(
                    (
                        chance * (self.u(i, p, p) - self.u(i, p, self.replaced(p, i, lie)))
                        for p, chance in self.given(i, own).items()
                    ),
                    Fraction(0),
                )
        return margins

    def dominant(self, i: int) -> list[Fraction]:
        return [
            self.u(i, p, p) - self.u(i, p, self.replaced(p, i, lie))
            for p in self.counted()
            for lie in range(self.setting.shape[i])
            if lie != p[i]
        ]

    def gain(self, i: int, own: int) -> Fraction:
        met = self.given(i, own).items()
        return sum((c * (self.u(i, p, p) - self.outside(i, p)) for p, c in met), Fraction(0))

    def participation(self, i: int) -> dict[str, Fraction]:
        average = sum(
            (c * (self.u(i, p, p) - self.outside(i, p)) for p, c in self.chance.items()),
            Fraction(0),
        )
        return {
            "ir-ex-ante": average,
            "ir-interim": min(self.gain(i, own) for own in range(self.setting.shape[i])),
            "ir-ex-post": min(self.u(i, p, p) - self.outside(i, p) for p in self.counted()),
        }

    def pot(self, p: Profile) -> Fraction:
        total = sum((self.t(i, p) for i in range(len(self.setting.parties))), Fraction(0))
        for k in self.options:
            total -= self.x(k, p) * Fraction(int(self.setting.outlay[k]), self.setting.grain)
        return total

    def margins(self, subsidy: Fraction) -> dict[str, Fraction | None]:
        """The nine worst margins; None where there is nothing to judge."""
        parties = range(len(self.setting.parties))
        asked = [i for i in parties if not self.setting.parties[i].compelled]
        bayesian = [
            margin
            for i in parties
            for own in range(self.setting.shape[i])
            for margin in self.bayesian(i, own).values()
        ]
        dominant = [margin for i in parties for margin in self.dominant(i)]
        found: dict[str, Fraction | None] = {
            "ic-bayesian": min(bayesian, default=None),
            "ic-dominant": min(dominant, default=None),
        }
        for name in ("ir-ex-ante", "ir-interim", "ir-ex-post"):
            found[name] = min((self.participation(i)[name] for i in asked), default=None)
        mean = sum((c * self.pot(p) for p, c in self.chance.items()), subsidy)
        rests = [self.pot(p) + subsidy for p in self.counted()]
        found["balance-ex-ante-exact"] = -abs(mean)
        found["balance-ex-ante-no-deficit"] = mean
        found["balance-ex-post-exact"] = -max(map(abs, rests))
        found["balance-ex-post-no-deficit"] = min(rests)
        return found

    def welfare(self, k: int, p: Profile) -> Fraction:
        own = int(self.setting.worth[k]) - int(self.setting.outlay[k])
        total = Fraction(own, self.setting.grain)
        return total + sum(self.value(i, k, p) for i in range(len(self.setting.parties)))

    def lost(self, p: Profile) -> Fraction:
        best = max(self.welfare(k, p) for k in self.options)
        return sum((self.x(k, p) * (best - self.welfare(k, p)) for k in self.options), Fraction(0))
