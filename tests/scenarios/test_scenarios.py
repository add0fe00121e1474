"""Every scenario that ships, posed: verdict and value exactly, and why that is the value."""

from __future__ import annotations

import itertools
import tomllib
from collections.abc import Sequence
from fractions import Fraction
from pathlib import Path

import pytest

from designer import Demands, Verdict, audit, pose, read_scenario
from designer.setting.setting import Setting
from tests.oracles.textbook import build_and_solve

FOLDER = Path(__file__).parents[2] / "scenarios"
NAMES = ("breakwater", "cooling-place", "dawn-berth", "lock-sale", "reef", "ropewalk", "wreck")

ANSWERS: tuple[tuple[str, Demands, str, dict[str, str | None]], ...] = (
    ("breakwater", Demands(), "impossible", {"floor": None}),
    ("breakwater", Demands(goal="outside-money"), "possible", {"outside-money": "95/12"}),
    ("breakwater", Demands(ir="none"), "possible", {"floor": "-95/36"}),
    ("lock-sale", Demands(), "impossible", {"any": None}),
    ("lock-sale", Demands(ir="none"), "possible", {"any": "0"}),
    ("lock-sale", Demands(goal="outside-money"), "possible", {"outside-money": "5/2"}),
    ("dawn-berth", Demands(), "possible", {"revenue": "455/2", "welfare": "265"}),
    ("dawn-berth", Demands(ir="none"), "unbounded", {"revenue": None}),
    ("cooling-place", Demands(), "possible", {"revenue": "167895/2048"}),
    ("ropewalk", Demands(), "possible", {"floor": "640/27"}),
    ("wreck", Demands(), "possible", {"revenue": "145/2"}),
    ("reef", Demands(), "possible", {"revenue": "165/4", "worst-pot": "25"}),
)


def scenario(name: str) -> Setting:
    return read_scenario(FOLDER / f"{name}.toml")


def posed(name: str, **words: str) -> Verdict:
    return pose(scenario(name), Demands(**words))  # type: ignore[arg-type]


def test_the_list_above_is_all_there_is() -> None:
    assert tuple(sorted(path.stem for path in FOLDER.glob("*.toml"))) == NAMES


@pytest.mark.parametrize("name", NAMES)
def test_scenarios_tell_a_story_and_state_their_demands(name: str) -> None:
    text = (FOLDER / f"{name}.toml").read_text(encoding="utf-8")
    story = list(itertools.takewhile(lambda line: line.startswith("#"), text.splitlines()))
    assert len(story) >= 5
    stated = tomllib.loads(text)
    assert "nvented" in stated["note"]
    assert set(stated["demands"]) >= {"decision", "ic", "ir", "balance", "budget", "goal"}
    assert all(party.size <= 4 for party in scenario(name).parties)


@pytest.mark.parametrize(("name", "demands", "status", "values"), ANSWERS)
def test_verdicts_and_values(
    name: str, demands: Demands, status: str, values: dict[str, str | None]
) -> None:
    verdict = pose(scenario(name), demands)
    assert (verdict.status, verdict.proved) == (status, True)
    found = {goal: None if v is None else str(v) for goal, v in verdict.goal_values.items()}
    assert {goal: found[goal] for goal in values} == values


@pytest.mark.parametrize(("name", "demands", "status", "values"), ANSWERS)
def test_the_textbook_program_agrees(
    name: str, demands: Demands, status: str, values: dict[str, str | None]
) -> None:
    """The independent formulation of tests/oracles, in floats by PuLP and HiGHS."""
    said, value, _ = build_and_solve(scenario(name), demands)
    assert said == status
    last = list(values.values())[-1]
    if status == "possible" and list(values) != ["any"] and last is not None:
        assert value == pytest.approx(float(Fraction(last)), abs=1e-6)


def test_breakwater_shares_the_missing_money_among_three() -> None:
    """Lowering every party's floor by z saves 3 z on average, so z = (95/12) / 3."""
    money = posed("breakwater", goal="outside-money").goal_value
    floor = posed("breakwater", ir="none").goal_value
    assert money is not None
    assert floor == -money / 3


def test_lock_sale_by_hand() -> None:
    """Why 5/2: what the Guild can be charged at most, less what the Mill must get at least.

    The Guild at 20 gets the lock from the Mill at 10 only, half the time: it pays at most 10.
    At 60 it always gets it, which is worth 30 more to it: it pays at most 30 more, 40.
    The Mill at 50 gives the lock up half the time and must get 25 for it. At 10, saying 50
    would bring it that 25 and half of its own worth, 5: it must get 30.
    """
    comes_in = Fraction(10 + 40, 2)
    goes_out = Fraction(25 + 30, 2)
    assert posed("lock-sale", goal="outside-money").goal_value == goes_out - comes_in
    derivation = posed("lock-sale").derivation
    assert derivation is not None
    assert derivation.total == 5
    assert [line.multiplier for line in derivation.lines] == [1, 1, 2, 2, 2]


def test_cooling_place_is_the_optimal_auction_among_alike() -> None:
    """E[max(0, virtual worths)] by the largest of six; Myerson (1981), as below.

    20 counts 20 - (60 - 20) 3 = -100, 60 counts 60 - (90 - 60) / 2 = 45, and 90 itself.
    """
    below_90, below_60 = Fraction(3, 4) ** 6, Fraction(1, 4) ** 6
    expected = 90 * (1 - below_90) + 45 * (below_90 - below_60)
    assert posed("cooling-place").goal_value == expected


def test_dawn_berth_is_the_optimal_auction() -> None:
    """E[max(0, virtual worths)]; Myerson, Mathematics of Operations Research 6 (1981).

    Discrete form, from memory: phi(v_k) = v_k - (v_{k+1} - v_k) P(v > v_k) / P(v = v_k); all
    three are increasing here, so nothing needs ironing.
    """
    setting = scenario("dawn-berth")
    expected = Fraction(0)
    virtual = [
        _virtual_worths([t.number or Fraction(0) for t in p.types], p.marginal)
        for p in setting.parties
    ]
    assert all(sorted(row) == row for row in virtual)
    for positions in itertools.product(*(range(size) for size in setting.shape)):
        chance = setting.probability(setting.profile_of(positions))
        best = max(row[a] for row, a in zip(virtual, positions, strict=True))
        expected += chance * max(Fraction(0), best)
    assert expected == Fraction(455, 2)
    assert posed("dawn-berth").goal_value == expected


def _virtual_worths(worths: Sequence[Fraction], chances: Sequence[Fraction]) -> list[Fraction]:
    found = []
    for k, worth in enumerate(worths):
        above = sum(chances[k + 1 :], Fraction(0))
        step = worths[k + 1] - worth if k + 1 < len(worths) else Fraction(0)
        found.append(worth - step * above / chances[k])
    return found


def test_wreck_is_sold_for_all_it_is_worth() -> None:
    """Correlated estimates can be charged for in full; Cremer and McLean, Econometrica 56 (1988).

    The rows of beliefs of Petrel (given its type) are independent, and each row of Gannet is
    outside the convex hull of the others: (3/4, 1/4), (1/3, 2/3), (1/5, 4/5) lie on a line, the
    middle one between, so for Gannet the theorem's condition fails; the optimum is full all
    the same: E[max(worth of Gannet, worth of Petrel)].
    """
    setting = scenario("wreck")
    one, two = setting.parties
    full = Fraction(0)
    for a, b in itertools.product(range(one.size), range(two.size)):
        best = max(int(one.value[a, 0]), int(two.value[b, 1]))
        full += setting.probability(setting.profile_of((a, b))) * Fraction(best, setting.grain)
    assert posed("wreck").goal_value == full == Fraction(145, 2)


def test_reef_by_hand() -> None:
    """Each winner pays what the channel is worth at the lowest own soundings that still win.

    Heron shoal: Teal wins whatever it sounds, so it pays 20 + 10/2 = 25. Heron clear: Heron
    wins against shoal and mixed with its highest soundings only, and pays all it is worth, 50
    and 55; Teal clear wins with its highest only and pays 50 + 40/2 = 70.
    """
    half, quarter = Fraction(1, 2), Fraction(1, 4)
    expected = half * 25 + half * (quarter * 50 + half * 55 + quarter * 70)
    assert posed("reef").goal_value == expected


def test_ropewalk_takes_part_by_itself() -> None:
    """The worst gain is positive, so asking for participation changes nothing."""
    assert posed("ropewalk", ir="none").goal_value == posed("ropewalk").goal_value


def test_the_drafted_ropewalk_rule_is_fair_and_not_honest() -> None:
    """By hand: Ines at 240 pays out 120 whoever else is there, and keeps 120 of worth.

    Saying 120 she still wins unless Jory or Kest is at 240 (4 of 9 cases): then pays 60 and
    keeps 180; in the other 5 of 9 she is paid 120. So 4/9 * 180 + 5/9 * 120 = 440/3, a gain
    of 80/3 over 120.
    """
    draft = audit(scenario("ropewalk"), FOLDER / "ropewalk-draft.csv")
    assert draft.worst["balance-ex-post-exact"].holds
    assert draft.worst["ir-ex-post"].holds
    worst = draft.worst["ic-bayesian"]
    assert (worst.party, worst.type, worst.lie, worst.margin) == (
        "Ines",
        "240",
        "120",
        Fraction(120) - (Fraction(4, 9) * 180 + Fraction(5, 9) * 120),
    )


def test_breakwater_commands_of_the_readme() -> None:
    verdict = posed(
        "breakwater",
        ic="dominant",
        ir="ex-post",
        budget="no-deficit",
        goal="welfare",
        decision="randomized",
    )
    assert (verdict.status, verdict.proved) == ("possible", True)
    said, value, _ = build_and_solve(verdict.setting, _demands_of(verdict))
    assert said == "possible"
    assert value is not None
    assert verdict.goal_value is not None
    assert float(verdict.goal_value) == pytest.approx(value, abs=1e-6)


def _demands_of(verdict: Verdict) -> Demands:
    terms = verdict.terms
    return Demands(
        decision=terms.decision,
        ic=terms.ic,
        ir=terms.ir,
        balance=terms.balance,
        budget=terms.budget,
        goal=terms.goals,
    )
