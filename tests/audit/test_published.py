"""The audit on rules whose properties are theorems, and on examples small enough for a pencil.

The sources beside the theorems are cited from memory.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Callable, Sequence
from fractions import Fraction

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from designer.auditing import Audit, audit, judge
from designer.setting.scenario import parse_scenario
from designer.setting.setting import Party, Setting, Type, integers
from designer.table import Table

Profile = tuple[int, ...]

# A buyer worth 20 or 100 and a seller worth 0 or 80, each equally likely: the trading example
# of Myerson (2008), 'Perspectives on mechanism design in economic theory', AER 98:586-603
# (numbers from memory). Every margin below was worked out by hand.
TRADE = """
title = "Two-by-two trade"
[decisions]
options = ["trade", "keep"]
[[party]]
name = "Buyer"
types = [20, 100]
weights = [1, 1]
value = { trade = "type", keep = 0 }
[[party]]
name = "Seller"
types = [0, 80]
weights = [1, 1]
value = { trade = "-type", keep = 0 }
"""
EFFICIENT = [[1, 0], [0, 1], [1, 0], [1, 0]]  # (20,0) (20,80) (100,0) (100,80)


def margins(checked: Audit) -> dict[str, Fraction | None]:
    return {name: finding.margin for name, finding in checked.worst.items()}


def test_splitting_the_difference_is_balanced_and_tempting() -> None:
    """Prices 10, 50, 90, half-way between the two worths.

    Buyer of 100: honest (50 + 10)/2 = 30, saying 20 (90 + 0)/2 = 45. Buyer of 20: honest 5,
    saying 100 (-30 - 70)/2 = -50. The seller mirrors this. At seller 0 the buyer of 100 gains
    90 - 50 = 40 for sure by saying 20.
    """
    setting = parse_scenario(TRADE)
    price = [10, 0, 50, 90]
    checked = audit(setting, Table.of(EFFICIENT, [price, [-p for p in price]]))
    assert margins(checked) == {
        "ic-bayesian": -15,
        "ic-dominant": -40,
        "ir-ex-ante": Fraction(35, 2),
        "ir-interim": 5,
        "ir-ex-post": 0,
        "balance-ex-ante-exact": 0,
        "balance-ex-ante-no-deficit": 0,
        "balance-ex-post-exact": 0,
        "balance-ex-post-no-deficit": 0,
    }
    worst = checked.worst["ic-dominant"]
    assert (worst.party, worst.type, worst.lie) == ("Buyer", "100", "20")
    assert worst.profile == {"Buyer": "100", "Seller": "0"}
    rows = {(row.party, row.type): row for row in checked.standings}
    assert rows["Buyer", "100"].margin == -15
    assert rows["Buyer", "20"].margin == 55
    assert rows["Buyer", "20"].pays == 5
    assert rows["Buyer", "20"].worth == 10
    assert rows["Seller", "80"].lie == "0"
    assert checked.decisions.efficient.holds
    assert checked.decisions.welfare == 35
    assert judge(checked, {"ic": "none", "ir": "ex-post", "balance": "ex-post"}) == []
    assert judge(checked, {"ic": "dominant", "ir": "interim"}) == ["ic-dominant"]


def test_the_cheapest_honest_trade_costs_five() -> None:
    """Honest reports, willing parties and efficient trade need 5 from outside on average.

    By hand from the binding rows: the buyer pays 10 or 60 in expectation, the seller gets 40
    or 40; 35 comes in and 40 goes out.
    """
    setting = parse_scenario(TRADE)
    table = Table.of(EFFICIENT, [[10, 10, 60, 60], [-40, -40, -40, -40]])
    checked = audit(setting, table)
    found = margins(checked)
    assert found["ic-bayesian"] == 0
    assert found["ir-interim"] == 0
    assert found["balance-ex-ante-no-deficit"] == -5
    assert checked.pot.expected == -5
    assert checked.pot.least == -30
    assert checked.pot.most == 20
    asked = {"ic": "bayesian", "ir": "interim", "balance": "ex-ante", "decision": "efficient"}
    assert judge(checked, asked) == ["balance-ex-ante-exact"]
    assert judge(audit(setting, table, subsidy=Fraction(5)), asked) == []
    assert judge(audit(setting, table, tolerance=Fraction(5)), asked) == []
    assert judge(audit(setting, table, tolerance=Fraction(49, 10)), asked) == [
        "balance-ex-ante-exact"
    ]


def test_a_compelled_party_is_reported_but_not_counted() -> None:
    text = TRADE.replace('name = "Seller"', 'name = "Seller"\ncompelled = true')
    table = Table.of(EFFICIENT, [[0, 0, 0, 0], [0, 0, 0, 0]])
    checked = audit(parse_scenario(text), table)
    assert checked.holds["ir-ex-post"]
    assert checked.worst["ir-ex-post"].party == "Buyer"
    assert {finding.demand: finding.margin for finding in checked.excused} == {
        "ir-ex-ante": -20,
        "ir-interim": -40,
        "ir-ex-post": -80,
    }
    assert not audit(parse_scenario(text), table, compelled=()).holds["ir-ex-post"]


# --- random private-worth settings for the theorems -------------------------------------------


@st.composite
def private(draw: st.DrawFn, parties: int = 3) -> Setting:
    """Independent private worths, no outlay: where the classic theorems live."""
    options = draw(st.integers(2, 3))
    rows = []
    for i in range(parties):
        size = draw(st.integers(1, 3))
        value = draw(st.lists(st.integers(-6, 6), min_size=size * options, max_size=size * options))
        weights = draw(st.lists(st.integers(1, 4), min_size=size, max_size=size))
        rows.append(
            Party(
                name=f"P{i}",
                types=tuple(Type(f"t{a}") for a in range(size)),
                weights=tuple(weights),
                value=integers(value, (size, options)),
                outside=integers([0] * size),
            )
        )
    zero = integers([0] * options)
    return Setting(
        title="private",
        options=tuple(f"o{k}" for k in range(options)),
        parties=tuple(rows),
        outlay=zero,
        worth=zero,
        grain=draw(st.integers(1, 3)),
    )


def efficient(setting: Setting) -> tuple[list[Profile], dict[Profile, int]]:
    """All profiles, and the first best option at each."""
    profiles = list(itertools.product(*map(range, setting.shape)))
    options = range(len(setting.options))
    choice = {}
    for p in profiles:
        total = [sum(worth(setting, i, k, p[i]) for i in range(len(p))) for k in options]
        choice[p] = max(options, key=lambda k, total=total: (total[k], -k))  # type: ignore[misc]
    return profiles, choice


def worth(setting: Setting, i: int, k: int, own: int) -> Fraction:
    return Fraction(int(setting.parties[i].value[own, k]), setting.grain)


def table_of(
    setting: Setting,
    profiles: Sequence[Profile],
    choice: dict[Profile, int],
    pays: Callable[[int, Profile], Fraction],
) -> Table:
    options = range(len(setting.options))
    decides = [[int(k == choice[p]) for k in options] for p in profiles]
    amounts = [[pays(i, p) for p in profiles] for i in range(len(setting.parties))]
    return Table.of(decides, amounts)


@given(private() | private(parties=2))
@settings(max_examples=40, deadline=None)
def test_expected_externality_payments_are_honest_on_average_and_balance_always(
    setting: Setting,
) -> None:
    """Balanced by D'Aspremont and Gérard-Varet (1979), J. Public Economics 11:25-45.

    With independent private worths, t_i = -xi_i(theta_i) + sum_{j != i} xi_j(theta_j)/(n-1),
    xi_i(a) the others' expected worth when i says a, is Bayesian incentive compatible for the
    efficient decision and sums to zero at every profile.
    """
    profiles, choice = efficient(setting)
    n = len(setting.parties)

    def brings(i: int, own: int) -> Fraction:
        total, mass = Fraction(0), Fraction(0)
        for p in profiles:
            if p[i] == own:
                odds = math.prod(setting.parties[j].marginal[p[j]] for j in range(n) if j != i)
                total += odds * sum(worth(setting, j, choice[p], p[j]) for j in range(n) if j != i)
                mass += odds
        assert mass == 1
        return total

    gifts = [[brings(i, a) for a in range(size)] for i, size in enumerate(setting.shape)]

    def pays(i: int, p: Profile) -> Fraction:
        others = sum((gifts[j][p[j]] for j in range(n) if j != i), Fraction(0))
        return others / (n - 1) - gifts[i][p[i]]

    checked = audit(setting, table_of(setting, profiles, choice, pays))
    assert checked.holds["ic-bayesian"]
    assert checked.holds["balance-ex-post-exact"]
    assert checked.pot.least == checked.pot.most == checked.pot.expected == 0
    assert checked.decisions.efficient.holds
    assert checked.decisions.certain


@given(private())
@settings(max_examples=40, deadline=None)
def test_pivotal_payments_are_always_honest_and_never_a_deficit(setting: Setting) -> None:
    """Clarke (1971), Public Choice 11:17-33; Groves (1973), Econometrica 41:617-631.

    t_i = (the others' best total) - (the others' total at the decision taken): truth is
    dominant, every payment and so the pot is nonnegative.
    """
    profiles, choice = efficient(setting)
    n, options = len(setting.parties), range(len(setting.options))

    def pays(i: int, p: Profile) -> Fraction:
        others = [
            sum((worth(setting, j, k, p[j]) for j in range(n) if j != i), Fraction(0))
            for k in options
        ]
        return max(others) - others[choice[p]]

    checked = audit(setting, table_of(setting, profiles, choice, pays))
    assert checked.holds["ic-dominant"]
    assert checked.holds["ic-bayesian"]
    assert checked.holds["balance-ex-post-no-deficit"]
    assert checked.pot.least >= 0


SLOT = """
title = "One slot among three"
[decisions]
options = ["A", "B", "C"]
""" + "".join(
    f"""
[[party]]
name = "{name}"
types = [1, 2, 4]
weights = [1, 2, 1]
value = {{ A = 0, B = 0, C = 0 }}
""".replace(f"{name} = 0", f'{name} = "type"')
    for name in "ABC"
)


def slot_table(setting: Setting, rule: Callable[[list[int]], int]) -> Table:
    """The highest report wins, the first among equals; the winner pays rule(reports)."""
    types = (1, 2, 4)
    decides, pays = [], [[], [], []]  # type: ignore[var-annotated]
    for p in itertools.product(range(3), repeat=3):
        said = [types[a] for a in p]
        winner = said.index(max(said))
        decides.append([int(i == winner) for i in range(3)])
        for i in range(3):
            pays[i].append(rule(said) if i == winner else 0)
    return Table.of(decides, pays)


def test_the_second_price_makes_truth_dominant() -> None:
    """Vickrey (1961), J. Finance 16:8-37: pay the best losing bid; nobody loses by taking part."""
    setting = parse_scenario(SLOT)
    checked = audit(setting, slot_table(setting, lambda said: sorted(said)[-2]))
    assert checked.worst["ic-dominant"].margin == 0
    assert checked.worst["ir-ex-post"].margin == 0
    assert checked.holds["balance-ex-post-no-deficit"]
    assert not checked.holds["balance-ex-post-exact"]
    assert checked.decisions.efficient.holds
    assert checked.largest.amount == 4


def test_the_first_price_does_not() -> None:
    """Where the others say 1, A of 4 wins by saying 1 as well and pays 1 instead of 4."""
    setting = parse_scenario(SLOT)
    checked = audit(setting, slot_table(setting, max))
    worst = checked.worst["ic-dominant"]
    assert worst.margin == -3
    assert (worst.party, worst.type, worst.lie) == ("A", "4", "1")
    assert worst.profile == {"A": "4", "B": "1", "C": "1"}
    assert worst.violation == 3


def test_bets_on_the_others_type_hold_a_correlated_party_to_the_truth() -> None:
    """Full extraction by side bets, in the manner of Crémer and McLean (1988), Econometrica 56.

    Ana is worth 0 or 10 for the thing; Ben's type, L or H, goes with hers two times in three.
    Saying 10 she pays 10 + bet with bet (6, -3), worth 0 on average to the type 10 and 3 to
    pay for the type 0. Saying 0 she gets nothing and bets (-4, 8): 0 on average for the type
    0, 4 to pay for the type 10. Margins by hand: 4 for the type 10, 13 for the type 0.
    """
    setting = parse_scenario("""
title = "Correlated"
[decisions]
options = ["give", "keep"]
[[party]]
name = "Ana"
types = [0, 10]
value = { give = "type", keep = 0 }
[[party]]
name = "Ben"
types = ["L", "H"]
value = { give = 0, keep = 0 }
[[joint]]
at = { Ana = 0, Ben = "L" }
weight = 2
[[joint]]
at = { Ana = 0, Ben = "H" }
weight = 1
[[joint]]
at = { Ana = 10, Ben = "L" }
weight = 1
[[joint]]
at = { Ana = 10, Ben = "H" }
weight = 2
""")
    table = Table.of([[0, 1], [0, 1], [1, 0], [1, 0]], [[-4, 8, 16, 7], [0, 0, 0, 0]])
    checked = audit(setting, table)
    rows = {row.type: row for row in checked.standings if row.party == "Ana"}
    assert rows["10"].margin == 4
    assert rows["0"].margin == 13
    assert rows["0"].gain == rows["10"].gain == 0
    assert checked.pot.expected == 5  # all of what the thing is worth to her
    assert checked.worst["ic-bayesian"].margin == 0  # Ben's reports change nothing for him
    assert checked.worst["ir-interim"].margin == 0
    assert checked.worst["ir-ex-post"].margin == -8
    # At L the type 10 would rather take the 4 than pay 16 for what is worth 10.
    assert checked.worst["ic-dominant"].margin == -10
    assert checked.worst["ic-dominant"].profile == {"Ana": "10", "Ben": "L"}


@pytest.mark.parametrize("size", [2, 3])
def test_interdependent_worths_are_held_to_ex_post_honesty(size: int) -> None:
    """Dasgupta and Maskin (2000), QJE 115:341-388: efficient and ex-post honest.

    The winner pays what the thing would be worth to it at the lowest report of its own that
    still wins, where own signals weigh more than others'.

    Worth 2 own + other. A wins ties and pays 3 b; B wins above a and pays 2 (a + 1) + a.
    With two types: A of 0 facing 1 and saying 1 would win what is truly worth 1 (not 3) at
    the price 3, and so lose 2.
    """
    types = list(range(size))
    setting = parse_scenario(f"""
title = "Interdependent"
[decisions]
options = ["A", "B"]
[[party]]
name = "A"
types = {types}
weights = {[1] * size}
value = {{ A = "2 * type + types.B", B = 0 }}
[[party]]
name = "B"
types = {types}
weights = {[1] * size}
value = {{ A = 0, B = "2 * type + types.A" }}
""")
    cells = list(itertools.product(types, types))
    decides = [[int(a >= b), int(a < b)] for a, b in cells]
    pays = [
        [3 * b if a >= b else 0 for a, b in cells],
        [3 * a + 2 if a < b else 0 for a, b in cells],
    ]
    checked = audit(setting, Table.of(decides, pays))
    assert checked.worst["ic-dominant"].margin == 0
    assert checked.worst["ir-ex-post"].margin == 0
    if size == 2:
        dearer, cheaper = list(pays[0]), list(pays[0])
        dearer[3] += 5  # A 1, B 1
        cheaper[3] = 0
        worst = audit(setting, Table.of(decides, [dearer, pays[1]])).worst["ic-dominant"]
        # Now A of 1 at B 1 pays 8 for what is worth 3: by saying 0 it saves 5.
        assert (worst.party, worst.type, worst.lie) == ("A", "1", "0")
        assert worst.margin == -5
        worst = audit(setting, Table.of(decides, [cheaper, pays[1]])).worst["ic-dominant"]
        # For nothing, A of 0 would say 1 at B 1 to win what is truly worth 1 to it, not 3.
        assert (worst.party, worst.type, worst.lie) == ("A", "0", "1")
        assert worst.margin == -1


def test_profiles_of_no_probability_count_only_if_asked() -> None:
    """Convention 5: an off-support profile with a bad payment fails 'all', passes 'support'."""
    text = """
title = "Support"
profiles = "all"
[decisions]
options = ["a"]
[[party]]
name = "P"
types = [0, 1]
value = { a = 0 }
[[party]]
name = "Q"
types = [0, 1]
value = { a = 0 }
[[joint]]
at = { P = 0, Q = 0 }
weight = 1
[[joint]]
at = { P = 1, Q = 1 }
weight = 1
"""
    table = Table.of([[1]] * 4, [[0, 7, 0, 0], [0, 0, 0, 0]])
    everywhere = audit(parse_scenario(text), table)
    supported = audit(parse_scenario(text.replace('"all"', '"support"')), table)
    assert everywhere.worst["ir-ex-post"].margin == -7
    assert supported.worst["ir-ex-post"].margin == 0
    # P of 0 at Q 1 (never met) would gain 7 by saying 1; from the support a lie there loses 7.
    assert everywhere.worst["ic-dominant"].margin == -7
    assert supported.worst["ic-dominant"].margin == 0
    assert everywhere.worst["balance-ex-post-exact"].margin == -7
    assert supported.worst["balance-ex-post-exact"].margin == 0
    assert everywhere.pot.most == 7
    assert everywhere.pot.most_at == {"P": "0", "Q": "1"}
    assert {supported.pot.least, supported.pot.most} == {0}
    assert supported.holds["ic-bayesian"]


def test_a_party_of_one_type_has_no_lies() -> None:
    setting = parse_scenario("""
title = "One"
[decisions]
options = ["a"]
[[party]]
name = "P"
types = [3]
weights = [1]
value = { a = "type" }
compelled = true
""")
    checked = audit(setting, Table.of([[1]], [[4]]))
    assert checked.worst["ic-bayesian"].margin is None
    assert checked.worst["ic-dominant"].margin is None
    assert checked.worst["ir-interim"].margin is None
    assert checked.holds["ic-bayesian"]
    assert checked.holds["ir-ex-post"]
    assert checked.standings[0].lie is None
    assert [finding.margin for finding in checked.excused] == [-1, -1, -1]
