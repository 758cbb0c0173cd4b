"""``roaddisp inputs``: what each file of a study may hold."""

from __future__ import annotations

import typer

from roaddisp.app.guard import guarded


@guarded
def command() -> None:
    """Describe every file, key and column of a study, with units.

    Example: roaddisp inputs | less
    """
    from roaddisp.study.document import document_inputs

    typer.echo(document_inputs())
