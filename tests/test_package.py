"""What is shipped: the wheel's files, the names it exports, the examples in docstrings."""

from __future__ import annotations

import doctest
import importlib
import tomllib
from pathlib import Path

import pytest

import designer

ROOT = Path(designer.__file__).parents[1]
EXAMPLES = sorted(
    ".".join(path.relative_to(ROOT).with_suffix("").parts)
    for path in (ROOT / "designer").rglob("*.py")
    if ">>> " in path.read_text(encoding="utf-8")
)


def test_every_public_name_is_there() -> None:
    for name in designer.__all__:
        assert getattr(designer, name).__doc__
    assert set(designer.__all__) <= set(dir(designer))


def test_what_ships_beside_the_code() -> None:
    """Hatchling takes every file under the package; these are promised by the README."""
    package = Path(designer.__file__).parent
    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))
    assert project["tool"]["hatch"]["build"]["targets"]["wheel"]["packages"] == ["designer"]
    for name in ("proof/FORMAT.md", "setting/scenario.schema.json", "py.typed"):
        assert (package / name).is_file()
    assert "Apache License" in (package / "LICENSE").read_text(encoding="utf-8")
    module, _, function = project["project"]["scripts"]["designer"].partition(":")
    assert callable(getattr(importlib.import_module(module), function))


@pytest.mark.parametrize("name", EXAMPLES)
def test_examples_in_docstrings(name: str, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(ROOT)  # examples name scenarios as the README does
    failed, tried = doctest.testmod(importlib.import_module(name.removesuffix(".__init__")))
    assert not failed
    assert tried
