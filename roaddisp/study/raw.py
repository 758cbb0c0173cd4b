"""A table as the user wrote it, before anything is made of its cells."""

from __future__ import annotations

import csv
import io
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Final

import numpy as np

from roaddisp.study.files import decode
from roaddisp.study.problems import Problems, nearest

MOST_COLUMNS: Final = 4000


@dataclass(frozen=True)
class RawTable:
    """Columns of a CSV file or of a vector layer.

    Attributes
    ----------
    file : str
    layer : str
        Empty for a CSV.
    names : tuple of str
        Headers as they stand.
    cells : tuple of sequences
        By column: text from a CSV (empty where missing); text, numbers or None
        from a layer.
    lines, rows : sequence of int
        Line and number, from 0, of each row in a CSV; empty for a layer. Rows that
        could not be read are noted as problems and left out.
    geometry : object array of WKB, or None
    crs : str or None
    """

    file: str
    layer: str
    names: tuple[str, ...]
    cells: tuple[Sequence[Any], ...]
    lines: Sequence[int]
    rows: Sequence[int] = ()
    geometry: Any = None
    crs: str | None = None

    def __len__(self) -> int:
        if self.geometry is not None:
            return len(self.geometry)
        return len(self.cells[0]) if self.cells else 0

    @property
    def is_layer(self) -> bool:
        """Whether it came from a vector layer."""
        return bool(self.layer)

    def place(self, row: int | None = None, column: str = "") -> str:
        """Say where a cell is; ``row`` counts from 0, the text from 1."""
        parts = [f"layer {self.layer!r}"] if self.is_layer else []
        if row is not None and self.is_layer:
            parts.append(f"feature {row + 1}")
        elif row is not None:
            parts.append(f"row {self.rows[row] + 1}")
            parts.append(f"line {self.lines[row]}")
        if column:
            parts.append(f"column {column!r}")
        return ", ".join(parts)


def read_csv(path: Path, name: str, problems: Problems) -> RawTable | None:
    """Read a CSV file as text; note every row that cannot be read.

    The first line that is neither empty nor begins with ``#`` is the header.
    Fields are parted by commas, quoted with ``"`` where need be.

    Returns
    -------
    RawTable or None
        None where no row can be trusted.
    """
    try:
        content = path.read_bytes()
    except OSError as error:
        problems.error(f"the file cannot be read ({error.strerror})", file=name)
        return None
    text = decode(content, problems, name)
    if text is None:
        return None
    skipped, body = _skip_notes(text)
    reader = csv.reader(io.StringIO(body, newline=""), strict=True)
    columns: list[list[str]] = []
    lines: list[int] = []
    rows: list[int] = []
    ragged: list[tuple[int, int, int]] = []
    header: list[str] = []
    known: dict[str, str] = {}
    try:
        header = [cell.strip() for cell in next(reader, [])]
        if not _header_fits(header, name, skipped + 1, problems):
            return None
        columns = [[] for _ in header]
        for cells in reader:
            if not cells or not any(cells):
                continue
            line = reader.line_num + skipped
            if len(cells) != len(header):
                ragged.append((len(lines) + len(ragged), line, len(cells)))
                continue
            rows.append(len(lines) + len(ragged))
            lines.append(line)
            for column, cell in zip(columns, cells, strict=True):
                column.append(known.setdefault(cell, cell))
    except csv.Error as error:
        problems.error(
            f"the rows cannot be parted into cells ({error})",
            file=name,
            place=f"line {reader.line_num + skipped}",
            allowed='cells parted by commas, with " around a cell that holds a comma',
            mend="look for a quotation mark that is not closed, or whether the file is cut short",
        )
        return None
    if ragged:
        row, line, found = ragged[0]
        problems.error(
            "a row has not as many cells as the header",
            file=name,
            place=f"row {row + 1}, line {line}",
            value=f"{found} cells",
            allowed=f"{len(header)} cells",
            mend="look for a missing or a decimal comma, or whether the file is cut short",
            count=len(ragged),
        )
        if not lines:
            return None
    if not lines:
        problems.error(
            "the table has a header and no rows",
            file=name,
            allowed="at least one row",
            mend="look whether the file was copied whole",
        )
        return None
    return RawTable(name, "", tuple(header), tuple(columns), lines, rows)


def _skip_notes(text: str) -> tuple[int, str]:
    """Leave out the notes above the header; say how many lines they are."""
    start = skipped = 0
    while start < len(text):
        end = text.find("\n", start)
        line = text[start : end if end >= 0 else len(text)]
        if line.strip() and not line.lstrip().startswith("#"):
            break
        skipped += 1
        start = end + 1 if end >= 0 else len(text)
    return skipped, text[start:]


def _header_fits(header: list[str], name: str, line: int, problems: Problems) -> bool:
    place = f"header, line {line}"
    if not any(header):
        problems.error("the file has no header", file=name, allowed="a header and rows below it")
        return False
    for mark, called in ((";", "semicolons"), ("\t", "tabs"), ("|", "bars")):
        if len(header) == 1 and mark in header[0]:
            problems.error(
                f"the cells are parted by {called}",
                file=name,
                place=place,
                value=header[0],
                allowed="commas",
                mend="save the table with commas (and points in its decimals)",
            )
            return False
    if len(header) > MOST_COLUMNS:
        problems.error(
            "too many columns",
            file=name,
            place=place,
            value=f"{len(header)}",
            allowed=f"at most {MOST_COLUMNS}",
        )
        return False
    twice = sorted({each for each in header if each and header.count(each) > 1})
    if twice:
        problems.error(
            "a header stands twice",
            file=name,
            place=place,
            value=", ".join(twice),
            allowed="each header once",
            mend="rename or delete one of the columns",
        )
        return False
    return True


def near_header(name: str, table: RawTable) -> str:
    """Suggest the header that is most like a name, or list what there is."""
    from roaddisp.quantities import split_header
    from roaddisp.study.problems import listed

    plain = [split_header(header)[0] for header in table.names]
    near = nearest(name, plain)
    if near is not None:
        return f"did you mean {table.names[plain.index(near)]!r}? (case matters)"
    return f"the columns there are: {listed(table.names)}"


def as_text(cell: Any) -> str:
    """Write a cell as text: an id may come from a layer as a number; None is empty."""
    if isinstance(cell, str):
        return cell.strip()
    if cell is None or (isinstance(cell, float | np.floating) and np.isnan(cell)):
        return ""
    if isinstance(cell, float | np.floating) and float(cell).is_integer():
        return str(int(cell))
    return str(cell).strip()
