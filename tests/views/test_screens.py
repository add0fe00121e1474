"""The screens at 80 columns without colour: what they say, and that they fit."""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction
from pathlib import Path

import pytest
from rich.cells import cell_len

from designer import (
    Demands,
    Limits,
    Setting,
    Side,
    Verdict,
    audit,
    parse_scenario,
    pose,
    read_scenario,
)
from designer.auditing import judge
from designer.proof.recheck import recheck
from designer.setting.setting import Chance
from designer.views.audited import audited
from designer.views.page import plain
from designer.views.rechecked import rechecked
from designer.views.screen import screen

FOLDER = Path(__file__).parents[2] / "scenarios"


def scenario(name: str) -> Setting:
    return read_scenario(FOLDER / f"{name}.toml")


def shown(verdict: Verdict, rows: int | None = None, width: int = 80) -> list[str]:
    lines = plain(screen(verdict, rows), width).split("\n")
    assert max(map(cell_len, lines)) <= width
    assert not any(line != line.rstrip() for line in lines)
    return lines


def between(lines: list[str], first: str, last: str) -> list[str]:
    start = lines.index(first)
    return lines[start : lines.index(last, start)]


WIDE = """
title = "A very long title, longer than any line of a terminal has room for, on a pier and a quay"
money = "thousands of silver crowns of the old coinage"
note  = "Invented."
decisions.options = ["verlängere die nördliche Mole bis zum Leuchtturm", "leave"]
designer.outlay = { "verlängere die nördliche Mole bis zum Leuchtturm" = 3 }
"""


def wide(parties: int = 12) -> Setting:
    """Many parties, long names, wide letters, types of forty characters."""
    text = [WIDE]
    for i in range(parties):
        types = '["' + f"{i} " + "x" * 40 + '", "港口很大"]' if i < 2 else '["single"]'
        value = "[4, 7]" if i < 2 else "[1]"
        text.append(
            f"""
[[party]]
name = "{"Harbour 港 of the eastern shore, no. " if i % 2 else "Étang-"}{i}"
types = {types}
weights = {"[2, 1]" if i < 2 else "[1]"}
value = {{ "verlängere die nördliche Mole bis zum Leuchtturm" = {value}, leave = 0 }}
"""
        )
    return parse_scenario("".join(text))


# --- possible ---------------------------------------------------------------------------------


def test_a_possible_verdict_from_top_to_bottom() -> None:
    lines = shown(pose(scenario("reef")))
    assert lines[0] == "Dredging the channel at Ombry"
    assert "  money      hundred crowns; in payments + is paid and - is received" in lines
    assert "  pot          In every case the payments come to at least the outlay." in lines
    assert "POSSIBLE, proved." in lines
    assert "  revenue    The largest expected pot is 165/4 = 41.25 hundred crowns." in lines
    assert between(lines, "Case by case", "")[1:] == [
        "  reported                       pays",
        "  Heron  Teal   chance  decided  Heron  Teal  pot",
        "  -----  -----  ------  -------  -----  ----  ---",
        "  shoal  shoal     1/8  Teal         0    25   25",
        "  shoal  mixed     1/4  Teal         0    25   25",
        "  shoal  clear     1/8  Teal         0    25   25",
        "  clear  shoal     1/8  Heron       50     0   50",
        "  clear  mixed     1/4  Heron       55     0   55",
        "  clear  clear     1/8  Teal         0    70   70",
    ]
    assert "  Heron  clear    40        0              0  shoal               0" in lines
    assert "  least     25 hundred crowns, at Heron shoal, Teal shoal" in lines
    assert "  expected  165/4 = 41.25 hundred crowns" in lines
    assert lines[-4:-1] == [
        "This is analysis under the stated priors and types, not legal or financial",
        "advice. Local law, procurement and competition rules, and licensed advisers",
        "decide.",
    ]


def test_the_first_rows_and_where_the_rest_is() -> None:
    verdict = pose(scenario("dawn-berth"))
    few = shown(verdict, rows=3)
    cases = between(few, "Case by case", "")
    assert len([line for line in cases if line.startswith(("  100", "  200", "  300"))]) == 3
    assert cases[-2:] == [
        "  … and 15 more cases: --rows N shows more of them, --save DIR writes all,",
        "  exact, to transfers.csv.",
    ]
    assert any("… and 5 more types" in line and "--rows N" in line for line in few)
    every = shown(verdict, rows=18)
    assert "more cases" not in "\n".join(every)
    assert len([line for line in between(every, "Case by case", "") if line[2:5].isdigit()]) == 18
    none = shown(verdict, rows=0)
    assert any("… and 18 more cases" in line for line in none)


def test_rounded_cells_are_marked_and_short_ones_exact() -> None:
    lines = shown(pose(scenario("breakwater"), Demands(ir="none")))
    assert any("~" in line for line in lines)
    assert any(line.startswith("  ~ marks a rounded number.") for line in lines)
    assert "  floor  The largest worst interim gain over staying out is -95/36 ≈ -2.63889" in lines


def test_least_outside_money_says_which_way_it_flows() -> None:
    given = "\n".join(shown(pose(scenario("lock-sale"), Demands(goal="outside-money"))))
    assert "The least outside money needed is 5/2 = 2.5 crowns." in given
    assert "Negative" not in given
    lines = shown(pose(scenario("wreck"), Demands(goal="outside-money")))
    handed = " ".join(" ".join(lines).split())
    assert "is -145/2 = -72.5 crowns. Negative: so much can be handed out." in handed


def test_an_unproved_goal_is_said_to_be_unproved() -> None:
    verdict = pose(scenario("lock-sale"), Demands(goal="outside-money"))
    goals = (replace(verdict.goals[0], proved=False, bound=2.25), *verdict.goals[1:])
    doubted = replace(verdict, proved=False, goals=goals)
    text = " ".join(" ".join(shown(doubted)).split())
    assert "POSSIBLE, unproved." in text
    assert "Unproved: the engine says that nothing beyond 2.25 exists." in text


def test_lotteries_are_written_out() -> None:
    text = """
title = "A toss"
decisions.options = ["left", "right"]
side.chance = [{ party = "Suth", type = 1, option = "left", exactly = "1/3" }]
demands = { decision = "randomized", ic = "none", ir = "none", balance = "none" }
[[party]]
name = "Suth"
types = [1]
weights = [1]
value = { left = 0, right = 0 }
"""
    lines = shown(pose(parse_scenario(text)))
    assert "  also         When Suth is 1, the chance of left is exactly 1/3 ≈ 0.333333." in lines
    assert any("1/3 left, 2/3 right" in line for line in lines)
    assert "  Suth   1        0        0              0  none" in lines


# --- impossible -------------------------------------------------------------------------------


def test_the_derivation_of_the_lock_sale() -> None:
    lines = shown(pose(scenario("lock-sale")))
    start = lines.index("IMPOSSIBLE, proved.")
    assert lines[start : lines.index("What now")] == [
        "IMPOSSIBLE, proved.",
        "  No table does all that is asked, with any payments whatever.",
        "  Colliding: honesty (2 lines), taking part (2 lines), the pot (1 line).",
        "",
        "Why: multiply each line by the number before it, and add up",
        "  E[P pays | a]  what P pays on average when it reports a",
        "",
        "  1 × Guild, being 60, gains nothing by reporting 20:",
        "        E[Guild pays | 20] - E[Guild pays | 60] ≥ -30",
        "  1 × Mill, being 10, gains nothing by reporting 50:",
        "        -E[Mill pays | 10] + E[Mill pays | 50] ≥ 5",
        "  2 × Guild, being 20, takes part:",
        "        -E[Guild pays | 20] ≥ -10",
        "  2 × Mill, being 50, takes part:",
        "        -E[Mill pays | 50] ≥ 25",
        "  2 × the pot balances in every case (4 rows, each weighed as likely):",
        "        1/2·E[Guild pays | 20] + 1/2·E[Guild pays | 60] + 1/2·E[Mill pays | 10]",
        "        + 1/2·E[Mill pays | 50] ≥ 0",
        "  Sum: on the left everything cancels; on the right -30 + 5 - 2·10 + 2·25 = 5.",
        "  That leaves 0 ≥ 5, which is false.",
        "",
    ]
    assert any("`designer weigh SCENARIO`" in line for line in lines)
    assert "analysis under the stated" not in "\n".join(lines)


def test_a_long_derivation_is_folded() -> None:
    demands = Demands(ic="dominant", ir="ex-post", decision="efficient")
    verdict = pose(scenario("breakwater"), demands)
    derivation = verdict.derivation
    assert derivation is not None
    lines = shown(verdict)
    written = [line for line in lines if " × " in line]
    assert len(written) == min(24, len(derivation.lines))
    if len(derivation.lines) > 24:
        left = len(derivation.lines) - 24
        assert any(line.startswith(f"  … and {left} more: --save DIR") for line in lines)


def test_impossible_without_lines_says_what_was_checked() -> None:
    verdict = pose(scenario("lock-sale"), Demands(goal="floor"))
    bare = replace(verdict, farkas=None, claims=("no table meets the first 3 rows in 4 cases",))
    text = "\n".join(shown(bare))
    assert "Proved in exact arithmetic: no table meets the first 3 rows in 4 cases." in text


# --- unbounded, undecided ---------------------------------------------------------------------


def test_what_grows_for_ever() -> None:
    demands = Demands(ir="none", ic="none", balance="none", goal="revenue")
    verdict = pose(scenario("lock-sale"), demands)
    lines = shown(verdict)
    assert "UNBOUNDED, proved." in lines
    text = " ".join(" ".join(lines).split())
    assert "brings the goal revenue further by 1 (crowns)" in text
    assert "pays" in text[text.index("again and again") :]
    assert "participation (--ir), a balance (--balance)" in text


def test_a_margin_without_lies() -> None:
    setting = parse_scenario(
        """
title = "One kind of each"
decisions.options = ["go"]
party = [{ name = "Ann", types = [1], weights = [1], value = { go = 3 } }]
"""
    )
    text = " ".join(" ".join(shown(pose(setting, Demands(goal="margin")))).split())
    assert "UNBOUNDED, proved." in text
    assert "again and again: tolerated gain 1 less" in text
    assert text.endswith("leave out the goal margin.")


def test_undecided_says_why_and_what_to_try() -> None:
    lines = shown(pose(scenario("breakwater"), time_limit=0))
    assert "UNDECIDED." in lines
    assert any(line.startswith("  Why: the time limit was reached") for line in lines)
    assert "What to try" in lines


# --- demands in words -------------------------------------------------------------------------


def test_every_demand_has_its_sentence() -> None:
    demands = Demands(
        decision="randomized",
        ic="dominant",
        ir="ex-ante",
        balance="ex-ante",
        budget="no-deficit",
        subsidy="1/2",
        slack=2,
        even_handed=True,
        compelled=frozenset({"Mill"}),
        goal="any",
        limits=Limits(Fraction(90), Fraction(-90), only_when_served=True, within_worth=False),
        side=Side(Fraction(-5), Fraction(-100), (Chance(0, 1, 0, at_least=Fraction(1, 4)),)),
    )
    lines = shown(pose(scenario("lock-sale"), demands))
    asked = " ".join(" ".join(between(lines, "Asked", "")).split())
    for sentence in (
        "Free: a decision or a lottery over decisions, case by case.",
        "Whatever the others report, no party gains more than 2 crowns by a lie.",
        "Not yet knowing its type, no party expects to lose by taking part. (Mill is compelled.)",
        "On average the payments come to at least the outlay less 1/2 = 0.5 crowns of outside "
        "money.",
        "No payment is above 90 crowns.",
        "No payment is below -90 crowns.",
        "A party pays only when the decision is worth something to it.",
        "Expected welfare is at least -5 crowns.",
        "The expected pot is at least -100 crowns.",
        "When Guild is 60, the chance of sell is at least 1/4 = 0.25.",
        "Parties with equal data are treated alike.",
        "None: any table that does this will do.",
    ):
        assert sentence in asked


@pytest.mark.parametrize("name", ["breakwater", "dawn-berth", "lock-sale", "reef", "ropewalk"])
@pytest.mark.parametrize("ir", ["none", "interim", "ex-post"])
@pytest.mark.parametrize("goal", ["any", "outside-money", "worst-pot,swing"])
def test_no_screen_is_wider_than_its_terminal(name: str, ir: str, goal: str) -> None:
    verdict = pose(scenario(name), Demands(ir=ir, goal=goal))
    for width in (60, 80, 100):
        shown(verdict, width=width)


# --- wide cases -------------------------------------------------------------------------------


@pytest.mark.parametrize("ir", ["none", "interim", "ex-post"])
def test_twelve_parties_with_long_names_wrap(ir: str) -> None:
    setting = wide()
    verdict = pose(setting, Demands(ir=ir, goal="outside-money"))
    lines = shown(verdict)
    text = "".join(line.strip() for line in lines).replace(" ", "")
    for party in setting.parties:
        assert party.name.replace(" ", "") in text
    shown(replace(verdict, proved=False))


def test_a_wide_derivation_and_audit_wrap() -> None:
    setting = wide(3)
    demands = Demands(ir="ex-post", balance="ex-post", ic="dominant", subsidy=-10_000)
    verdict = pose(setting, demands)
    assert verdict.status == "impossible"
    shown(verdict)
    possible = pose(setting, Demands(ir="none"))
    assert possible.table is not None
    found = audit(setting, possible.table)
    lines = plain(audited(found, ["ir-interim"], judge(found, {"ir": "interim"}))).split("\n")
    assert max(map(cell_len, lines)) <= 80


# --- audits and rechecked proofs --------------------------------------------------------------


def test_an_audit_demand_by_demand() -> None:
    setting = scenario("ropewalk")
    found = audit(setting, FOLDER / "ropewalk-draft.csv")
    asked = {"ic": "bayesian", "ir": "interim", "balance": "ex-post", "budget": "exact"}
    names = ["ic-bayesian", "ir-interim", "balance-ex-post-exact"]
    lines = plain(audited(found, names, judge(found, asked))).split("\n")
    assert max(map(len, lines)) <= 80
    assert "DOES NOT HOLD." in lines
    assert "  Broken: honesty, on average." in lines
    text = " ".join(" ".join(lines).split())
    assert "asked BROKEN honesty, on average: Ines, being 240, saying 120 gains 80/3" in text
    assert "asked kept taking part, type by type: Ines, being 240, gains 0 crowns" in text
    assert "kept pot exact, on average" in text
    assert "  Ines   240      120      120              0  120             -80/3" in lines
    kept = plain(audited(found, names[1:], judge(found, {"ir": "interim"}))).split("\n")
    assert "HOLDS." in kept
    assert "  The table does all that is asked." in kept


def test_an_audit_names_who_is_compelled_and_what_was_tolerated() -> None:
    setting = scenario("breakwater")
    table = pose(setting, Demands(ir="none")).table
    assert table is not None
    found = audit(
        setting,
        table,
        compelled=["Norhaven", "Suth", "Eastmole"],
        tolerance=Fraction(1, 100),
        subsidy=Fraction(1),
        slack=Fraction(2),
    )
    text = " ".join(plain(audited(found, [], [])).split())
    assert "Tolerance: 1/100 = 0.01 thousand crowns. Outside money: 1 thousand crowns." in text
    assert "Tolerated gain from a lie: 2 thousand crowns." in text
    assert "Compelled, so not asked to gain by taking part: Eastmole, Norhaven, Suth." in text
    assert "Norhaven, being 20, loses 95/36" in text
    assert "off by 1 thousand crowns" in text


def test_a_rechecked_proof_and_a_broken_one() -> None:
    document = pose(scenario("lock-sale")).proof
    good = plain(rechecked("A lock", recheck(document), compared=True)).split("\n")
    assert good[0] == "HOLDS."
    assert "  verdict   impossible" in good
    assert any("rebuilt from the scenario and is the same" in line for line in good)
    other = plain(rechecked("A lock", recheck(document), True, ["row 3 differs"])).split("\n")
    assert other[0] == "DOES NOT HOLD."
    assert "  differs   row 3 differs." in other
    bad = plain(rechecked("", recheck({**document, "verdict": "possible"}), False)).split("\n")
    assert bad[0] == "DOES NOT HOLD."
    assert any(line.startswith("  fault") for line in bad)
    assert "  Nothing is proved by this file." in bad


def test_a_hostile_title_cannot_write_to_the_terminal() -> None:
    finding = recheck([])
    text = plain(rechecked("\x1b[2Jgone\x07" + "x" * 5000, finding, compared=False))
    assert "\x1b" not in text
    assert "\x07" not in text
    assert "?[2Jgone?" in text
    assert len(text) < 1500
