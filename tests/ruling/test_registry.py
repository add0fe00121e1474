"""The register is whole, and every rule says what it is, where it comes from and when it fails."""

from __future__ import annotations

import importlib
import re
from pathlib import Path

import pytest

import designer.ruling
from designer.errors import UsageError
from designer.ruling.kinds import Refusal, Rule
from designer.ruling.registry import RULES
from designer.ruling.report import rules
from designer.setting.scenario import parse_scenario, read_scenario
from designer.setting.setting import Setting
from tests.published.corpus import instances, setting_of
from tests.ruling.helpers import table_of

FOLDER = Path(designer.ruling.__file__).parent
SCENARIOS = sorted((Path(__file__).parents[2] / "scenarios").glob("*.toml"))


def rule_files() -> list[Path]:
    return [
        path for path in FOLDER.glob("*.py") if re.search(r"^RULE = Rule\(", path.read_text(), re.M)
    ]


def test_every_rule_file_is_registered_under_its_name() -> None:
    names = {path.stem.replace("_", "-") for path in rule_files()}
    assert names == set(RULES)
    assert all(name == rule.name for name, rule in RULES.items())


@pytest.mark.parametrize("path", rule_files(), ids=lambda path: path.stem)
def test_every_rule_file_names_its_source(path: Path) -> None:
    module = importlib.import_module(f"designer.ruling.{path.stem}")
    assert re.search(r"^Sources?: ", module.__doc__ or "", re.M)
    rule: Rule = module.RULE
    assert rule.source
    assert rule.assumes
    assert rule.checks


@pytest.mark.parametrize("name", sorted(instances()))
def test_every_rule_builds_or_refuses_in_words(name: str) -> None:
    """On all data of the corpus; what is built is a table of the setting's shape."""
    setting = setting_of(name)
    if setting.profiles > 1500:
        return
    built = 0
    for rule in RULES.values():
        refusal = rule.applies(setting)
        if refusal is None:
            table = rule.build(setting).table
            assert table.decides.shape == (setting.profiles, len(setting.options))
            assert table.pays.shape == (len(setting.parties), setting.profiles)
            assert (table.decides.sum(axis=1) == table.decides_den).all()
            built += 1
        else:
            assert isinstance(refusal, Refusal)
            assert all((refusal.needs, refusal.found, refusal.remedy))
            assert refusal.remedy.endswith((".", "worths."))
    assert built >= 4


@pytest.mark.parametrize("path", SCENARIOS, ids=lambda path: path.stem)
def test_every_scenario_gets_a_report(path: Path) -> None:
    report = rules(path, optimum=False)
    assert [result.name for result in report.results] == list(RULES)
    for result in report.results:
        assert result.applies == (result.table is not None) == (result.why_not is None)


def parsed(party: str, *, designer_part: str = "", options: str = '["yes", "no"]') -> Setting:
    """A scenario of two parties from one [[party]] body."""
    text = f'title = "t"\n[decisions]\noptions = {options}\n{designer_part}\n'
    return parse_scenario(text + "".join(f'[[party]]\nname = "{n}"\n{party}\n' for n in "AB"))


INTERDEPENDENT = 'types = [1, 2]\nweights = [1, 1]\nvalue = { yes = "type + types.A", no = 0 }'


@pytest.mark.parametrize("name", [n for n in RULES if n != "proportional-to-report"])
def test_interdependent_worths_are_refused(name: str) -> None:
    setting = parsed(INTERDEPENDENT)
    refusal = RULES[name].applies(setting)
    assert refusal is not None
    assert "private worths" in refusal.needs
    assert "pose" in refusal.remedy


def test_unknown_names_and_inapplicable_rules_stop_with_a_remedy() -> None:
    setting = read_scenario(SCENARIOS[0])
    with pytest.raises(UsageError, match=r"'tea-leaves'; expected one of expected-externality"):
        rules(setting, ["tea-leaves"])
    breakwater = next(path for path in SCENARIOS if path.stem == "breakwater")
    with pytest.raises(UsageError) as stopped:
        rules(breakwater, ["full-extraction", "k-double-auction"])
    assert [mistake.place for mistake in stopped.value.mistakes] == [
        "rule k-double-auction",
        "rule full-extraction",
    ]
    assert stopped.value.exit_code == 2
    assert "of rank 1 for 3 types" in str(stopped.value)


def test_ties_go_to_the_first_option() -> None:
    """Convention 6, and what the notes say: both options are worth the same here."""
    worth = 'types = [1, 2]\nweights = [1, 1]\nvalue = { yes = "type", no = "type" }'
    for options, first in (('["yes", "no"]', 0), ('["no", "yes"]', 0)):
        setting = parsed(worth, options=options)
        for name in ("pivotal", "expected-externality", "cavallo-rebate"):
            assert (table_of(name, setting).decides[:, first] == 1).all()


def test_the_posted_price_of_a_designer_who_would_rather_not() -> None:
    """Nothing she could ask makes up for her own loss: prices that nobody accepts."""
    party = 'types = [1, 2]\nweights = [1, 1]\nvalue = { yes = "type", no = 0 }'
    setting = parsed(party, designer_part="[designer]\nworth = { no = 100 }")
    table = table_of("posted-price", setting)
    assert (table.decides[:, 1] == 1).all()
    assert not table.pays.any()


def test_a_single_party_and_a_designer_who_cares() -> None:
    """Convention 9: expected externality has nobody to redistribute to."""
    text = (
        'title = "t"\n[decisions]\noptions = ["yes", "no"]\n[designer]\noutlay = {{ yes = 2 }}\n'
        "worth = {{ no = {worth} }}\n"
        '[[party]]\nname = "A"\ntypes = [1, 4]\nweights = [1, 1]\n'
        'value = {{ yes = "type", no = 0 }}'
    )
    rule = RULES["expected-externality"]
    alone = parse_scenario(text.format(worth=0))
    assert rule.applies(alone) is None
    assert table_of("expected-externality", alone).pays.tolist() == [[0, 2]]
    cares = rule.applies(parse_scenario(text.format(worth=1)))
    assert cares is not None
    assert "one party" in cares.found
