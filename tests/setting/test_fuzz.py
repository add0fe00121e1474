"""Attacks on the door: whatever the bytes, a complete setting or a list of mistakes."""

from __future__ import annotations

import random
from pathlib import Path

import pytest

from designer.errors import Mistake, ScenarioError
from designer.setting.scenario import dump, parse_scenario, read_scenario
from tests.setting.test_mistakes import BASE, JOINT, RULE
from tests.setting.test_sheets import GOOD, RULE_SHEETS
from tests.setting.test_sheets import JOINT as JOINT_SHEET
from tests.setting.test_sheets import RULE as RULE_SHEET

SCENARIOS = Path(__file__).parents[2] / "scenarios"
SEEDS = [BASE, JOINT, RULE, *(p.read_text("utf-8") for p in sorted(SCENARIOS.glob("*.toml")))]

TOKENS = (
    "true", '""', '"x"', "[]", "{}", "[[]]", "[{}]", "nan", "-inf", "1e999", "1e9999", "-1", "0",
    "1979-05-27", "07:32:00", '"1/0"', '"1/3"', "0x" + "f" * 3000, "9" * 4400, "1" + "0" * 1000,
    '"type / 0"', '"type ** 99"', '"types.Suth"', '"types[0]"', '"(" ', '"\\u0000"', '"\\u202e"',
    "[" * 40 + "]" * 40, "'''\n'''", "=", "[[party]]", "[party]", "a.b.c = 1", '"joint.csv"', ",",
)  # fmt: skip


def spoil(text: str, chance: random.Random) -> bytes:
    """A few random damages: to bytes, to lines, and to whole values."""
    data = text.encode()
    for _ in range(chance.choice((1, 1, 1, 2, 4))):
        kind = chance.randrange(8)
        at = chance.randrange(len(data) + 1)
        lines = data.split(b"\n")
        row = chance.randrange(len(lines))
        if kind == 0:
            data = data[:at] + bytes([chance.randrange(256)]) + data[at + 1 :]
        elif kind == 1:
            data = data[:at] + data[at + chance.randrange(1, 12) :]
        elif kind == 2:
            data = data[:at] + chance.choice(TOKENS).encode() + data[at:]
        elif kind == 3:
            lines.insert(chance.randrange(len(lines) + 1), lines[row])
            data = b"\n".join(lines)
        elif kind == 4:
            del lines[row]
            data = b"\n".join(lines)
        elif kind == 5:
            other = chance.randrange(len(lines))
            lines[row], lines[other] = lines[other], lines[row]
            data = b"\n".join(lines)
        else:  # another value under a key, or another cell
            mark = b"=" if b"=" in lines[row] else b","
            pieces = lines[row].split(mark)
            pieces[chance.randrange(len(pieces))] = b" " + chance.choice(TOKENS).encode()
            lines[row] = mark.join(pieces)
            data = b"\n".join(lines)
    return data


def hold(path: Path) -> bool:
    """Read a file: True for a setting that survives its dump, False for told mistakes."""
    told: tuple[Mistake, ...] = ()
    try:
        setting = read_scenario(path)
    except ScenarioError as caught:
        told = caught.mistakes
        assert told
    else:
        assert parse_scenario(dump(setting)).digest == setting.digest
    for mistake in told:
        parts = (mistake.place, mistake.found, mistake.expected, mistake.remedy)
        assert all(part and part.isprintable() for part in parts), parts
        assert len(str(mistake)) < 2000
    return not told


@pytest.mark.parametrize("seed", range(len(SEEDS)))
def test_spoiled_scenarios(seed: int, tmp_path: Path) -> None:
    chance = random.Random(seed)  # noqa: S311  repeatable damage, no secret
    path = tmp_path / "scenario.toml"
    outcomes = []
    for _ in range(300):
        path.write_bytes(spoil(SEEDS[seed], chance))
        outcomes.append(hold(path))
    assert len(set(outcomes)) == 2  # the damage is neither always fatal nor always harmless


@pytest.mark.parametrize(
    ("text", "name", "sheet"),
    [
        (JOINT_SHEET, "joint.csv", GOOD),
        *((RULE_SHEET, "rule.csv", sheet) for sheet in RULE_SHEETS),
    ],
)
def test_spoiled_sheets(text: str, name: str, sheet: str, tmp_path: Path) -> None:
    chance = random.Random(sheet)  # noqa: S311  repeatable damage, no secret
    path = tmp_path / "scenario.toml"
    path.write_text(text, encoding="utf-8")
    outcomes = []
    for _ in range(300):
        (tmp_path / name).write_bytes(spoil(sheet, chance))
        outcomes.append(hold(path))
    assert len(set(outcomes)) == 2


def test_noise(tmp_path: Path) -> None:
    chance = random.Random(7)  # noqa: S311  repeatable damage, no secret
    path = tmp_path / "scenario.toml"
    for _ in range(300):
        path.write_bytes(chance.randbytes(chance.randrange(80)))
        hold(path)
    for _ in range(300):
        parts = (
            chance.choice((*TOKENS, "\n", "party", "types", "name", "[decisions]\n", " = "))
            for _ in range(30)
        )
        path.write_text("".join(parts), encoding="utf-8")
        hold(path)
