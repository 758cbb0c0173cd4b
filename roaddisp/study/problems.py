"""The list of problems that grows while a study is read."""

from __future__ import annotations

from collections.abc import Iterable
from difflib import get_close_matches
from typing import Any

from roaddisp.errors import Problem, Severity, StudyError

_LONGEST_VALUE = 80


class Problems:
    """Problems found so far, each once, in the order they were found."""

    def __init__(self) -> None:
        self._found: dict[Problem, None] = {}

    def add(
        self,
        message: str,
        *,
        file: str = "",
        place: str = "",
        value: object = "",
        allowed: str = "",
        mend: str = "",
        severity: Severity = "error",
        count: int = 1,
    ) -> None:
        """Note a problem; the same problem noted again (by another scenario) stays one."""
        problem = Problem(
            severity, file, place, shown(value), allowed, mend, message, max(int(count), 1)
        )
        self._found.setdefault(problem, None)

    def error(self, message: str, **about: Any) -> None:
        """Note an error."""
        self.add(message, severity="error", **about)

    def caution(self, message: str, **about: Any) -> None:
        """Note a caution."""
        self.add(message, severity="caution", **about)

    @property
    def all(self) -> tuple[Problem, ...]:
        """Every problem so far."""
        return tuple(self._found)

    @property
    def errors(self) -> int:
        """How many of them are errors."""
        return sum(problem.severity == "error" for problem in self._found)

    def refuse(self) -> None:
        """Raise `StudyError` where there is an error.

        Raises
        ------
        StudyError
            With every problem, cautions too.
        """
        if self.errors:
            raise StudyError(self.all)


def shown(value: object) -> str:
    """Write a value as a message shows it: printable and not too long."""
    text = value if isinstance(value, str) else str(value)
    text = "".join(mark if mark.isprintable() else "\N{REPLACEMENT CHARACTER}" for mark in text)
    return text if len(text) <= _LONGEST_VALUE else text[: _LONGEST_VALUE - 3] + "..."


def listed(names: Iterable[str], most: int = 12) -> str:
    """Write names as a list, the first of them where there are many."""
    every = [shown(name) for name in names]
    more = f", and {len(every) - most} more" if len(every) > most else ""
    return ", ".join(every[:most]) + more


def nearest(name: str, names: Iterable[str]) -> str | None:
    """Name the entry of ``names`` that is most like ``name``, None where none is.

    >>> nearest("Speed", ["aadt", "speed"])
    'speed'
    """
    every = list(names)
    for candidate in every:
        if candidate.lower() == name.lower():
            return candidate
    close = get_close_matches(name.lower(), [each.lower() for each in every], n=1, cutoff=0.72)
    if not close:
        return None
    return next(each for each in every if each.lower() == close[0])
