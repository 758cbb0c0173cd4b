"""Stability class from wind, cloud, ceiling and sun (Turner 1964)."""

from __future__ import annotations

from typing import Final

import numpy as np
import numpy.typing as npt

from roaddisp.constants import FOOT, KNOT
from roaddisp.model import STABILITY_CLASSES, BoolArray, FloatArray, IntArray, TimeArray
from roaddisp.weather.sun import solar_elevation

_LOW_CEILING: Final = 7000 * FOOT
_MIDDLE_CEILING: Final = 16000 * FOOT
_SLACK: Final = 1e-6

_ROW_OF_KNOT: Final = np.array([0, 0, 1, 1, 2, 2, 3, 4, 5, 5, 6, 7, 8])
"""Row of the table for 0 to 12 knots; more than 12 takes the last."""

_CLASS_NUMBER: Final = np.array(
    [
        [1, 1, 2, 3, 4, 6, 7],
        [1, 2, 2, 3, 4, 6, 7],
        [1, 2, 3, 4, 4, 5, 6],
        [2, 2, 3, 4, 4, 5, 6],
        [2, 2, 3, 4, 4, 4, 5],
        [2, 3, 3, 4, 4, 4, 5],
        [3, 3, 4, 4, 4, 4, 5],
        [3, 3, 4, 4, 4, 4, 4],
        [3, 4, 4, 4, 4, 4, 4],
    ]
)
"""Class 1 (A) to 7 (G) by wind, down, and net radiation index 4 to -2, across."""


def turner_class(
    wind_speed: npt.ArrayLike,
    cloud_tenths: npt.ArrayLike,
    ceiling_m: npt.ArrayLike,
    solar_elevation_deg: npt.ArrayLike,
    *,
    night: npt.ArrayLike | None = None,
) -> str | npt.NDArray[np.str_]:
    """Stability class by Turner's objective method.

    Parameters
    ----------
    wind_speed : (...) [m/s]
        As measured at about 10 m, before any floor. Rounded to whole knots, half
        knots up, which reproduces every limit printed in m/s.
    cloud_tenths : (...) [tenths], 0 to 10; opaque cloud where it is reported
    ceiling_m : (...) [m]; inf for no ceiling
    solar_elevation_deg : (...) [deg]
    night : (...) bool, optional
        Turner's night, an hour before sunset to an hour after sunrise
        (`turner_night`). By default the sun at or below the horizon.

    Returns
    -------
    (...) str
        ``"A"`` to ``"F"``, the table's G merged into F; ``""`` where an argument
        is NaN. A plain str where every argument is a scalar.

    Raises
    ------
    ValueError
        Where wind or ceiling is negative, wind is infinite, or cloud is not
        within 0 to 10.

    Notes
    -----
    The table is EPA-454/R-99-005 Table 6-4, insolation Table 6-5, the index Table
    6-6. From memory: that 10/10 cloud with a ceiling at or above 7,000 ft takes
    one more off, cumulatively, and that the day's index is at least 1.

    References
    ----------
    Turner 1964, J. Appl. Meteorol. 3, 83-91.

    Examples
    --------
    >>> turner_class(2.0, 3, float("inf"), 50.0)
    'B'
    >>> turner_class([2.0, 2.0], [3, 10], [float("inf"), 600.0], [-10.0, 50.0]).tolist()
    ['F', 'D']
    """
    arguments = (wind_speed, cloud_tenths, ceiling_m, solar_elevation_deg)
    wind, cloud, ceiling, elevation = np.broadcast_arrays(
        *(np.asarray(value, dtype=np.float64) for value in arguments)
    )
    _check(wind, cloud, ceiling)
    dark = np.asarray(elevation <= 0 if night is None else night, dtype=bool)
    codes = turner_codes(wind, cloud, ceiling, elevation, night=dark)
    letters: npt.NDArray[np.str_] = np.array(["", *STABILITY_CLASSES])[codes + 1]
    return str(letters) if letters.ndim == 0 else letters


def turner_codes(
    wind_speed: FloatArray,
    cloud_tenths: FloatArray,
    ceiling_m: FloatArray,
    solar_elevation_deg: FloatArray,
    *,
    night: BoolArray,
) -> IntArray:
    """Return codes, 0 for A to 5 for F, -1 for missing; otherwise as `turner_class`.

    Parameters
    ----------
    wind_speed, cloud_tenths, ceiling_m, solar_elevation_deg, night : (...)
        Trusted to be in range.

    Returns
    -------
    (...) int

    Examples
    --------
    >>> import numpy as np
    >>> overcast = turner_codes(np.float64(1), np.float64(10), np.inf, np.float64(70), night=False)
    >>> int(overcast)  # strong sun less one for 10/10 cloud: index 3
    1
    """
    missing = (
        np.isnan(wind_speed)
        | np.isnan(cloud_tenths)
        | np.isnan(ceiling_m)
        | np.isnan(solar_elevation_deg)
    )
    knots = np.floor(np.round(np.where(missing, 0.0, wind_speed) / KNOT, 6) + 0.5)
    row = _ROW_OF_KNOT[np.minimum(knots, 12).astype(np.int64)]
    index = _net_radiation_index(cloud_tenths, ceiling_m, solar_elevation_deg, night)
    code = np.minimum(_CLASS_NUMBER[row, 4 - index], 6) - 1
    return np.where(missing, -1, code)


def _net_radiation_index(
    cloud: FloatArray, ceiling: FloatArray, elevation: FloatArray, night: BoolArray
) -> IntArray:
    overcast = cloud >= 10 - _SLACK
    low = ceiling < _LOW_CEILING - _SLACK
    middle = ~low & (ceiling < _MIDDLE_CEILING - _SLACK)
    insolation = 1 + (elevation > 15) + (elevation > 35) + (elevation > 60)
    taken_off = np.where(cloud > 5 + _SLACK, 2 * low + 1 * middle + 1 * (overcast & ~low), 0)
    by_day = np.maximum(insolation - taken_off, 1)
    by_night = np.where(cloud > 4 + _SLACK, -1, -2)
    index: IntArray = np.where(overcast & low, 0, np.where(night, by_night, by_day))
    return index


def _check(wind: FloatArray, cloud: FloatArray, ceiling: FloatArray) -> None:
    faults = (
        ("wind_speed", wind, (wind < 0) | np.isinf(wind), "0 m/s and more, finite"),
        ("cloud_tenths", cloud, (cloud < 0) | (cloud > 10 + _SLACK), "0 to 10 tenths"),
        ("ceiling_m", ceiling, ceiling < 0, "0 m and more, inf for no ceiling"),
    )
    for name, values, bad, allowed in faults:
        if np.any(bad):
            raise ValueError(f"{name} is {values[bad].flat[0]:g}; allowed: {allowed}")


def turner_night(utc: TimeArray, *, latitude: float, longitude: float) -> BoolArray:
    """Night as the method counts it: an hour before sunset to an hour after sunrise.

    Parameters
    ----------
    utc : (T,) datetime64
        Middles of the hours.
    latitude, longitude : float [deg]

    Returns
    -------
    (T,) bool
        Whether the sun is at or below the horizon then, an hour before or an
        hour after. (The first matters only where a night is shorter than two
        hours.)

    Examples
    --------
    >>> import numpy as np
    >>> hours = np.array(["2024-03-20T06:30", "2024-03-20T07:30"], dtype="datetime64[m]")
    >>> turner_night(hours, latitude=50.0, longitude=0.0)
    array([ True, False])
    """
    times: TimeArray = np.asarray(utc).astype("datetime64[m]")
    dark: BoolArray = np.zeros(times.shape, dtype=bool)
    for minutes in (-60, 0, 60):
        shifted: TimeArray = times + np.timedelta64(minutes, "m")
        dark |= solar_elevation(shifted, latitude=latitude, longitude=longitude) <= 0
    return dark
