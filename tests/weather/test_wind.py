"""The wind at the plume, calms and missing hours."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from roaddisp.model import Clock, StationHours, WeatherHours
from roaddisp.weather.wind import calm_hours, plume_wind, weather_hours

NAN = np.nan
RELEASE = {
    "terrain": "open",
    "anemometer_height": 10.0,
    "plume_heights": np.array([2.0]),
    "wind_height": "release",
    "wind_floor": 1.0,
}


def at_plume(speed: list[float], code: int, **changes: object) -> list[float]:
    codes = np.full(len(speed), code)
    return plume_wind(np.array(speed), codes, **(RELEASE | changes))[0].tolist()  # type: ignore[arg-type]


def test_in_class_f_the_floor_binds_below_2_4() -> None:
    """Design section 5: (2/10) ** 0.55 = 0.4126, and 1 / 0.4126 = 2.424 m/s at 10 m."""
    assert at_plume([2.42, 2.43], 5) == pytest.approx([1.0, 1.0026], abs=2e-4)


@pytest.mark.parametrize(
    ("terrain", "factors"),
    # 0.2 ** p for Irwin's exponents (EPA-454/R-99-005 sec. 6.2.5, from memory):
    # open .07 .07 .10 .15 .35 .55, urban .15 .15 .20 .25 .30 .30
    [
        ("open", [0.8934, 0.8934, 0.8513, 0.7855, 0.5693, 0.4126]),
        ("urban", [0.7855, 0.7855, 0.7248, 0.6687, 0.6170, 0.6170]),
    ],
)
def test_power_law_by_class(terrain: str, factors: list[float]) -> None:
    for code, factor in enumerate(factors):
        assert at_plume([10.0], code, terrain=terrain)[0] == pytest.approx(10 * factor, abs=1e-3)


def test_order_of_the_steps() -> None:
    """0.6 m/s in D: raised to 1, then 0.7855 at 2 m, then the floor.

    Floored last, 0.5 lets 0.7855 stand; were 1 m/s taken at the plume it would not.
    """
    assert at_plume([0.6], 3, wind_floor=0.5) == pytest.approx([0.7855], abs=1e-4)
    assert at_plume([0.6], 3, wind_floor=0.9) == [0.9]
    assert at_plume([0.6, 4.0], 3, wind_height="station") == [1.0, 4.0]


def test_each_group_has_its_height() -> None:
    wind = plume_wind(
        np.array([10.0]), np.array([3]), **(RELEASE | {"plume_heights": np.array([2.0, 3.4])})
    )
    assert wind[:, 0] == pytest.approx([10 * 0.2**0.15, 10 * 0.34**0.15])


def test_missing_speed_or_class_is_missing() -> None:
    wind = plume_wind(np.array([NAN, 3.0]), np.array([3, -1]), **RELEASE)
    assert np.isnan(wind).all()


@pytest.mark.parametrize(
    "changes", [{"wind_floor": 0.0}, {"anemometer_height": -1.0}, {"plume_heights": np.zeros(1)}]
)
def test_heights_and_floor_are_above_zero(changes: dict[str, object]) -> None:
    with pytest.raises(ValueError, match="allowed: above 0"):
        at_plume([3.0], 3, **changes)


@given(speed=st.floats(0, 40), code=st.integers(0, 5), floor=st.floats(0.1, 3))
def test_never_below_the_floor_nor_above_the_station(speed: float, code: int, floor: float) -> None:
    wind = at_plume([speed], code, wind_floor=floor)[0]
    assert floor <= wind <= max(speed, 1.0, floor)


@pytest.mark.parametrize(
    ("speed", "direction", "calm"),
    [
        (0.49, 90.0, True),
        (0.5, 90.0, False),
        (0.99, NAN, True),
        (1.0, NAN, False),
        (NAN, 90.0, False),
        (0.0, NAN, True),
    ],
)
def test_what_is_calm(speed: float, direction: float, calm: bool) -> None:
    found = calm_hours(np.array([speed]), np.array([direction]), calm_threshold=0.5)
    assert found.tolist() == [calm]


HOURS = np.datetime64("2024-05-14T00:00", "m") + np.arange(8) * np.timedelta64(60, "m")
CLOCK = Clock(HOURS, HOURS, utc_offset=0.0, timezone="UTC")
STATION = StationHours(
    #                  below 1   calm  calm  gone  gone  gone  360   plain
    wind_speed=np.array([0.8, 0.3, 0.7, 2.0, NAN, 3.0, 4.0, 2.0]),
    wind_from=np.array([90.0, 45.0, NAN, NAN, 10.0, 20.0, 360.0, 123.0]),
    temperature=np.full(8, 288.15),
    stability=np.array([3, 5, 4, 3, 3, -1, 3, 5]),
    cloud=None,
    ceiling=None,
    mixing_height=np.full(8, np.inf),
    pressure=np.full(8, NAN),
    latitude=50.0,
    longitude=0.0,
)


def weather(station: StationHours, **changes: object) -> WeatherHours:
    clock = changes.pop("clock", CLOCK)
    return weather_hours(station, clock, calm_threshold=0.5, **(RELEASE | changes))  # type: ignore[arg-type]


def test_hours_are_sorted_into_calm_missing_and_blowing() -> None:
    made = weather(STATION)
    assert np.flatnonzero(made.calm).tolist() == [1, 2]
    assert np.flatnonzero(made.missing).tolist() == [3, 4, 5]
    assert made.stability.tolist() == [3, 5, 4, -1, -1, -1, 3, 5]
    assert made.wind_from[[0, 6, 7]].tolist() == [90.0, 0.0, 123.0]
    assert np.isnan(made.wind_from[1:6]).all()
    assert made.wind_speed[0, 1:3].tolist() == [1.0, 1.0]
    assert np.isnan(made.wind_speed[0, 3:6]).all()
    # 0.7855 and 2 x 0.4126 m/s at 2 m are raised; 4 x 0.7855 stands
    assert made.wind_speed[0, [0, 6, 7]] == pytest.approx([1.0, 3.142, 1.0], abs=1e-3)


def test_every_step_is_counted() -> None:
    assert dict(weather(STATION).counts) == {
        "hours": 8,
        "missing": 3,
        "calm": 2,
        "below_1_m_s": 1,
        "raised_to_floor": 2,
        "class_A": 0,
        "class_B": 0,
        "class_C": 0,
        "class_D": 2,
        "class_E": 1,
        "class_F": 2,
    }


def test_calm_without_a_class_is_missing() -> None:
    stability = np.full(8, -1)
    made = weather(replace(STATION, stability=stability))
    assert made.missing.all()
    assert not made.calm.any()


def test_class_comes_from_the_measured_wind_and_the_sun_at_mid_hour() -> None:
    """0.6 m/s is 1 kt; on a clear equinox at the equator, longitude 0.

    At 09:30 UTC the sun stands at 51 degrees (index 3): 1 kt gives A, the 2 kt of a wind
    raised to 1 m/s would give B. At 06:30 it is within an hour of sunrise (about 06:05):
    night, F. At 07:30, 21 degrees: slight, B. At 17:30 within an hour of sunset: night.
    At 11:30, 80 degrees, under 10/10 at 300 m: D.
    """
    hours = np.array(
        [f"2024-03-20T{hour:02d}:00" for hour in (6, 7, 9, 11, 17)], dtype="datetime64[m]"
    )
    station = StationHours(
        wind_speed=np.full(5, 0.6),
        wind_from=np.full(5, 200.0),
        temperature=np.full(5, 300.0),
        stability=None,
        cloud=np.array([0.0, 0.0, 0.0, 10.0, 0.0]),
        ceiling=np.array([np.inf, np.inf, np.inf, 300.0, np.inf]),
        mixing_height=np.full(5, np.inf),
        pressure=np.full(5, NAN),
        latitude=0.0,
        longitude=0.0,
    )
    clock = Clock(hours, hours, utc_offset=0.0, timezone="UTC")
    assert weather(station, clock=clock).stability.tolist() == [5, 1, 0, 3, 5]


def test_local_standard_time_is_brought_to_utc() -> None:
    """The same sun at longitude -105 on a clock seven hours behind."""
    hours = np.array(["2024-03-20T09:00"], dtype="datetime64[m]")
    station = StationHours(
        wind_speed=np.array([0.6]),
        wind_from=np.array([200.0]),
        temperature=np.array([300.0]),
        stability=None,
        cloud=np.array([0.0]),
        ceiling=np.array([np.inf]),
        mixing_height=np.array([np.inf]),
        pressure=np.array([NAN]),
        latitude=0.0,
        longitude=-105.0,
    )
    clock = Clock(hours, hours, utc_offset=-7.0, timezone="America/Denver")
    assert weather(station, clock=clock).stability.tolist() == [0]


def test_empty_cloud_is_a_missing_hour() -> None:
    station = replace(
        STATION,
        stability=None,
        cloud=np.array([0.0, NAN, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0]),
        ceiling=np.full(8, np.inf),
    )
    assert np.flatnonzero(weather(station).missing).tolist() == [1, 3, 4]


def test_a_station_without_stability_or_cloud_is_refused() -> None:
    with pytest.raises(ValueError, match="stability, or cloud and ceiling"):
        weather(replace(STATION, stability=None))


def test_spread_directions_stay_within_half_a_step_and_even_out() -> None:
    """10-degree reports become whole half-degrees: 360 distinct, each about as often."""
    from roaddisp.weather.wind import spread_directions

    reported = np.tile(np.arange(10.0, 370.0, 10.0), 2000)
    spread = spread_directions(reported, step=10.0, seed=5)
    moved = np.mod(spread - reported + 180.0, 360.0) - 180.0
    assert np.abs(moved).max() == 4.5
    values, counts = np.unique(spread, return_counts=True)
    assert values.size == 360
    assert counts.min() > 0.7 * counts.mean()
    again = spread_directions(reported, step=10.0, seed=5)
    np.testing.assert_array_equal(spread, again)
    assert (spread != spread_directions(reported, step=10.0, seed=6)).any()
