"""Posing again what `weigh` says: the plain question, asked of `pose` and of the scenario."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from fractions import Fraction

from hypothesis import strategies as st

from designer.demands.terms import Demands, Terms
from designer.engines.highs import HIGHS
from designer.engines.watch import Watch
from designer.posing import pose_terms
from designer.setting.setting import Limits, Setting, integers
from designer.weighing.mix import Mix
from designer.weighing.oracle import plain

HAIR = Fraction(1, 10**9)

STRICT = st.builds(
    Demands,
    decision=st.sampled_from(("efficient", "randomized")),
    ic=st.sampled_from(("bayesian", "dominant")),
    ir=st.sampled_from(("interim", "ex-post", "ex-ante")),
    balance=st.sampled_from(("ex-post", "ex-ante")),
    budget=st.sampled_from(("exact", "no-deficit")),
    subsidy=st.sampled_from((0, 0, 1)),
    limits=st.sampled_from(
        (
            Limits(),
            Limits(),
            Limits(pays_at_most=Fraction(1), pays_at_least=Fraction(-3, 2)),
            Limits(within_worth=True),
        )
    ),
)
"""Demands that are often too much to ask."""


def mix_of(setting: Setting, demands: Demands) -> Mix:
    """The mix that `weigh` would weigh."""
    terms = plain(demands.over(setting), setting)
    return Mix(setting, terms, HIGHS, Watch())


def possible(setting: Setting, terms: Terms) -> bool:
    """What `pose` says on the plain road, proved; nothing lies between a floor and a lower cap."""
    low, high = terms.limits.pays_at_least, terms.limits.pays_at_most
    if low is not None and high is not None and low > high:
        return False
    verdict = pose_terms(setting, replace(terms, goals=("any",), tidy="none"), path="full")
    assert verdict.proved, verdict.reason
    return verdict.status == "possible"


def lowered(setting: Setting, names: tuple[str, ...], amount: Fraction) -> Setting:
    """The same setting where staying out is worth less to some parties, by an exact amount."""
    grain = setting.grain * amount.denominator
    factor = amount.denominator

    def scaled(party_name: str, values: object) -> object:
        import numpy as np

        array = np.asarray(values, dtype=object) * factor
        return array - int(amount * grain) if party_name in names else array

    parties = tuple(
        replace(
            party,
            value=integers((party.value.astype(object) * factor).tolist(), party.value.shape),
            outside=integers(scaled(party.name, party.outside)),
        )
        for party in setting.parties
    )
    return replace(
        setting,
        parties=parties,
        grain=grain,
        outlay=integers(setting.outlay.astype(object) * factor),
        worth=integers(setting.worth.astype(object) * factor),
    )


def with_allowances(terms: Terms, allowances: Mapping[str, Fraction]) -> Terms:
    """The terms with what is allowed of money, shortfall, lies and welfare."""
    if "money" in allowances:
        terms = replace(terms, subsidy=allowances["money"])
    if "shortfall" in allowances:
        terms = replace(terms, shortfall=allowances["shortfall"])
    if "lies" in allowances:
        terms = replace(terms, slack=allowances["lies"])
    if "welfare_at_least" in allowances:
        side = replace(terms.side, welfare_at_least=allowances["welfare_at_least"])
        terms = replace(terms, decision="randomized", side=side)
    return terms
