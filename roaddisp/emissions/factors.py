"""Emission factors by vehicle class and speed."""

from __future__ import annotations

import csv
from collections.abc import Sequence
from importlib.resources import files
from typing import Final

import numpy as np

from roaddisp.model import BoolArray, FactorTable, FloatArray
from roaddisp.traffic.fleet import HEAVY_CLASSES

_SLACK: Final = 1e-6
_KMH: Final = 1.0 / 3.6
_HEADER: Final = ["vehicle_class", "speed [km/h]", "nox [g/km]", "no2_fraction", "source"]


def emission_factors(
    table: FactorTable, speed: FloatArray, *, where: BoolArray | None = None
) -> tuple[FloatArray, FloatArray]:
    """Factors of every class at given speeds, within the table.

    Parameters
    ----------
    table : FactorTable
    speed : (...) [m/s]
    where : (C, ...) bool, optional
        Which are wanted; elsewhere the result is 0 and the speed need not be in
        the table.

    Returns
    -------
    nox : (C, ...) [g/km], as NO2
    no2_fraction : (C, ...)
        NaN where the speed is.

    Raises
    ------
    ValueError
        Where a speed lies outside the class's speeds by more than 1e-6 of them;
        a class with one speed allows only that one.

    Notes
    -----
    Piecewise cubic Hermite interpolation that keeps the data monotone (Fritsch &
    Carlson 1980, SIAM J. Numer. Anal. 17, 238-246), so that no factor leaves the
    range of its two neighbours.

    Examples
    --------
    >>> import numpy as np
    >>> nox, no2_fraction = emission_factors(built_in_factors(), np.array([50 / 3.6]))
    >>> float(nox[0, 0])  # car, g/km
    0.3055
    """
    speed = np.asarray(speed, dtype=np.float64)
    shape = (len(table.classes), *speed.shape)
    wanted = np.ones(shape, dtype=bool) if where is None else np.broadcast_to(where, shape)
    nox, no2_fraction = np.zeros(shape), np.zeros(shape)
    for c in range(len(table.classes)):
        here = wanted[c]
        nox[c][here], no2_fraction[c][here] = class_factors(table, c, speed[here])
    return nox, no2_fraction


def class_factors(table: FactorTable, c: int, speed: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Factors of one class; otherwise as `emission_factors`.

    Parameters
    ----------
    table : FactorTable
    c : int
        Place of the class in ``table.classes``.
    speed : (...) [m/s]

    Returns
    -------
    nox : (...) [g/km]
    no2_fraction : (...)

    Raises
    ------
    ValueError
        Where a speed lies outside the class's speeds.

    Examples
    --------
    >>> import numpy as np
    >>> nox, no2_fraction = class_factors(built_in_factors(), 3, np.array([10.0]))
    >>> float(nox[0]), float(no2_fraction[0])  # bus
    (3.09, 0.1)
    """
    at = _within(table.speed[c], np.asarray(speed, dtype=np.float64), table.classes[c])
    return (
        _interpolated(table.speed[c], table.nox[c], at),
        _interpolated(table.speed[c], table.no2_fraction[c], at),
    )


def _within(speeds: FloatArray, at: FloatArray, name: str) -> FloatArray:
    low, high = speeds[0], speeds[-1]
    outside = (at < low * (1 - _SLACK)) | (at > high * (1 + _SLACK))
    if outside.any():
        allowed = f"{low / _KMH:g}" if low == high else f"{low / _KMH:g} to {high / _KMH:g}"
        raise ValueError(
            f"speed {at[outside][0] / _KMH:g} km/h is outside the factor table of {name}; "
            f"allowed: {allowed} km/h; extend the table or change the speed"
        )
    return np.clip(at, low, high)


def _interpolated(speeds: FloatArray, values: FloatArray, at: FloatArray) -> FloatArray:
    if len(speeds) == 1:
        return np.where(np.isnan(at), np.nan, values[0])
    from scipy.interpolate import PchipInterpolator

    result: FloatArray = np.full(at.shape, np.nan)
    known = ~np.isnan(at)
    result[known] = PchipInterpolator(speeds, values)(at[known])
    return result


def built_in_factors() -> FactorTable:
    """Return the screening factors that come with the package.

    Averages of mixed driving from published tables, held constant over the
    speeds named; each row of ``data/factors.csv`` says where it comes from and
    whether it was quoted from memory. They carry no year.

    Examples
    --------
    >>> built_in_factors().classes
    ('car', 'van', 'motorcycle', 'bus', 'rigid_truck', 'articulated_truck')
    """
    text = files("roaddisp").joinpath("data/factors.csv").read_text(encoding="utf-8")
    header, *rows = csv.reader(text.splitlines())
    if header != _HEADER:
        raise RuntimeError(f"header of data/factors.csv is {header}, not {_HEADER}")
    classes = tuple(dict.fromkeys(row[0] for row in rows))
    by_class = [[row for row in rows if row[0] == name] for name in classes]
    return FactorTable(
        classes=classes,
        heavy=np.array([name in HEAVY_CLASSES for name in classes]),
        speed=tuple(_column(group, 1) * _KMH for group in by_class),
        nox=tuple(_column(group, 2) for group in by_class),
        no2_fraction=tuple(_column(group, 3) for group in by_class),
        year=None,
        built_in=True,
        sources=tuple("; ".join(dict.fromkeys(row[4] for row in group)) for group in by_class),
    )


def _column(rows: list[list[str]], number: int) -> FloatArray:
    return np.array([float(row[number]) for row in rows])


def nearest_year(years: Sequence[int], wanted: int) -> int:
    """Year of a table nearest to the one wanted; of two as near, the earlier.

    Parameters
    ----------
    years : sequence of int
    wanted : int

    Returns
    -------
    int

    Raises
    ------
    ValueError
        Where there are no years.

    Examples
    --------
    >>> nearest_year([2020, 2025, 2035], 2030)
    2025
    """
    if not years:
        raise ValueError("the factor table has no years to choose from")
    return min(years, key=lambda year: (abs(year - wanted), year))
