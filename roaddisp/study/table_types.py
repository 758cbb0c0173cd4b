"""What a table of a study is made of: columns, and the words some of them choose from."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

from roaddisp.traffic.fleet import HEAVY_CLASSES

LAYER: Final = "GeoPackage, GeoJSON, Shapefile or FlatGeobuf"
"""The forms a vector layer may have."""

DAY_TYPES: Final = ("weekday", "saturday", "sunday")
LIGHT_CLASSES: Final = ("car", "van", "motorcycle")
CLASSES: Final = (*LIGHT_CLASSES, *HEAVY_CLASSES)


@dataclass(frozen=True)
class Column:
    """One column of a table.

    Attributes
    ----------
    quantity : str
        A quantity of `roaddisp.quantities`, or ``id``, ``text``, ``time``,
        ``number``, ``integer``.
    low, high : float, in the unit kept inside
    choices : tuple of str
        The words allowed, for a text; empty for any.
    empty : str
        What an empty cell (or a column left out) means; without it an empty
        cell is an error.
    later : bool
        A column of the contract that this version refuses where it is not zero.
    """

    name: str
    meaning: str
    quantity: str
    required: bool = False
    low: float | None = None
    high: float | None = None
    choices: tuple[str, ...] = ()
    empty: str = ""
    later: bool = False


@dataclass(frozen=True)
class Table:
    """One kind of file: its columns, and whether it is a CSV or a vector layer."""

    name: str
    meaning: str
    forms: str
    columns: tuple[Column, ...]
    geometry: str = ""

    def column(self, name: str) -> Column:
        """Find a column by our name."""
        return next(column for column in self.columns if column.name == name)

    @property
    def names(self) -> tuple[str, ...]:
        """Our names of its columns."""
        return tuple(column.name for column in self.columns)
