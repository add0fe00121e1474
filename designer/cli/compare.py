"""`designer compare`: any tables of one scenario side by side."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from designer.cli import options
from designer.cli.output import POSSIBLE, Output, command

EPILOG = """\b
Examples:
  designer rules scenarios/dawn-berth.toml --save out/dawn
  designer compare scenarios/dawn-berth.toml out/dawn/pivotal.csv out/dawn/optimal-auction.csv"""


@command
def compare(
    scenario: options.Scenario,
    tables: Annotated[
        list[Path],
        typer.Argument(metavar="TABLE.csv TABLE2.csv …", help="Two tables or more."),
    ],
    decision: options.Decision = None,
    ic: options.Ic = None,
    ir: options.Ir = None,
    balance: options.Balance = None,
    budget: options.Budget = None,
    subsidy: options.Subsidy = None,
    slack: options.Slack = None,
    compel: options.Compel = None,
    json: options.Json = False,
    quiet: options.Quiet = False,
) -> None:
    """Two payment tables or more side by side: what each keeps, and who gains, who loses."""
    from designer.ruling.comparing import compare as set_side_by_side
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
        subsidy=subsidy,
        slack=slack,
    )
    found = set_side_by_side(setting, tables, demands)
    output = Output(json=json, quiet=quiet)
    if json:
        from designer.views.compared import compare_document

        output.document(compare_document(found))
    else:
        from designer.views.compared import compared

        output.page(compared(found))
    raise typer.Exit(POSSIBLE)


def register(app: typer.Typer) -> None:
    """Add the command."""
    app.command(epilog=EPILOG)(compare)
