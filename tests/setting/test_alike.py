"""Parties alike, stated once with a count: what it stands for, and what is told of slips."""

from __future__ import annotations

from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import settings as effort
from hypothesis import strategies as st

from designer import Demands, pose
from designer.setting.parties import MOST_ALIKE
from designer.setting.scenario import dump, parse_scenario
from designer.setting.setting import Setting
from tests.setting.test_laws import same
from tests.setting.test_mistakes import mistakes

FARMS = """decisions.options = ["open", "shut"]
[[party]]
name = "Farm"
count = 3
types = [1, { name = "high", number = 4, a = "1/2" }]
weights = [2, 1]
value = { open = "type / 3", shut = [0, "a"] }
outside = "type / 5"
compelled = true
[[party]]
name = "Mill"
types = [0, 5]
weights = [1, 1]
value = { open = 0, shut = "type" }
"""
PLACE = """decisions.options = ["to {Farm}", "none"]
[[party]]
name = "Farm"
count = 3
types = [1, 2]
weights = [2, 1]
value = { "to {Farm}" = 0, "to {name}" = "type", none = 0 }
"""


def written_out(text: str, count: int) -> str:
    """The same scenario with every party of its first table written out."""
    head, table, *rest = text.split("[[party]]")
    tables = []
    for number in range(1, count + 1):
        own = table.replace('"Farm"', f'"Farm {number}"').replace("{name}", f"Farm {number}")
        tables.append("\n".join(line for line in own.split("\n") if "count =" not in line))
    return "[[party]]".join([head, *tables, *rest])


def test_a_count_states_parties_with_numbered_names() -> None:
    setting = parse_scenario(FARMS)
    assert [party.name for party in setting.parties] == ["Farm 1", "Farm 2", "Farm 3", "Mill"]
    assert [party.compelled for party in setting.parties] == [True, True, True, False]
    assert setting.shape == (2, 2, 2, 2)
    assert setting.parties[2].value.tolist() == [[10, 0], [40, 15]]
    assert setting.parties[2].outside.tolist() == [6, 24]
    assert setting.parties[2].weights == (2, 1)


def test_the_canonical_text_and_its_digest_are_those_of_the_parties_written_out() -> None:
    counted, plain = parse_scenario(FARMS), parse_scenario(written_out(FARMS, 3))
    assert same(counted, plain)
    assert counted.digest == plain.digest
    assert "count" not in dump(counted)
    assert same(parse_scenario(dump(counted)), counted)


def test_a_count_of_one_is_the_plain_name() -> None:
    one = parse_scenario(FARMS.replace("count = 3\n", "count = 1\n"))
    assert same(one, parse_scenario(FARMS.replace("count = 3\n", "")))
    alone = parse_scenario(PLACE.replace("count = 3", "count = 1"))
    assert alone.options == ("to Farm", "none")
    assert alone.parties[0].value.tolist() == [[1, 0], [2, 0]]


def test_an_option_in_braces_is_one_for_each_and_name_is_ones_own() -> None:
    setting = parse_scenario(PLACE)
    assert setting.options == ("to Farm 1", "to Farm 2", "to Farm 3", "none")
    assert setting.parties[0].value.tolist() == [[1, 0, 0, 0], [2, 0, 0, 0]]
    assert setting.parties[2].value.tolist() == [[0, 0, 1, 0], [0, 0, 2, 0]]


PAIRS = """decisions.options = ["none", "to {Farm}", "to {Farm} and {Farm}"]
[[party]]
name = "Farm"
count = 4
types = [1, 2]
weights = [2, 1]
[party.value]
none = 0
"to {Farm}" = 0
"to {name}" = "type"
"to {Farm} and {Farm}" = "1 / 2"
"to {name} and {Farm}" = "2 * type"
"""


def test_braces_twice_are_one_option_for_every_pair() -> None:
    setting = parse_scenario(PAIRS)
    pairs = [(i, j) for i in range(1, 5) for j in range(i + 1, 5)]
    names = [f"to Farm {i} and Farm {j}" for i, j in pairs]
    assert setting.options == ("none", *(f"to Farm {i}" for i in range(1, 5)), *names)
    for own, party in enumerate(setting.parties, 1):
        low, high = (party.value / setting.grain).tolist()
        assert low == [
            0,
            *(float(i == own) for i in range(1, 5)),
            *(2 if own in pair else 0.5 for pair in pairs),
        ]
        assert high[-6:] == [4 if own in pair else 0.5 for pair in pairs]


def test_two_places_among_alike_farms_sold_for_the_most() -> None:
    """E[the two largest positive virtual worths] (Myerson 1981): 1 - (2 - 1) / 2 = 1/2, and 2."""
    text = PAIRS.replace('"1 / 2"', "0").replace('"2 * type"', '"type"')
    asked = Demands(goal="revenue", decision="randomized", balance="ex-post", budget="no-deficit")
    verdict = pose(parse_scenario(text), asked)
    low = Fraction(2, 3)
    none, one = low**4, 4 * low**3 * (1 - low)
    assert verdict.goal_value == none * 1 + one * Fraction(5, 2) + (1 - none - one) * 4


def test_own_name_goes_before_an_option_written_out_and_that_before_all_of_them() -> None:
    text = PLACE.replace("none = 0", 'none = 0, "to Farm 2" = "type / 2"')
    text += 'designer.outlay = { "to {Farm}" = 3, "to Farm 1" = 1 }\n'.replace("designer.", "")
    text = text.replace("outlay = ", "[designer]\noutlay = ")
    setting = parse_scenario(text)
    money = [(party.value / setting.grain).tolist() for party in setting.parties]
    assert money[0] == [[1, 0.5, 0, 0], [2, 1, 0, 0]]
    assert money[1] == [[0, 1, 0, 0], [0, 2, 0, 0]]
    assert [int(spent) // setting.grain for spent in setting.outlay] == [1, 3, 3, 0]


def test_another_party_may_value_every_option_of_a_group() -> None:
    mill = '[[party]]\nname = "Mill"\ntypes = [7]\nweights = [1]\n'
    setting = parse_scenario(PLACE + mill + 'value = { "to {Farm}" = "type", none = 1 }\n')
    assert setting.parties[3].value.tolist() == [[7, 7, 7, 1]]


@pytest.mark.parametrize("own", ["Farm 1", "Farm 2", "Farm 3"])
def test_a_worth_of_another_partys_type_is_read_for_each(own: str) -> None:
    text = FARMS.replace('"type / 3"', "'type + 10 * types[\"" + own + "\"]'")
    assert same(parse_scenario(text), parse_scenario(written_out(text, 3)))


def test_a_worth_first_read_for_the_party_it_mentions_is_not_taken_for_its_own() -> None:
    """Farm 1 takes {name} instead, so Farm 2 is the first to need "to Farm 1"."""
    other = ', "to Farm 1" = \'types["Farm 2"]\''
    text = PLACE.replace(", none = 0", other + ", none = 0")
    plain = written_out(text, 3).replace(other, "", 1)  # Farm 1 has its own word for it
    plain = plain.replace("{Farm}", "Farm 1", 1).replace(
        '"none"]', '"to Farm 2", "to Farm 3", "none"]'
    )
    first, second, third = (
        '"to Farm 2" = 0, "to Farm 3" = 0',
        '"to Farm 3" = 0',
        '"to Farm 2" = 0',
    )
    for written in (first, second, third):
        plain = plain.replace('"to {Farm}" = 0', written, 1)
    assert same(parse_scenario(text), parse_scenario(plain))


def test_the_groups_name_stands_for_each_of_its_members() -> None:
    text = PLACE + (
        '[[side.chance]]\nparty = "Farm"\ntype = 2\noption = "to {name}"\nat_least = "1/4"\n'
        "[goal]\nblend = { Farm = 2, worth = 1, 'Farm 3' = 5 }\n"
    )
    setting = parse_scenario(text)
    chances = [(c.party, c.type, c.option, c.at_least) for c in setting.side.chances]
    assert chances == [(i, 1, i, Fraction(1, 4)) for i in range(3)]
    assert setting.asked["blend"] == {"Farm 1": 2, "Farm 2": 2, "Farm 3": 5, "worth": 1}


def test_a_group_in_a_joint_prior_and_in_a_rule_has_one_type_unless_a_member_is_named() -> None:
    text = FARMS.replace("weights = [2, 1]\n", "").replace("weights = [1, 1]\n", "") + (
        "[[joint]]\nat = { Farm = 1, Mill = 0 }\nweight = 1\n"
        '[[joint]]\nat = { Farm = "high", "Farm 2" = 1, Mill = 5 }\nweight = 2\n'
        '[[joint]]\nat = { Farm = "high", Mill = 5 }\nweight = 3\n'
        '[[rule]]\ntake = "shut"\n[[rule]]\nat = { Farm = 1, Mill = 5 }\ntake = "open"\n'
    )
    setting = parse_scenario(text)
    assert setting.joint is not None
    assert setting.rule is not None
    weights = {theta: int(w) for theta, w in enumerate(setting.joint) if w}
    assert weights == {0b0000: 1, 0b1011: 2, 0b1111: 3}
    assert [theta for theta, row in enumerate(setting.rule.tolist()) if row[0]] == [0b0001]


def test_braces_are_plain_characters_where_no_party_has_a_count() -> None:
    text = (
        written_out(FARMS, 3)
        .replace('"open"', '"{Farm} {name}"')
        .replace("open =", '"{Farm} {name}" =')
    )
    setting = parse_scenario(text)
    assert setting.options == ("{Farm} {name}", "shut")
    assert same(parse_scenario(dump(setting)), setting)


@given(st.integers(1, 5), st.lists(st.integers(0, 9), min_size=1, max_size=3, unique=True))
@effort(max_examples=40, deadline=None)
def test_counted_is_written_out(count: int, types: list[int]) -> None:
    text = FARMS.replace("count = 3", f"count = {count}").replace(
        'types = [1, { name = "high", number = 4, a = "1/2" }]\nweights = [2, 1]',
        f"types = {types}\nweights = {list(range(1, len(types) + 1))}",
    )
    text = text.replace('[0, "a"]', '"type * type"')
    out = written_out(text, count) if count > 1 else text.replace("count = 1\n", "")
    assert same(parse_scenario(text), parse_scenario(out))


def test_a_group_poses_like_its_members_written_out() -> None:
    asked = Demands(goal="revenue", decision="randomized", balance="ex-post", budget="no-deficit")
    one, two = (pose(setting, asked) for setting in (parse_scenario(PLACE), _place_written_out()))
    # phi(1) = 1 - (2 - 1) / 2, phi(2) = 2: the largest of three virtual worths, all positive.
    assert one.goal_value == two.goal_value == 2 - Fraction(3, 2) * Fraction(2, 3) ** 3
    assert one.setting.digest == two.setting.digest


def _place_written_out() -> Setting:
    text = 'decisions.options = ["to Farm 1", "to Farm 2", "to Farm 3", "none"]\n'
    for own in (1, 2, 3):
        worths = ", ".join(f'"to Farm {i}" = {"[1, 2]" if i == own else 0}' for i in (1, 2, 3))
        text += f'[[party]]\nname = "Farm {own}"\ntypes = [1, 2]\nweights = [2, 1]\n'
        text += f"value = {{ {worths}, none = 0 }}\n"
    return parse_scenario(text)


COUNT = "expected a whole number from 1 to 1,000.\n"
EIGHT = "    Write count = 8 for eight parties alike, each with its own type."
CASES = [
    (FARMS, "count = 3", "count = true", f"party[0].count: found true; {COUNT}{EIGHT}"),
    (FARMS, "count = 3", "count = 3.0", f"party[0].count: found 3; {COUNT}{EIGHT}"),
    (FARMS, "count = 3", "count = 2.5", f"party[0].count: found 5/2; {COUNT}{EIGHT}"),
    (FARMS, "count = 3", "count = 0", f"party[0].count: found 0; {COUNT}{EIGHT}"),
    (FARMS, "count = 3", "count = -3", f"party[0].count: found -3; {COUNT}{EIGHT}"),
    (FARMS, "count = 3", 'count = "3"', f"party[0].count: found '3'; {COUNT}{EIGHT}"),
    (FARMS, "count = 3", "count = [3]", f"party[0].count: found a list of 1; {COUNT}{EIGHT}"),
    (FARMS, "count = 3", "count = nan", f"party[0].count: found nan; {COUNT}{EIGHT}"),
    (
        FARMS,
        "count = 3",
        "count = 1001",
        f"party[0].count: found 1001; {COUNT}    State fewer parties, each standing for several.",
    ),
    (
        FARMS,
        '"Mill"',
        '"Farm 2"',
        "party[1].name: found 'Farm 2'; expected a name unlike party[0]'s.\n"
        "    Give each party its own name.",
    ),
    (
        FARMS,
        '"Mill"',
        '"Farm"',
        "party[1].name: found 'Farm'; expected a name unlike party[0]'s.\n"
        "    Give each party its own name.",
    ),
    (
        FARMS,
        '"Mill"\ntypes',
        '"Farm"\ncount = 9\ntypes',
        "party[1].name: found 'Farm'; expected a name unlike party[0]'s.\n"
        "    Give each party its own name.",
    ),
    (
        FARMS.replace('"Farm"\ncount = 3', '"Mill 2"').replace('"Mill"', '"Mill"\ncount = 2'),
        "",
        "",
        "party[1].name: found 'Mill', whose count makes 'Mill 2' of it; expected a name unlike "
        "party[0]'s.\n    Give each party its own name.",
    ),
    (
        FARMS,
        '"Farm"',
        '"pot"',
        "party[0].name: found 'pot'; expected a name other than worth, pot, parties.\n"
        "    Rename it: in the blend of goals these words mean something else.",
    ),
    (
        FARMS,
        '"Farm"',
        '"name"',
        "party[0].name: found 'name'; expected a name other than name.\n"
        "    Rename them: {name} stands for each one's own name.",
    ),
    (
        FARMS,
        '"type / 3"',
        '"type + types.Farm"',
        "party[0] 'Farm'.value.open: found 'type + types.Farm', where 'Farm' stands for 3 "
        "parties alike; expected an amount in the value language.\n"
        '    Name one of them: types["Farm 1"].',
    ),
    (
        FARMS,
        '"type / 3"',
        "[[[[1, 2]]]]",
        "party[0] 'Farm'.value.open: found lists in lists, for several parties alike; expected "
        "worths that each one's own position gives.\n"
        "    Write an expression of type and types.PARTY, or the parties one by one.",
    ),
    (
        PLACE,
        '"to {Farm}" = 0, ',
        "",
        "party[0] 'Farm'.value.\"to {Farm}\": found nothing; expected a worth for every option.\n"
        "    Write 0 if it is worth nothing.",
    ),
    (
        PLACE,
        '"to {name}" =',
        '"for {name}" =',
        "party[0] 'Farm'.value.\"for {name}\": found an unknown option 'for {name}', which is "
        "'for Farm 1'; expected one of to {Farm}, none.\n    Did you mean 'to Farm 1'?",
    ),
    (
        PLACE,
        '["to {Farm}"',
        '["to {Frm}", "to {Farm}"',
        "decisions.options[0]: found 'to {Frm}'; expected one name in braces, of parties with a "
        "count: Farm.\n    Did you mean 'Farm'?",
    ),
    (
        PLACE,
        '["to {Farm}"',
        '["to {name}", "to {Farm}"',
        "decisions.options[0]: found 'to {name}'; expected one name in braces, of parties with a "
        "count: Farm.\n    Options are listed for all: write {Farm}.",
    ),
    (
        PLACE,
        '["to {Farm}"',
        '["{Farm} or {Mill}", "to {Farm}"',
        "decisions.options[0]: found '{Farm} or {Mill}'; expected one name in braces, of parties "
        "with a count: Farm.\n    Write out the options for every pair.",
    ),
    (
        PLACE,
        '["to {Farm}"',
        '["{Farm}, {Farm}, {Farm}, {Farm}", "to {Farm}"',
        "decisions.options[0]: found '{Farm}, {Farm}, {Farm}, {Farm}'; expected {Farm} at most 3 "
        "times.\n    Write fewer places, or a larger count.",
    ),
    (
        PLACE.replace("count = 3", "count = 60"),
        '["to {Farm}"',
        '["{Farm}, {Farm}, {Farm}", "to {Farm}"',
        "decisions.options[0]: found '{Farm}, {Farm}, {Farm}', which makes 34,220 options; "
        "expected at most 5,000.\n    Take fewer parties or fewer places.",
    ),
    (
        PAIRS,
        '"to {Farm} and {Farm}" = "1 / 2"',
        "",
        "party[0] 'Farm'.value.\"to {Farm} and {Farm}\": found nothing; expected a worth for every "
        "option.\n    Write 0 if it is worth nothing.",
    ),
    (
        PLACE,
        '"none"]',
        '"to Farm 2", "none"]',
        "decisions.options[1]: found 'to Farm 2' a second time; expected each once.\n"
        "    Remove one.",
    ),
    (
        PLACE,
        '"to {name}" = "type"',
        '"to {name}" = "typ"',
        "party[0] 'Farm'.value.\"to {name}\": found 'typ', where the name 'typ' is unknown; "
        "expected an amount in the value language.\n    Did you mean 'type'?",
    ),
    (
        PLACE + "[goal]\nblend = { Farms = 1 }\n",
        "",
        "",
        "goal.blend.Farms: found an unknown name 'Farms'; expected one of worth, pot, parties, "
        "Farm 1, Farm 2, Farm 3, Farm.\n    Did you mean 'Farm'?",
    ),
    (
        PLACE + '[[rule]]\nat = { "Farm 4" = 1 }\ntake = "none"\n',
        "",
        "",
        "rule[0].at.\"Farm 4\": found an unknown party 'Farm 4'; expected one of Farm 1, Farm 2, "
        "Farm 3.\n    Did you mean 'Farm 3'?\n"
        "rule[0].at.Farm: found nothing; expected a type of every party.\n"
        "    Add Farm = TYPE.",
    ),
    (
        PLACE + '[[rule]]\nat = { "Farm 2" = 1, "Farm 3" = 9 }\ntake = "none"\n',
        "",
        "",
        'rule[0].at."Farm 1": found nothing; expected a type of every party.\n'
        "    Add Farm 1 = TYPE.\n"
        'rule[0].at."Farm 3": found 9; expected a type of Farm 3: 1, 2.\n'
        "    Write one of its types.",
    ),
    (
        PLACE + '[[side.chance]]\nparty = "Farm"\ntype = 3\noption = "at {name}"\nexactly = 1\n',
        "",
        "",
        "side.chance[0].option: found 'at {name}'; expected to Farm 1, to Farm 2, to Farm 3, none."
        "\n    Name an option.\n"
        "side.chance[0].type: found 3; expected a type of Farm 1: 1, 2.\n"
        "    Write one of its types.",
    ),
]


@pytest.mark.parametrize(("base", "old", "new", "told"), CASES)
def test_one_slip_is_told_once_for_the_whole_group(
    base: str, old: str, new: str, told: str
) -> None:
    assert old in base
    assert mistakes(base.replace(old, new, 1) if old else base) == told


def test_independent_slips_are_told_together_and_none_that_only_follows() -> None:
    text = PLACE.replace("count = 3", "count = 3.5").replace("[2, 1]", "[2, 0]") + (
        '[goal]\nblend = { Farm = 1, "Farm 2" = "x" }\n[[rule]]\nat = { "Farm 1" = 1 }\n'
        'take = "to Farm 1"\n'
    )
    assert mistakes(text) == (
        f"party[0].count: found 7/2; {COUNT}{EIGHT}\n"
        "party[0].weights[1]: found 0; expected a positive number.\n"
        "    Remove the type if it cannot occur.\n"
        "goal.blend.\"Farm 2\": found 'x'; expected an exact number.\n"
        '    Write 3, 0.25 or "1/3".'
    )


def test_a_name_too_long_with_its_number_is_told() -> None:
    assert "at most 200 printable characters" in mistakes(FARMS.replace('"Farm"', f'"{"F" * 199}"'))


def test_a_type_that_cannot_occur_is_told_of_the_member() -> None:
    text = FARMS.replace("weights = [2, 1]\n", "").replace("weights = [1, 1]\n", "") + (
        '[[joint]]\nat = { Farm = 1, "Farm 2" = "high", Mill = 0 }\nweight = 1\n'
        '[[joint]]\nat = { Farm = 1, "Farm 3" = "high", Mill = 5 }\nweight = 1\n'
    )
    assert mistakes(text) == (
        "party[0] 'Farm'.types: found the type 'high' of Farm 1 of probability 0 in the joint "
        "prior; expected a positive probability for every type.\n"
        "    Give a profile with it some weight, or remove the type."
    )


def test_the_largest_count_is_read() -> None:
    setting = parse_scenario(FARMS.replace("count = 3", f"count = {MOST_ALIKE}"))
    assert len(setting.parties) == MOST_ALIKE + 1
    assert setting.parties[-2].name == "Farm 1000"
    assert setting.parties[-2].types is setting.parties[0].types
