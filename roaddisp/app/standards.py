"""``roaddisp standards``: the standards built in."""

from __future__ import annotations

import json

import typer

from roaddisp.app.guard import guarded
from roaddisp.app.options import JsonOption


@guarded
def command(as_json: JsonOption = False) -> None:
    """List the air-quality standards built in, with form, limit and source.

    Example: roaddisp standards
    """
    from roaddisp.standards.rules import standards

    rules = list(standards().values())
    if as_json:
        answer = {rule.name: rule.description() for rule in rules}
        typer.echo(json.dumps(answer, indent=1, ensure_ascii=False))
        return
    for rule in rules:
        typer.secho(rule.name, bold=True)
        for label, text in rule.description().items():
            typer.echo(f"  {label}: {text}")
