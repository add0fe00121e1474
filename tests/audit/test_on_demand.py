"""A table.json is audited like the CSV of the same table."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from designer import Demands, audit, pose, read_scenario
from designer.errors import TableError
from designer.saving import save

SCENARIO = Path(__file__).parents[2] / "scenarios" / "breakwater.toml"
ASKED = {
    "interim": Demands(goal="revenue", balance="none"),
    "type-graph": Demands(goal="revenue", balance="none", ic="dominant", ir="ex-post"),
}


@pytest.mark.parametrize("path", sorted(ASKED))
def test_both_files_of_a_table_are_audited_alike(path: str, tmp_path: Path) -> None:
    setting = read_scenario(SCENARIO)
    verdict = pose(setting, ASKED[path], path=path)
    assert verdict.proved
    assert verdict.path == path
    save(verdict, tmp_path, {})
    one, two = (audit(setting, tmp_path / name) for name in ("table.json", "transfers.csv"))
    assert one.holds == two.holds
    assert one.standings == two.standings
    assert one.pot.expected == two.pot.expected == verdict.goal_value


@pytest.mark.parametrize(
    ("change", "words"),
    [
        (lambda plain: plain | {"scenario": {"digest": "0"}}, "another scenario"),
        (lambda plain: plain | {"pot": "x"}, "not an exact number"),
        (lambda plain: plain | {"mixture": []}, "mixture"),
        (lambda plain: [plain], "not a JSON object"),
    ],
)
def test_any_other_json_is_refused(change: object, words: str, tmp_path: Path) -> None:
    setting = read_scenario(SCENARIO)
    save(pose(setting, ASKED["interim"], path="interim"), tmp_path, {})
    file = tmp_path / "table.json"
    plain = change(json.loads(file.read_bytes()))  # type: ignore[operator]
    file.write_text(json.dumps(plain), encoding="utf-8")
    with pytest.raises(TableError, match=words):
        audit(setting, file)
