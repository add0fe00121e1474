"""Numbers and labels in words, and what a ray does."""

from __future__ import annotations

import doctest
import json
from fractions import Fraction
from pathlib import Path

import pytest

from designer import Demands, pose, read_scenario
from designer.errors import Mistake
from designer.program import labels
from designer.program.labels import (
    AtMost,
    Balances,
    Clause,
    Covered,
    Decides,
    ExpectedDecision,
    ExpectedPay,
    Honest,
    Label,
    Lottery,
    OnAverage,
    Paths,
    Pays,
    PaysAgainst,
    Pin,
    Share,
    Slice,
    TakesPart,
    Unknown,
)
from designer.proof.recheck import recheck
from designer.views import amounts, page
from designer.views import labels as label_words
from designer.views.amounts import amount, approximate, cell
from designer.views.direction import direction
from designer.views.documents import (
    error_document,
    nearest,
    recheck_document,
    verdict_document,
)
from designer.views.labels import addends, axis_name, family, sentence, term

FOLDER = Path(__file__).parents[2] / "scenarios"


@pytest.mark.parametrize("module", [amounts, label_words, page], ids=lambda m: m.__name__)
def test_examples_in_docstrings(module: object) -> None:
    assert doctest.testmod(module, raise_on_error=True).attempted > 0  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("value", "written"),
    [
        ("0", "0 crowns"),
        ("-7", "-7 crowns"),
        ("13/4", "13/4 = 3.25 crowns"),
        ("-1/8", "-1/8 = -0.125 crowns"),
        ("1/3", "1/3 ≈ 0.333333 crowns"),
        ("1/128", "1/128 ≈ 0.0078125 crowns"),
        ("12345678/7", "12345678/7 ≈ 1763668 crowns"),
        (str(10**30), "≈ 1e30 crowns (exact: 31 digits)"),
    ],
)
def test_amounts(value: str, written: str) -> None:
    assert amount(Fraction(value), "crowns") == written


@pytest.mark.parametrize(
    ("value", "written"),
    [
        ("-12345678", "-12345678"),  # exact, so no mark, however long
        ("1234567/2", "617283.5"),
        ("999999999/10", "~100000000"),
        ("12345678/7", "~1763668"),
        ("-100001/3000", "~-33.334"),
        ("1/123456789", "~8.1e-9"),
        (str(10**15), "~1e15"),
    ],
)
def test_cells(value: str, written: str) -> None:
    assert cell(Fraction(value)) == written


def test_numbers_beyond_floats_keep_their_size() -> None:
    assert approximate(Fraction(3 * 10**400)) == "3e400"
    assert approximate(Fraction(-1, 8 * 10**350)) == "-1.25e-351"
    assert nearest(Fraction(10**400)) is None
    assert nearest(Fraction(1, 3)) == 1 / 3
    assert cell(Fraction(10**400 + 1, 10**399)) == "~10"


EVERY_LABEL = (
    Pays("Suth", ("20", "50")),
    Decides("build", ("20", "50")),
    ExpectedPay("Suth", "20"),
    ExpectedDecision("Suth", "20", "build"),
    Unknown("floor"),
    Honest("Suth", "20", "50"),
    Honest("Suth", "20", "50", ("20", "50")),
    TakesPart("Suth"),
    TakesPart("Suth", "20"),
    TakesPart("Suth", "20", ("20", "50")),
    Balances(),
    Balances(("20", "50")),
    Covered(("20", "50")),
    Lottery(("20", "50")),
    Clause("limit", "pays_at_most", "Suth", ("20", "50")),
    Clause("limit", "pays_at_least", "Suth", ("20", "50")),
    Clause("limit", "only_when_served", "Suth", ("20", "50")),
    Clause("limit", "within_worth", "Suth", ("20", "50")),
    Clause("side", "welfare_at_least"),
    Clause("side", "revenue_at_least"),
    Clause("side", "chance[0]", "Suth"),
    Clause("even-handed", "Suth and Norhaven", "Suth", ("20", "50")),
    Clause("goal", "swing", "Suth", ("20", "50")),
    Pin("floor"),
    Slice("20"),
    Share("20", 3),
    AtMost("Suth"),
    AtMost("Suth", "20"),
    Paths("Suth", ("20", "·"), 3),
    Paths("Suth", ("20", "·"), 3, "50"),
    PaysAgainst("Suth", ("20", "·")),
    PaysAgainst("Suth", ("20", "·"), "50"),
    OnAverage("pays", "Suth"),
    OnAverage("outlay"),
)


def test_every_kind_of_label_has_words_of_its_own() -> None:
    kinds = {type(label) for label in EVERY_LABEL}
    known = {
        kind
        for kind in vars(labels).values()
        if isinstance(kind, type) and issubclass(kind, Label) and kind is not Label
    }
    assert kinds == known
    sentences = [sentence(label) for label in EVERY_LABEL if not isinstance(label, Pays)]
    assert len(set(sentences)) == len(sentences)
    assert not any("(party=" in text for text in sentences)
    names = [axis_name(label) for label in EVERY_LABEL]
    assert len(set(names)) == len(names)
    assert all(family(label) for label in EVERY_LABEL)


def test_sentences() -> None:
    assert sentence(Honest("Suth", "20", "50", ("20", "80"))) == (
        "Suth, being 20, gains nothing by reporting 50, when the types are (20, 80)"
    )
    assert sentence(TakesPart("Suth")) == "Suth takes part, before it knows its type"
    assert sentence(Balances(), 1) == "the pot balances on average"
    assert sentence(Balances(("1", "2"))) == "the pot balances, when the types are (1, 2)"
    assert sentence(None).startswith("the chances of the decisions")
    assert term(ExpectedDecision("Suth", "20", "build")) == "Pr[build | Suth 20]"


def test_long_sums_are_cut_and_say_so() -> None:
    terms = [(Pays("Suth", (str(k),)), Fraction(k - 7, 3)) for k in range(20)]
    parts = addends(terms)
    assert parts[0] == "-7/3·[Suth pays | 0]"
    assert parts[1] == "- 2·[Suth pays | 1]"
    assert parts[8] == "+ 1/3·[Suth pays | 8]"
    assert parts[-1] == "+ 8 more terms"
    assert len(parts) == 13
    assert addends([]) == ["0"]


def test_a_ray_is_scaled_to_one_unit_of_the_goal() -> None:
    demands = Demands(ir="none", ic="none", balance="none", goal="revenue")
    verdict = pose(read_scenario(FOLDER / "lock-sale.toml"), demands)
    assert verdict.ray is not None
    found = direction(verdict.program, verdict.ray, verdict.setting)
    assert found.goal == "revenue"
    assert sum(change.expected for change in found.changes) == 1
    for change in found.changes:
        assert change.least <= change.expected <= change.most
        assert change.always == (change.least == change.most)


def test_a_change_in_some_profiles_only_reaches_down_to_nothing() -> None:
    demands = Demands(ir="none", goal="revenue")
    verdict = pose(read_scenario(FOLDER / "dawn-berth.toml"), demands)
    assert verdict.ray is not None
    for change in direction(verdict.program, verdict.ray, verdict.setting).changes:
        entries = [
            value
            for column, value in verdict.ray.fractions().items()
            if getattr(verdict.program.column_axis.label(column), "party", "") == change.party
        ]
        assert change.least <= 0 or len(entries) >= verdict.setting.profiles


def test_documents_are_json_with_exact_text() -> None:
    verdict = pose(read_scenario(FOLDER / "breakwater.toml"), Demands(ir="none"))
    document = verdict_document(verdict, {"proof": "out/proof.json"})
    again = json.loads(json.dumps(document, allow_nan=False))
    assert again == document
    assert list(document)[:7] == [
        "format",
        "scenario",
        "demands",
        "verdict",
        "proved",
        "goal",
        "goals",
    ]
    assert document["format"] == "designer.verdict/1"
    assert document["scenario"] == {
        "title": "A breakwater for three harbour towns",
        "digest": verdict.setting.digest,
    }
    assert document["goal"] == {"name": "floor", "value": "-95/36", "approx": float(-95 / 36)}
    assert document["goals"][1]["tidy"] is True
    assert document["files"] == {"proof": "out/proof.json"}
    assert "legal" in document["caution"]


def test_an_undecided_document_has_no_value() -> None:
    verdict = pose(read_scenario(FOLDER / "breakwater.toml"), time_limit=0)
    document = verdict_document(verdict)
    assert document["verdict"] == "undecided"
    assert document["goal"] == {"name": "floor", "value": None, "approx": None}
    assert document["reason"].startswith("the time limit was reached")


def test_error_and_recheck_documents() -> None:
    mistake = Mistake("here", "1", "2", "Write 2.")
    document = error_document("input", 2, "words", [mistake])
    assert document["mistakes"] == [
        {"place": "here", "found": "1", "expected": "2", "remedy": "Write 2."}
    ]
    finding = recheck([])
    found = recheck_document("", "", finding, compared=False)
    assert found["holds"] is False
    assert found["faults"] == ["the document: not an object"]
