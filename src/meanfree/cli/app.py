"""The command line put together: one line a command, each in its own file.

A command's module holds no more than its arguments at the top; what it computes with is imported
inside it, so that `--help` and `check` stay quick.
"""

from __future__ import annotations

from typing import Annotated

import typer

from meanfree.cli import (
    ceiling,
    check,
    collide,
    compare,
    equations,
    fit,
    limits,
    schedule,
    schema,
    size,
    start,
    sweep,
    window,
)
from meanfree.cli import run as predict
from meanfree.cli.errors import INTERRUPTED, report_errors

app = typer.Typer(
    name="meanfree",
    add_completion=False,
    pretty_exceptions_enable=False,
    rich_markup_mode=None,
    context_settings={"help_option_names": ["-h", "--help"]},
    help=(
        "Concentrations against time for gas-phase reactions in a closed batch vessel.\n\n"
        "A case file says what is in the vessel and how it reacts; "
        "begin with: meanfree start NAME"
    ),
)


def _version(asked: bool) -> None:
    if asked:
        from importlib.metadata import version

        typer.echo(f"meanfree {version('meanfree')}")
        raise typer.Exit


@app.callback()
def _options(
    version: Annotated[
        bool, typer.Option("--version", callback=_version, is_eager=True, help="Say which version.")
    ] = False,
) -> None:
    """Options of the program itself."""


app.command("start")(start.start)
app.command("check")(check.check)
app.command("run")(predict.run)
app.command("equations")(equations.equations)
app.command("collide")(collide.collide)
app.command("ceiling")(ceiling.ceiling)
app.command("limits")(limits.limits)
app.command("size")(size.size)
app.command("compare")(compare.compare)
app.command("fit")(fit.fit)
app.command("schedule")(schedule.schedule)
app.command("window")(window.window)
app.command("sweep")(sweep.sweep)
app.command("schema")(schema.schema)


def run(arguments: list[str]) -> int:
    """Carry out one command line and return its exit status. Prints; never raises."""
    command = typer.main.get_command(app)

    def call() -> None:
        words = arguments or ["--help"]
        status = command.main(words, prog_name="meanfree", standalone_mode=False)
        if status == INTERRUPTED:  # what typer makes of Ctrl-C
            raise KeyboardInterrupt

    names = list(getattr(command, "commands", {}))
    return report_errors(call, as_json="--json" in arguments, commands=names)
