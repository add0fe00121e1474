"""The screen, the document, the charts and the files of `weigh`."""

from __future__ import annotations

import csv
import io
import json
from dataclasses import replace
from fractions import Fraction
from pathlib import Path

import pytest
from rich.cells import cell_len

from designer import Demands, Limits, Setting, Side, Tradeoff, read_scenario, weigh
from designer.setting.setting import Chance
from designer.views.chart import Chart, chart
from designer.views.page import plain
from designer.views.weighed import weighed
from designer.views.weighed_files import NAMES, contents, corners_csv, tradeoff_document
from designer.views.weighing_words import CRITERIA, DEMANDS, FORMS, group, groups, way
from designer.weighing.frontier import PAIRS, Frontier
from designer.weighing.ladders import RUNGS
from tests.published.corpus import as_setting, setting_of
from tests.published.families import midpoints, one_item, trade

FOLDER = Path(__file__).parents[2] / "scenarios"
BALANCED = Demands(balance="ex-post")


def scenario(name: str) -> Setting:
    return read_scenario(FOLDER / f"{name}.toml")


def shown(page: Tradeoff, rows: int | None = None, width: int = 80) -> list[str]:
    lines = plain(weighed(page, rows), width).split("\n")
    assert max(map(cell_len, lines)) <= width
    return lines


def after(lines: list[str], heading: str) -> list[str]:
    """The lines below a heading up to the next blank one."""
    start = lines.index(heading) + 1
    return lines[start : lines.index("", start)]


def flowing(lines: list[str]) -> str:
    return " ".join(" ".join(lines).split())


# -- the screen --------------------------------------------------------------------------------


def test_the_two_by_two_trade_on_one_screen() -> None:
    """All numbers of entry B06: 5 missing; 100/3 instead of 35; who gives way and why."""
    lines = shown(weigh(setting_of("B06_base"), BALANCED))
    assert "IMPOSSIBLE, proved." in lines
    ways = flowing(after(lines, "Ways out, each alone, all else kept whole"))
    assert "outside money 5 money units, the same in every case." in ways
    assert "5/2 = 2.5 money units below staying out may be asked of every type" in ways
    assert "Compel Aster or Briar: 1 party at least." in ways
    assert "5 money units gained by the best lie must be tolerated." in ways
    assert "5/3 ≈ 1.66667 money units of expected welfare is given up: 100/3" in ways
    assert "instead of 35." in ways
    assert "Nearby, each unit of it saves 1/2 = 0.5 money units of lowered floor" in ways
    why = after(lines, "Why: the money in expected terms")
    assert any(line.split()[-3:] == ["1/2", "×", "-40"] for line in why)
    assert any(line.split() == ["=", "missing", "5"] for line in why)
    assert "The lines add up to -5 money units" in flowing(why)
    assert "No combination of smaller steps does: one whole step is needed." in flowing(lines)
    assert lines[-4:][0].startswith("This is analysis under the stated priors")


def test_what_collides_in_words() -> None:
    lines = shown(weigh(scenario("breakwater"), only=["collisions"]))
    text = flowing(after(lines, "What collides"))
    assert text.startswith(
        "All of these together: the decision, honesty of Norhaven, honesty of Suth, everyone "
        "taking part and the pot."
    )
    assert "Enough to drop one of:" in text


def test_the_ledger_of_the_breakwater() -> None:
    lines = shown(weigh(scenario("breakwater"), only=["prices", "ledger"]))
    why = flowing(after(lines, "Why: the money in expected terms"))
    assert "the outlay -625/8" in why
    assert "= missing 95/12" in why
    assert "The designer's own worth counts in the decision; it is no money." in why


def test_a_possible_mix_shows_the_room() -> None:
    lines = shown(weigh(scenario("dawn-berth")))
    assert "POSSIBLE, proved." in lines
    room = flowing(after(lines, "Room, in each direction alone"))
    assert "hand back 100 crowns could be taken out of the pot in every case" in room
    assert "100/3 ≈ 33.3333 crowns more than staying out" in room
    assert "Holds as well: the pot comes out exactly." in flowing(lines)
    assert not any("Ways out" in line for line in lines)


def test_what_is_missing_is_said() -> None:
    page = weigh(scenario("breakwater"), only=["prices"])
    page = replace(page, complete=False, reasons={"page": "interrupted", "ladders": "no proof"})
    text = flowing(shown(page))
    assert "INCOMPLETE: it was interrupted; ladders: no proof. What was found so far" in text
    nothing = weigh(scenario("breakwater"), time_limit=0)
    lines = shown(nothing)
    assert "UNDECIDED." in lines
    assert "INCOMPLETE: the time limit was reached" in flowing(lines)


def test_an_incomplete_frontier_is_labelled() -> None:
    page = weigh(as_setting(trade(midpoints(12))), BALANCED, only=["frontiers"])
    one = page.frontiers[1]
    assert len(one.corners) > 2
    half = replace(one, corners=one.corners[:2], complete=False)
    text = flowing(shown(replace(page, frontiers=(half,), corners=None, complete=False)))
    assert "2 corners;" in text
    assert "INCOMPLETE: corners are missing." in text
    assert "exact, complete, proved" not in text
    (document,) = tradeoff_document(replace(page, frontiers=(half,)))["frontiers"]
    assert (document["proved"], document["complete"]) == (False, False)


def test_long_lists_are_cut_and_say_so() -> None:
    page = weigh(as_setting(trade(midpoints(16))), BALANCED, only=["frontiers", "ledger"])
    counts = [len(one.corners) for one in page.frontiers]
    assert max(counts) > 4
    short = flowing(shown(page, rows=2))
    assert f"{max(counts)} corners, {max(counts) - 2} between not shown (--rows, --save)" in short
    none = shown(page, rows=0)
    assert not any(line.startswith("  outside money  ") for line in none)
    # Many types: rents are added up by party.
    assert any("information rent of Aster  " in line for line in shown(page, rows=4))


def test_ways_that_do_not_help_say_so() -> None:
    demands = Demands(decision="efficient", ic="dominant", ir="none", balance="ex-post")
    lines = shown(weigh(setting_of("D01_n2_m2_1_3"), demands))
    ways = flowing(after(lines, "Ways out, each alone, all else kept whole"))
    assert "outside money Does not help alone, however much of it there is." in ways
    assert "A little outside money would take nothing off it." in ways
    why = flowing(after(lines, "Why: the money in expected terms"))
    assert why == ("On average the pot can hold any amount: what is missing is not money.")


def test_limits_and_side_demands_in_words() -> None:
    setting = as_setting(one_item([midpoints(2), midpoints(2)]))
    side = Side(Fraction(9, 10), Fraction(1), (Chance(0, 0, 1, at_least=Fraction(1)),))
    limits = Limits(pays_at_most=Fraction(1, 4), pays_at_least=Fraction(0), within_worth=True)
    page = weigh(
        setting, Demands(decision="randomized", side=side, limits=limits, budget="no-deficit")
    )
    text = flowing(shown(page))
    assert page.status == "impossible"
    for words in (
        "the cap on payments",
        "a higher cap",
        "a lower least payment",
        "a lower welfare floor",
        "a lower pot floor",
    ):
        assert words in text, words


@pytest.mark.parametrize("width", [40, 60, 80, 120])
@pytest.mark.parametrize("name", ["breakwater", "dawn-berth", "lock-sale", "reef", "wreck"])
def test_screens_fit(name: str, width: int) -> None:
    shown(weigh(scenario(name)), width=width)


def test_every_word_has_its_words() -> None:
    assert set(FORMS) == set(RUNGS) == set(DEMANDS)
    for demand, rungs in RUNGS.items():
        assert set(rungs) <= set(FORMS[demand])
    assert {name for pair in PAIRS for name in pair} == set(CRITERIA)
    setting = scenario("breakwater")
    names = ("decision", "ic:Suth", "ir:Suth", "balance", "even-handed", "side:revenue_at_least")
    chance = Side(chances=(Chance(party=1, type=0, option=0, at_least=Fraction(1, 2)),))
    words = [group(name, setting, chance) for name in (*names, "side:chance[0]")]
    assert words == [
        "the decision",
        "honesty of Suth",
        "Suth taking part",
        "the pot",
        "even-handed",
        "the floor under the expected pot",
        "the chance of build for Suth being 20",
    ]
    page = weigh(setting, only=["ledger"])
    everyone = "the decision, everyone's honesty, everyone taking part and the pot"
    assert groups(page.groups, page) == everyone
    assert way("shortfall:Suth") == "a lower floor for Suth"


# -- the chart ---------------------------------------------------------------------------------


def corners(*pairs: tuple[int, int]) -> list[tuple[Fraction, ...]]:
    return [(Fraction(x), Fraction(y)) for x, y in pairs]


def test_a_chart_cell_by_cell() -> None:
    lines = chart(corners((0, 6), (1, 2), (5, 0)), "money", "floor", 21, 7)
    assert lines[0] == "  floor"
    grid = [line[3:].ljust(21) for line in lines[1:8]]
    assert [(r, c) for r, line in enumerate(grid) for c, x in enumerate(line) if x == "o"] == [
        (0, 0),
        (4, 4),
        (6, 20),
    ]
    # Without gaps: every dot has a neighbour in the next column or row.
    marks = {(r, c) for r, line in enumerate(grid) for c, x in enumerate(line) if x in "o."}
    for r, c in marks - {(6, 20)}:
        assert {(r, c + 1), (r + 1, c), (r + 1, c + 1)} & marks
    assert "can be had" in grid[1]
    assert lines[-2].split() == ["0", "5"]
    assert lines[-1].strip() == "money"
    assert all(line.isascii() for line in lines)


def test_nothing_to_draw_draws_nothing() -> None:
    assert chart([], "x", "y") == []
    assert chart(corners((0, 0)), "x", "y") == []
    assert chart(corners((0, 3)), "x", "y") == []
    assert chart(corners((-1, 3), (2, 1)), "x", "y") == []
    assert chart(corners((0, 3), (2, 0)), "x", "y", wide=8) == []
    assert plain([Chart(corners((0, 0)), "x", "y")]).strip() == ""


def test_many_corners_are_drawn_as_a_line() -> None:
    many = [(Fraction(i), Fraction((30 - i) ** 2)) for i in range(31)]
    assert sum(line.count("o") for line in chart(many, "x", "y")) == 2


# -- the document --------------------------------------------------------------------------------


def test_the_document() -> None:
    page = weigh(setting_of("B06_base"), BALANCED)
    found = json.loads(json.dumps(tradeoff_document(page), allow_nan=False))
    assert found["format"] == "designer.tradeoff/1"
    assert {"collisions", "possible_sets", "ladders", "ways_out", "frontiers", "ledger"} <= set(
        found
    )
    names = ["decision", "ic:Aster", "ic:Briar", "ir:Aster", "ir:Briar", "balance"]
    assert found["collisions"] == [{"groups": names, "proved": True}]
    assert len(found["possible_sets"]) == 6
    money = found["ways_out"][0]
    assert {key: money[key] for key in ("relax", "amount", "approx", "unit", "proved")} == {
        "relax": "outside-money",
        "amount": "5",
        "approx": 5.0,
        "unit": "money units",
        "proved": True,
    }
    assert money["buys"] == {"shortfall": "1/2", "lies": "1"}
    compel = [way for way in found["ways_out"] if way["relax"] == "compel"]
    assert [(way["parties"], way["unit"]) for way in compel] == [
        (["Aster"], "parties"),
        (["Briar"], "parties"),
    ]
    assert [(one["x"], one["y"]) for one in found["frontiers"]] == list(PAIRS)
    assert found["frontiers"][0]["corners"] == [["0", "5/2"], ["5", "0"]]
    assert found["frontiers"][0]["proved"] is True
    assert found["corners"]["corners"] == [["0", "0", "5/3"], ["0", "5/2", "0"], ["5", "0", "0"]]
    ledger = found["ledger"]
    total = sum(Fraction(line["amount"]) for line in ledger["entries"])
    assert total + Fraction(ledger["allowed"]) == -Fraction(ledger["gap"]) == -5
    assert found["complete"] is True
    assert "not legal or financial" in found["caution"]


def test_the_document_of_a_possible_mix_has_the_same_keys() -> None:
    one = tradeoff_document(weigh(setting_of("B06_base"), BALANCED))
    two = tradeoff_document(weigh(scenario("dawn-berth")))
    assert list(one) == list(two)
    assert two["collisions"] == two["ways_out"] == two["frontiers"] == []
    assert two["ledger"] is None
    assert [one["kind"] for one in two["room"]] == ["money", "shortfall", "lies"]
    assert two["room"][0]["amount"] == "100"


# -- files -------------------------------------------------------------------------------------


def test_files_are_exact_and_described() -> None:
    page = weigh(as_setting(trade(midpoints(12))), BALANCED)
    written, files = contents(page, "out", plots=False)
    assert set(written) <= set(NAMES)
    assert set(files) == set(written)
    for one in page.frontiers:
        text = written[f"frontier-{one.x}-{one.y}.csv"]
        assert isinstance(text, str)
        rows = list(csv.DictReader(io.StringIO(text)))
        assert [(Fraction(r[one.x]), Fraction(r[one.y])) for r in rows] == list(one.corners)
        for row in rows:
            assert float(row[f"{one.x}_decimal"]) == pytest.approx(float(Fraction(row[one.x])))
    triples = written["corners-money-shortfall-welfare.csv"]
    assert isinstance(triples, str)
    assert page.corners is not None
    assert triples == corners_csv(page.corners.criteria, page.corners.corners)
    package = json.loads(written["datapackage.json"])
    tables = {name for name in written if name.endswith(".csv")}
    assert {resource["path"] for resource in package["resources"]} == tables
    for resource in package["resources"]:
        table = written[resource["path"]]
        assert isinstance(table, str)
        header = next(csv.reader(io.StringIO(table)))
        assert [field["name"] for field in resource["schema"]["fields"]] == header
    document = json.loads(written["tradeoff.json"])
    assert document["files"] == files


def test_figures_are_pictures_that_repeat_themselves() -> None:
    pytest.importorskip("matplotlib")
    page = weigh(scenario("lock-sale"), only=["frontiers"])
    written, _ = contents(page, "out")
    again, _ = contents(page, "out")
    for one in page.frontiers:
        png, svg = (written[f"frontier-{one.x}-{one.y}.{kind}"] for kind in ("png", "svg"))
        assert isinstance(png, bytes)
        assert png.startswith(b"\x89PNG\r\n")
        assert isinstance(svg, bytes)
        text = svg.decode()
        assert f"{CRITERIA[one.x]} (crowns)" in text
        assert f"{CRITERIA[one.y]} (crowns)" in text
        assert "proved" in text
        assert again[f"frontier-{one.x}-{one.y}.svg"] == svg


def test_one_corner_and_no_corner_are_no_trouble() -> None:
    page = weigh(setting_of("B06_base"), BALANCED, only=["frontiers"])
    single = Frontier("money", "welfare", ((Fraction(0), Fraction(2)),), True)
    none = Frontier("lies", "money", (), True, reason="the two together do not help")
    page = replace(page, frontiers=(single, none), corners=None)
    text = flowing(shown(page))
    assert "One point is best in both: 0 of outside money and 2 of welfare given up." in text
    assert "The two together do not help." in text
    written, _ = contents(page, "out", plots=False)
    assert "frontier-money-welfare.csv" in written
    assert "frontier-lies-money.csv" not in written
    pytest.importorskip("matplotlib")
    assert "frontier-money-welfare.png" in contents(page, "out")[0]
