"""The wind at the plume, calms and missing hours."""

from __future__ import annotations

from typing import Final

import numpy as np

from roaddisp.constants import (
    CALM_PLUME_WIND,
    LEAST_MEASURED_WIND,
    SIGNIFICANT_SPEED_WITHOUT_DIRECTION,
)
from roaddisp.model import (
    STABILITY_CLASSES,
    BoolArray,
    Clock,
    FloatArray,
    IntArray,
    StationHours,
    Terrain,
    TimeArray,
    WeatherHours,
    WindHeight,
)
from roaddisp.weather.stability import turner_codes, turner_night
from roaddisp.weather.sun import solar_elevation

WIND_EXPONENT: Final[dict[Terrain, tuple[float, ...]]] = {
    "open": (0.07, 0.07, 0.10, 0.15, 0.35, 0.55),
    "urban": (0.15, 0.15, 0.20, 0.25, 0.30, 0.30),
}
"""Power-law exponents of classes A to F.

Irwin 1979, as the defaults of EPA-454/R-99-005 sec. 6.2.5 (values from memory).
"""


def plume_wind(
    wind_speed: FloatArray,
    stability: IntArray,
    *,
    terrain: Terrain,
    anemometer_height: float,
    plume_heights: FloatArray,
    wind_height: WindHeight,
    wind_floor: float,
) -> FloatArray:
    """Wind speed that each group's plume feels.

    Parameters
    ----------
    wind_speed : (T,) [m/s]
        As measured.
    stability : (T,) int codes
    terrain : "open" or "urban"
    anemometer_height : float [m]
    plume_heights : (G,) [m]
    wind_height : "release" or "station"
        ``"station"`` takes the measured height's wind as the plume's.
    wind_floor : float [m/s]

    Returns
    -------
    (G, T) [m/s], NaN where speed or stability is missing

    Raises
    ------
    ValueError
        Where a height or the floor is not above 0.

    Notes
    -----
    In this order: not below 1 m/s as measured (EPA-454/R-99-005 sec. 6.2.3); by
    the power law ``u = u_a (z / z_a) ** p`` (sec. 6.2.5) to the plume; not below
    the floor.

    Examples
    --------
    >>> import numpy as np
    >>> plume_wind(
    ...     np.array([0.6, 5.0]),
    ...     np.array([3, 3]),
    ...     terrain="open",
    ...     anemometer_height=10.0,
    ...     plume_heights=np.array([2.0]),
    ...     wind_height="release",
    ...     wind_floor=1.0,
    ... ).round(3)
    array([[1.   , 3.928]])
    """
    before_floor = _wind_before_floor(
        wind_speed, stability, terrain, anemometer_height, plume_heights, wind_height
    )
    if not wind_floor > 0:
        raise ValueError(f"wind_floor is {wind_floor:g} m/s; allowed: above 0")
    return np.maximum(before_floor, wind_floor)


def _wind_before_floor(
    wind_speed: FloatArray,
    stability: IntArray,
    terrain: Terrain,
    anemometer_height: float,
    plume_heights: FloatArray,
    wind_height: WindHeight,
) -> FloatArray:
    heights = np.asarray(plume_heights, dtype=np.float64)
    if not (anemometer_height > 0 and np.all(heights > 0)):
        raise ValueError(
            f"anemometer_height {anemometer_height:g} m and plume_heights {heights.tolist()} m; "
            "allowed: above 0"
        )
    measured = np.maximum(wind_speed, LEAST_MEASURED_WIND)
    known = np.where(np.asarray(stability) >= 0, measured, np.nan)
    if wind_height == "station":
        return np.repeat(known[None, :], heights.size, axis=0)
    exponent = np.array(WIND_EXPONENT[terrain])[stability]
    brought: FloatArray = known * (heights[:, None] / anemometer_height) ** exponent
    return brought


def calm_hours(
    wind_speed: FloatArray, wind_from: FloatArray, *, calm_threshold: float
) -> BoolArray:
    """Calm hours: below the threshold, or without direction and below 1 m/s.

    Parameters
    ----------
    wind_speed : (T,) [m/s]
    wind_from : (T,) [deg]
    calm_threshold : float [m/s]

    Returns
    -------
    (T,) bool

    Notes
    -----
    Calm is wind below the starting threshold of anemometer or vane, whichever is
    greater (EPA-454/R-99-005 sec. 6.2.3); the rule for a missing direction is a
    choice of this project.

    Examples
    --------
    >>> import numpy as np
    >>> calm_hours(np.array([0.4, 0.9, 0.9]), np.array([90, np.nan, 90]), calm_threshold=0.5)
    array([ True,  True, False])
    """
    without_direction = np.isnan(wind_from) & (wind_speed < SIGNIFICANT_SPEED_WITHOUT_DIRECTION)
    calm: BoolArray = (wind_speed < calm_threshold) | without_direction
    return calm


def spread_directions(wind_from: FloatArray, *, step: float, seed: int) -> FloatArray:
    """Spread directions that were rounded to a step evenly within it.

    Directions in steps of 10 degrees line up with straight roads or miss them: near
    a road the highest hours then differ by tens of percent from one orientation to
    the next. A draw within the step takes that accident out.

    Parameters
    ----------
    wind_from : (T,) [deg], NaN where not reported
    step : float [deg]
        The step of the reports; a direction is moved by half of it at most, in
        parts of about one degree so that few distinct directions result.
    seed : int
        Of the draw, which is the same for the same seed.

    Returns
    -------
    (T,) [deg] in [0, 360)

    Raises
    ------
    ValueError
        Where the step is not above 0.

    Examples
    --------
    >>> import numpy as np
    >>> spread_directions(np.array([0.0, 90.0, 90.0]), step=10.0, seed=1)
    array([359.5,  90.5,  92.5])
    """
    if not step > 0:
        raise ValueError(f"step is {step:g} deg; allowed: above 0")
    parts = max(round(step), 1)
    drawn = np.random.default_rng(seed).integers(0, parts, np.shape(wind_from))
    moved: FloatArray = wind_from + step * ((drawn + 0.5) / parts - 0.5)
    return np.mod(np.round(moved, 6), 360.0)


def weather_hours(
    station: StationHours,
    clock: Clock,
    *,
    terrain: Terrain,
    anemometer_height: float,
    wind_height: WindHeight,
    wind_floor: float,
    calm_threshold: float,
    plume_heights: FloatArray,
    direction_step: float = 0.0,
    direction_seed: int = 1,
) -> WeatherHours:
    """Weather of a station's hours as the engine takes it.

    Parameters
    ----------
    station : StationHours
    clock : Clock
    terrain, anemometer_height, wind_height, wind_floor
        As `plume_wind`.
    calm_threshold : float [m/s]
    plume_heights : (G,) [m]
    direction_step, direction_seed : float [deg], int
        As `spread_directions`; a step of 0 leaves directions as reported.

    Returns
    -------
    WeatherHours
        In calm hours the wind is 1 m/s at every plume, the speed at which they
        are run in the worst direction; in missing ones NaN. ``counts`` has
        ``hours``, ``missing``, ``calm``, ``below_1_m_s`` (measured wind raised to
        1 m/s), ``raised_to_floor`` (some plume's wind raised to the floor) and
        ``class_A`` to ``class_F`` (hours not missing, by class).

    Raises
    ------
    ValueError
        Where stability is neither given nor derivable, or as `plume_wind`.

    Notes
    -----
    A missing hour lacks the speed, the stability, or a direction at 1 m/s or
    more. Stability, where not given, comes from the measured wind before any
    floor and the sun at mid-hour (`turner_class`).

    Examples
    --------
    >>> import numpy as np
    >>> hours = np.array(["2024-05-14T00:00", "2024-05-14T01:00"], dtype="datetime64[m]")
    >>> station = StationHours(
    ...     wind_from=np.array([360.0, np.nan]),
    ...     wind_speed=np.array([4.0, 0.2]),
    ...     temperature=np.array([285.0, 284.0]),
    ...     stability=None,
    ...     cloud=np.array([0.0, 0.0]),
    ...     ceiling=np.array([np.inf, np.inf]),
    ...     mixing_height=np.array([np.inf, np.inf]),
    ...     pressure=np.array([np.nan, np.nan]),
    ...     latitude=50.0,
    ...     longitude=0.0,
    ... )
    >>> weather = weather_hours(
    ...     station,
    ...     Clock(hours, hours, utc_offset=0.0, timezone="UTC"),
    ...     terrain="open",
    ...     anemometer_height=10.0,
    ...     wind_height="release",
    ...     wind_floor=1.0,
    ...     calm_threshold=0.5,
    ...     plume_heights=np.array([2.0]),
    ... )
    >>> weather.stability, weather.calm, weather.wind_speed.round(2)
    (array([4, 5]), array([False,  True]), array([[2.28, 1.  ]]))
    """
    stability = _stability(station, clock.utc)
    calm = calm_hours(station.wind_speed, station.wind_from, calm_threshold=calm_threshold)
    missing = np.isnan(station.wind_speed) | (stability < 0) | (np.isnan(station.wind_from) & ~calm)
    calm &= ~missing
    blowing = ~calm & ~missing
    before_floor = _wind_before_floor(
        station.wind_speed, stability, terrain, anemometer_height, plume_heights, wind_height
    )
    wind = plume_wind(
        station.wind_speed,
        stability,
        terrain=terrain,
        anemometer_height=anemometer_height,
        plume_heights=plume_heights,
        wind_height=wind_height,
        wind_floor=wind_floor,
    )
    wind[:, calm] = CALM_PLUME_WIND
    wind[:, missing] = np.nan
    below_least = blowing & (station.wind_speed < LEAST_MEASURED_WIND)
    below_floor = blowing & (before_floor < wind_floor).any(axis=0)
    counts = {
        "hours": len(calm),
        "missing": int(missing.sum()),
        "calm": int(calm.sum()),
        "below_1_m_s": int(below_least.sum()),
        "raised_to_floor": int(below_floor.sum()),
    } | {
        f"class_{letter}": int((~missing & (stability == code)).sum())
        for code, letter in enumerate(STABILITY_CLASSES)
    }
    wind_from = np.mod(station.wind_from, 360.0)
    if direction_step > 0:
        wind_from = spread_directions(wind_from, step=direction_step, seed=direction_seed)
    return WeatherHours(
        wind_from=np.where(blowing, wind_from, np.nan),
        wind_speed=wind,
        stability=np.where(missing, -1, stability),
        mixing_height=station.mixing_height,
        calm=calm,
        missing=missing,
        raised=below_least | below_floor,
        counts=counts,
    )


def _stability(station: StationHours, utc: TimeArray) -> IntArray:
    if station.stability is not None:
        return station.stability
    if station.cloud is None or station.ceiling is None:
        raise ValueError("a station gives stability, or cloud and ceiling to derive it from")
    place = {"latitude": station.latitude, "longitude": station.longitude}
    middle = utc + np.timedelta64(30, "m")
    return turner_codes(
        station.wind_speed,
        station.cloud,
        station.ceiling,
        solar_elevation(middle, **place),
        night=turner_night(middle, **place),
    )
