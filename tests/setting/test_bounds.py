"""Where size is refused, and the odd shapes a value may come in."""

from __future__ import annotations

import pytest

from designer.errors import ScenarioError
from designer.setting import scenario
from designer.setting.scenario import parse_scenario
from tests.setting.test_mistakes import BASE, JOINT, RULE, mistakes

MANY = 'decisions.options = ["open", "shut"]\n' + "".join(
    f'[[party]]\nname = "P{i}"\ntypes = {list(range(10))}\nweights = {[1] * 10}\n'
    'value = { open = "type", shut = 0 }\n'
    for i in range(20)
)
WITHOUT_WEIGHTS = "\n".join(line for line in MANY.split("\n") if not line.startswith("weights"))
REMEDY = "    Use independent priors and worths of the own type, or coarser types."


@pytest.mark.parametrize(
    ("text", "told"),
    [
        (
            WITHOUT_WEIGHTS + "[[joint]]\nat = { P0 = 0 }\nweight = 1\n",
            "joint: found a table over about 10**20 profiles; expected at most 5,000,000.\n"
            + REMEDY,
        ),
        (
            MANY + '[[rule]]\ntake = "open"\n',
            "rule: found a table over about 10**20 profiles; expected at most 5,000,000.\n"
            + REMEDY,
        ),
        (
            MANY.replace('"type"', '"type * types.P1"', 1),
            "party[0] 'P0'.value: found a table over about 10**20 profiles; expected at most "
            f"5,000,000.\n{REMEDY}",
        ),
        (
            MANY.replace('"type"', "[[1]]", 1),
            "party[0] 'P0'.value.open: found a table over about 10**20 profiles; expected at most "
            f"5,000,000.\n{REMEDY}",
        ),
        (
            MANY.replace('"type"', '"' + " + ".join(f"types.P{i}" for i in range(7)) + '"', 1),
            "party[0] 'P0'.value.open: found an expression over 10,000,000 combinations of types; "
            "expected at most 5,000,000, over at most 60 parties.\n"
            "    Mention fewer parties or use coarser types.",
        ),
    ],
)
def test_tables_over_too_many_profiles_are_refused_before_they_are_built(
    text: str, told: str
) -> None:
    assert mistakes(text) == told


def test_five_thousand_parties_are_too_many_for_a_rule_but_not_for_a_message() -> None:
    text = 'decisions.options = ["a"]\n[[rule]]\ntake = "a"\n' + "".join(
        f'[[party]]\nname = "P{i}"\ntypes = [0, 1, 2, 3, 4, 5, 6, 7, 8, 9]\n'
        "weights = [1, 1, 1, 1, 1, 1, 1, 1, 1, 1]\nvalue = { a = 0 }\n"
        for i in range(5000)
    )
    assert "found a table over about 10**5000 profiles" in mistakes(text)


def primes(count: int) -> list[int]:
    found: list[int] = []
    candidate = 2
    while len(found) < count:
        if all(candidate % prime for prime in found):
            found.append(candidate)
        candidate += 1
    return found


# The product of the first 1,200 primes has about 13,900 binary digits.
SHARES = ", ".join(f'"1/{prime}"' for prime in primes(1200))
NUMBERS = ", ".join(map(str, range(1200)))
WIDE = f"""
decisions.options = ["a"]
[[party]]
name = "N"
types = [{NUMBERS}]
weights = [{", ".join(["1"] * 1200)}]
value = {{ a = 0 }}
"""


def test_common_denominators_are_bounded() -> None:
    told = (
        "found amounts whose common denominator has more than 10,000 binary digits; expected "
        "amounts with common denominators.\n    Round them to a common unit."
    )
    assert mistakes(WIDE.replace("a = 0", f"a = [{SHARES}]")) == f"party[0] 'N'.value.a: {told}"
    weights = WIDE.replace(", ".join(["1"] * 1200), SHARES)
    assert mistakes(weights) == (
        "party[0] 'N'.weights: found weights whose common denominator has more than 10,000 binary "
        "digits; expected weights with common denominators.\n    Round them to a common unit."
    )
    halves = SHARES.split(", ")
    first = ", ".join([*halves[:800], *["0"] * 400])
    second = ", ".join([*["0"] * 800, *halves[800:]])
    two = WIDE.replace('["a"]', '["a", "b"]').replace("a = 0", f"a = [{first}], b = [{second}]")
    assert mistakes(two) == f"file: {told}"


def test_weights_of_very_different_sizes_are_bounded() -> None:
    big = 2**9000 + 1
    text = WIDE.replace(NUMBERS, "1, 2").replace(", ".join(["1"] * 1200), f'"{hex(big)}", "1/7e0"')
    assert "weights[1]: found '1/7e0'; expected an exact number" in mistakes(text)
    fine = f"{hex(big)}/0x7"
    wide = f"0x1/{hex(2**5000 + 1)}"
    text = WIDE.replace(NUMBERS, "1, 2").replace(", ".join(["1"] * 1200), f'"{fine}", "{wide}"')
    assert "found weights whose common denominator has more than 10,000" in mistakes(text)


def test_numbers_are_bounded() -> None:
    assert mistakes(BASE.replace("open = 5", f'open = "{hex(2**10_000)}"')) == (
        "designer.outlay.open: found a number of more than 10,000 binary digits; expected a number "
        "of money or weight.\n    Choose a larger unit of money, or round the number."
    )
    divided = '"1 / ' + " / ".join(f"(type + {2**3000 + i})" for i in range(4)) + '"'
    assert "binary digits" in mistakes(BASE.replace('"type"', divided))


def test_a_text_too_long_to_read(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(scenario, "MAX_BYTES", 100)
    with pytest.raises(ScenarioError, match=r"file: found \d+ characters; expected at most 100"):
        parse_scenario(BASE)


@pytest.mark.parametrize(
    ("base", "old", "new", "told"),
    [
        (JOINT, "Norhaven = 50", "Norhaven = true", "joint[1].at.Norhaven: found true"),
        (JOINT, "Norhaven = 50", "Norhaven = [1]", "joint[1].at.Norhaven: found a list of 1"),
        (JOINT, "weight = 2\n", "", "joint[1].weight: found nothing"),
        (
            JOINT,
            'at = { Norhaven = 50, Suth = "keen" }\n',
            "",
            "joint[1].at: found nothing; expected a type of every party",
        ),
        (BASE, "title =", "joint = []\ntitle =", "joint: found an empty list"),
        (BASE, 'title = "A gate"', "joint = [1]", "joint[0]: found 1; expected a table"),
        (BASE, 'title = "A gate"', "rule = 3", "rule: found 3; expected one or more tables"),
        (RULE, '"1/3"', '"-1/3"', "rule[1].take.open: found '-1/3'; expected a probability"),
        (RULE, 'take = "open"', "take = 1", "rule[0].take: found 1; expected an option or a lot"),
        (
            RULE,
            '{ open = "1/3"',
            '{ opn = "1/3"',
            "rule[1].take.opn: found an unknown option 'opn'",
        ),
        (BASE, '"keen", a', "{ a = 1 }, a", "types[1].name: found a table; expected a name or a n"),
        (BASE, 'name = "keen", a', "a", "types[1].name: found nothing; expected a name or a num"),
        (BASE, '"type"', "{ a = 1 }", "value.open: found a table; expected an amount of money"),
        (BASE, "open = 5", "open = [5]", "outlay.open: found a list of 1; expected an amount of"),
        (BASE, "open = 5", "open = 'types.Suth'", "where 'types' has no meaning here"),
        (BASE, '"type"', "[[1, 2], 3]", "value.open[1]: found 3; expected a list, one entry per"),
        (BASE, '"type"', "[[1, 2], [3, 'x']]", "value.open[1][1]: found 'x'; expected an exact"),
        (BASE, "[demands]", "[goal]\n[demands]", "goal.blend: found nothing; expected weights by"),
        (
            BASE,
            "[demands]",
            "goal.blend = {}\n[demands]",
            "limits.goal: found an unknown key 'goal'",
        ),
        (
            BASE,
            'ic = "bayesian"',
            "goal = []",
            "demands.goal: found an empty list; expected a goal",
        ),
        (
            BASE,
            "[demands]",
            "[[side.chance]]\n[demands]",
            "side.chance[0].party: found nothing; expected Norhaven, Suth.\n    Name a party.\n"
            "side.chance[0].option: found nothing; expected open, shut.\n    Name an option.\n"
            "side.chance[0].type: found nothing; expected a type of the party.\n"
            "    Write type = TYPE.\nside.chance[0]: found no bound; expected at_least, at_most,",
        ),
    ],
)
def test_odd_shapes(base: str, old: str, new: str, told: str) -> None:
    assert old in base
    assert told in mistakes(base.replace(old, new, 1))
