"""From the user's columns to arrays in SI, with every cell that cannot be taken noted."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any, Final

import numpy as np

from roaddisp.model import FloatArray
from roaddisp.quantities import (
    INSIDE,
    UNITLESS,
    UNITS,
    FromMass,
    QuantityError,
    check_unit,
    spellings,
    split_header,
    to_inside,
)
from roaddisp.study.cells import bound, is_nothing, is_number, taken
from roaddisp.study.problems import Problems, listed, nearest
from roaddisp.study.raw import RawTable, as_text, near_header
from roaddisp.study.table_types import Column, Table

_WORDS: Final = frozenset({"id", "text", "time"})
_PLAIN: Final = frozenset({"number", "integer"})
_UNKNOWN: Final = "?"


@dataclass
class ColumnMap:
    """The ``columns`` of a section: our names onto the user's headers.

    Attributes
    ----------
    ours : mapping of our name to ``"THEIRS [unit]"``
    file, place : callable
        The settings file, and where in it a key of the mapping stands.
    lenient : set of our names
        Shared by several files of the section: a header that one of them lacks
        is looked for under our own name there.
    used : set of our names found so far
    """

    ours: Mapping[str, str] = field(default_factory=dict)
    file: str = "study.toml"
    place: Callable[[str], str] = lambda _name: ""
    lenient: frozenset[str] = frozenset()
    used: set[str] = field(default_factory=set)


@dataclass(frozen=True)
class _Source:
    index: int
    unit: str | None


class TableView:
    """A raw table seen through the list of columns it may hold.

    Attributes
    ----------
    complete : bool
        Whether every required column is there, with a unit that is known.
    clean : bool
        Whether no cell taken so far was refused.
    """

    def __init__(
        self, table: RawTable, spec: Table, mapping: ColumnMap, problems: Problems
    ) -> None:
        self.table = table
        self.spec = spec
        self.problems = problems
        self.mapping = mapping
        self.complete = True
        self.clean = True
        self._sources: dict[str, _Source] = {}
        self._words: dict[str, list[str]] = {}
        for column in spec.columns:
            self._resolve(column)
        self._refuse_later()
        self._doubt_near_misses()

    def __len__(self) -> int:
        return len(self.table)

    def has(self, name: str) -> bool:
        """Whether the table has the column of our name."""
        return name in self._sources

    def header(self, name: str) -> str:
        """Name a column as the user's file does."""
        source = self._sources.get(name)
        return name if source is None else self.table.names[source.index]

    def error(self, message: str, name: str, row: int | None = None, **about: Any) -> None:
        """Note an error in a column, at a row where one is given."""
        self.clean = False
        self.problems.error(
            message, file=self.table.file, place=self.table.place(row, self.header(name)), **about
        )

    def caution(self, message: str, name: str, row: int | None = None, **about: Any) -> None:
        """Note a caution about a column, at a row where one is given."""
        self.problems.caution(
            message, file=self.table.file, place=self.table.place(row, self.header(name)), **about
        )

    # --- which header is which column ------------------------------------------

    def _resolve(self, column: Column) -> None:
        mapped = self.mapping.ours.get(column.name)
        found = self._candidates(mapped) if mapped is not None else []
        if found:
            self.mapping.used.add(column.name)
        elif mapped is None or column.name in self.mapping.lenient:
            found = self._candidates(column.name)
            mapped = None
        if not found:
            self._missing(column, mapped)
            return
        if len(found) > 1:
            self.complete = False
            self.problems.error(
                f"two columns could be {column.name!r}",
                file=self.table.file,
                place=self.table.place(),
                value=listed(self.table.names[i] for i in found),
                allowed="one",
                mend="choose one by `columns` in study.toml, written as its header",
            )
            return
        index = found[0]
        self._sources[column.name] = _Source(index, None)
        unit = self._unit(column, index, mapped)
        self._sources[column.name] = _Source(index, unit)

    def _candidates(self, wanted: str) -> list[int]:
        whole = [i for i, header in enumerate(self.table.names) if header == wanted]
        if whole:
            return whole
        name = split_header(wanted)[0]
        return [i for i, header in enumerate(self.table.names) if split_header(header)[0] == name]

    def _missing(self, column: Column, mapped: str | None) -> None:
        if mapped is not None:
            self.complete = self.complete and not column.required
            name = split_header(mapped)[0]
            self.clean = False
            self.problems.error(
                f"{self.table.file} has no column {name!r}",
                file=self.mapping.file,
                place=self.mapping.place(column.name),
                value=mapped,
                allowed=f"a column of {self.table.file}: {listed(self.table.names)}",
                mend=near_header(name, self.table),
            )
        elif column.required:
            self.complete = False
            unit = f" [{next(iter(UNITS[column.quantity]))}]" if self._needs_unit(column) else ""
            self.problems.error(
                f"the column {column.name!r} ({column.meaning}) is missing",
                file=self.table.file,
                place=self.table.place(),
                allowed=f"a column {column.name + unit!r}, or one named by `columns`",
                mend=near_header(column.name, self.table),
            )

    @staticmethod
    def _needs_unit(column: Column) -> bool:
        return column.quantity in UNITS and column.quantity not in UNITLESS

    def _unit(self, column: Column, index: int, mapped: str | None) -> str | None:
        in_header = split_header(self.table.names[index])[1]
        in_map = split_header(mapped)[1] if mapped is not None else None
        unit = in_map if in_map is not None else in_header
        if in_map is not None and in_header is not None and in_map != in_header:
            self.complete = False
            self.problems.error(
                "the header and `columns` give different units",
                file=self.mapping.file,
                place=self.mapping.place(column.name),
                value=f"{in_map}, {in_header}",
                allowed="one unit",
                mend="correct the one that is wrong",
            )
            return None
        if column.quantity in _WORDS | _PLAIN:
            if unit is not None:
                self.complete = False
                self.error(
                    "a unit in brackets where none belongs",
                    column.name,
                    value=f"[{unit}]",
                    allowed="no bracket: counts, ids, names and times have no unit",
                    mend="leave the bracket away, or look whether the column is right",
                )
            return None
        if unit is None:
            return None if self._may_lack_unit(column, index) else _UNKNOWN
        try:
            check_unit(column.quantity, unit)
        except QuantityError as error:
            self.complete = False
            self.error(
                str(error), column.name, value=f"[{unit}]", allowed=error.allowed, mend=error.mend
            )
            return _UNKNOWN
        return unit

    def _may_lack_unit(self, column: Column, index: int) -> bool:
        """Whether a column without a unit can be read: no unit needed, or one in each value."""
        cells = self.table.cells[index]
        if not self._needs_unit(column):
            return True
        if self.table.is_layer and not any(is_number(cell) for cell in cells):
            return True
        first = next((row for row, cell in enumerate(cells) if as_text(cell)), None)
        if first is None:
            return True
        self.complete = False
        theirs = self.table.names[index]
        unit = next(iter(UNITS[column.quantity]))
        ways = f'columns = {{ {column.name} = "{theirs} [{unit}]" }} in study.toml'
        if not self.table.is_layer:
            ways = f'the header "{theirs} [{unit}]", or {ways}'
        self.problems.error(
            f"numbers without a unit, where a {column.quantity} is needed",
            file=self.table.file,
            place=self.table.place(first, theirs),
            value=as_text(cells[first]),
            allowed=spellings(column.quantity),
            mend=f"give the unit by {ways}",
        )
        return False

    def _refuse_later(self) -> None:
        for column in self.spec.columns:
            if not column.later or not self.has(column.name):
                continue
            cells = self.table.cells[self._sources[column.name].index]
            rows = [row for row, cell in enumerate(cells) if not is_nothing(cell)]
            if rows:
                self.error(
                    f"not in this version: the column {column.name!r} ({column.meaning})",
                    column.name,
                    rows[0],
                    value=as_text(cells[rows[0]]),
                    allowed="empty or zero",
                    mend="leave the column out",
                    count=len(rows),
                )

    def _doubt_near_misses(self) -> None:
        in_use = {source.index for source in self._sources.values()}
        absent = [name for name in self.spec.names if not self.has(name)]
        required = {column.name for column in self.spec.columns if column.required}
        for index, header in enumerate(self.table.names):
            near = nearest(split_header(header)[0], absent) if index not in in_use else None
            if near is not None and near not in required and near not in self.mapping.ours:
                self.problems.caution(
                    "a column that is not read",
                    file=self.table.file,
                    place=self.table.place(None, header),
                    value=header,
                    allowed=f"{near!r} is read",
                    mend=f"did you mean {near!r}? (case matters)",
                )

    # --- the cells ------------------------------------------------------------

    def words(self, name: str) -> list[str]:
        """Take a column of ids, names or choices; empty where missing."""
        if name not in self._words:
            self._words[name] = self._take_words(name)
        return self._words[name]

    def _take_words(self, name: str) -> list[str]:
        column = self.spec.column(name)
        if not self.has(name):
            return [""] * len(self)
        cells = [as_text(cell) for cell in self.table.cells[self._sources[name].index]]
        bad = _Refused(self, name)
        known: dict[str, bool] = {}
        for row, cell in enumerate(cells):
            if not cell:
                if column.quantity in {"id", "time"} or (column.required and not column.empty):
                    bad.note(row, cell, "an empty cell", "a value in every row", "fill it in")
            elif column.choices and not known.setdefault(cell, cell in column.choices):
                near = nearest(cell, column.choices)
                mend = f"did you mean {near!r}?" if near else "choose one of them"
                bad.note(row, cell, f"unknown {name}", listed(column.choices), mend)
        bad.report()
        return cells

    def numbers(self, name: str, *, from_mass: FromMass | None = None) -> FloatArray:
        """Take a column of numbers in the unit kept inside; NaN where missing or refused."""
        column = self.spec.column(name)
        if not self.has(name):
            return np.full(len(self), np.nan)
        source = self._sources[name]
        cells = self.table.cells[source.index]
        bad = _Refused(self, name)
        values = np.full(len(cells), np.nan)
        by_cell = column.quantity in UNITS and source.unit is None and self._needs_unit(column)
        known: dict[str, float | QuantityError] = {}
        for row, cell in enumerate(cells):
            text = cell if isinstance(cell, str) else None
            if text is None and is_number(cell):
                values[row] = float(cell)
                if np.isinf(values[row]):
                    values[row] = np.nan
                    bad.note(row, str(cell), "not finite", "a finite number", "correct it")
                continue
            text = as_text(cell) if text is None else text
            if text not in known:
                known[text] = taken(text, column.quantity if by_cell else "", from_mass)
            answer = known[text]
            if isinstance(answer, QuantityError):
                bad.note(row, text, str(answer), answer.allowed, answer.mend)
            else:
                values[row] = answer
        if not by_cell and column.quantity in UNITS:
            if source.unit == _UNKNOWN:
                return np.full(len(cells), np.nan)
            values = to_inside(values, column.quantity, source.unit or "", from_mass=from_mass)
        self._check_range(column, cells, values, bad)
        bad.report()
        return values

    def _check_range(
        self, column: Column, cells: Sequence[Any], values: FloatArray, bad: _Refused
    ) -> None:
        inside = INSIDE.get(column.quantity, "")
        low = -np.inf if column.low is None else column.low
        high = np.inf if column.high is None else column.high
        slack = 1e-9 * max(abs(low) if np.isfinite(low) else 0.0, 1.0)
        wrong = (values < low - slack) | (values > high * (1 + 1e-9) if high > 0 else values > high)
        if column.quantity == "integer":
            wrong |= np.isfinite(values) & (values != np.round(values))
        unit = f" {inside}" if inside else ""
        whole = "a whole number, " if column.quantity == "integer" else ""
        allowed = f"{whole}{bound(low)} to {bound(high)}{unit}"
        for row in np.flatnonzero(wrong).tolist():
            mend = "correct the value"
            if inside:
                mend = "correct the value, or the unit of the column"
            found = as_text(cells[row])
            bad.note(row, found, "a value out of range", allowed, mend)
        values[wrong] = np.nan
        if column.required and not column.empty:
            for row in np.flatnonzero(np.isnan(values)).tolist():
                if not as_text(cells[row]):
                    bad.note(row, "", "an empty cell", "a value in every row", "fill it in")


class _Refused:
    """Cells of one column that were refused, gathered by what is wrong with them."""

    def __init__(self, view: TableView, name: str) -> None:
        self.view = view
        self.name = name
        self.first: dict[str, tuple[int, str, str, str]] = {}
        self.count: dict[str, int] = {}

    def note(self, row: int, value: str, message: str, allowed: str, mend: str) -> None:
        self.first.setdefault(message, (row, value, allowed, mend))
        self.count[message] = self.count.get(message, 0) + 1

    def report(self) -> None:
        for message, (row, value, allowed, mend) in self.first.items():
            self.view.error(
                message,
                self.name,
                row,
                value=value,
                allowed=allowed,
                mend=mend,
                count=self.count[message],
            )
