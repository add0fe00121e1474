"""What the program says when it cannot go on: place, found, expected, remedy."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass


@dataclass(frozen=True)
class Mistake:
    """One mistake in the input: where it is, what was found, what was expected, what to do."""

    place: str
    found: str
    expected: str
    remedy: str

    def __str__(self) -> str:
        """The mistake in two lines, as printed."""
        return f"{self.place}: found {self.found}; expected {self.expected}.\n    {self.remedy}"


class DesignerError(Exception):
    """Anything the program raises on purpose; `exit_code` is what the shell sees."""

    exit_code = 70


class InputError(DesignerError):
    """Bad input: all independent mistakes at once. Exit code 2."""

    exit_code = 2

    def __init__(self, mistakes: Sequence[Mistake], source: str = "") -> None:
        """Keep the mistakes; `source` names the file or option they are in."""
        self.mistakes = tuple(mistakes)
        self.source = source
        super().__init__(self.report())

    def report(self) -> str:
        """Every mistake, one after the other, under the name of the source."""
        count = len(self.mistakes)
        head = f"{self.source}: " if self.source else ""
        lines = [f"{head}{count} mistake{'s' if count != 1 else ''}"]
        lines += [str(mistake) for mistake in self.mistakes]
        return "\n".join(lines)


class ScenarioError(InputError):
    """A scenario file that cannot be read as one complete, consistent setting."""


class UsageError(InputError):
    """Demands or options that cannot be asked of this setting."""


class TableError(InputError):
    """A payment table that cannot be read or does not belong to the scenario."""


class ProofError(InputError):
    """A proof file that cannot be read as a proof document at all."""
