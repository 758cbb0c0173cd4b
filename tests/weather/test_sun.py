"""Solar elevation: symmetry, limits, arguments. (Against pvlib: tests/outside.)"""

from __future__ import annotations

import numpy as np
import pytest

from roaddisp.weather.sun import solar_elevation


def test_a_turn_of_longitude_is_a_turn_of_time() -> None:
    """15 degrees east is an hour earlier, but for the hour's drift of declination."""
    noon = np.datetime64("2024-05-10T12:00", "m")
    here = solar_elevation(np.array([noon]), latitude=40.0, longitude=10.0)
    west = solar_elevation(np.array([noon + 60]), latitude=40.0, longitude=-5.0)
    assert here == pytest.approx(west, abs=0.02)


def test_polar_day_and_polar_night() -> None:
    """North of the polar circle: the sun does not set in June, nor rise in December."""
    june = np.datetime64("2024-06-21", "h") + np.arange(24)
    december = np.datetime64("2024-12-21", "h") + np.arange(24)
    assert solar_elevation(june, latitude=75.0, longitude=20.0).min() > 0
    assert solar_elevation(december, latitude=75.0, longitude=20.0).max() < 0


def test_missing_time_gives_missing_elevation() -> None:
    times = np.array(["NaT", "2024-06-21T12:00"], dtype="datetime64[m]")
    elevation = solar_elevation(times, latitude=50.0, longitude=0.0)
    assert np.isnan(elevation).tolist() == [True, False]


@pytest.mark.parametrize(("latitude", "longitude"), [(91.0, 0.0), (0.0, 400.0), (np.nan, 0.0)])
def test_impossible_places_are_refused(latitude: float, longitude: float) -> None:
    with pytest.raises(ValueError, match="allowed: latitude -90 to 90"):
        solar_elevation(
            np.array(["2024-06-21"], dtype="datetime64[D]"), latitude=latitude, longitude=longitude
        )
