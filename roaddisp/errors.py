"""What roaddisp raises.

RoaddispError
├── StudyError (also ValueError)          the input is at fault; carries every problem
├── NotYetError (also NotImplementedError)  a part of the contract that this version lacks
└── OutputError (also OSError)            a result cannot be written where asked
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Literal

Severity = Literal["error", "caution"]


@dataclass(frozen=True)
class Problem:
    """One thing wrong, or doubtful, in what the user brought.

    Every field but ``severity`` is text meant to be read; an empty text means
    that the field does not apply.

    Attributes
    ----------
    severity : "error" or "caution"
        An error refuses the study; a caution is listed, counted and lets it run.
    file : str
        The file, as the study names it.
    place : str
        Where in it: ``"line 12, column 9"``, ``"row 40, column 'speed'"``,
        ``"layer 'roads', feature 3, column 'aadt'"``. Rows of a CSV count from
        1 below the header; features of a layer count from 1.
    value : str
        What was found there.
    allowed : str
        What would be accepted.
    mend : str
        What to do next.
    message : str
        What is wrong, in one clause.
    count : int
        How many places have this same problem; ``place`` is the first of them.
    """

    severity: Severity
    file: str
    place: str
    value: str
    allowed: str
    mend: str
    message: str
    count: int = 1

    def __str__(self) -> str:
        head = ": ".join(part for part in (self.file, self.place) if part)
        more = f" (and {self.count - 1} more like it)" if self.count > 1 else ""
        found = f" Found: {self.value}." if self.value else ""
        allowed = f" Allowed: {self.allowed}." if self.allowed else ""
        mend = f" Mend: {self.mend}." if self.mend else ""
        return f"{head}: {self.message}{more}.{found}{allowed}{mend}"


class RoaddispError(Exception):
    """Root of the errors roaddisp raises on purpose."""


class StudyError(RoaddispError, ValueError):
    """A study cannot be run as it stands.

    Attributes
    ----------
    problems : tuple of Problem
        Every problem found, errors and cautions, in the order of the files.
    """

    def __init__(self, problems: Iterable[Problem]) -> None:
        self.problems: tuple[Problem, ...] = tuple(problems)
        errors = [problem for problem in self.problems if problem.severity == "error"]
        noun = "problem" if len(errors) == 1 else "problems"
        lines = "\n".join(f"  {number}. {problem}" for number, problem in enumerate(errors, 1))
        super().__init__(f"{len(errors)} {noun} in the study:\n{lines}")


class NotYetError(RoaddispError, NotImplementedError):
    """A value or function of the contract that this version does not deliver."""


class OutputError(RoaddispError, OSError):
    """A result cannot be written where it was asked for."""
