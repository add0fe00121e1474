"""Every query of the published corpus, posed end to end and compared as exact fractions.

Each answer must be proved, its proof must survive the independent checker, and the table it
comes with must stand up to the audit, which shares no rows with the program that made it.
"""

from __future__ import annotations

import json

import pytest

from designer import audit, pose
from designer.proof.recheck import recheck
from tests.oracles.audited import achieved, shortcomings
from tests.published.corpus import FOLDER, Query, entries, instances, queries, setting_of


@pytest.mark.parametrize("query", queries(), ids=lambda query: query.name)
def test_published_answer(query: Query) -> None:
    setting = setting_of(query.instance)
    verdict = pose(setting, query.demands)

    assert verdict.status == query.verdict
    assert verdict.proved
    if query.value is not None:
        assert verdict.goal_value == query.value

    # The document must mean the same after a trip through its file format.
    document = json.loads(json.dumps(verdict.proof))
    finding = recheck(document)
    assert finding.holds, finding.faults
    assert finding.verdict == query.verdict

    if query.verdict == "possible":
        assert verdict.table is not None
        findings = audit(setting, verdict.table)
        assert shortcomings(findings, query.demands) == []
        if query.value is not None:
            assert achieved(findings, verdict.terms.goals[0]) == query.value
    else:
        assert verdict.table is None


def test_the_corpus_is_whole() -> None:
    """Nothing of it may get lost unnoticed: entries, queries and the data they name."""
    assert len(entries()) == 34
    assert len(queries()) == 383
    assert {query.instance for query in queries()} == set(instances())
    assert len({query.name for query in queries()}) == len(queries())


def test_every_entry_names_a_source_and_how_it_was_confirmed() -> None:
    for name, entry in entries().items():
        assert entry["sources"], name
        for source in entry["sources"]:
            assert {"authors", "year", "title", "journal", "confirmed"} <= set(source), name
        # What is not posed here says why, and where it is used instead.
        assert ("beyond" in entry) == ("beyond_because" in entry), name
        assert entry["queries"] or "beyond" in entry, name


def test_the_readme_has_a_row_for_every_entry() -> None:
    readme = (FOLDER / "README.md").read_text(encoding="utf-8")
    rows = [line.split("|")[1].strip() for line in readme.splitlines() if line.startswith("| ")]
    assert set(entries()) <= set(rows)
