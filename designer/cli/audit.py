"""`designer audit`: any payment table against every demand."""

from __future__ import annotations

from fractions import Fraction
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from designer.cli import options
from designer.cli.output import IMPOSSIBLE, POSSIBLE, Output, command

if TYPE_CHECKING:
    from designer.auditing import Audit
    from designer.demands.terms import Terms
    from designer.setting.setting import Setting
    from designer.table import Table

EPILOG = """\b
Examples:
  designer audit scenarios/ropewalk.toml scenarios/ropewalk-draft.csv --slack 27
  designer audit scenarios/ropewalk.toml scenarios/ropewalk-draft.csv --ic none --json"""


@command
def audit(
    scenario: options.Scenario,
    table: Annotated[
        Path, typer.Argument(metavar="TABLE.csv", help="A table in the format of transfers.csv.")
    ],
    tolerance: Annotated[
        str | None,
        typer.Option(
            metavar="AMOUNT",
            help="How much may be missed; else 0, or what rounding in the file explains.",
        ),
    ] = None,
    decision: options.Decision = None,
    ic: options.Ic = None,
    ir: options.Ir = None,
    balance: options.Balance = None,
    budget: options.Budget = None,
    subsidy: options.Subsidy = None,
    slack: options.Slack = None,
    even_handed: options.EvenHanded = None,
    compel: options.Compel = None,
    rows: options.Rows = None,
    json: options.Json = False,
    quiet: options.Quiet = False,
) -> None:
    """Hold a payment table, ours or anyone's, against every demand, asked or not."""
    from designer.auditing import as_json, judge
    from designer.setting.scenario import read_scenario

    setting = read_scenario(scenario)
    terms = options.demands(
        setting,
        compel,
        decision=decision,
        ic=ic,
        ir=ir,
        balance=balance,
        budget=budget,
        subsidy=subsidy,
        slack=slack,
        even_handed=even_handed,
    ).over(setting)
    found = _audited(setting, table, terms, _amount(tolerance), free=subsidy is None)
    asked = {
        "decision": terms.decision,
        "ic": terms.ic,
        "ir": terms.ir,
        "balance": terms.balance,
        "budget": terms.budget,
    }
    failing = judge(found, asked)
    output = Output(json=json, quiet=quiet)
    if failing and (words := _posed_as(table, setting, asked)):
        output.note(f"The table was made under other demands; hold it to them with {words}")
    if json:
        output.document(
            {**as_json(found), "asked": asked, "satisfied": not failing, "failing": failing}
        )
    elif not quiet:
        from designer.views.audited import audited

        output.page(audited(found, _names(asked, found), failing, rows))
    raise typer.Exit(IMPOSSIBLE if failing else POSSIBLE)


def _audited(
    setting: Setting, path: Path, terms: Terms, tolerance: Fraction | None, free: bool
) -> Audit:
    """The audit under the terms.

    free  whether no --subsidy was given: where the scenario's goal leaves outside money
          open, the table is then held against the outside money it takes itself
    """
    from designer.holding import audit

    def held(table: Table | Path, subsidy: Fraction, tolerance: Fraction | None) -> Audit:
        return audit(
            setting,
            table,
            tolerance=tolerance,
            subsidy=subsidy,
            slack=terms.slack,
            compelled=terms.compelled,
            even_handed=terms.even_handed,
        )

    found = held(path, terms.subsidy, tolerance)
    if free and "outside-money" in terms.goals:
        taken = found.pot.least if terms.balance == "ex-post" else found.pot.expected
        return held(path, -taken, tolerance)
    return found


def _posed_as(table: Path, setting: Setting, asked: dict[str, str]) -> str:
    """The options that restore the demands a table was saved under, if they are others.

    Read from the verdict.json beside the table, where that is about the same scenario.
    """
    import json

    try:
        verdict = json.loads((table.parent / "verdict.json").read_bytes())
        if verdict["scenario"]["digest"] != setting.digest:
            return ""
        made = {key: str(verdict["demands"][key]) for key in asked}
    except (OSError, ValueError, KeyError, TypeError, RecursionError):
        return ""
    options = [f"--{key} {word}" for key, word in made.items() if word != asked[key]]
    known = all(word.replace("-", "").isalpha() for word in made.values())
    return " ".join(options) if known else ""


def _names(asked: dict[str, str], found: Audit) -> list[str]:
    """The findings the table is held to, by the names the audit gives them."""
    names = [f"decision-{asked['decision']}", "lottery", *found.limits]
    names += [f"{key}-{asked[key]}" for key in ("ic", "ir")]
    return [*names, f"balance-{asked['balance']}-{asked['budget']}"]


def _amount(written: str | None) -> Fraction | None:
    from designer.errors import Mistake, UsageError
    from designer.setting.exact import number

    if written is None:
        return None
    try:
        value = number(written)
        if value >= 0:
            return value
    except ValueError:
        pass
    raise UsageError(
        [
            Mistake(
                "--tolerance",
                repr(written[:40]),
                "an exact amount of at least 0",
                'Write 0, 0.01 or "1/100".',
            )
        ]
    )


def register(app: typer.Typer) -> None:
    """Add the command."""
    app.command(epilog=EPILOG, short_help="Any payment table against every demand.")(audit)
