"""The command line: one thin file per command. Nothing heavy is imported before it is needed."""

from __future__ import annotations

import sys
from collections.abc import Sequence
from typing import Any

import typer

from designer.cli import audit, compare, pose, recheck, rules, weigh
from designer.cli.output import Output, open_streams, stop_for

CUT_SHORT = 130
"""What the option parser makes of a Ctrl-C that reaches it."""

app = typer.Typer(
    name="designer",
    help="Drafts, proves, audits and rechecks payment rules for shared decisions.",
    epilog="Exit codes: 0 possible or holds; 1 impossible or does not hold; 2 bad input or "
    "usage; 3 undecided; 4 unbounded; 70 a bug of ours.",
    rich_markup_mode=None,  # plain help that starts fast and reads in any terminal
    pretty_exceptions_enable=False,
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100},
)

for command in (pose, weigh, audit, rules, compare, recheck):
    command.register(app)


@app.callback(invoke_without_command=True)
def _root(
    context: typer.Context,
    version: bool = typer.Option(False, "--version", help="Print the version and stop."),
) -> None:
    if version:
        from importlib.metadata import version as installed

        Output().line(f"designer {installed('designer')}")
        raise typer.Exit(0)
    if context.invoked_subcommand is None:
        Output(to_stderr=True).line(context.get_help())
        raise typer.Exit(2)


def main(arguments: Sequence[str] | None = None) -> None:
    """Run the command line and leave with its exit code.

    Usage errors found by the option parser are said like any other: in words on stderr, and
    as an error document on stdout under --json.
    """
    open_streams()
    words = list(sys.argv[1:] if arguments is None else arguments)
    usage_error: Any = typer.BadParameter.__mro__[2]  # the parser's ClickException
    code: Any
    try:
        code = app(words, prog_name="designer", standalone_mode=False)
    except usage_error as error:
        code = stop_for(error, "--json" in words)
    except BaseException as error:  # the parser turns Ctrl-C between commands into its own
        if isinstance(error, SystemExit):
            raise
        code = stop_for(error, "--json" in words)
    if code == CUT_SHORT:
        code = stop_for(KeyboardInterrupt(), "--json" in words)
    sys.exit(code if isinstance(code, int) else 0)
