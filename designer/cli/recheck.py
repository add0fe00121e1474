"""`designer recheck`: a saved proof, verified with no solver installed."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Any

import typer

from designer.cli import options
from designer.cli.output import IMPOSSIBLE, POSSIBLE, Output, command

EPILOG = """\b
Examples:
  designer recheck scenarios/lock-sale-proof.json
  designer recheck scenarios/lock-sale-proof.json --scenario scenarios/lock-sale.toml"""


@command
def recheck(
    proof: Annotated[Path, typer.Argument(metavar="PROOF.json", help="A saved proof.")],
    scenario: Annotated[
        Path | None,
        typer.Option(metavar="FILE", help="Also rebuild the program from this scenario."),
    ] = None,
    json: options.Json = False,
    quiet: options.Quiet = False,
) -> None:
    """Check that a saved proof is right, and that its program is the scenario's."""
    from designer.proof.document import load_document
    from designer.proof.recheck import recheck

    document = load_document(proof)
    finding = recheck(document)
    differences: list[str] = []
    if finding.holds and scenario is not None and isinstance(document, dict):
        differences = _rebuilt(scenario, document)
    title, digest = _named(document)
    compared = finding.holds and scenario is not None
    output = Output(json=json, quiet=quiet)
    if json:
        from designer.views.documents import recheck_document

        output.document(recheck_document(title, digest, finding, compared, differences))
    elif not quiet:
        from designer.views.rechecked import rechecked

        output.page(rechecked(title, finding, compared, differences))
    raise typer.Exit(POSSIBLE if finding.holds and not differences else IMPOSSIBLE)


def _rebuilt(scenario: Path, document: dict[str, Any]) -> list[str]:
    from designer.rebuilding import rebuild
    from designer.setting.scenario import read_scenario

    return rebuild(read_scenario(scenario), document)


def _named(document: object) -> tuple[str, str]:
    """The title and digest a document states, whatever else it is."""
    scenario = document.get("scenario") if isinstance(document, dict) else None
    if not isinstance(scenario, dict):
        return "", ""
    return str(scenario.get("title", ""))[:400], str(scenario.get("digest", ""))[:400]


def register(app: typer.Typer) -> None:
    """Add the command."""
    app.command(epilog=EPILOG, short_help="A saved proof, with no solver.")(recheck)
