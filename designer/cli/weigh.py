"""`designer weigh`: what must give, at what price."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from designer.cli import options
from designer.cli.output import (
    IMPOSSIBLE,
    PATIENCE,
    POSSIBLE,
    UNDECIDED,
    Output,
    Progress,
    command,
)

if TYPE_CHECKING:
    from designer.weighing.tradeoff import Tradeoff

PARTS = ("prices", "ledger", "ladders", "collisions", "frontiers")
CODES = {"possible": POSSIBLE, "impossible": IMPOSSIBLE, "undecided": UNDECIDED}

EPILOG = """\b
Examples:
  designer weigh scenarios/lock-sale.toml
  designer weigh scenarios/breakwater.toml --ic dominant --only prices --only ledger --json"""


def _parts(incomplete: str) -> list[str]:
    return [part for part in PARTS if part.startswith(incomplete)]


@command
def weigh(
    scenario: options.Scenario,
    decision: options.Decision = None,
    ic: options.Ic = None,
    ir: options.Ir = None,
    balance: options.Balance = None,
    budget: options.Budget = None,
    subsidy: options.Subsidy = None,
    slack: options.Slack = None,
    even_handed: options.EvenHanded = None,
    compel: options.Compel = None,
    only: Annotated[
        list[str] | None,
        typer.Option(
            metavar="|".join(PARTS), help="This part; repeat for more.", autocompletion=_parts
        ),
    ] = None,
    engine: Annotated[
        str, typer.Option(metavar="highs|pulp:NAME", help="Who gives the hints that are proved.")
    ] = "highs",
    time_limit: Annotated[
        float | None,
        typer.Option(metavar="SECONDS", min=0, help="Stop then and keep what was found."),
    ] = None,
    save: Annotated[
        Path | None,
        typer.Option(metavar="DIR", help="Write the document, tables and plots, all or nothing."),
    ] = None,
    plots: Annotated[
        bool, typer.Option("--plots/--no-plots", help="Draw frontiers on the screen, or not.")
    ] = True,
    rows: options.Rows = None,
    json: options.Json = False,
    quiet: options.Quiet = False,
    progress: options.ShowProgress = None,
) -> None:
    """What must give: which demands collide, what each way out costs, what trades for what."""
    from designer.setting.scenario import read_scenario
    from designer.weighing.weigh import weigh as weigh_all

    setting = read_scenario(scenario)
    demands = options.demands(
        setting,
        compel,
        decision=decision,
        ic=ic,
        ir=ir,
        balance=balance,
        budget=budget,
        goal="any",
        subsidy=subsidy,
        slack=slack,
        even_handed=even_handed,
    )
    output = Output(json=json, quiet=quiet)
    shown = Progress(progress)
    try:
        found = weigh_all(
            setting,
            demands,
            only=only or (),
            engine=engine,
            time_limit=time_limit,
            progress=shown,
            found=_Teller(shown),
        )
    finally:
        shown.close()
    files = _save(found, save, output) if save else {}
    if json:
        from designer.views.weighed_files import tradeoff_document

        output.document(tradeoff_document(found, files))
    elif not quiet:
        from designer.views.weighed import weighed

        output.page(weighed(found, rows, plots))
    if files:
        output.note(f"Saved in {save}: {', '.join(files)}.")
    raise typer.Exit(CODES[found.status])


class _Teller:
    """Says on stderr what was found while the work goes on: the verdict, then each price."""

    def __init__(self, progress: Progress) -> None:
        self.progress, self.told = progress, -1

    def __call__(self, found: Tradeoff) -> None:
        import time

        if not self.progress.shown or time.monotonic() - self.progress.start < PATIENCE:
            return
        from designer.views.weighing_words import price, way

        if self.told < 0:
            self.progress.say(f"{found.status}, {'proved' if found.proved else 'unproved'}")
            self.told = 0
        for one in found.prices[self.told :]:
            text = price(one, found.setting)
            self.progress.say(f"{way(one.relax)}: {text.partition('. ')[0].removesuffix('.')}")
        self.told = max(self.told, len(found.prices))
        corners = [f"{one.x}-{one.y} {len(one.corners)}" for one in found.frontiers]
        if corners:
            self.progress(f"corners found: {', '.join(corners)}", PATIENCE, 0)


def _save(found: Tradeoff, folder: Path, output: Output) -> dict[str, str]:
    """Write all or nothing; without matplotlib all but the plots."""
    from designer.files import write_all
    from designer.views.figure import MISSING, installed
    from designer.views.weighed_files import NAMES, contents

    plots = installed()
    written, files = contents(found, str(folder), plots)
    write_all(folder, written, retire=NAMES)
    if not plots and found.frontiers:
        output.note(MISSING)
    return files


def register(app: typer.Typer) -> None:
    """Add the command."""
    app.command(epilog=EPILOG, short_help="What must give, and at what price.")(weigh)
