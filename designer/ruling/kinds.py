"""What a rule is: a published name, when it applies, and how its table is built."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from designer.setting.setting import Setting
from designer.table import Table


@dataclass(frozen=True)
class Refusal:
    """Why a rule does not apply: the assumption that fails, what was found, what to do."""

    needs: str
    found: str
    remedy: str

    def __str__(self) -> str:
        """The refusal as one sentence or two."""
        return f"It needs {self.needs}; found {self.found}. {self.remedy}"


Check = Callable[[Setting], Refusal | None]
"""One assumption: a Refusal where it fails, None where it holds."""


@dataclass(frozen=True)
class Built:
    """A rule's table, and what its making settled (a price, the size of a bet, …), in words."""

    table: Table
    notes: tuple[str, ...] = ()


@dataclass(frozen=True)
class Rule:
    """One classic rule.

    name     the published name in kebab case, as `--only` and the JSON spell it
    source   author and year, for the screen; the file's docstring says more
    assumes  what the source assumes, in one phrase
    checks   the assumptions as code, in the order in which they are tried
    build    the table, exact; called only where every check holds
    """

    name: str
    source: str
    assumes: str
    checks: tuple[Check, ...]
    build: Callable[[Setting], Built]

    def applies(self, setting: Setting) -> Refusal | None:
        """Find the first assumption that fails; None when the rule applies."""
        for check in self.checks:
            refusal = check(setting)
            if refusal is not None:
                return refusal
        return None
