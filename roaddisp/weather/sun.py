"""Where the sun stands."""

from __future__ import annotations

import numpy as np

from roaddisp.model import FloatArray, TimeArray


def solar_elevation(utc: TimeArray, *, latitude: float, longitude: float) -> FloatArray:
    """Geometric elevation of the sun's centre, without refraction.

    Parameters
    ----------
    utc : (...) datetime64
    latitude : float [deg], north positive
    longitude : float [deg], east positive

    Returns
    -------
    (...) [deg], NaN where the time is NaT

    Raises
    ------
    ValueError
        Where latitude is beyond 90 or longitude beyond 360 degrees.

    Notes
    -----
    Low-precision position of the Astronomical Almanac, good to 0.01 degree of
    arc from 1950 to 2050. Horizontal parallax, 0.002 degree, is left out, and
    universal time stands for UTC, 0.004 degree.

    References
    ----------
    Michalsky 1988, Solar Energy 40(3), 227-235 (coefficients from memory; tested
    against an independent ephemeris).

    Examples
    --------
    >>> import numpy as np
    >>> noon = np.array(["2024-03-20T12:07"], dtype="datetime64[m]")
    >>> solar_elevation(noon, latitude=50.0, longitude=0.0).round()
    array([40.])
    """
    if not (abs(latitude) <= 90 and abs(longitude) <= 360):
        raise ValueError(
            f"latitude {latitude:g}, longitude {longitude:g}; "
            "allowed: latitude -90 to 90, longitude -360 to 360 degrees"
        )
    epoch = np.datetime64("2000-01-01T12:00", "s")
    times = np.asarray(utc).astype("datetime64[s]")
    days = (times - epoch) / np.timedelta64(1, "D")
    hour = (times - times.astype("datetime64[D]")) / np.timedelta64(1, "h")

    mean_longitude = 280.460 + 0.9856474 * days
    mean_anomaly = np.radians(357.528 + 0.9856003 * days)
    ecliptic_longitude = np.radians(
        mean_longitude + 1.915 * np.sin(mean_anomaly) + 0.020 * np.sin(2 * mean_anomaly)
    )
    obliquity = np.radians(23.439 - 4e-7 * days)
    right_ascension = np.arctan2(
        np.cos(obliquity) * np.sin(ecliptic_longitude), np.cos(ecliptic_longitude)
    )
    sin_declination = np.sin(obliquity) * np.sin(ecliptic_longitude)

    sidereal_hours = 6.697375 + 0.0657098242 * days + hour
    hour_angle = np.radians(15 * sidereal_hours + longitude) - right_ascension
    phi = np.radians(latitude)
    sin_elevation = np.sin(phi) * sin_declination + np.cos(phi) * np.cos(hour_angle) * np.sqrt(
        1 - sin_declination**2
    )
    elevation: FloatArray = np.degrees(np.arcsin(np.clip(sin_elevation, -1.0, 1.0)))
    return elevation
