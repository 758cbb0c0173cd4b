"""How a command ends: exit codes and what is said on the way out.

0 done; 1 a standard is not met, where asked to gate on it; 2 bad input;
3 a fault of roaddisp's own; 130 stopped by the user.
"""

from __future__ import annotations

import functools
import os
import traceback
from collections.abc import Callable
from typing import ParamSpec

import typer

from roaddisp.errors import NotYetError, OutputError, StudyError

P = ParamSpec("P")

NOT_MET = 1
BAD_INPUT = 2
OUR_FAULT = 3
STOPPED = 130


def guarded(command: Callable[P, None]) -> Callable[P, None]:
    """Turn what a command raises into a message on stderr and an exit code."""

    @functools.wraps(command)
    def wrapper(*args: P.args, **kwargs: P.kwargs) -> None:
        try:
            command(*args, **kwargs)
        except StudyError as error:
            from roaddisp.app.listing import list_problems

            list_problems(error.problems)
            raise typer.Exit(BAD_INPUT) from error
        except (NotYetError, OutputError) as error:
            typer.echo(f"roaddisp: {error}", err=True)
            raise typer.Exit(BAD_INPUT) from error
        except KeyboardInterrupt as error:
            typer.echo("roaddisp: stopped; nothing was written.", err=True)
            raise typer.Exit(STOPPED) from error
        except typer.Exit:
            raise
        except Exception as error:
            if os.environ.get("ROADDISP_TRACEBACK"):
                traceback.print_exc()
            typer.echo(
                f"roaddisp: a fault of ours, not of your study: {type(error).__name__}: {error}. "
                "Set ROADDISP_TRACEBACK=1 to see where, and report it with the study's record.",
                err=True,
            )
            raise typer.Exit(OUR_FAULT) from error

    return wrapper
