"""Tables out to CSV and back in: nothing changes, and nothing bad gets through."""

from __future__ import annotations

import csv
import io
import json
import random
from collections.abc import Callable
from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from designer.auditing import audit
from designer.errors import TableError
from designer.files import Content, write_all, write_atomic
from designer.setting.exact import number
from designer.setting.scenario import parse_scenario
from designer.setting.setting import Setting
from designer.table import Table, frame
from designer.tablefile import datapackage, read_table, transfers_csv
from designer.tablefile.package import EXACT
from tests.audit.test_naive import cases

SCENARIO = """
title = "A weir for two"
money = "crowns"
[decisions]
options = ["build", "leave"]
[designer]
outlay = { build = 5 }
[[party]]
name = "Norhaven"
types = [2, 0.5]
weights = [1, 2]
value = { build = "type", leave = 0 }
[[party]]
name = "Suth"
types = ["low", "high"]
weights = [1, 1]
value = { build = [1, 7], leave = 0 }
"""
GOOD = """\
type:Norhaven,type:Suth,probability,decides:build,decides:leave,pays:Norhaven,pays:Suth,pot
2,low,1/6,0,1,0,0,0
2,high,1/6,1,0,1/3,14/3,0
1/2,low,1/3,0,1,0,0,0
1/2,high,1/3,1,0,0,4,-1
"""


@pytest.fixture
def setting() -> Setting:
    return parse_scenario(SCENARIO)


@pytest.fixture
def put(tmp_path: Path) -> Callable[[str | bytes], Path]:
    def write(content: str | bytes) -> Path:
        path = tmp_path / "table.csv"
        path.write_bytes(content.encode() if isinstance(content, str) else content)
        return path

    return write


Put = Callable[[str | bytes], Path]


def same(one: Table, other: Table) -> bool:
    return bool(
        np.array_equal(one.pays * other.pays_den, other.pays * one.pays_den)
        and np.array_equal(one.decides * other.decides_den, other.decides * one.decides_den)
    )


def written(table: Table, setting: Setting) -> str:
    file = io.BytesIO()
    transfers_csv(table, setting)(file)
    return file.getvalue().decode()


def test_a_table_is_written_as_laid_down(setting: Setting, put: Put) -> None:
    third = Fraction(1, 3)
    table = Table.of([[0, 1], [1, 0], [0, 1], [1, 0]], [[0, third, 0, 0], [0, 14 * third, 0, 4]])
    assert written(table, setting) == GOOD
    read = read_table(put(GOOD), setting)
    assert same(read.table, table)
    assert read.exact
    assert read.tolerance == 0
    assert read.decisions == "file"


@given(cases())
@settings(
    max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture]
)
def test_what_is_written_reads_back_the_same(tmp_path: Path, case: tuple[Setting, Table]) -> None:
    setting, table = case
    write_atomic(tmp_path / "t.csv", transfers_csv(table, setting))
    read = read_table(tmp_path / "t.csv", setting)
    assert read.exact
    assert same(read.table, table)
    by_path = audit(setting, tmp_path / "t.csv")
    assert dict(by_path.worst) == dict(audit(setting, table).worst)


@given(cases(), st.randoms(use_true_random=False))
@settings(
    max_examples=40, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture]
)
def test_rows_and_columns_come_in_any_order(
    tmp_path: Path, case: tuple[Setting, Table], dice: random.Random
) -> None:
    setting, table = case
    rows = list(csv.reader(io.StringIO(written(table, setting))))
    columns = list(range(len(rows[0])))
    dice.shuffle(columns)
    body = rows[1:]
    dice.shuffle(body)
    shuffled = [[row[c] for c in columns] for row in [rows[0], *body]]
    out = io.StringIO()
    csv.writer(out, lineterminator="\r\n").writerows(shuffled)
    (tmp_path / "t.csv").write_bytes(b"\xef\xbb\xbf" + out.getvalue().encode() + b"\r\n")
    assert same(read_table(tmp_path / "t.csv", setting).table, table)


def test_enormous_numbers_survive(setting: Setting, put: Put) -> None:
    huge = Fraction(3**20_000, 2**9_000 + 1)
    table = Table.of([[1, 0]] * 4, [[huge, -huge, 0, 1], [0, 0, 0, 0]])
    assert same(read_table(put(written(table, setting)), setting).table, table)


def test_numeric_types_are_matched_by_value(setting: Setting, put: Put) -> None:
    text = GOOD.replace("1/2,low", "0.50,low").replace("2,high,1/6", " 4/2 , high ,1/6")
    assert same(read_table(put(text), setting).table, read_table(put(GOOD), setting).table)


def test_odds_and_pot_may_be_left_out(setting: Setting, put: Put) -> None:
    rows = list(csv.reader(io.StringIO(GOOD)))
    text = "\n".join(",".join(row[:2] + row[3:-1]) for row in rows)
    assert same(read_table(put(text), setting).table, read_table(put(GOOD), setting).table)


def test_decisions_may_be_left_out_where_the_scenario_settles_them(
    setting: Setting, put: Put
) -> None:
    rows = list(csv.reader(io.StringIO(GOOD)))
    bare = "\n".join(",".join(row[:2] + row[5:]) for row in rows)
    read = read_table(put(bare), setting)
    assert read.decisions == "efficient"
    assert same(read.table, read_table(put(GOOD), setting).table)
    ruled = parse_scenario(
        SCENARIO + '[[rule]]\nat = { Norhaven = 2, Suth = "low" }\ntake = "build"\n'
        '[[rule]]\ntake = "leave"\n[demands]\ndecision = "table"\n'
    )
    nopot = "\n".join(",".join(row[:2] + row[5:-1]) for row in rows)
    read = read_table(put(nopot), ruled)
    assert read.decisions == "rule"
    assert [read.table.chance(n, 0) for n in range(4)] == [1, 0, 0, 0]


def test_decisions_may_not_be_left_out_where_it_does_not(put: Put) -> None:
    rows = list(csv.reader(io.StringIO(GOOD)))
    bare = put("\n".join(",".join(row[:2] + row[5:7]) for row in rows))
    with pytest.raises(TableError, match="and decision 'randomized'"):
        read_table(bare, parse_scenario(SCENARIO + '[demands]\ndecision = "randomized"\n'))
    tied = parse_scenario(SCENARIO.replace("build = 5", "build = 3"))
    with pytest.raises(TableError) as caught:
        read_table(bare, tied)
    assert str(caught.value) == (
        f"{bare}: 1 mistake\n"
        "the first row: found no 'decides:' columns, and two best options where Norhaven 2, "
        "Suth low; expected columns 'decides:build', 'decides:leave'.\n"
        "    Add a column per option with its probability at every profile."
    )


def test_every_mistake_is_named_at_once(setting: Setting, put: Put) -> None:
    path = put(
        GOOD.replace("2,low,1/6", "3,low,1/6")
        .replace("14/3", "nan")
        .replace("1/2,low,1/3,0,1,0,0,0", "1/2,low,1/3,0,1,0,0")
        .replace("0,4,-1", "one,1/0,-1")
    )
    with pytest.raises(TableError) as caught:
        read_table(path, setting)
    assert caught.value.exit_code == 2
    assert str(caught.value) == (
        f"{path}: 5 mistakes\n"
        "row 4: found 7 cells; expected 8, as in the first row.\n"
        "    Check the commas and quotation marks of the row.\n"
        "row 2, column 'type:Norhaven': found '3'; expected one of its types 2, 1/2.\n"
        "    Write the type as the scenario does.\n"
        "row 5, column 'pays:Norhaven': found 'one'; expected an exact number.\n"
        "    Write an integer, a decimal with a point, or a fraction such as 1/3.\n"
        "row 3, column 'pays:Suth': found 'nan'; expected an exact number.\n"
        "    Write an integer, a decimal with a point, or a fraction such as 1/3.\n"
        "row 5, column 'pays:Suth': found '1/0'; expected an exact number.\n"
        "    Write an integer, a decimal with a point, or a fraction such as 1/3."
    )


def test_profiles_missing_and_repeated(setting: Setting, put: Put) -> None:
    lines = GOOD.splitlines()
    path = put("\n".join([lines[0], lines[1], lines[4], lines[1]]))
    with pytest.raises(TableError) as caught:
        read_table(path, setting)
    assert str(caught.value) == (
        f"{path}: 2 mistakes\n"
        "row 4: found the profile of row 2 again (Norhaven 2, Suth low); expected each profile "
        "once.\n    Take out one of the two rows.\n"
        "the rows: found 2 of 4 profiles missing, the first Norhaven 2, Suth high; expected a "
        "row for every profile, for a lie can lead to any.\n    Add the rows."
    )


def test_columns_that_follow_from_the_others_must_agree(setting: Setting, put: Put) -> None:
    path = put(GOOD.replace("2,high,1/6", "2,high,1/5").replace("4,-1", "4,0"))
    with pytest.raises(TableError) as caught:
        read_table(path, setting)
    assert str(caught.value) == (
        f"{path}: 2 mistakes\n"
        "row 3, column 'probability': found 1/5; expected 1/6.\n"
        "    Correct the number, or leave the column out: it follows from the others.\n"
        "row 5, column 'pot': found 0; expected -1.\n"
        "    Correct the number, or leave the column out: it follows from the others."
    )


def test_columns_missing_repeated_and_unknown(setting: Setting, put: Put) -> None:
    header, rest = GOOD.split("\n", 1)
    header = header.replace("pays:Norhaven", "pays:Norhavn").replace("decides:leave", "pot")
    with pytest.raises(TableError) as caught:
        read_table(put(f"{header}\n{rest}"), setting)
    places = [mistake.found for mistake in caught.value.mistakes]
    assert places == [
        "the column 'pot' 2 times",
        "a column 'pays:Norhavn'",
        "no column 'pays:Norhaven'",
        "no column 'decides:leave'",
    ]


def test_twenty_mistakes_are_enough(setting: Setting, put: Put) -> None:
    with pytest.raises(TableError) as caught:
        read_table(put(GOOD + "x,y,1,1,1,1,1,1\n" * 50), setting)
    assert len(caught.value.mistakes) == 21
    assert caught.value.mistakes[-1].found == "80 more such mistakes"


def test_rounded_tables_are_recognised_and_bounded(setting: Setting, put: Put) -> None:
    """Thirds to seven places: half a unit each, so 10**-7 on a gain; the pot is held to it."""
    exact = read_table(
        put(GOOD.replace("14/3", "4.66667").replace("1/3,4.6", "0.33333,4.6")), setting
    )
    assert exact.exact  # five places are an amount one can pay
    path = put(GOOD.replace("14/3", "4.6666667").replace("1/3,4.6", "0.3333333,4.6"))
    read = read_table(path, setting)
    assert not read.exact
    assert read.tolerance == Fraction(1, 10**7)
    assert read.chance_tolerance == 0
    checked = audit(setting, path)
    assert checked.tolerance == read.tolerance
    assert not checked.exact
    with pytest.raises(TableError, match="column 'pot'"):
        read_table(
            put(GOOD.replace("14/3", "4.6666867").replace("1/3,4.6", "0.3333333,4.6")), setting
        )


def test_columns_that_follow_may_be_rounded_to_cents(setting: Setting, put: Put) -> None:
    """As spreadsheets write them, closing zeros dropped; payments are still taken exactly."""
    cents = (
        GOOD.replace("1/6", "0.17")
        .replace("1/3,0,1", "0.33,0,1")
        .replace("1/3,1,0", "0.33,1,0")
        .replace("1/3,14/3,0", "0.33,4.66,0.00")
        .replace("0,4,-1", "0,4.1,-0.9")
    )
    read = read_table(put(cents), setting)
    assert read.exact
    assert read.table.payment(1, 1) == Fraction(466, 100)
    for wrong in (cents.replace("0.17", "0.16"), cents.replace("4.66", "4.63")):
        with pytest.raises(TableError, match=r"column '(probability|pot)'"):
            read_table(put(wrong), setting)


def test_a_rounded_balanced_table_still_balances(setting: Setting, put: Put) -> None:
    """Floats as Python writes them: the pot is off by an ulp and counts as balanced."""
    rows = "2,low,0,1,0.1,-0.1\n2,high,1,0,0.3333333333333333,4.666666666666667\n"
    rows += "0.5,low,0,1,1e-7,-1e-07\n0.5,high,1,0,0.7,4.3\n"
    names = "type:Norhaven,type:Suth,decides:build,decides:leave,pays:Norhaven,pays:Suth\n"
    checked = audit(setting, put(names + rows))
    assert checked.holds["balance-ex-post-exact"]
    assert checked.worst["balance-ex-post-exact"].violation > 0
    assert not audit(setting, put(names + rows), tolerance=Fraction(0)).holds[
        "balance-ex-post-exact"
    ]


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (b"", "no column 'type:Norhaven'"),
        (b"\n\n", "no column 'type:Norhaven'"),
        (b"\xff\xfe\x00t", "not UTF-8"),
        (GOOD.encode("utf-16"), "not UTF-8"),
        (b'"a', "unexpected end of data"),
        (b'type:Norhaven,"a"b\n', "expected after"),
        (GOOD.replace(",", ";").encode(), "Separate columns by commas"),
        (GOOD.replace("14/3", "0x1/0x0").encode(), "an exact number"),
        (GOOD.replace("14/3", "1_000").encode(), "an exact number"),
        (GOOD.replace("14/3", "1e999999999").encode(), "an exact number"),
        (GOOD.replace("14/3", "9" * 200_000).encode(), "field larger"),
        (GOOD.replace("14/3", "9" * 100_000).encode(), "an exact number"),
        (GOOD.replace("14/3", "").encode(), "an exact number"),
        (GOOD.replace("14/3", "\0").encode(), "mistake"),
        (GOOD.replace("14/3", "\u0663").encode(), "an exact number"),
        (GOOD.split("\n")[0].encode(), "4 of 4 profiles missing"),
    ],
)
def test_whatever_is_no_table_is_refused(
    setting: Setting, put: Put, content: bytes, words: str
) -> None:
    with pytest.raises(TableError, match=words):
        read_table(put(content), setting)


def test_files_that_cannot_be_read(setting: Setting, tmp_path: Path) -> None:
    for path in (tmp_path, tmp_path / "none.csv", "a\0b", tmp_path / "x" / "y.csv"):
        with pytest.raises(TableError):
            read_table(path, setting)


def test_denominators_without_end_are_refused(
    setting: Setting, put: Put, monkeypatch: pytest.MonkeyPatch
) -> None:
    from designer.tablefile import reading

    monkeypatch.setattr(reading, "MOST_BITS", 200)
    with pytest.raises(TableError, match="manageable length"):
        read_table(put(GOOD.replace("14/3", f"1/{10**40 + 1}")), setting)


def damaged(dice: random.Random, data: bytearray) -> bytes:
    """The bytes with one to three of them flipped, cut out, doubled or replaced."""
    hostile = [b",", b"\n", b'"', b"\0", b"\xff", b"nan", b"1e400", b"-", b"/0", b"0x", b"9" * 50]
    hostile += [b"\r", b"type:", b"\xe2\x88\x92", b"1/3", b" ", b";", b"'", b"0.1234567", b"e9"]
    figures = [b"7", b"-2", b"1/3", b".5", b"0.1234567", b"e2", b"/3", b"1e-9", b" 4", b"0x1f"]
    for _ in range(dice.randint(1, 3)):
        at, to = sorted(dice.randrange(len(data)) for _ in range(2))
        digits = [place for place, byte in enumerate(data) if byte in b"012345" and place > 90]
        match dice.randrange(9):
            case 0:
                data[at] = dice.randrange(256)
            case 1:
                del data[at : min(to, at + 6)]
            case 2:
                data[at:at] = data[at : min(to, at + 30)]
            case 3:
                data[at:at] = dice.choice(hostile)
            case 4:
                data[at : at + 1] = dice.choice(hostile)
            case _ if digits:
                at = dice.choice(digits)
                data[at : at + 1] = dice.choice(figures)
    return bytes(data)


def test_thousands_of_damaged_files_are_read_or_refused(setting: Setting, put: Put) -> None:
    """Whatever happened to the file: a table that can be audited, or a TableError."""
    dice = random.Random(11)  # noqa: S311 - places to damage, no secret
    rows = list(csv.reader(io.StringIO(GOOD)))
    bare = "\n".join(",".join(row[:2] + row[3:-1]) for row in rows) + "\n"
    read, refused = 0, []
    for _ in range(2000):
        data = damaged(dice, bytearray(dice.choice((GOOD, bare)).encode()))
        try:
            table = read_table(put(data), setting).table
        except TableError as problem:
            refused.append(problem)
        else:
            assert table.pays.shape == (2, 4)
            assert len(audit(setting, table).standings) == 4
            read += 1
    assert read > 80
    assert len(refused) > 1000
    assert all(1 <= len(problem.mistakes) <= 21 for problem in refused)


def test_the_frame_shows_what_the_file_says(setting: Setting, put: Put) -> None:
    table = read_table(put(GOOD), setting).table
    shown = frame(table, setting)
    rows = list(csv.reader(io.StringIO(GOOD)))
    assert list(shown.columns) == rows[0]
    for row, line in zip(shown.itertuples(index=False), rows[1:], strict=True):
        assert list(row[:2]) == line[:2]
        assert list(row[2:]) == [number(cell) for cell in line[2:]]


def test_the_data_package_describes_the_files_column_by_column(
    setting: Setting, tmp_path: Path, put: Put
) -> None:
    import re

    from designer.auditing import interim_csv

    table = read_table(put(GOOD), setting).table
    contents: dict[str, Content] = {
        "transfers.csv": transfers_csv(table, setting),
        "interim.csv": interim_csv(audit(setting, table).standings),
        "datapackage.json": datapackage(setting),
    }
    write_all(tmp_path / "out", contents)
    package = json.loads((tmp_path / "out" / "datapackage.json").read_bytes())
    assert package["name"] == "a-weir-for-two"
    for resource in package["resources"]:
        with (tmp_path / "out" / resource["path"]).open(newline="", encoding="utf-8") as lines:
            header, *rows = csv.reader(lines)
        fields = resource["schema"]["fields"]
        assert [field["name"] for field in fields] == header
        assert set(resource["schema"]["primaryKey"]) <= set(header)
        assert rows
        for row in rows:
            for field, cell in zip(fields, row, strict=True):
                if "pattern" in field["constraints"]:
                    assert re.fullmatch(field["constraints"]["pattern"], cell)
                if "enum" in field["constraints"]:
                    assert cell in field["constraints"]["enum"]
    unit = [f for f in package["resources"][0]["schema"]["fields"] if f["name"] == "pays:Suth"]
    assert unit[0]["description"].startswith("What Suth pays (negative: receives), in crowns.")
    assert re.fullmatch(EXACT, "-0x1f/0x3")
    assert not re.fullmatch(EXACT, "0.5")
