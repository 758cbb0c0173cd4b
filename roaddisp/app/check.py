"""``roaddisp check``: list every problem of a study."""

from __future__ import annotations

import json
from typing import TYPE_CHECKING

import typer

from roaddisp.app.guard import BAD_INPUT, guarded
from roaddisp.app.options import JsonOption, StudyArgument
from roaddisp.errors import Problem, StudyError

if TYPE_CHECKING:
    from roaddisp.model import Study


@guarded
def command(study: StudyArgument, as_json: JsonOption = False) -> None:
    """List every problem of a study at once, and what was read.

    Ends with 0 where the study can be run, 2 where it cannot.

    Example: roaddisp check examples/larch_field
    """
    from roaddisp.app.listing import as_data, list_problems
    from roaddisp.study.read import read_study

    problems: tuple[Problem, ...]
    try:
        read = read_study(study)
        problems, what = read.cautions, _what_was_read(read)
    except StudyError as error:
        problems, what = error.problems, []
    refused = any(problem.severity == "error" for problem in problems)
    if as_json:
        answer = {"fit_to_run": not refused, "problems": as_data(problems), "read": what}
        typer.echo(json.dumps(answer, indent=1, ensure_ascii=False))
    else:
        for line in what:
            typer.echo(line)
        list_problems(problems)
        if not refused:
            typer.echo("The study can be run.")
    if refused:
        raise typer.Exit(BAD_INPUT)


def _what_was_read(study: Study) -> list[str]:
    lines = [f"{study.title} ({study.path})"]
    for name, scenario in study.scenarios.items():
        clock = scenario.clock
        lines.append(
            f"  {name}: {len(scenario.network.link)} links, "
            f"{len(scenario.receptors)} receptors, {clock.standard.size} hours from "
            f"{clock.standard[0]} local standard time, standards "
            f"{', '.join(scenario.options.standards) or 'none'}"
        )
    return lines
