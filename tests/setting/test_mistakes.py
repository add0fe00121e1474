"""What the author of a scenario is told: the exact text, for one mistake and for several."""

from __future__ import annotations

from pathlib import Path

import pytest

from designer.errors import ScenarioError
from designer.setting.scenario import parse_scenario, read_scenario

BASE = """title = "A gate"
money = "crowns"
[decisions]
options = ["open", "shut"]
[designer]
outlay = { open = 5 }
[[party]]
name = "Norhaven"
types = [20, 50]
prior = ["1/4", "3/4"]
value = { open = "type", shut = 0 }
[[party]]
name = "Suth"
types = ["low", { name = "keen", a = 3, b = 0 }]
weights = [1, 2]
value = { open = [1, "a / 2"], shut = 0 }
[limits]
pays_at_most = 100
[demands]
ic = "bayesian"
"""
JOINT = (
    BASE.replace('prior = ["1/4", "3/4"]\n', "").replace("weights = [1, 2]\n", "")
    + """
[[joint]]
at = { Norhaven = 20, Suth = "low" }
weight = 1
[[joint]]
at = { Norhaven = 50, Suth = "keen" }
weight = 2
"""
)
RULE = (
    BASE
    + """
[[rule]]
at = { Norhaven = 20, Suth = "low" }
take = "open"
[[rule]]
take = { open = "1/3", shut = "2/3" }
"""
)
CASES: list[tuple[str, str, str, str]] = [
    (
        BASE,
        "title =",
        "titel =",
        (
            "titel: found an unknown key 'titel'; expected one of title, money, note, "
            "profiles, decisions, designer, party, joint, rule, limits, side, demands, … (13 "
            "in all).\n"
            "    Did you mean 'title'?"
        ),
    ),
    (
        BASE,
        'title = "A gate"',
        "title = 3",
        ('title: found 3; expected text in quotes.\n    Write title = "…".'),
    ),
    (
        BASE,
        '"A gate"',
        '"A\\u001bgate"',
        (
            "title: found 'A\\x1bgate'; expected text of printable characters.\n"
            "    Remove the control characters."
        ),
    ),
    (
        BASE,
        "title =",
        'profiles = "supporting"\ntitle =',
        (
            "profiles: found 'supporting'; expected one of all, support.\n"
            "    Did you mean 'support'?"
        ),
    ),
    (
        BASE,
        'options = ["open", "shut"]',
        'options = ["open", "open"]',
        ("decisions.options[1]: found 'open' a second time; expected each once.\n    Remove one."),
    ),
    (
        BASE,
        'options = ["open", "shut"]',
        "options = []",
        (
            "decisions.options: found an empty list; expected a list of names.\n"
            '    Write options = ["build", "leave"].'
        ),
    ),
    (
        BASE,
        '[decisions]\noptions = ["open", "shut"]\n',
        "",
        (
            "decisions: found nothing; expected the options.\n"
            '    Write [decisions] and options = ["…"].'
        ),
    ),
    (
        BASE,
        "open = 5",
        "opne = 5",
        (
            "designer.outlay.opne: found an unknown option 'opne'; expected one of open, shut.\n"
            "    Did you mean 'open'?"
        ),
    ),
    (
        BASE,
        "open = 5",
        'open = "type"',
        (
            "designer.outlay.open: found 'type', where 'type' has no meaning here; expected an "
            "amount in the value language.\n"
            "    The designer has no type: write a number."
        ),
    ),
    (
        BASE,
        "outlay = { open = 5 }",
        "outlay = 5",
        ("designer.outlay: found 5; expected a table.\n    Write outlay = { … }."),
    ),
    (
        BASE,
        'name = "Suth"',
        'name = "Norhaven"',
        (
            "party[1].name: found 'Norhaven'; expected a name unlike party[0]'s.\n"
            "    Give each party its own name."
        ),
    ),
    (
        BASE,
        'name = "Suth"',
        'name = "pot"',
        (
            "party[1].name: found 'pot'; expected a name other than worth, pot, parties.\n"
            "    Rename it: in the blend of goals these words mean something else."
        ),
    ),
    (
        BASE,
        'name = "Suth"',
        'nam = "Suth"',
        (
            "party[1].name: found nothing; expected a name.\n"
            '    Write name = "…".\n'
            "party[1].nam: found an unknown key 'nam'; expected one of name, count, types, "
            "prior, weights, value, outside, compelled.\n"
            "    Did you mean 'name'?"
        ),
    ),
    (
        BASE,
        "types = [20, 50]",
        "types = [20, 20.0]",
        (
            "party[0] 'Norhaven'.types[1]: found the type '20' a second time; expected each "
            "type once.\n"
            "    Remove it, and add its weight to the other."
        ),
    ),
    (
        BASE,
        "types = [20, 50]",
        "types = []",
        (
            "party[0] 'Norhaven'.types: found an empty list; expected a list of types.\n"
            '    Write types = [20, 50] or ["low", "high"].'
        ),
    ),
    (
        BASE,
        "types = [20, 50]",
        "types = [20, true]",
        (
            "party[0] 'Norhaven'.types[1]: found true; expected a number, a name or a table.\n"
            '    Write 20, "low" or { name = "low", a = 3 }.'
        ),
    ),
    (
        BASE,
        "types = [20, 50]",
        "types = [20, nan]",
        (
            "party[0] 'Norhaven'.types[1]: found nan; expected a finite exact number.\n"
            "    Write an integer, a decimal with an exponent below 1000, or a fraction in "
            "quotes."
        ),
    ),
    (
        BASE,
        "types = [20, 50]",
        "types = [20, 1e9999]",
        (
            "party[0] 'Norhaven'.types[1]: found 1e9999; expected a finite exact number.\n"
            "    Write an integer, a decimal with an exponent below 1000, or a fraction in "
            "quotes."
        ),
    ),
    (
        BASE,
        "a = 3, b = 0",
        "type = 3",
        (
            "party[1] 'Suth'.types[1].type: found a field called 'type'; expected a plain word "
            "that the value language does not use itself.\n"
            "    Rename it: letters, digits and _, other than type, types, min, max, abs, if, …"
        ),
    ),
    (
        BASE,
        '["1/4", "3/4"]',
        '["1/4", "1/2"]',
        (
            "party[0] 'Norhaven'.prior: found weights that sum to 3/4; expected a sum of 1.\n"
            '    Write fractions such as "1/3" if rounding is the cause, or use weights.'
        ),
    ),
    (
        BASE,
        '["1/4", "3/4"]',
        "[0, 1]",
        (
            "party[0] 'Norhaven'.prior[0]: found 0; expected a positive number.\n"
            "    Remove the type if it cannot occur."
        ),
    ),
    (
        BASE,
        '["1/4", "3/4"]',
        "[1]",
        (
            "party[0] 'Norhaven'.prior: found a list of 1; expected 2, one per type.\n"
            "    Add or remove entries."
        ),
    ),
    (
        BASE,
        '["1/4", "3/4"]',
        '["1/4", "x"]',
        (
            "party[0] 'Norhaven'.prior[1]: found 'x'; expected an exact number.\n"
            '    Write 3, 0.25 or "1/3".'
        ),
    ),
    (
        BASE,
        "weights = [1, 2]",
        "weights = [1, 2]\nprior = [0.5, 0.5]",
        (
            "party[1] 'Suth'.prior: found both prior and weights; expected prior or weights, "
            "one number per type.\n"
            "    Remove one of them."
        ),
    ),
    (
        BASE,
        "weights = [1, 2]\n",
        "",
        (
            "party[1] 'Suth'.prior: found nothing; expected prior or weights, one number per "
            "type.\n"
            "    Write weights = [1, …] if all are equally likely."
        ),
    ),
    (
        BASE,
        'open = "type", shut = 0',
        'open = "type"',
        (
            "party[0] 'Norhaven'.value.shut: found nothing; expected a worth for every option.\n"
            "    Write 0 if it is worth nothing."
        ),
    ),
    (
        BASE,
        '"type"',
        '"tpye"',
        (
            "party[0] 'Norhaven'.value.open: found 'tpye', where the name 'tpye' is unknown; "
            "expected an amount in the value language.\n"
            "    Did you mean 'type'?"
        ),
    ),
    (
        BASE,
        '"type"',
        '"1 / (type - 20)"',
        (
            "party[0] 'Norhaven'.value.open: found '1 / (type - 20)', a division by zero at "
            "Norhaven = 20; expected a divisor that is never zero.\n"
            "    Guard it: … / x if x != 0 else 0."
        ),
    ),
    (
        BASE,
        '"type"',
        '"type ** 0.5"',
        (
            "party[0] 'Norhaven'.value.open: found 'type ** 0.5', whose exponent at Norhaven = "
            "20 is no integer within 1,000; expected an integer power from -1,000 to 1,000.\n"
            "    Roots and huge powers are not exact worths: give a list of worths instead."
        ),
    ),
    (
        BASE,
        '"type"',
        '"type >"',
        (
            "party[0] 'Norhaven'.value.open: found 'type >', which does not read as an "
            "expression (invalid syntax); expected an expression of numbers, type, fields, "
            "types.PARTY, + - * / **, min, max, abs, comparisons, if-else.\n"
            '    Names that are not plain words are written types["North Haven"].'
        ),
    ),
    (
        BASE,
        '"type"',
        '"types.Suth"',
        (
            "party[0] 'Norhaven'.value.open: found a type of Suth, 'low', that has no number; "
            "expected a number behind every type the expression mentions.\n"
            '    Write the type as a table: { name = "keen", number = 3 }, or use its fields.'
        ),
    ),
    (
        BASE,
        '"type"',
        '"types.Sud"',
        (
            "party[0] 'Norhaven'.value.open: found 'types.Sud', where no party is called "
            "'Sud'; expected an amount in the value language.\n"
            "    The parties are Norhaven, Suth."
        ),
    ),
    (
        BASE,
        '"type"',
        '"type > 3"',
        (
            "party[0] 'Norhaven'.value.open: found 'type > 3', where 'type > 3' is a condition "
            "where a number belongs; expected an amount in the value language.\n"
            "    Write: 1 if CONDITION else 0."
        ),
    ),
    (
        BASE,
        '"type"',
        '"9 ** type ** 3"',
        (
            "party[0] 'Norhaven'.value.open: found '9 ** type ** 3', whose exponent at "
            "Norhaven = 20 is no integer within 1,000; expected an integer power from -1,000 "
            "to 1,000.\n"
            "    Roots and huge powers are not exact worths: give a list of worths instead."
        ),
    ),
    (
        BASE,
        '"type"',
        "\"__import__('os')\"",
        (
            "party[0] 'Norhaven'.value.open: found \"__import__('os')\", where "
            "\"__import__('os')\" is not in the language; expected an amount in the value "
            "language.\n"
            "    Functions are abs(x), min(x, y, …) and max(x, y, …)."
        ),
    ),
    (
        BASE,
        '"type"',
        '"types.Suth.a"',
        (
            "party[0] 'Norhaven'.value.open: found a type of Suth, 'low', that has no field "
            "'a'; expected a number behind every type the expression mentions.\n"
            "    Give that type the field, or test for it first."
        ),
    ),
    (
        BASE,
        '[1, "a / 2"]',
        "[1]",
        (
            "party[1] 'Suth'.value.open: found a list of 1; expected 2 entries, one per type "
            "of Suth.\n"
            "    Add or remove entries."
        ),
    ),
    (
        BASE,
        '[1, "a / 2"]',
        "[[1, 2], [3]]",
        (
            "party[1] 'Suth'.value.open[1]: found a list of 1; expected 2 entries, one per "
            "type of Suth.\n"
            "    Add or remove entries."
        ),
    ),
    (
        BASE,
        '[1, "a / 2"]',
        "1979-05-27",
        (
            "party[1] 'Suth'.value.open: found the date or time 1979-05-27; expected an exact "
            "number.\n"
            '    Write 3, 0.25 or "1/3".'
        ),
    ),
    (
        BASE,
        '[1, "a / 2"]',
        '[1, "a / b"]',
        (
            "party[1] 'Suth'.value.open[1]: found 'a / b', a division by zero at Suth = keen; "
            "expected a divisor that is never zero.\n"
            "    Guard it: … / x if x != 0 else 0."
        ),
    ),
    (
        BASE,
        "weights = [1, 2]",
        'weights = [1, 2]\ncompelled = "yes"',
        (
            "party[1] 'Suth'.compelled: found 'yes'; expected true or false.\n"
            "    Write true or false, without quotes."
        ),
    ),
    (
        BASE,
        "pays_at_most = 100",
        "pays_at_most = 100\npays_at_least = 200",
        (
            "limits.pays_at_least: found 200; expected at most pays_at_most, which is 100.\n"
            "    Exchange or mend them."
        ),
    ),
    (
        BASE,
        '"bayesian"',
        '"bayesain"',
        (
            "demands.ic: found 'bayesain'; expected one of none, bayesian, dominant.\n"
            "    Did you mean 'bayesian'?"
        ),
    ),
    (
        BASE,
        'ic = "bayesian"',
        'goal = "flor"',
        (
            "demands.goal: found 'flor'; expected one of any, outside-money, revenue, welfare, "
            "parties, floor, swing, margin, worst-pot, returned-share, blend.\n"
            "    Did you mean 'floor'?"
        ),
    ),
    (
        BASE,
        'ic = "bayesian"',
        'goal = ["floor", "floor"]',
        (
            "demands.goal: found 'floor' twice; expected each goal once.\n"
            "    Drop the repeated goal."
        ),
    ),
    (
        BASE,
        'ic = "bayesian"',
        "slack = true",
        ('demands.slack: found true; expected an exact number.\n    Write 3, 0.25 or "1/3".'),
    ),
    (
        BASE,
        "[demands]",
        "[goal]\nblend = { Soth = 1 }\n[demands]",
        (
            "goal.blend.Soth: found an unknown name 'Soth'; expected one of worth, pot, "
            "parties, Norhaven, Suth.\n"
            "    Did you mean 'Suth'?"
        ),
    ),
    (
        BASE,
        "[demands]",
        '[[side.chance]]\nparty = "Suth"\ntype = "lo"\noption = "open"\nexactly = 2\nat_most = '
        "1\n[demands]",
        (
            "side.chance[0].type: found 'lo'; expected a type of Suth: low, keen.\n"
            "    Did you mean 'low'?\n"
            "side.chance[0].exactly: found 2; expected a probability.\n"
            "    Write a number from 0 to 1.\n"
            "side.chance[0]: found at_most and exactly; expected at_least, at_most, or exactly "
            "alone.\n"
            '    Write exactly = "1/2", or at_least and at_most.'
        ),
    ),
    (
        JOINT,
        'Suth = "keen"',
        'Suth = "low"',
        (
            "party[1] 'Suth'.types: found the type 'keen' of probability 0 in the joint prior; "
            "expected a positive probability for every type.\n"
            "    Give a profile with it some weight, or remove the type."
        ),
    ),
    (
        JOINT,
        "weight = 2",
        "weight = -2",
        ("joint[1].weight: found -2; expected a weight of 0 or more.\n    Write its share."),
    ),
    (
        JOINT,
        ', Suth = "keen"',
        "",
        ("joint[1].at.Suth: found nothing; expected a type of every party.\n    Add Suth = TYPE."),
    ),
    (
        JOINT,
        "Norhaven = 50",
        "Norhaven = 20",
        (
            "party[0] 'Norhaven'.types: found the type '50' of probability 0 in the joint "
            "prior; expected a positive probability for every type.\n"
            "    Give a profile with it some weight, or remove the type."
        ),
    ),
    (
        JOINT,
        "types = [20, 50]",
        "types = [20, 50]\nprior = [0.5, 0.5]",
        (
            "party[0] 'Norhaven'.prior: found a prior beside a joint prior; expected one or "
            "the other.\n"
            "    Remove it: the joint prior already gives this party's probabilities."
        ),
    ),
    (
        JOINT,
        'Suth = "keen"',
        'Seth = "keen", Suth = 3',
        (
            "joint[1].at.Seth: found an unknown party 'Seth'; expected one of Norhaven, Suth.\n"
            "    Did you mean 'Suth'?\n"
            "joint[1].at.Suth: found 3; expected a type of Suth: low, keen.\n"
            "    Write one of its types."
        ),
    ),
    (
        JOINT,
        'Norhaven = 50, Suth = "keen"',
        'Norhaven = 20, Suth = "low"',
        (
            "joint[1]: found a profile given before; expected each profile once.\n"
            "    Remove one of them."
        ),
    ),
    (
        RULE,
        'take = "open"',
        'take = "opn"',
        ("rule[0].take: found 'opn'; expected one of open, shut.\n    Did you mean 'open'?"),
    ),
    (
        RULE,
        '"2/3"',
        '"1/3"',
        (
            "rule[1].take: found probabilities that sum to 2/3; expected a sum of 1.\n"
            '    Write fractions such as "1/3" if rounding is the cause.'
        ),
    ),
    (
        RULE,
        "take = { open",
        'at = { Norhaven = 50, Suth = "low" }\ntake = { open',
        (
            "rule: found no decision at Norhaven = 20, Suth = keen and 1 more; expected a "
            "decision at every profile.\n"
            "    Add it; one [[rule]] with take and without at covers every profile not named."
        ),
    ),
    (
        RULE,
        'at = { Norhaven = 20, Suth = "low" }\n',
        "",
        (
            "rule[1]: found a second entry without at; expected at most one, for every other "
            "profile.\n"
            "    Say which profile it is for, or remove it."
        ),
    ),
    (
        BASE,
        "[limits]",
        "[limits",
        (
            "line 17, column 8: found '[limits'; expected valid TOML.\n"
            "    Expected ']' at the end of a table declaration."
        ),
    ),
    (
        BASE,
        'title = "A gate"',
        'rule = "rule.csv"\ntitle = "A gate"',
        (
            "rule: found the file 'rule.csv'; expected entries in the scenario itself, which "
            "was not read from a folder.\n"
            "    Read the scenario from a file, or write the entries in it."
        ),
    ),
]


def mistakes(text: str, folder: Path | None = None) -> str:
    """The report without its first line, which counts the mistakes and names the source."""
    with pytest.raises(ScenarioError) as caught:
        parse_scenario(text, folder=folder)
    return str(caught.value).split("\n", 1)[1]


@pytest.mark.parametrize("base", [BASE, JOINT, RULE])
def test_the_bases_have_no_mistake(base: str) -> None:
    assert parse_scenario(base).title == "A gate"


@pytest.mark.parametrize(("base", "old", "new", "told"), CASES)
def test_one_slip_is_told_in_these_words(base: str, old: str, new: str, told: str) -> None:
    assert old in base
    assert mistakes(base.replace(old, new, 1)) == told


def test_independent_mistakes_come_in_one_report() -> None:
    text = BASE
    for old, new in (
        ("title =", "titel ="),
        ('["1/4", "3/4"]', '["1/4", "1/2"]'),
        ('"a / 2"', '"a / (b - b)"'),
        ('"bayesian"', '"honest"'),
        ("open = 5", "opened = 5"),
    ):
        text = text.replace(old, new)
    with pytest.raises(ScenarioError) as caught:
        parse_scenario(text, source="gate.toml")
    assert caught.value.exit_code == 2
    assert str(caught.value) == (
        "gate.toml: 5 mistakes\n"
        "titel: found an unknown key 'titel'; expected one of title, money, note, profiles, "
        "decisions, designer, party, joint, rule, limits, side, demands, … (13 in all).\n"
        "    Did you mean 'title'?\n"
        "designer.outlay.opened: found an unknown option 'opened'; expected one of open, shut.\n"
        "    Did you mean 'open'?\n"
        "party[1] 'Suth'.value.open[1]: found 'a / (b - b)', a division by zero at Suth = keen; "
        "expected a divisor that is never zero.\n"
        "    Guard it: … / x if x != 0 else 0.\n"
        "party[0] 'Norhaven'.prior: found weights that sum to 3/4; expected a sum of 1.\n"
        '    Write fractions such as "1/3" if rounding is the cause, or use weights.\n'
        "demands.ic: found 'honest'; expected one of none, bayesian, dominant.\n"
        "    Pick one."
    )


def test_a_mistaken_list_of_options_is_not_held_against_the_parties() -> None:
    text = BASE.replace('["open", "shut"]', '["open", "open"]').replace('"type"', '"tpye"')
    assert mistakes(text) == (
        "decisions.options[1]: found 'open' a second time; expected each once.\n"
        "    Remove one.\n"
        "party[0] 'Norhaven'.value.open: found 'tpye', where the name 'tpye' is unknown; expected "
        "an amount in the value language.\n"
        "    Did you mean 'type'?"
    )


def test_mistaken_types_of_one_party_leave_the_others_readable() -> None:
    text = BASE.replace("types = [20, 50]", "types = [20, 20]").replace('"a / 2"', '"a / b"')
    told = mistakes(text)
    assert "party[0] 'Norhaven'.types[1]: found the type '20' a second time" in told
    assert "party[1] 'Suth'.value.open[1]: found 'a / b', a division by zero" in told
    assert len(told.split("\n")) == 4


def test_a_long_report_is_cut_and_counted() -> None:
    extra = "".join(f"key_{i} = 0\n" for i in range(100))
    with pytest.raises(ScenarioError) as caught:
        parse_scenario(extra + BASE)
    assert len(caught.value.mistakes) == 61
    assert str(caught.value.mistakes[-1]) == (
        "further on: found 40 more mistakes; expected none.\n"
        "    Mend the ones above first, then read the file again."
    )


def test_an_empty_file_says_what_is_missing() -> None:
    assert mistakes("") == (
        "decisions: found nothing; expected the options.\n"
        '    Write [decisions] and options = ["…"].\n'
        "party: found nothing; expected at least one [[party]].\n"
        "    Describe each party in a table [[party]]."
    )


@pytest.mark.parametrize(
    ("text", "told"),
    [
        ("a = [", "line 1, column 6: found 'a = ['; expected valid TOML.\n    Invalid value."),
        (
            'a = 1\n\nb = "x',
            "line 3, column 7: found 'b = \"x'; expected valid TOML.\n    Unterminated string.",
        ),
        (
            "a = 1\r\na = 2\r\n",
            "line 2, column 6: found 'a = 2'; expected valid TOML.\n    Cannot overwrite a value.",
        ),
        (
            f"a = {'9' * 5000}",
            "file: found an integer of more than 4,300 digits; expected numbers of a bearable "
            "size.\n    Choose a larger unit of money.",
        ),
        (
            f"a = {'[' * 5000}",
            "file: found lists or tables nested too deep; expected a flatter file.\n"
            "    Flatten it.",
        ),
    ],
)
def test_what_is_not_toml_is_told_with_line_and_column(text: str, told: str) -> None:
    assert mistakes(text) == told


def test_files_that_cannot_be_read(tmp_path: Path) -> None:
    def told(path: Path | str) -> str:
        with pytest.raises(ScenarioError) as caught:
            read_scenario(path)
        return str(caught.value)

    missing = tmp_path / "gone.toml"
    assert told(missing).startswith(f"{missing}: 1 mistake\nfile: found ")
    assert "No such file or directory" in told(missing)
    assert "Is a directory" in told(tmp_path)
    assert "not a possible path" in told("a\0b.toml")
    latin = tmp_path / "latin.toml"
    latin.write_bytes("title = 'Åby'\n# Ö".encode("latin-1"))
    assert told(latin).endswith(
        "file, line 1: found the byte 0xc5, which is not UTF-8; expected text in UTF-8.\n"
        "    Save the file with the encoding UTF-8."
    )
    huge = tmp_path / "huge.toml"
    with huge.open("wb") as stream:
        stream.truncate(65 * 2**20)  # sparse: takes no room on the disk
    assert "found a file of more than 64 MiB" in told(huge)


def test_a_byte_order_mark_and_windows_lines_are_no_mistake(tmp_path: Path) -> None:
    plain = parse_scenario(BASE)
    path = tmp_path / "gate.toml"
    path.write_bytes(b"\xef\xbb\xbf" + BASE.replace("\n", "\r\n").encode())
    assert read_scenario(path).digest == plain.digest
    assert parse_scenario("\ufeff" + BASE).digest == plain.digest
