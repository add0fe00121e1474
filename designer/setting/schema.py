"""The JSON Schema (draft 2020-12) of the scenario format, for editors that know TOML.

Many editors check and complete a TOML file whose first line is

    #:schema ./scenario.schema.json

The schema says what can be said of single keys; that weights sum to 1 or that a rule covers
every profile is for `read_scenario`.
"""

from __future__ import annotations

from pathlib import Path


def schema_path() -> Path:
    """Where the schema lies in the installed package."""
    return Path(__file__).with_name("scenario.schema.json")


def schema_text() -> str:
    """The schema itself, as JSON text."""
    return schema_path().read_text(encoding="utf-8")
