"""Arguments and options that several commands share."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

StudyArgument = Annotated[
    Path,
    typer.Argument(metavar="STUDY", help="A study folder, or its study.toml.", show_default=False),
]

JsonOption = Annotated[bool, typer.Option("--json", help="Answer in JSON, for a program to read.")]
