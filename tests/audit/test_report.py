"""What the audit reports: verdicts on demands, plain forms, even-handedness, refusals."""

from __future__ import annotations

import itertools
import json
from collections.abc import Callable
from fractions import Fraction

import pytest

from designer.auditing import as_json, audit, interim_csv, judge
from designer.errors import TableError
from designer.setting.exact import number
from designer.setting.scenario import parse_scenario
from designer.setting.setting import Chance, Limits, Side
from designer.table import Table
from tests.audit.test_published import EFFICIENT, SLOT, TRADE, slot_table

SPLIT = [[10, 0, 50, 90], [-10, 0, -50, -90]]


def test_the_document_says_everything_exactly() -> None:
    setting = parse_scenario(TRADE)
    checked = audit(setting, Table.of(EFFICIENT, SPLIT), subsidy=Fraction(1, 3))
    document = json.loads(json.dumps(as_json(checked)))
    assert document["format"] == "designer.audit/1"
    assert document["scenario"] == {"title": "Two-by-two trade", "digest": setting.digest}
    assert document["subsidy"] == "1/3"
    assert document["holds"]["ic-bayesian"] is False
    assert document["worst"]["ic-dominant"] == {
        "holds": False,
        "margin": "-40",
        "approx": "-40",
        "party": "Buyer",
        "type": "100",
        "lie": "20",
        "profile": {"Buyer": "100", "Seller": "0"},
    }
    assert document["worst"]["balance-ex-post-exact"]["margin"] == "-1/3"
    assert document["interim"][0] == {
        "party": "Buyer",
        "type": "20",
        "probability": "1/2",
        "pays": "5",
        "worth": "10",
        "utility": "5",
        "outside": "0",
        "gain": "5",
        "lie": "100",
        "margin": "55",
    }
    assert document["pot"]["by_profile"][1] == {"types": ["20", "80"], "pot": "0"}
    assert document["decisions"]["welfare"] == {"exact": "35", "approx": "35"}
    assert document["largest_payment"]["amount"]["exact"] == "90"
    assert document["limits"] == {}


def test_the_interim_table_has_a_line_per_type() -> None:
    checked = audit(parse_scenario(TRADE), Table.of(EFFICIENT, SPLIT))
    lines = interim_csv(checked.standings).decode().splitlines()
    assert lines == [
        "party,type,expected payment,expected utility,gain over staying out,closest lie,margin",
        "Buyer,20,5,5,5,100,55",
        "Buyer,100,70,30,30,20,-15",
        "Seller,0,-30,30,30,80,-15",
        "Seller,80,-45,5,5,0,55",
    ]
    shown = checked.interim
    assert list(shown["gain"]) == [number(line.split(",")[4]) for line in lines[1:]]
    assert list(checked.pots.columns) == ["type:Buyer", "type:Seller", "pot"]
    assert list(checked.pots["pot"]) == [0, 0, 0, 0]


def test_verdicts_on_decisions() -> None:
    setting = parse_scenario(TRADE)
    half = Fraction(1, 2)
    wasteful = Table.of([[half, half], [0, 1], [1, 0], [1, 0]], [[0] * 4, [0] * 4])
    broken = Table.of([[half, 1], [0, 1], [1, 0], [1, 0]], [[0] * 4, [0] * 4])
    nothing = {"ic": "none", "ir": "none", "balance": "none"}
    checked = audit(setting, wasteful)
    assert judge(checked, nothing) == []
    assert judge(checked, {**nothing, "decision": "efficient"}) == ["decision-efficient"]
    assert judge(checked, {**nothing, "decision": "deterministic"}) == ["decision-deterministic"]
    assert checked.decisions.efficient.violation == 10
    assert checked.decisions.efficient.profile == {"Buyer": "20", "Seller": "0"}
    assert checked.decisions.lost == Fraction(10, 4)
    assert judge(audit(setting, broken), nothing) == ["lottery"]
    assert audit(setting, broken).decisions.lottery.violation == half
    rule = '[[rule]]\ntake = "trade"\n[demands]\ndecision = "table"\n'
    ruled = audit(parse_scenario(TRADE + rule), wasteful)
    assert judge(ruled, {**nothing, "decision": "table"}) == ["decision-table"]
    assert ruled.decisions.follows is not None
    assert ruled.decisions.follows.margin == -1
    with pytest.raises(ValueError, match="no such demand"):
        judge(checked, {"ic": "perfect"})
    with pytest.raises(ValueError, match="no such demand"):
        judge(checked, {"decision": "wise"})


def test_slack_and_shortfall_are_tolerated_apart() -> None:
    setting, table = parse_scenario(TRADE), Table.of(EFFICIENT, SPLIT)
    assert audit(setting, table, slack=Fraction(15)).holds["ic-bayesian"]
    assert not audit(setting, table, slack=Fraction(14)).holds["ic-bayesian"]
    dear = Table.of(EFFICIENT, [[11, 1, 51, 91], [-10, 0, -50, -90]])
    assert not audit(setting, dear, slack=Fraction(15)).holds["ir-ex-post"]
    assert audit(setting, dear, shortfall=Fraction(1)).holds["ir-ex-post"]


def test_limits_and_side_demands_are_asked_always() -> None:
    setting, table = parse_scenario(TRADE), Table.of(EFFICIENT, SPLIT)
    side = Side(
        welfare_at_least=Fraction(36),
        revenue_at_least=Fraction(0),
        chances=(Chance(0, 0, 0, at_least=Fraction(2, 3)), Chance(1, 1, 0, at_most=Fraction(1, 2))),
    )
    limits = Limits(pays_at_most=Fraction(80), pays_at_least=Fraction(-90), within_worth=True)
    checked = audit(setting, table, side=side, limits=limits)
    assert judge(checked, {}) == ["chance[0]", "pays_at_most", "welfare_at_least"]
    assert checked.limits["chance[0]"].margin == Fraction(-1, 6)
    assert checked.limits["pays_at_most"].margin == -10
    assert checked.limits["pays_at_most"].profile == {"Buyer": "100", "Seller": "80"}
    assert checked.limits["pays_at_least"].margin == 0
    assert checked.limits["welfare_at_least"].margin == -1
    assert checked.limits["within_worth"].holds


def test_even_handed_tables_do_not_know_names() -> None:
    """Three alike parties: the first winning ties is a privilege, a fair draw is not."""
    setting = parse_scenario(SLOT + "[demands]\neven_handed = true\n")
    first = audit(setting, slot_table(setting, lambda said: sorted(said)[-2]))
    # Ties: the payment moves with the slot, up to 4 where two report 4.
    assert first.limits["even-handed"].margin == -4
    assert judge(first, {}) == ["even-handed"]

    decides, pays = [], []
    for p in itertools.product((1, 2, 4), repeat=3):
        winners = [i for i in range(3) if p[i] == max(p)]
        share = Fraction(1, len(winners))
        decides.append([share if i in winners else 0 for i in range(3)])
        price = sorted(p)[-2]
        pays.append([share * price if i in winners else Fraction(0) for i in range(3)])
    fair = Table.of(decides, list(zip(*pays, strict=True)))
    drawn = audit(setting, fair)
    assert drawn.limits["even-handed"].margin == 0
    assert judge(drawn, {"ic": "dominant", "ir": "ex-post", "decision": "efficient"}) == []
    pays[5][0] += 1
    skewed = audit(setting, Table.of(decides, list(zip(*pays, strict=True))))
    assert skewed.limits["even-handed"].margin == -1
    decides[1] = [Fraction(1, 4), Fraction(3, 4), 0]
    biased = audit(setting, Table.of(decides, list(fair_pays(fair))))
    assert not biased.limits["even-handed"].holds
    unlike = parse_scenario(
        SLOT.replace("[1, 2, 1]", "[1, 1, 1]", 1) + "[demands]\neven_handed = true\n"
    )
    # With another prior, A is unlike B and C, who must still be treated alike.
    assert not audit(unlike, slot_table(unlike, max)).limits["even-handed"].holds


def fair_pays(table: Table) -> list[list[Fraction]]:
    return [[table.payment(i, p) for p in range(table.pays.shape[1])] for i in range(3)]


@pytest.mark.parametrize(
    ("table", "words"),
    [
        (lambda: Table.of([[1, 0]] * 3, SPLIT), r"table.decides: found shape \(3, 2\)"),
        (lambda: Table.of(EFFICIENT, [[0] * 4]), r"table.pays: found shape \(1, 4\)"),
    ],
)
def test_a_table_of_another_scenario_is_refused(table: Callable[[], Table], words: str) -> None:
    with pytest.raises(TableError, match=words):
        audit(parse_scenario(TRADE), table())
