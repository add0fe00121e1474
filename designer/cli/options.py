"""The options that several commands share: the demands, each overriding the scenario's own."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from designer.setting.vocabulary import BALANCE, BUDGET, DECISIONS, GOALS, HONESTY, PARTICIPATION

if TYPE_CHECKING:
    from designer.demands.terms import Demands
    from designer.setting.setting import Setting


def _words(words: Sequence[str]) -> dict[str, Any]:
    """The metavar of an option that takes one word of a list, and its completion."""
    return {"metavar": "|".join(words), "autocompletion": _completion(words)}


def _completion(words: Sequence[str]) -> Callable[[str], list[str]]:
    def complete(incomplete: str) -> list[str]:
        return [word for word in words if word.startswith(incomplete)]

    return complete


def _goals(incomplete: str) -> list[str]:
    """Completion of the last goal of a list."""
    before, comma, last = incomplete.rpartition(",")
    return [f"{before}{comma}{word}" for word in GOALS if word.startswith(last)]


Scenario = Annotated[Path, typer.Argument(metavar="SCENARIO", help="A scenario file (TOML).")]
Decision = Annotated[str | None, typer.Option(help="Who decides, and how.", **_words(DECISIONS))]
Ic = Annotated[str | None, typer.Option(help="Honesty.", **_words(HONESTY))]
Ir = Annotated[str | None, typer.Option(help="Taking part.", **_words(PARTICIPATION))]
Balance = Annotated[str | None, typer.Option(help="The pot.", **_words(BALANCE))]
Budget = Annotated[
    str | None, typer.Option(help="Whether the pot may be left over.", **_words(BUDGET))
]
Goal = Annotated[
    str | None,
    typer.Option(
        metavar="A[,B…]",
        help=f"Goals, one after the other: {', '.join(GOALS)}.",
        autocompletion=_goals,
    ),
]
Subsidy = Annotated[
    str | None,
    typer.Option(metavar="AMOUNT", help='Outside money for the pot, exact: 3, 0.25 or "1/3".'),
]
Slack = Annotated[
    str | None, typer.Option(metavar="AMOUNT", help="Gain from a lie that is tolerated.")
]
EvenHanded = Annotated[
    bool | None,
    typer.Option("--even-handed/--no-even-handed", help="Parties with equal data alike or not."),
]
Compel = Annotated[
    list[str] | None,
    typer.Option(metavar="NAME", help="A party that has to take part; repeat for more."),
]
Rows = Annotated[
    int | None, typer.Option(metavar="N", min=0, help="Rows shown of each table; 0: none.")
]
Json = Annotated[
    bool, typer.Option("--json", help="One JSON document on stdout, the rest on stderr.")
]
ShowProgress = Annotated[
    bool | None,
    typer.Option("--progress/--no-progress", help="Progress on stderr; else on terminals."),
]
Quiet = Annotated[bool, typer.Option("--quiet", "-q", help="No screen: the exit code tells.")]


def demands(setting: Setting, compel: list[str] | None = None, **words: Any) -> Demands:
    """The overrides as `Demands`; parties to compel join those the scenario compels."""
    from designer.demands.terms import Demands

    compelled = None
    if compel:
        own = {party.name for party in setting.parties if party.compelled}
        compelled = frozenset(own.union(compel))
    return Demands(compelled=compelled, **words)
