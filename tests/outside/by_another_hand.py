"""Stability classes and NOx of single hours, worked by another hand.

Every formula is written out again from its source; nothing here imports
roaddisp. The sun is pvlib's.
"""

from __future__ import annotations

import itertools
import math
from datetime import datetime
from typing import Protocol

import numpy as np
import numpy.typing as npt

FloatArray = npt.NDArray[np.float64]


class Hours(Protocol):
    """What is needed of a station: the beginning of each hour, and its weather."""

    start: list[datetime]
    wind_speed: list[float]
    opaque_tenths: list[int]
    ceiling_m: list[float]


# --- Turner's classes ---

TURNER_ROWS = (
    # highest whole knots, class number for net radiation index 4, 3, 2, 1, 0, -1, -2
    (1, (1, 1, 2, 3, 4, 6, 7)),
    (3, (1, 2, 2, 3, 4, 6, 7)),
    (5, (1, 2, 3, 4, 4, 5, 6)),
    (6, (2, 2, 3, 4, 4, 5, 6)),
    (7, (2, 2, 3, 4, 4, 4, 5)),
    (9, (2, 3, 3, 4, 4, 4, 5)),
    (10, (3, 3, 4, 4, 4, 4, 5)),
    (11, (3, 3, 4, 4, 4, 4, 4)),
    (math.inf, (3, 4, 4, 4, 4, 4, 4)),
)
"""Turner 1964, J. Appl. Meteorol. 3, 83-91, as EPA-454/R-99-005 Table 6-4 prints it."""


def turner(
    speed: float, tenths: float, ceiling: float, sun: float, sun_before: float, sun_after: float
) -> str:
    """Class letter (G as F) from elevations [deg] at mid-hour, an hour before and after.

    Tables 6-4 to 6-6 of EPA-454/R-99-005; from memory: that cloud of 10/10 at or
    above 7,000 ft takes one more off, and that the index by day is at least 1.
    """
    feet = ceiling / 0.3048
    if tenths == 10 and feet < 7000:
        index = 0
    elif min(sun, sun_before, sun_after) <= 0:
        index = -2 if tenths <= 4 else -1
    else:
        index = 4 if sun > 60 else 3 if sun > 35 else 2 if sun > 15 else 1
        if tenths > 5:
            if feet < 7000:
                index -= 2
            elif feet < 16000:
                index -= 1
            if tenths == 10 and feet >= 7000:
                index -= 1
        index = max(index, 1)
    knots = math.floor(speed * 3600 / 1852 + 0.5)
    numbers = next(numbers for highest, numbers in TURNER_ROWS if knots <= highest)
    return "ABCDEFF"[numbers[4 - index] - 1]


def sun_elevation(
    station: Hours, latitude: float, longitude: float, *, utc_offset: float
) -> FloatArray:
    """(3, T) [deg] an hour before mid-hour, at it and after.

    By pvlib (NREL's algorithm), of the sun's centre, without refraction.
    """
    import pandas as pd
    from pvlib.solarposition import get_solarposition

    middle = pd.DatetimeIndex(station.start) + pd.Timedelta(minutes=30)
    utc = middle.tz_localize("UTC") - pd.Timedelta(hours=utc_offset)
    return np.stack(
        [
            get_solarposition(utc + pd.Timedelta(hours=shift), latitude, longitude)[
                "elevation"
            ].to_numpy()
            for shift in (-1, 0, 1)
        ]
    )


def classes(station: Hours, sun: FloatArray) -> list[str]:
    """(T,) letters; `sun` as of `sun_elevation`."""
    before, middle, after = sun
    return [
        turner(*hour)
        for hour in zip(
            station.wind_speed,
            station.opaque_tenths,
            station.ceiling_m,
            middle,
            before,
            after,
            strict=True,
        )
    ]


# --- NOx as a sum of small point plumes ---

BRIGGS_OPEN = {
    # sigma_y coefficient; sigma_z coefficient, curvature, power
    "A": (0.22, 0.20, 0.0, 0.0),
    "B": (0.16, 0.12, 0.0, 0.0),
    "C": (0.11, 0.08, 2.0e-4, -0.5),
    "D": (0.08, 0.06, 1.5e-3, -0.5),
    "E": (0.06, 0.03, 3.0e-4, -1.0),
    "F": (0.04, 0.016, 3.0e-4, -1.0),
}
"""Briggs 1973, open country, as reprinted by Gifford 1976."""

WIND_EXPONENT = {"A": 0.07, "B": 0.07, "C": 0.10, "D": 0.15, "E": 0.35, "F": 0.55}
"""Irwin 1979, rural; EPA-454/R-99-005 sec. 6.2.5 (from memory)."""


def strip_points(line: FloatArray, width: float, step: float = 1.0, strips: int = 8) -> FloatArray:
    """(N, 3): points over the travelled way, and the metres of road each stands for."""
    points = []
    for start, end in itertools.pairwise(line):
        along = end - start
        length = float(np.hypot(*along))
        count = max(math.ceil(length / step), 1)
        places = start + np.outer((np.arange(count) + 0.5) / count, along)
        across = np.array([-along[1], along[0]]) / length
        for offset in ((np.arange(strips) + 0.5) / strips - 0.5) * width:
            share = np.full((count, 1), length / count / strips)
            points.append(np.hstack([places + offset * across, share]))
    return np.vstack(points)


def nox_by_points(
    places: list[FloatArray],
    sources: list[tuple[float, float, float]],
    receptor: FloatArray,
    wind_from: float,
    wind_speed: float,
    letter: str,
) -> float:
    """NOx [ug/m3] 1.5 m above ground from a million small sources (Turner 1970 eq. 3.1)."""
    a_y, a_z, curve, power = BRIGGS_OPEN[letter]
    bearing = math.radians(wind_from)
    upwind = np.array([math.sin(bearing), math.cos(bearing)])
    total = 0.0
    for points, (strength, height, sigma_z0) in zip(places, sources, strict=True):
        away = points[:, :2] - receptor
        down = away @ upwind
        cross = away @ np.array([-upwind[1], upwind[0]])
        d, c, metres = (values[down > 0] for values in (down, cross, points[:, 2]))
        sy2 = (a_y * d) ** 2 / (1 + 1e-4 * d)
        sz2 = sigma_z0**2 + (a_z * d * (1 + curve * d) ** power) ** 2
        plume = max(height, 2.0)
        wind = max(max(wind_speed, 1.0) * (round(plume, 1) / 10) ** WIND_EXPONENT[letter], 1.0)
        vertical = np.exp(-((1.5 - height) ** 2) / (2 * sz2)) + np.exp(
            -((1.5 + height) ** 2) / (2 * sz2)
        )
        dose = metres * np.exp(-(c**2) / (2 * sy2)) * vertical / np.sqrt(sy2 * sz2)
        total += strength * float(dose.sum()) / (2 * math.pi * wind)
    return total * 1e6
