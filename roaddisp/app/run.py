"""``roaddisp run``: run a study and leave its files."""

from __future__ import annotations

import json
import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from roaddisp.app.guard import NOT_MET, guarded
from roaddisp.app.options import JsonOption, StudyArgument

if TYPE_CHECKING:
    from roaddisp.engine.kept import KeptResponses
    from roaddisp.model import Study


@guarded
def command(
    study: StudyArgument,
    scenario: Annotated[
        str | None, typer.Option(metavar="NAME", help="A scenario of the study; default base.")
    ] = None,
    out: Annotated[
        Path | None,
        typer.Option(metavar="DIR", help="Where the files go; default STUDY/out."),
    ] = None,
    responses: Annotated[
        Path | None,
        typer.Option(
            metavar="FILE",
            help="Keep the responses in FILE and use them again: a run after a change of "
            "traffic, fleet, factors or background then takes a moment.",
        ),
    ] = None,
    threads: Annotated[
        int | None, typer.Option(metavar="N", min=1, help="Threads; default all processors.")
    ] = None,
    gate: Annotated[
        bool, typer.Option("--gate", help="End with 1 where a standard is not met.")
    ] = False,
    as_json: JsonOption = False,
) -> None:
    """Run a study: tables, layers, a map and the record of the run.

    Writes receptors.csv, receptors.parquet, study.gpkg, map.png and
    record.json, the hours of the receptors asked for (hourly.nc) and, with a
    grid, no2_mean_ugm3.tif.

    Example: roaddisp run examples/larch_field --out results
    """
    from roaddisp.app.summary import summary_data, summary_text
    from roaddisp.dispersion.kernel import needs_compiling
    from roaddisp.pipeline import run
    from roaddisp.study.read import read_study

    read = read_study(study)
    if needs_compiling():
        typer.echo("Compiling the inner loops, once after installation: half a minute.", err=True)
    with _progress_bar() as progress:
        kept = None if responses is None else _kept(responses, read, scenario, threads)
        result = run(read, scenario=scenario, progress=progress, responses=kept, threads=threads)
        progress("writing", 0, 1)
        written = result.write(out if out is not None else read.folder / "out")
        progress("writing", 1, 1)
    if as_json:
        answer = {**summary_data(result), "files": [str(path) for path in written]}
        typer.echo(json.dumps(answer, indent=1, ensure_ascii=False))
    else:
        typer.echo(summary_text(result))
        typer.echo(f"{len(written)} files in {written[0].parent}")
    if gate and any("no" in verdict.met for verdict in result.verdicts):
        raise typer.Exit(NOT_MET)


def _kept(file: Path, study: Study, scenario: str | None, threads: int | None) -> KeptResponses:
    """Read kept responses, or compute and keep them where there is no file yet."""
    from roaddisp.analysis.what_if import keep_responses
    from roaddisp.engine.kept_file import read_responses, write_responses

    if file.exists():
        return read_responses(file)
    kept = keep_responses(study, scenario=scenario, threads=threads)
    write_responses(kept, file)
    return kept


@contextmanager
def _progress_bar() -> Iterator[Callable[[str, int, int], None]]:
    """Show a bar on stderr while the work lasts; nothing where that is no terminal."""
    if not sys.stderr.isatty():
        yield lambda *_: None
        return
    from rich.console import Console
    from rich.progress import BarColumn, Progress, TaskID, TextColumn, TimeElapsedColumn

    columns = (TextColumn("{task.description:<28}"), BarColumn(), TimeElapsedColumn())
    with Progress(*columns, console=Console(stderr=True), transient=True) as bar:
        tasks: dict[str, TaskID] = {}

        def show(stage: str, done: int, total: int) -> None:
            if stage not in tasks:
                tasks[stage] = bar.add_task(stage, total=total)
            bar.update(tasks[stage], completed=done, total=total)

        yield show
