"""The roads a design could take, and why it takes the one it does."""

from __future__ import annotations

from typing import Any

from designer.roads.registry import Choice
from designer.setting.setting import Setting
from designer.views.page import Page, heading, listed

FORMAT = "designer.roads/1"


def roads(choice: Choice) -> Page:
    """Every road in the order of trial, the one taken marked in words."""
    rows = []
    for name, reason in choice.reasons:
        if name == choice.road.name:
            rows.append((name, "Taken: it applies."))
        elif reason is None:
            rows.append((name, "Applies, but comes later in the order of trial."))
        else:
            rows.append((name, f"Not taken: {reason}."))
    return [heading("Roads, in the order of trial"), listed(rows)]


def roads_document(setting: Setting, choice: Choice) -> dict[str, Any]:
    """The same as JSON-ready values."""
    return {
        "format": FORMAT,
        "scenario": {"title": setting.title, "digest": setting.digest},
        "path": choice.road.name,
        "roads": [
            {"name": name, "applies": reason is None, "reason": reason or ""}
            for name, reason in choice.reasons
        ],
    }
