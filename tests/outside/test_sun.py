"""Solar elevation against pvlib's full ephemeris and facts of the calendar."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pvlib
import pytest

from roaddisp.weather.sun import solar_elevation

MAXIMUM_OBLIQUITY = 23.44


def test_within_a_tenth_of_a_degree_of_pvlib() -> None:
    """pvlib, Solar Position Algorithm of Reda & Andreas 2004, geometric elevation."""
    rng = np.random.default_rng(20240320)
    start = np.datetime64("1985-01-01T00:00", "m")
    span = int((np.datetime64("2045-01-01T00:00", "m") - start) / np.timedelta64(1, "m"))
    for _ in range(60):
        latitude, longitude = rng.uniform(-89, 89), rng.uniform(-180, 180)
        times = np.sort(start + rng.integers(0, span, 40).astype("timedelta64[m]"))
        expected = pvlib.solarposition.get_solarposition(
            pd.DatetimeIndex(times, tz="UTC"), latitude, longitude, method="nrel_numpy"
        )["elevation"].to_numpy()
        ours = solar_elevation(times, latitude=latitude, longitude=longitude)
        assert np.abs(ours - expected).max() < 0.1


@pytest.mark.parametrize("latitude", [-35.0, 0.0, 12.5, 51.5, 66.0])
@pytest.mark.parametrize(
    ("date", "longitude", "declination"),
    # Almanac: equinoxes of 2023 on 20 March 21:24 and 23 September 06:50 UTC, solstices
    # on 21 June 14:58 and 22 December 03:27; the longitudes have their noon then.
    [
        ("2023-03-20", -141.0, 0.0),
        ("2023-09-23", 77.5, 0.0),
        ("2023-06-21", -44.5, MAXIMUM_OBLIQUITY),
        ("2023-12-22", 128.25, -MAXIMUM_OBLIQUITY),
    ],
)
def test_noon_at_equinox_and_solstice(
    latitude: float, date: str, longitude: float, declination: float
) -> None:
    """Noon elevation = 90 - abs(latitude - declination), a fact of astronomy.

    Steps of 10 s find a noon near the zenith within 0.02 degree.
    """
    times = np.datetime64(date, "s") + np.arange(0, 86400, 10)
    highest = solar_elevation(times, latitude=latitude, longitude=longitude).max()
    assert highest == pytest.approx(90 - abs(latitude - declination), abs=0.025)
