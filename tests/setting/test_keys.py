"""Every key of the file, one by one: what it may say and what it comes to."""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest

from designer.demands.terms import Demands
from designer.setting.scenario import dump, parse_scenario
from designer.setting.setting import Chance, Limits, Setting, Side

HEAD = 'decisions.options = ["open", "shut"]\n'
NORTH = """
[[party]]
name = "North Haven"
types = [20, 0.5, "1/3"]
prior = ["1/4", 0.5, 0.25]
value = { open = "type", shut = 0 }
"""
SUTH = """
[[party]]
name = "Suth"
types = ["low", { name = "keen", number = 3, a = "1/2", b = 2 }]
weights = [3, 1.5]
value = { open = [1, "type * b"], shut = "1/7" }
"""


def read(*parts: str) -> Setting:
    return parse_scenario(HEAD + "".join(parts))


def test_what_is_left_out_has_these_defaults() -> None:
    setting = read(NORTH)
    assert (setting.title, setting.money, setting.note) == ("Untitled scenario", "money units", "")
    assert not setting.support_only
    assert setting.outlay.tolist() == setting.worth.tolist() == [0, 0]
    assert setting.parties[0].outside.tolist() == [0, 0, 0]
    assert not setting.parties[0].compelled
    assert setting.joint is None
    assert setting.rule is None
    assert (setting.limits, setting.side, dict(setting.asked)) == (Limits(), Side(), {})


def test_title_money_note_and_profiles() -> None:
    setting = read(
        'title = "Åby"\nmoney = "crowns"\nnote = "one\\n\\ttwo"\nprofiles = "support"\n', NORTH
    )
    assert (setting.title, setting.money, setting.note) == ("Åby", "crowns", "one\n\ttwo")
    assert setting.support_only


def test_types_and_their_labels() -> None:
    setting = read(NORTH, SUTH)
    north, suth = setting.parties
    assert [kind.label for kind in north.types] == ["20", "1/2", "1/3"]
    assert [kind.number for kind in north.types] == [20, Fraction(1, 2), Fraction(1, 3)]
    assert [(kind.label, kind.number) for kind in suth.types] == [("low", None), ("keen", 3)]
    assert dict(suth.types[1].fields) == {"a": Fraction(1, 2), "b": 2}


def test_priors_and_weights_come_to_the_smallest_whole_weights() -> None:
    setting = read(NORTH, SUTH)
    assert [party.weights for party in setting.parties] == [(1, 2, 1), (2, 1)]
    assert setting.weights.tolist() == [2, 1, 4, 2, 2, 1]
    assert setting.independent


def test_money_is_whole_over_the_least_common_denominator() -> None:
    setting = read(NORTH, SUTH, "[designer]\noutlay = { open = 0.1 }\nworth = { shut = 2 }\n")
    assert setting.grain == 2 * 3 * 5 * 7
    north, suth = setting.parties
    assert north.value.tolist() == [[4200, 0], [105, 0], [70, 0]]
    assert suth.value.tolist() == [[210, 30], [1260, 30]]
    assert setting.outlay.tolist() == [21, 0]
    assert setting.worth.tolist() == [0, 420]
    assert north.value.dtype == np.int64


def test_the_designer_may_calculate() -> None:
    setting = read(NORTH, '[designer]\noutlay = { open = "3 * 50 + max(1, 2)" }\n')
    assert setting.outlay.tolist() == [152 * 6, 0]


def test_numbers_beyond_64_bits_become_python_integers() -> None:
    setting = read(NORTH.replace("shut = 0", "shut = 1e30"))
    assert setting.parties[0].value.dtype == object
    assert setting.parties[0].value[0, 1] == 6 * 10**30
    assert parse_scenario(dump(setting)).digest == setting.digest


def test_arrays_are_closed_to_writing() -> None:
    setting = read(NORTH, SUTH.replace("[1, ", "[types['North Haven'], ".replace("'", '"'), 0))
    for array in (setting.outlay, setting.worth, *(party.value for party in setting.parties)):
        with pytest.raises(ValueError, match="read-only"):
            array[...] = 1


@pytest.mark.parametrize(
    ("outside", "expected"),
    [
        ("3", [3, 3, 3]),
        ('"type / 2"', [10, Fraction(1, 4), Fraction(1, 6)]),
        ('[0, "1/2", "type"]', [0, Fraction(1, 2), Fraction(1, 3)]),
    ],
)
def test_outside_options_have_the_same_three_forms(
    outside: str, expected: list[int | Fraction]
) -> None:
    setting = read(NORTH, f"outside = {outside}\ncompelled = true\n", SUTH)
    party = setting.parties[0]
    assert [Fraction(int(one), setting.grain) for one in party.outside] == expected
    assert not party.outside_depends
    assert [party.compelled for party in setting.parties] == [True, False]


def test_worths_that_depend_on_others_run_over_all_profiles() -> None:
    mixed = SUTH.replace('[1, "type * b"]', "'''types[\"North Haven\"] + b if type > 0 else 0'''")
    setting = read(NORTH, mixed.replace('"low"', '{ name = "low", number = 0, b = 1 }'))
    party = setting.parties[1]
    assert party.depends
    assert not setting.parties[0].depends
    assert setting.interdependent
    money = [Fraction(int(one), setting.grain) for one in party.value[:, 0]]
    assert money == [0, 22, 0, Fraction(5, 2), 0, Fraction(7, 3)]
    assert {Fraction(int(one), setting.grain) for one in party.value[:, 1]} == {Fraction(1, 7)}


def test_dependence_is_about_worths_and_not_about_words() -> None:
    setting = read(
        NORTH.replace('"type"', '"type + 0 * types.Suth.b"'),
        SUTH.replace('"low"', '{ name = "low", b = 1 }'),
    )
    assert not setting.interdependent
    assert setting.parties[0].value.shape == (3, 2)


def test_lists_in_lists_give_a_worth_to_every_profile() -> None:
    setting = read(NORTH.replace('"type"', '[[1, 2], [3, 4], ["1/2", 6]]'), SUTH)
    party = setting.parties[0]
    money = [Fraction(int(one), setting.grain) for one in party.value[:, 0]]
    assert money == [1, 2, 3, 4, Fraction(1, 2), 6]


def test_an_outside_option_may_depend_on_others_while_worths_do_not() -> None:
    setting = read(
        NORTH, "outside = 'types.Suth.b'\n", SUTH.replace('"low"', '{ name = "low", b = 1 }')
    )
    party = setting.parties[0]
    assert (party.depends, party.outside_depends) == (False, True)
    assert [one / setting.grain for one in party.outside.tolist()] == [1, 2] * 3


JOINT = """
[[joint]]
at = { "North Haven" = 20.0, Suth = "low" }
weight = "1/2"
[[joint]]
at = { Suth = "keen", "North Haven" = 0.5 }
weight = 1
[[joint]]
at = { "North Haven" = "2/6", Suth = "keen" }
weight = 0.25
"""


def without_priors(*parts: str) -> str:
    lines = "".join(parts).split("\n")
    return "\n".join(line for line in lines if not line.startswith(("prior", "weights")))


def test_joint_weights_and_the_marginals_they_leave() -> None:
    setting = read(without_priors(NORTH, SUTH), JOINT)
    assert setting.joint is not None
    assert setting.joint.tolist() == [2, 0, 0, 4, 0, 1]
    assert [party.weights for party in setting.parties] == [(2, 4, 1), (2, 5)]
    assert setting.total_weight == 7
    assert not setting.independent


def test_a_joint_prior_that_is_a_product_stays_a_joint_prior() -> None:
    every = "".join(
        f'[[joint]]\nat = {{ "North Haven" = {a}, Suth = "{b}" }}\nweight = 1\n'
        for a in ("20", "0.5", '"1/3"')
        for b in ("low", "keen")
    )
    setting = read(without_priors(NORTH, SUTH), every)
    assert setting.joint is not None
    assert setting.joint.tolist() == [1] * 6


def test_a_rule_of_options_lotteries_and_the_rest() -> None:
    setting = read(
        NORTH,
        """
        [[rule]]
        at = { "North Haven" = 20 }
        take = "open"
        [[rule]]
        take = { open = "1/3", shut = "2/3" }
        [[rule]]
        at = { "North Haven" = "1/3" }
        take = { shut = 1 }
        """,
    )
    assert setting.rule is not None
    assert setting.rule.tolist() == [[3, 0], [1, 2], [0, 3]]
    assert setting.rule_den == 3


def test_limits() -> None:
    setting = read(
        NORTH,
        "[limits]\npays_at_most = 9\npays_at_least = '-1/2'\n"
        "only_when_served = true\nwithin_worth = true\n",
    )
    assert setting.limits == Limits(Fraction(9), Fraction(-1, 2), True, True)


def test_side_demands() -> None:
    setting = read(
        NORTH,
        SUTH,
        """
        [side]
        welfare_at_least = 1.5
        revenue_at_least = -2
        [[side.chance]]
        party = "Suth"
        type = "keen"
        option = "shut"
        exactly = "1/3"
        [[side.chance]]
        party = "North Haven"
        type = 0.5
        option = "open"
        at_least = 0.25
        at_most = 1
        """,
    )
    assert setting.side == Side(
        Fraction(3, 2),
        Fraction(-2),
        (
            Chance(1, 1, 1, Fraction(1, 3), Fraction(1, 3)),
            Chance(0, 1, 0, Fraction(1, 4), Fraction(1)),
        ),
    )


def test_demands_as_plain_values_and_as_terms() -> None:
    setting = read(
        NORTH,
        """
        [demands]
        decision = "randomized"
        ic = "dominant"
        ir = "ex-post"
        balance = "ex-ante"
        budget = "no-deficit"
        goal = "blend , swing"
        tidy = "none"
        subsidy = "1/3"
        slack = 0.1
        even_handed = true
        [goal]
        blend = { worth = 1, pot = -1, parties = "1/2", "North Haven" = 2 }
        """,
    )
    blend = setting.asked["blend"]
    assert blend == {"worth": 1, "pot": -1, "parties": Fraction(1, 2), "North Haven": 2}
    assert {key: value for key, value in setting.asked.items() if key != "blend"} == {
        "decision": "randomized",
        "ic": "dominant",
        "ir": "ex-post",
        "balance": "ex-ante",
        "budget": "no-deficit",
        "goal": ("blend", "swing"),
        "tidy": "none",
        "subsidy": Fraction(1, 3),
        "slack": Fraction(1, 10),
        "even_handed": True,
    }
    terms = Demands().over(setting)
    assert (terms.ic, terms.goals, terms.subsidy) == (
        "dominant",
        ("blend", "swing"),
        Fraction(1, 3),
    )
    assert dict(terms.blend)["North Haven"] == 2


def test_many_profiles_cost_nothing_until_a_table_over_them_is_asked_for() -> None:
    parties = "".join(
        f'[[party]]\nname = "P{i}"\ntypes = {list(range(10))}\nweights = {[1] * 10}\n'
        'value = { open = "type / 3", shut = 0 }\n'
        for i in range(20)
    )
    setting = read(parties)
    assert setting.profiles == 10**20
    assert parse_scenario(dump(setting)).digest == setting.digest


def test_a_hundred_parties_of_one_type_are_no_trouble() -> None:
    single = "".join(
        f'[[party]]\nname = "P{i}"\ntypes = ["only"]\nvalue = {{ open = {i}, shut = 0 }}\n'
        for i in range(100)
    )
    pair = "".join(
        f'[[party]]\nname = "{name}"\ntypes = [1, 2]\n'
        f'value = {{ open = "type * types.{other}", shut = 0 }}\n'
        for name, other in (("A", "B"), ("B", "A"))
    )
    rest = ", ".join(f'P{i} = "only"' for i in range(100))
    joint = "".join(
        f"[[joint]]\nat = {{ A = {a}, B = {a}, {rest} }}\nweight = {a}\n" for a in (1, 2)
    )
    rule = '[[rule]]\ntake = "open"\n'
    setting = read(single, pair, joint, rule)
    assert setting.joint is not None
    assert setting.joint.tolist() == [1, 0, 0, 2]
    assert setting.parties[100].value[:, 0].tolist() == [1, 2, 2, 4]
    again = parse_scenario(dump(setting))
    assert again.digest == setting.digest
    assert again.parties[100].value.tolist() == setting.parties[100].value.tolist()


def test_dump_writes_what_was_changed_after_reading() -> None:
    setting = read(NORTH, SUTH)
    changed = replace(setting, title="Another", support_only=True)
    again = parse_scenario(dump(changed))
    assert (again.title, again.support_only) == ("Another", True)
    assert again.digest != setting.digest
