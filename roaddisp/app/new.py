"""``roaddisp new``: start a study."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from roaddisp.app.guard import guarded


@guarded
def command(
    folder: Annotated[
        Path,
        typer.Argument(metavar="DIR", help="A folder, new or empty.", show_default=False),
    ],
) -> None:
    """Write a small study that runs as it is, to be changed into your own.

    Its place and data are invented, and say so.

    Example: roaddisp new my-study && roaddisp run my-study
    """
    from roaddisp.study.new import new_study

    written = new_study(folder)
    for path in written:
        typer.echo(path)
    typer.echo(f"Next: roaddisp run {folder}", err=True)
