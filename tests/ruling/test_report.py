"""The comparison as a library, on the screen, as JSON and as files."""

from __future__ import annotations

import json
from fractions import Fraction
from pathlib import Path
from typing import Any

import pytest

from designer import Demands, audit, read_scenario
from designer.cli import main
from designer.errors import TableError, UsageError
from designer.ruling import RULES, compare, rules
from designer.views.compared import compared
from designer.views.page import plain
from designer.views.ruled import ruled

SCENARIOS = Path(__file__).parents[2] / "scenarios"
BREAKWATER = str(SCENARIOS / "breakwater.toml")
LOCK = str(SCENARIOS / "lock-sale.toml")
BERTH = str(SCENARIOS / "dawn-berth.toml")
REEF = str(SCENARIOS / "reef.toml")
KEYS = [
    "name",
    "applies",
    "why_not",
    "expected_pot",
    "worst_pot",
    "lie_gain_bayesian",
    "lie_gain_dominant",
    "interim_shortfall",
    "expost_shortfall",
    "largest_payment",
]


def run(capsys: pytest.CaptureFixture[str], *words: str) -> tuple[int, str, str]:
    """The exit code, stdout and stderr of a command."""
    with pytest.raises(SystemExit) as left:
        main(words)
    out, err = capsys.readouterr()
    code = left.value.code
    assert isinstance(code, int)
    return code, out, err


def document(capsys: pytest.CaptureFixture[str], *words: str) -> dict[str, Any]:
    code, out, err = run(capsys, *words, "--json")
    assert (code, err) == (0, "")
    found: dict[str, Any] = json.loads(out)
    return found


# -- the library


def test_the_report_of_the_lock_is_what_a_pencil_gives() -> None:
    """Guild 20 or 60, Mill 10 or 50, even odds; sold unless 20 meets 50: gains 10, 50, 10, 0."""
    report = rules(LOCK)
    assert report.optimum is not None
    assert report.optimum.status == "impossible"
    assert report.beside is None
    marginal = report["marginal-product"].judged
    assert marginal is not None
    assert marginal.expected_pot == -Fraction(10 + 50 + 10, 4)
    assert marginal.worst_pot == -50  # 60 meets 10: the Guild pays 10, the Mill receives 60
    assert marginal.lie_gain_dominant == marginal.expost_shortfall == 0
    assert marginal.keeps == {"ic": "dominant", "ir": "ex-post", "balance": "none"}
    assert marginal.failing == ("balance-ex-post-exact",)
    face_value = report["k-double-auction"].judged
    assert face_value is not None
    # The Guild at 60 pays 35 or 55; saying 20 it pays 15 when the Mill says 10: 45/2 to 15.
    assert face_value.lie_gain_bayesian == Fraction(45, 2) - Fraction(60 - 35 + 60 - 55, 2)
    assert face_value.lie("bayesian").party in ("Guild", "Mill")
    with pytest.raises(KeyError):
        report["worst"]


def test_a_possible_mix_shows_the_optimum_in_the_same_columns() -> None:
    report = rules(BERTH, ["optimal-auction", "pivotal"])
    assert [result.name for result in report.results] == ["pivotal", "optimal-auction"]
    auction = report["optimal-auction"].judged
    assert report.beside is not None
    assert auction is not None
    assert report.beside.expected_pot == auction.expected_pot == Fraction(455, 2)
    assert report.beside.failing == auction.failing == ()


def test_demands_decide_what_is_broken() -> None:
    strict = rules(BREAKWATER, ["expected-externality"], optimum=False)
    loose = rules(BREAKWATER, ["expected-externality"], Demands(ir="none"), optimum=False)
    assert strict.results[0].judged is not None
    assert strict.results[0].judged.failing == ("ir-interim",)
    assert loose.results[0].judged is not None
    assert loose.results[0].judged.failing == ()
    assert loose.optimum is None


def test_outside_money_may_be_what_a_rule_needs() -> None:
    """With that goal the subsidy is open: a table is held against what it takes itself."""
    demands = Demands(goal="outside-money")
    found = rules(BREAKWATER, ["revenue-greatest-efficient", "pivotal"], demands)
    greatest, pivotal = (found[name].judged for name in ("revenue-greatest-efficient", "pivotal"))
    assert greatest is not None
    assert pivotal is not None
    assert greatest.failing == ()
    assert found.optimum is not None
    assert found.optimum.goal_value == -greatest.expected_pot == Fraction(95, 12)
    assert pivotal.failing == ("balance-ex-post-exact",)  # its pot differs from case to case


def test_gains_and_losses_add_up() -> None:
    setting = read_scenario(BREAKWATER)
    report = rules(setting, ["second-best", "posted-price"], optimum=False)
    tables = [(result.name, result.table) for result in report.results]
    found = compare(setting, [(name, table) for name, table in tables if table is not None])
    assert found.names == ("second-best", "posted-price")
    for change in found.changes:
        assert change.against_first[0] == 0
        assert change.utility[1] == change.utility[0] + change.against_first[1]
        assert change.utility[change.best[0]] == max(change.utility)
    # What the parties gain in all, weighted, is the worth that the decision adds (pots are 0).
    lost = sum(c.probability * c.against_first[1] for c in found.changes)
    worths = []
    for (_, table), judged in zip(tables, found.tables, strict=True):
        assert table is not None
        builds = sum(setting.probability(p) * table.chance(p, 0) for p in range(setting.profiles))
        worths.append(judged.audit.decisions.welfare - (1 - builds) * 5)  # less the marsh
    assert lost == worths[1] - worths[0]


def test_comparing_takes_two(tmp_path: Path) -> None:
    with pytest.raises(UsageError, match="two or more"):
        compare(LOCK, [])
    broken = tmp_path / "broken.csv"
    broken.write_text("type:Guild\n20\n")
    with pytest.raises(TableError):
        compare(LOCK, [broken, broken])


# -- the command line


def test_the_json_document(capsys: pytest.CaptureFixture[str]) -> None:
    found = document(capsys, "rules", LOCK)
    assert found["format"] == "designer.rules/1"
    assert [entry["name"] for entry in found["rules"]] == list(RULES)
    for entry in found["rules"]:
        assert list(entry) == KEYS
        amounts = [entry[key] for key in KEYS[3:]]
        if entry["applies"]:
            assert entry["why_not"] is None
            assert all(str(Fraction(amount)) == amount for amount in amounts)
        else:
            assert entry["why_not"]
            assert amounts == [None] * 7
    assert found["optimum"]["verdict"] == "impossible"
    assert found["optimum"]["proved"] is True
    named = {entry["name"]: entry for entry in found["rules"]}
    assert named["revenue-greatest-efficient"]["expected_pot"] == "-5/2"
    assert "advice" in found["caution"]


def test_a_rule_asked_for_by_name_must_apply(capsys: pytest.CaptureFixture[str]) -> None:
    code, out, err = run(capsys, "rules", BREAKWATER, "--only", "full-extraction")
    assert (code, out) == (2, "")
    assert "rule full-extraction: found Norhaven's, of rank 1 for 3 types" in err
    assert "optimal-auction" in err
    code, out, err = run(capsys, "rules", BREAKWATER, "--only", "pivotl,full-extraction,pivotal")
    assert (code, out) == (2, "")
    assert "rules: found 'pivotl'" in err
    assert "Did you mean 'pivotal'?" in err
    assert "rule full-extraction: found" in err
    code, out, err = run(capsys, "rules", LOCK, "--only", "guesswork", "--json")
    assert code == 2
    assert json.loads(out)["mistakes"][0]["found"] == "'guesswork'"


def test_several_names_in_one_option(capsys: pytest.CaptureFixture[str]) -> None:
    found = document(capsys, "rules", LOCK, "--only", "posted-price, pivotal", "--only", "groves")
    assert [entry["name"] for entry in found["rules"]] == ["pivotal", "groves", "posted-price"]


def test_rules_that_fail_alike_are_told_why_once(capsys: pytest.CaptureFixture[str]) -> None:
    """Interdependent worths stop every rule, for one reason."""
    code, out, _ = run(capsys, "rules", REEF)
    assert code == 0
    assert "full-extraction (Cremer and McLean 1988)" in " ".join(out.split())
    assert out.count("It needs private worths") == 1


def test_saved_tables_audit_and_compare(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    folder = tmp_path / "out"
    code, _, err = run(capsys, "rules", BERTH, "--save", str(folder))
    assert code == 0
    assert "optimum.csv" in err
    report = rules(BERTH, optimum=False)
    applied = [result for result in report.results if result.applies]
    saved = {path.name for path in folder.iterdir()}
    assert saved == {*(f"{r.name}.csv" for r in applied), "optimum.csv", "rules.json"}
    for result in applied:
        assert result.judged is not None
        again = audit(report.setting, folder / f"{result.name}.csv")
        assert again.pot.expected == result.judged.expected_pot
        assert again.holds == result.judged.audit.holds
    inside = json.loads((folder / "rules.json").read_text(encoding="utf-8"))
    assert inside["format"] == "designer.rules/1"

    tables = [str(folder / f"{name}.csv") for name in ("pivotal", "optimal-auction", "optimum")]
    found = document(capsys, "compare", BERTH, *tables)
    assert found["format"] == "designer.compare/1"
    assert [entry["name"] for entry in found["tables"]] == ["pivotal", "optimal-auction", "optimum"]
    assert found["tables"][1]["expected_pot"] == "455/2"
    for entry in found["types"]:
        assert entry["against_first"][0] == "0"
    # A second run with fewer rules takes the others' files away.
    code, _, _ = run(
        capsys, "rules", BERTH, "--only", "pivotal", "--no-optimum", "--save", str(folder)
    )
    assert code == 0
    assert {path.name for path in folder.iterdir()} == {"pivotal.csv", "rules.json"}


def test_compare_needs_two_tables(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    code, out, err = run(capsys, "compare", LOCK, str(tmp_path / "one.csv"))
    assert (code, out) == (2, "")
    assert "two or more" in err


# -- the screen


@pytest.mark.parametrize("path", sorted(SCENARIOS.glob("*.toml")), ids=lambda path: path.stem)
def test_the_screen_fits_eighty_columns(path: Path) -> None:
    report = rules(path)
    lines = plain(ruled(report), 80).split("\n")
    assert max(len(line) for line in lines) <= 80
    text = "\n".join(lines)
    for result in report.results:
        assert result.name in text
    assert "not legal or financial" in text


def test_the_screen_tells_whose_and_why() -> None:
    report = rules(BREAKWATER, ["proportional-to-report", "pivotal-equal-shares"])
    text = " ".join(plain(ruled(report), 80).split())
    assert "Norhaven, being 80, gains 11081/1824 ≈ 6.07511 thousand crowns on average" in text
    assert "can expect to lose 35/4 = 8.75 thousand crowns against staying out" in text
    assert "IMPOSSIBLE, proved" in text
    assert "Asked and broken: taking part, type by type; pot exact, in every case" in text


def test_the_screen_of_a_comparison() -> None:
    setting = read_scenario(LOCK)
    report = rules(setting, ["second-best", "posted-price", "marginal-product"], optimum=False)
    tables = [(r.name, r.table) for r in report.results if r.table is not None]
    page = compared(compare(setting, tables))
    lines = plain(page, 80).split("\n")
    assert max(len(line) for line in lines) <= 80
    text = " ".join(" ".join(lines).split())
    assert (
        "second-best, against marginal-product Worse off: Guild 20, Guild 60, Mill 10, Mill 50."
        in text
    )
    assert "the pot -35/2 +35/2 +35/2" in text  # whose money it was
    narrow = plain(page, 50).split("\n")
    assert max(len(line) for line in narrow) <= 50
