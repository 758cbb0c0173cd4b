"""Turner's method: shapes, missing values, bad values, night. (Its table: tests/outside.)"""

from __future__ import annotations

import math

import numpy as np
import pandas as pd
import pvlib
import pytest
from hypothesis import given
from hypothesis import strategies as st

from roaddisp.weather.stability import turner_class, turner_night


def test_scalars_give_a_str_and_arrays_broadcast() -> None:
    assert type(turner_class(3.0, 0, math.inf, 40.0)) is str
    letters = turner_class([[1.0], [9.0]], [0, 10, 3], [math.inf, 300.0, math.inf], 40.0)
    assert letters.shape == (2, 3)
    assert letters.tolist() == [["B", "D", "B"], ["D", "D", "D"]]


@pytest.mark.parametrize("place", range(4))
def test_nan_gives_an_empty_letter(place: int) -> None:
    arguments: list[object] = [np.array([2.0, 2.0]), 3.0, 900.0, 40.0]
    assert turner_class(*arguments).tolist() == ["B", "B"]
    arguments[place] = np.array([np.nan, [2.0, 3.0, 900.0, 40.0][place]])
    assert turner_class(*arguments).tolist() == ["", "B"]
    assert turner_class(*[np.nan if n == place else 2.0 for n in range(4)]) == ""


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ((-0.1, 3, 900, 40), "wind_speed is -0.1"),
        ((math.inf, 3, 900, 40), "wind_speed is inf"),
        ((2, 11, 900, 40), "cloud_tenths is 11; allowed: 0 to 10 tenths"),
        ((2, [3, -1], 900, 40), "cloud_tenths is -1"),
        ((2, 3, -5, 40), "ceiling_m is -5"),
    ],
)
def test_impossible_values_are_refused(arguments: tuple[object, ...], message: str) -> None:
    with pytest.raises(ValueError, match=message):
        turner_class(*arguments)


@given(
    cloud=st.floats(0, 10),
    ceiling=st.floats(0, 20_000),
    elevation=st.floats(-60, 90),
    wind=st.floats(0, 40),
    more=st.floats(0, 10),
)
def test_more_wind_is_never_farther_from_neutral(
    cloud: float, ceiling: float, elevation: float, wind: float, more: float
) -> None:
    """Mechanical mixing drives every class towards D."""
    before = turner_class(wind, cloud, ceiling, elevation)
    after = turner_class(wind + more, cloud, ceiling, elevation)
    assert abs(ord(after) - ord("D")) <= abs(ord(before) - ord("D"))


@given(cloud=st.floats(0, 10), ceiling=st.floats(0, 20_000), wind=st.floats(0, 40))
def test_higher_sun_is_never_more_stable(cloud: float, ceiling: float, wind: float) -> None:
    elevations = [1.0, 20.0, 50.0, 80.0]
    letters = turner_class(wind, cloud, ceiling, elevations).tolist()
    assert letters == sorted(letters, reverse=True)


def test_night_reaches_an_hour_into_the_light_on_both_sides() -> None:
    """Rise and set from pvlib's full ephemeris for the centre of the sun at 0 degrees."""
    minutes = np.datetime64("2024-05-10T00:00", "m") + np.arange(24 * 60)
    height = pvlib.solarposition.get_solarposition(
        pd.DatetimeIndex(minutes, tz="UTC"), 47.0, 8.0, method="nrel_numpy"
    )["elevation"].to_numpy()
    up = np.flatnonzero(height > 0)
    night = turner_night(minutes, latitude=47.0, longitude=8.0)
    day = np.flatnonzero(~night)
    assert day[0] == pytest.approx(up[0] + 60, abs=1)
    assert day[-1] == pytest.approx(up[-1] - 60, abs=1)


def test_a_night_shorter_than_two_hours_is_night_throughout() -> None:
    """At 66.3 N in June: cos H = -tan(66.3) tan(23.44), H = 171 degrees, a night of 1.2 h."""
    minutes = np.datetime64("2024-06-20T18:00", "m") + np.arange(12 * 60)
    night = turner_night(minutes, latitude=66.3, longitude=0.0)
    changes = np.flatnonzero(np.diff(night.astype(int)))
    assert night.any()
    assert len(changes) == 2
