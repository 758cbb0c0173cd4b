"""The command ``roaddisp``: one module a command, this one gathers them."""

from __future__ import annotations

from typing import Annotated

import typer

import roaddisp
from roaddisp.app import check, inputs, later, new, run, standards

app = typer.Typer(
    name="roaddisp",
    no_args_is_help=True,
    add_completion=False,
    pretty_exceptions_enable=False,
    context_settings={"help_option_names": ["-h", "--help"]},
    epilog="Results are model estimates: check them against local codes, the reviewing "
    "agency's current rules and licensed practice.",
)

app.command("new")(new.command)
app.command("check")(check.command)
app.command("run")(run.command)
app.command("standards")(standards.command)
app.command("inputs")(inputs.command)
later.register(app)


def _version(wanted: bool) -> None:
    if wanted:
        typer.echo(f"roaddisp {roaddisp.__version__}")
        raise typer.Exit


@app.callback()
def about(
    version: Annotated[
        bool,
        typer.Option("--version", callback=_version, is_eager=True, help="Show the version."),
    ] = False,
) -> None:
    """Compute NOx and NO2 beside roads and judge them by air-quality standards.

    Start a study with `roaddisp new DIR`, see what it lacks with
    `roaddisp check DIR`, run it with `roaddisp run DIR`.
    """


def main() -> None:
    """Run the command; the entry point of the installed script."""
    app()
