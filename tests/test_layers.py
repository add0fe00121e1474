"""Imports go downwards only, and the register of demands and goals is complete."""

from __future__ import annotations

import ast
from pathlib import Path

import pytest

import designer
from designer.demands import registry
from designer.demands.kinds import Demand, Goal
from designer.setting import vocabulary

ROOT = Path(designer.__file__).parent
LAYERS = (
    ("errors",),
    ("setting", "files"),
    ("table",),
    ("tablefile", "auditing"),
    ("program",),
    ("demands",),
    ("engines",),
    ("proof",),
    ("roads",),
    ("verdict",),
    ("posing", "rebuilding", "holding"),
    ("weighing", "ruling"),
    ("saving",),
    ("views",),
    ("cli", "__main__"),
)
RANK = {name: rank for rank, layer in enumerate(LAYERS) for name in layer}


def rooms() -> list[Path]:
    return sorted(path for path in ROOT.rglob("*.py") if path != ROOT / "__init__.py")


def room_of(path: Path) -> str:
    return path.relative_to(ROOT).parts[0].removesuffix(".py")


@pytest.mark.parametrize("path", rooms(), ids=lambda path: str(path.relative_to(ROOT)))
def test_imports_go_downwards(path: Path) -> None:
    here = RANK[room_of(path)]
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.ImportFrom) and (node.module or "").startswith("designer."):
            there = (node.module or "").split(".")[1]
            assert RANK[there] <= here, f"{path.name} imports {node.module}"


def test_the_checker_stands_alone() -> None:
    tree = ast.parse((ROOT / "proof" / "recheck.py").read_text(encoding="utf-8"))
    modules = {
        (node.module or "").split(".")[0]
        for node in ast.walk(tree)
        if isinstance(node, ast.ImportFrom)
    } | {
        alias.name.split(".")[0]
        for node in ast.walk(tree)
        if isinstance(node, ast.Import)
        for alias in node.names
    }
    assert not modules & {"numpy", "scipy", "highspy", "flint", "pandas", "pulp"}


def test_the_audit_shares_no_row_building() -> None:
    for path in (ROOT / "auditing").rglob("*.py"):
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            if isinstance(node, ast.ImportFrom):
                module = node.module or ""
                assert not module.startswith(
                    ("designer.program", "designer.demands", "designer.proof", "designer.roads")
                ), f"{path.name} imports {module}"


def _declared(folder: Path, name: str) -> set[str]:
    return {
        path.stem
        for path in folder.glob("*.py")
        if any(
            isinstance(node, ast.Assign)
            and any(isinstance(t, ast.Name) and t.id == name for t in node.targets)
            for node in ast.parse(path.read_text(encoding="utf-8")).body
        )
    }


def test_every_demand_file_is_registered() -> None:
    files = _declared(ROOT / "demands", "DEMAND")
    assert len(files) == len(registry.DEMANDS)
    assert all(isinstance(demand, Demand) for demand in registry.DEMANDS)
    names = [demand.name for demand in registry.DEMANDS]
    assert len(set(names)) == len(names)
    for stem in files:
        module = __import__(f"designer.demands.{stem}", fromlist=["DEMAND"])
        assert module.DEMAND in registry.DEMANDS


def test_every_goal_file_is_registered_under_its_word() -> None:
    files = _declared(ROOT / "demands" / "goals", "GOAL")
    assert {stem.replace("_", "-") for stem in files} == set(registry.GOALS)
    assert set(registry.GOALS) == set(vocabulary.GOALS)
    assert all(
        isinstance(goal, Goal) and name == goal.name for name, goal in registry.GOALS.items()
    )
