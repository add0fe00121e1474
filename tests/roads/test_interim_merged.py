"""Options that are all one to a party share one interim probability."""

from __future__ import annotations

from fractions import Fraction

import numpy as np

from designer.demands.terms import Demands
from designer.engines.watch import Watch
from designer.posing import pose_terms
from designer.program.labels import ExpectedDecision
from designer.roads.interim.master import Master, averaged
from designer.roads.interim.merged import merged
from designer.setting.scenario import parse_scenario
from designer.setting.setting import Chance, Setting
from designer.views.labels import term


def place(parties: int, extra: str = "") -> Setting:
    """One free place among farms alike, which another may cost more to serve."""
    return parse_scenario(
        'decisions.options = ["to {Farm}", "none"]\n[[party]]\nname = "Farm"\n'
        f"count = {parties}\ntypes = [1, 4, 6]\nweights = [1, 2, 1]\n"
        'value = { "to {Farm}" = 0, "to {name}" = "type", none = 0 }\n' + extra
    )


def test_a_place_gives_each_party_two_chances() -> None:
    classes = merged(place(4))
    assert [own.size for own in classes] == [2] * 4
    assert [own.of.tolist() for own in classes] == [
        [0, 1, 1, 1, 1],
        [0, 1, 0, 0, 0],
        [0, 0, 1, 0, 0],
        [0, 0, 0, 1, 0],
    ]
    assert classes[2].first.tolist() == [0, 2]


def test_what_the_designer_pays_and_single_demands_keep_options_apart() -> None:
    spent = place(4, '[designer]\noutlay = { "to Farm 2" = 1, "to Farm 3" = 1 }\n')
    assert merged(spent)[0].of.tolist() == [0, 1, 1, 2, 2]
    chances = (Chance(0, 1, 3, Fraction(1, 2)), Chance(1, 1, 1, Fraction(1, 2)))
    assert [own.of.tolist() for own in merged(place(4), chances)[:2]] == [
        [0, 1, 1, 2, 1],
        [0, 1, 0, 0, 0],
    ]


def test_sums_are_by_class() -> None:
    own = merged(place(3))[1]
    table = np.array([[1, 2, 3, 4], [10**30, 20, 30, 40]], dtype=object)
    assert own.sums(table).tolist() == [[8, 2], [10**30 + 70, 20]]


def test_the_master_has_a_column_per_class_and_says_so() -> None:
    setting = place(4)
    terms = averaged(Demands(decision="randomized", goal="revenue").over(setting))
    draft, program = Master(setting, terms, None, None, Watch()).program()
    assert draft.expected_decision(0)[0].shape == (3, 2)
    assert sum(b.count for b in program.row_axis.blocks if b.family == "expected decision") == 24
    first = program.column_axis.start("expected decision")
    label = program.column_axis.label(first + 1)
    assert label == ExpectedDecision("Farm 1", "1", "to Farm 2", 3)
    assert term(label) == "Pr[to Farm 2 or 3 others all one to it | Farm 1 1]"


def test_thirty_parties_and_one_place_with_a_floor_on_welfare() -> None:
    """205 trillion profiles, 31 options, 180 chances.

    Revenue alone is E[max(0, virtual worths)] with virtual worths -8, 3, 6 (Myerson 1981): 1
    counts 1 - (4 - 1) 3, 4 counts 4 - (6 - 4) / 2 = 3. The optimal sale is efficient but where all
    have the lowest type, so a floor on welfare just below the largest costs next to nothing.
    """
    setting = place(30, "[side]\nwelfare_at_least = 5\n")
    demands = Demands(decision="randomized", balance="ex-post", budget="no-deficit", goal="revenue")
    verdict = pose_terms(setting, demands.over(setting), path="interim")
    assert (verdict.status, verdict.proved) == ("possible", True)
    below_6, below_4 = Fraction(3, 4) ** 30, Fraction(1, 4) ** 30
    assert verdict.goal_value == 6 * (1 - below_6) + 3 * (below_6 - below_4)
