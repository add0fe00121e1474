"""Joint priors and rules in CSV files beside the scenario."""

from __future__ import annotations

from pathlib import Path

import pytest

from designer.errors import ScenarioError
from designer.setting.scenario import dump, parse_scenario, read_scenario
from designer.setting.setting import Setting

BASE = """
title = "A gate"
{0}
[decisions]
options = ["open", "shut"]
[[party]]
name = "North Haven"
types = [20, 0.5]
{1}
value = {{ open = "type", shut = 0 }}
[[party]]
name = "Suth"
types = ["low", "high, very"]
{1}
value = {{ open = 1, shut = 0 }}
"""
JOINT = BASE.format('joint = "joint.csv"', "")
RULE = BASE.format('rule = "rule.csv"', "weights = [1, 1]")


def read(folder: Path, text: str, name: str, sheet: str | bytes) -> Setting:
    (folder / "gate.toml").write_text(text, encoding="utf-8")
    data = sheet if isinstance(sheet, bytes) else sheet.encode()
    (folder / name).write_bytes(data)
    return read_scenario(folder / "gate.toml")


def told(folder: Path, text: str, name: str, sheet: str | bytes) -> str:
    with pytest.raises(ScenarioError) as caught:
        read(folder, text, name, sheet)
    return str(caught.value).split("\n", 1)[1]


GOOD = 'North Haven,Suth,weight\n20,low,1\n1/2,"high, very",2\n0.5,low,0.5\n'


@pytest.mark.parametrize(
    "sheet",
    [
        GOOD,
        "\ufeff" + GOOD,
        GOOD.replace("\n", "\r\n"),
        GOOD.rstrip("\n"),
        GOOD.replace("\n", "\n\n , , \n"),
        'North Haven , Suth, weight \n 20, low , 1\n1/2, "high, very", 2\n0.5 ,low,0.5\n',
        'weight,Suth,"North Haven"\n1,low,20.0\n2,"high, very",0.5\n1/2,low,5e-1\n'
        '0,"high, very",20\n',
    ],
)
def test_a_joint_prior_from_a_sheet(tmp_path: Path, sheet: str) -> None:
    setting = read(tmp_path, JOINT, "joint.csv", sheet)
    assert setting.joint is not None
    assert setting.joint.tolist() == [2, 0, 1, 4]
    assert [party.weights for party in setting.parties] == [(2, 5), (3, 4)]
    assert parse_scenario(dump(setting)).digest == setting.digest


RULE_SHEETS = [
    'North Haven,Suth,take\n20,low,open\n20,"high, very",shut\n0.5,low,shut\n'
    '0.5,"high, very",shut\n',
    'North Haven,Suth,open,shut\n20,low,1,0\n20,"high, very",0,1\n0.5,low,0,1\n'
    '0.5,"high, very",0.0,"2/2"\n',
    "type:North Haven,type:Suth,probability,decides:open,decides:shut,pays:North Haven,pays:Suth,"
    'pot\n20,low,1/4,1,0,3,-3,0\n20,"high, very",1/4,0,1,1,2,3\n1/2,low,1/4,0,1,0,0,0\n'
    '1/2,"high, very",1/4,0,1,1/3,-1/3,0\n',
]


@pytest.mark.parametrize("sheet", RULE_SHEETS)
def test_a_rule_from_a_sheet(tmp_path: Path, sheet: str) -> None:
    setting = read(tmp_path, RULE, "rule.csv", sheet)
    assert setting.rule is not None
    assert setting.rule.tolist() == [[1, 0], [0, 1], [0, 1], [0, 1]]
    assert setting.rule_den == 1
    assert parse_scenario(dump(setting)).digest == setting.digest


def test_a_sheet_of_lotteries(tmp_path: Path) -> None:
    sheet = (
        'North Haven,Suth,open,shut\n20,low,1/3,2/3\n20,"high, very",0.5,0.5\n0.5,low,0,1\n'
        '0.5,"high, very",1,0\n'
    )
    setting = read(tmp_path, RULE, "rule.csv", sheet)
    assert setting.rule is not None
    assert setting.rule.tolist() == [[2, 4], [3, 3], [0, 6], [6, 0]]
    assert setting.rule_den == 6


@pytest.mark.parametrize(
    ("sheet", "expected"),
    [
        (
            GOOD.replace(",", ";"),
            "joint.csv, line 1: found columns separated by ';'; expected columns separated by "
            "commas.\n    Save the sheet as CSV with commas (and a point in decimals).",
        ),
        (
            "",
            "joint.csv, line 1: found no header; expected a row of column names.\n"
            "    Name the columns first.",
        ),
        (
            GOOD.replace("weight", "wieght"),
            "joint.csv, line 1: found nothing; expected a column 'weight'.\n    Add it.\n"
            "joint.csv, line 1: found an unknown column 'wieght'; expected a column per party and "
            "weight.\n    Rename or remove it.",
        ),
        (
            GOOD.replace("Suth", "North Haven"),
            "joint.csv, line 1: found the column 'North Haven' twice; expected each column once, "
            "with its name.\n    Rename or remove it.",
        ),
        (
            GOOD.replace("weight", "weight,"),
            "joint.csv, line 1: found a column without a name; expected each column once, with "
            "its name.\n    Rename or remove it.",
        ),
        (
            GOOD.replace("North Haven", "Nord"),
            "joint.csv, line 1: found 0 columns for 'North Haven'; expected one column per party, "
            "unlike the other columns.\n    Add North Haven's types.\n"
            "joint.csv, line 1: found an unknown column 'Nord'; expected a column per party and "
            "weight.\n    Rename or remove it.",
        ),
        (
            GOOD.replace('"', ""),
            "joint.csv, line 3: found 4 cells; expected 3, as in the header.\n"
            "    Add or remove cells; quote a cell that contains a comma.",
        ),
        (
            GOOD.replace("low,1\n", "lwo,x\n"),
            "joint.csv, line 2, column 'Suth': found 'lwo'; expected a type of Suth: low, high, "
            "very.\n    Did you mean 'low'?\n"
            "joint.csv, line 2, column 'weight': found 'x'; expected an exact number.\n"
            '    Write 3, 0.25 or "1/3".',
        ),
        (
            GOOD + "20,low,3\n20,low,-1\n",
            "joint.csv, line 5: found a profile given before; expected each profile once.\n"
            "    Remove one of them.\n"
            "joint.csv, line 6, column 'weight': found -1; expected a weight of 0 or more.\n"
            "    Write its share.",
        ),
        (
            GOOD + '"20,low,1\n',
            "joint.csv, line 5: found a row that is not CSV (unexpected end of data); expected "
            "cells separated by commas, quoted with double quotes where needed.\n"
            "    Mend the quotes of that row; the rows after it were not read.",
        ),
        (
            GOOD.encode("utf-16"),
            "joint.csv, line 1: found the byte 0xff, which is not UTF-8; expected text in UTF-8.\n"
            "    Save the file with the encoding UTF-8.",
        ),
        (
            "North Haven,Suth,weight\n20,low,1\n",
            "party[0] 'North Haven'.types: found the type '1/2' of probability 0 in the joint "
            "prior; expected a positive probability for every type.\n"
            "    Give a profile with it some weight, or remove the type.\n"
            "party[1] 'Suth'.types: found the type 'high, very' of probability 0 in the joint "
            "prior; expected a positive probability for every type.\n"
            "    Give a profile with it some weight, or remove the type.",
        ),
    ],
)
def test_what_a_mistaken_sheet_is_told(tmp_path: Path, sheet: str | bytes, expected: str) -> None:
    assert told(tmp_path, JOINT, "joint.csv", sheet) == expected


@pytest.mark.parametrize(
    ("sheet", "expected"),
    [
        (
            RULE_SHEETS[0].replace("20,low,open\n", ""),
            "rule: found no decision at North Haven = 20, Suth = low; expected a decision at "
            "every profile.\n"
            "    Add it; one [[rule]] with take and without at covers every profile not named.",
        ),
        (
            RULE_SHEETS[0].replace("low,open", "low,opn"),
            "rule.csv, line 2, column 'take': found 'opn'; expected one of open, shut.\n"
            "    Did you mean 'open'?",
        ),
        (
            RULE_SHEETS[1].replace("low,1,0", "low,1,1/2"),
            "rule.csv, line 2: found probabilities that sum to 3/2; expected a sum of 1.\n"
            '    Write fractions such as "1/3" if rounding is the cause.',
        ),
        (
            RULE_SHEETS[1].replace("low,1,0", "low,2,-1"),
            "rule.csv, line 2, column 'shut': found -1; expected a probability.\n"
            "    Write a number from 0 to 1.",
        ),
        (
            RULE_SHEETS[1].replace("shut\n", "shot\n"),
            "rule.csv, line 1: found nothing; expected a column 'shut'.\n    Add it.\n"
            "rule.csv, line 1: found an unknown column 'shot'; expected a column per party and "
            "open, shut.\n    Rename or remove it.",
        ),
    ],
)
def test_what_a_mistaken_rule_sheet_is_told(tmp_path: Path, sheet: str, expected: str) -> None:
    assert told(tmp_path, RULE, "rule.csv", sheet) == expected


def test_sheets_that_are_not_there(tmp_path: Path) -> None:
    (tmp_path / "gate.toml").write_text(JOINT, encoding="utf-8")
    with pytest.raises(ScenarioError, match=r"joint\.csv', which cannot be read"):
        read_scenario(tmp_path / "gate.toml")
    with pytest.raises(ScenarioError, match="was not read from a folder"):
        parse_scenario(JOINT)
    (tmp_path / "joint.csv").mkdir()
    with pytest.raises(ScenarioError, match="Is a directory"):
        read_scenario(tmp_path / "gate.toml")


def test_a_party_called_like_a_column_needs_the_longer_title(tmp_path: Path) -> None:
    text = RULE.replace("Suth", "open")
    sheet = RULE_SHEETS[1].replace("Suth", "type:open")
    assert "one column per party" in told(tmp_path, text, "rule.csv", sheet)
    shorter = RULE_SHEETS[0].replace("Suth", "type:open")
    assert read(tmp_path, text, "rule.csv", shorter).rule is not None


def test_ninety_thousand_wrong_cells_are_counted_quickly_and_listed_briefly(tmp_path: Path) -> None:
    sheet = "North Haven,Suth,weight\n" + "21,lo,x\n" * 30_000
    with pytest.raises(ScenarioError) as caught:
        read(tmp_path, JOINT, "joint.csv", sheet)
    assert len(caught.value.mistakes) == 61
    assert caught.value.mistakes[-1].found == "89940 more mistakes"
