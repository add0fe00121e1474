"""`designer rules`: the classic rules, audited and set beside the optimum."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from designer.cli import options
from designer.cli.output import POSSIBLE, Output, Progress, command

if TYPE_CHECKING:
    from designer.ruling.report import RulesReport

EPILOG = """\b
Examples:
  designer rules scenarios/breakwater.toml
  designer rules scenarios/lock-sale.toml --only posted-price --only second-best --json"""


def _names(incomplete: str) -> list[str]:
    from designer.ruling.registry import RULES

    return [name for name in RULES if name.startswith(incomplete)]


@command
def rules(
    scenario: options.Scenario,
    only: Annotated[
        list[str] | None,
        typer.Option(
            metavar="NAME[,NAME…]",
            help="These rules; may be repeated.",
            autocompletion=_names,
        ),
    ] = None,
    decision: options.Decision = None,
    ic: options.Ic = None,
    ir: options.Ir = None,
    balance: options.Balance = None,
    budget: options.Budget = None,
    goal: options.Goal = None,
    subsidy: options.Subsidy = None,
    slack: options.Slack = None,
    compel: options.Compel = None,
    optimum: Annotated[
        bool, typer.Option("--optimum/--no-optimum", help="Pose the scenario as well, or not.")
    ] = True,
    time_limit: Annotated[
        float | None, typer.Option(metavar="SECONDS", min=0, help="Stop looking for the optimum.")
    ] = None,
    save: Annotated[
        Path | None,
        typer.Option(metavar="DIR", help="Write every rule's table, and the document."),
    ] = None,
    json: options.Json = False,
    quiet: options.Quiet = False,
    progress: options.ShowProgress = None,
) -> None:
    """Why not simply use the textbook rule? What each classic rule keeps, costs and breaks."""
    from designer.ruling.report import rules as report_on
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
    )
    output = Output(json=json, quiet=quiet)
    shown = Progress(progress)
    try:
        report = report_on(
            setting,
            [name.strip() for names in only for name in names.split(",")] if only else None,
            demands,
            optimum=optimum,
            time_limit=time_limit,
            progress=shown,
        )
    finally:
        shown.close()
    files = _save(report, save) if save else {}
    if json:
        from designer.views.ruled import rules_document

        output.document(rules_document(report, files))
    else:
        from designer.views.ruled import ruled

        output.page(ruled(report))
    if files:
        output.note(f"Saved in {save}: {', '.join(Path(path).name for path in files.values())}.")
    raise typer.Exit(POSSIBLE)


def _save(report: RulesReport, folder: Path) -> dict[str, str]:
    """Write all or nothing: a table per rule that applies, the optimum's, and the document."""
    import json

    from designer.files import Content, write_all
    from designer.ruling.registry import RULES
    from designer.tablefile import transfers_csv
    from designer.views.ruled import rules_document

    tables = {result.name: result.table for result in report.results}
    if report.optimum is not None:
        tables["optimum"] = report.optimum.table
    contents: dict[str, Content] = {
        f"{name}.csv": transfers_csv(table, report.setting)
        for name, table in tables.items()
        if table is not None
    }
    files = {name.removesuffix(".csv"): str(folder / name) for name in contents}
    files["rules"] = str(folder / "rules.json")
    document = rules_document(report, files)
    contents["rules.json"] = json.dumps(document, indent=2, ensure_ascii=False) + "\n"
    retire = [*(f"{name}.csv" for name in (*RULES, "optimum")), "rules.json"]
    write_all(folder, contents, retire=retire)
    return files


def register(app: typer.Typer) -> None:
    """Add the command."""
    app.command(epilog=EPILOG)(rules)
