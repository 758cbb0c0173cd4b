"""Problems as a person, or a program, reads them."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import asdict
from typing import Any

import typer

from roaddisp.errors import Problem


def list_problems(problems: Iterable[Problem]) -> None:
    """Print errors, then cautions, on stderr, with counts."""
    every = list(problems)
    for severity, heading in (("error", "to be mended"), ("caution", "to be aware of")):
        chosen = [problem for problem in every if problem.severity == severity]
        if not chosen:
            continue
        typer.secho(f"{len(chosen)} {heading}:", bold=True, err=True)
        for number, problem in enumerate(chosen, 1):
            typer.echo(_paragraph(number, problem), err=True)


def _paragraph(number: int, problem: Problem) -> str:
    where = ", ".join(part for part in (problem.file, problem.place) if part)
    more = f" (and {problem.count - 1} more like it)" if problem.count > 1 else ""
    lines = [f"{number:3d}. {where}", f"     {problem.message}{more}"]
    for label, text in (
        ("found", problem.value),
        ("allowed", problem.allowed),
        ("mend", problem.mend),
    ):
        if text:
            lines.append(f"     {label}: {text}")
    return "\n".join(lines)


def as_data(problems: Iterable[Problem]) -> list[dict[str, Any]]:
    """Return problems as plain data for ``--json``."""
    return [asdict(problem) for problem in problems]
