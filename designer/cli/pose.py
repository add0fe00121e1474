"""`designer pose`: the main job, from a scenario to a verdict."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from designer.cli import options
from designer.cli.output import (
    IMPOSSIBLE,
    POSSIBLE,
    UNBOUNDED,
    UNDECIDED,
    Output,
    Progress,
    command,
)
from designer.setting.vocabulary import TIDY

if TYPE_CHECKING:
    from designer.verdict import Verdict

CODES = {
    "possible": POSSIBLE,
    "impossible": IMPOSSIBLE,
    "unbounded": UNBOUNDED,
    "undecided": UNDECIDED,
}

EPILOG = """\b
Examples:
  designer pose scenarios/breakwater.toml --ir none --goal floor,swing
  designer pose scenarios/dawn-berth.toml --json --save out/dawn-berth"""


@command
def pose(
    scenario: options.Scenario,
    decision: options.Decision = None,
    ic: options.Ic = None,
    ir: options.Ir = None,
    balance: options.Balance = None,
    budget: options.Budget = None,
    goal: options.Goal = None,
    subsidy: options.Subsidy = None,
    slack: options.Slack = None,
    even_handed: options.EvenHanded = None,
    compel: options.Compel = None,
    tidy: Annotated[
        str | None,
        typer.Option(
            metavar="|".join(TIDY),
            help="Among the best tables: the smallest largest payment, or any.",
        ),
    ] = None,
    engine: Annotated[
        str, typer.Option(metavar="highs|pulp:NAME", help="Who gives the hint that is proved.")
    ] = "highs",
    time_limit: Annotated[
        float | None, typer.Option(metavar="SECONDS", min=0, help="Stop then: undecided.")
    ] = None,
    save: Annotated[
        Path | None,
        typer.Option(metavar="DIR", help="Write tables, verdict and proof, all or nothing."),
    ] = None,
    export: Annotated[
        Path | None,
        typer.Option(metavar="FILE", help="Write the program as well: FILE.mps or FILE.lp."),
    ] = None,
    path: Annotated[
        str | None,
        typer.Option(metavar="NAME", help="Take this road; see --why-path."),
    ] = None,
    why_path: Annotated[
        bool,
        typer.Option("--why-path", help="List the roads and why each does or does not apply."),
    ] = False,
    rows_up_to: Annotated[
        int,
        typer.Option(metavar="N", min=0, help="Cases up to which --save writes the table out."),
    ] = 200_000,
    rows: options.Rows = None,
    json: options.Json = False,
    quiet: options.Quiet = False,
    progress: options.ShowProgress = None,
) -> None:
    """Find the best payment table that does all that is asked, or prove that none does."""
    from designer.setting.scenario import read_scenario

    setting = read_scenario(scenario)
    demands = options.demands(
        setting,
        compel,
        decision=decision,
        ic=ic,
        ir=ir,
        balance=balance,
        budget=budget,
        goal=goal,
        subsidy=subsidy,
        slack=slack,
        tidy=tidy,
        even_handed=even_handed,
    )
    output = Output(json=json, quiet=quiet)
    if why_path:
        _tell_roads(setting, demands, path, output, json)
    if export is not None:
        _export(setting, demands, export)
        output.note(f"Program written to {export}.")
    verdict = _posed(setting, demands, engine, time_limit, path, Progress(progress))
    files = _save(verdict, save, rows_up_to, output)
    if json:
        from designer.views.documents import verdict_document

        output.document(verdict_document(verdict, files))
    elif not quiet:
        from designer.views.screen import screen

        output.page(screen(verdict, rows))
    if files:
        output.note(f"Saved in {save}: {', '.join(Path(path).name for path in files.values())}.")
    raise typer.Exit(CODES[verdict.status])


def _posed(
    setting: Any,
    demands: Any,
    engine: str,
    time_limit: float | None,
    path: str | None,
    progress: Progress,
) -> Verdict:
    from designer.posing import pose

    with progress:
        return pose(
            setting,
            demands,
            engine=engine,
            time_limit=time_limit,
            progress=progress,
            path=path,
        )


def _tell_roads(setting: Any, demands: Any, path: str | None, output: Output, json: bool) -> None:
    """Print the roads and stop: nothing is posed."""
    from designer.roads.registry import choose
    from designer.views.roads import roads, roads_document

    choice = choose(setting, demands.over(setting), path)
    if json:
        output.document(roads_document(setting, choice))
    else:
        output.page(roads(choice))
    raise typer.Exit(POSSIBLE)


def _save(verdict: Verdict, folder: Path | None, rows_up_to: int, output: Output) -> dict[str, str]:
    """Save, unless Ctrl-C cut the work short: then the folder keeps what it had."""
    if folder is None:
        return {}
    if verdict.status == "undecided" and verdict.reason.startswith("interrupted"):
        output.note(f"Interrupted: {folder} is left as it was.")
        return {}
    from designer.saving import planned, save
    from designer.views.documents import verdict_document

    files = planned(verdict, folder, rows_up_to)
    return save(verdict, folder, verdict_document(verdict, files), rows_up_to)


def _export(setting: Any, demands: Any, path: Path) -> None:
    """The program of the first goal, each row and column under a name made of its label."""
    from designer.demands.formulate import formulate
    from designer.engines.export import export
    from designer.views.labels import axis_names

    program = formulate(setting, demands.over(setting))
    rows, columns = axis_names(program.row_axis), axis_names(program.column_axis)
    export(program.stage(0), rows, columns, path)


def register(app: typer.Typer) -> None:
    """Add the command."""
    app.command(epilog=EPILOG, short_help="The main job: demands to a proved verdict.")(pose)
