"""The engine against the plain integral, hour by hour.

Expected values come from `unit_concentration`, which tests/outside checks
against adaptive quadrature, and from sums written out here.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from roaddisp.dispersion.reference import unit_concentration
from roaddisp.engine.hours import Conversion, hours
from roaddisp.engine.kept import keep, link_means, regrouped
from roaddisp.engine.responses import responses
from roaddisp.engine.states import DIRECTIONS, weather_states
from roaddisp.model import (
    STABILITY_CLASSES,
    Background,
    LinkStrengths,
    Receptors,
    Segments,
    WeatherHours,
)

HOURS = 12
CALM = [2, 7]
MISSING = [5]


@pytest.fixture
def segments() -> Segments:
    ends = np.array([[[0.0, 0.0], [300.0, 40.0]], [[300.0, 40.0], [420.0, 260.0]]])
    return Segments(
        ends=ends,
        link=np.array([0, 1]),
        weight=np.ones(2),
        sigma_y0=np.full(2, 3.0),
        piece=ends,
        near=np.zeros(2),
        far=np.full(2, np.inf),
    )


@pytest.fixture
def strengths() -> LinkStrengths:
    rng = np.random.default_rng(3)
    return LinkStrengths(
        amplitude=np.array([[4e-4, 2e-4], [5e-5, 6e-5]]),
        group=np.array([1, 0]),
        shape=np.repeat(rng.uniform(0.2, 2.0, (1, 2, HOURS)), 2, axis=0),
        wind_height=np.array([2.0, 2.4]),
        release_height=np.array([1.6, 2.3]),
        sigma_z0=np.array([1.5, 2.1]),
    )


@pytest.fixture
def weather() -> WeatherHours:
    rng = np.random.default_rng(4)
    calm = np.isin(np.arange(HOURS), CALM)
    missing = np.isin(np.arange(HOURS), MISSING)
    wind_from = rng.choice(np.arange(0.0, 360.0, 10.0), HOURS)
    wind_from[calm | missing] = np.nan
    return WeatherHours(
        wind_from=wind_from,
        wind_speed=rng.uniform(1.0, 5.0, (2, HOURS)),
        stability=rng.integers(0, 6, HOURS),
        mixing_height=np.where(np.arange(HOURS) % 2 == 0, np.inf, 120.0),
        calm=calm,
        missing=missing,
        raised=np.zeros(HOURS, dtype=bool),
        counts={},
    )


@pytest.fixture
def background() -> Background:
    rng = np.random.default_rng(5)
    return Background(o3=rng.uniform(1, 40, HOURS), no2=rng.uniform(2, 20, HOURS), no=None)


@pytest.fixture
def receptors() -> Receptors:
    x = np.array([40.0, 260.0, 350.0, 700.0, 120.0])
    y = np.array([30.0, -15.0, 160.0, 400.0, 14.0])
    none = ("",) * x.size
    return Receptors(
        receptor=tuple("abcde"),
        site=none,
        kind=none,
        x=x,
        y=y,
        z=np.array([1.5, 1.5, 4.0, 1.5, 0.0]),
        longitude=x * 0,
        latitude=y * 0,
        on_road=np.zeros(x.size, dtype=bool),
        grid=None,
        cell=np.full((x.size, 2), -1),
    )


def plain_hour(
    segments: Segments,
    strengths: LinkStrengths,
    receptors: Receptors,
    hour: int,
    *,
    wind_from: float,
    wind_speed: np.ndarray,
    weather: WeatherHours,
) -> np.ndarray:
    """Sum the links of one hour by the reference integral: (K, R) [ug/m3].

    A strip's spread lies across its line; the plume gets its part across the wind.
    """
    total = np.zeros((2, len(receptors)))
    for link in range(2):
        group = strengths.group[link]
        along = np.diff(segments.ends[link], axis=0)[0]
        downwind = -np.array([np.sin(np.radians(wind_from)), np.cos(np.radians(wind_from))])
        across = abs(along @ downwind) / np.hypot(*along)
        seen = unit_concentration(
            receptors.xyz,
            segments.ends[link : link + 1],
            wind_from=wind_from,
            wind_speed=float(wind_speed[group]),
            stability=STABILITY_CLASSES[weather.stability[hour]],
            height=strengths.release_height[link],
            sigma_z0=strengths.sigma_z0[link],
            sigma_y0=segments.sigma_y0[link] * across,
            mixing_height=weather.mixing_height[hour],
        )[:, 0]
        strength = strengths.amplitude[:, link] * strengths.shape[:, group, hour]
        total += 1e6 * strength[:, None] * seen
    return total


@pytest.mark.parametrize("calms", ["both", "leave-out"])
def test_hours_are_the_integral_hour_by_hour(
    segments: Segments,
    strengths: LinkStrengths,
    weather: WeatherHours,
    background: Background,
    receptors: Receptors,
    calms: str,
) -> None:
    """States are a saving, not a method: every hour equals its own integral (fast path: 1e-3)."""
    states = weather_states(weather, calms=calms)  # type: ignore[arg-type]
    tables = responses(segments, strengths, receptors, states, terrain="open")
    conversion = Conversion("ozone-limited", 1.8804)
    (block,) = hours(tables, strengths, weather, background, conversion)
    for hour in range(HOURS):
        if hour in CALM + MISSING:
            assert np.isnan(block.nox_road_ugm3[:, hour]).all()
            continue
        nox, primary = plain_hour(
            segments,
            strengths,
            receptors,
            hour,
            wind_from=weather.wind_from[hour],
            wind_speed=weather.wind_speed[:, hour],
            weather=weather,
        )
        scale = nox.max()
        np.testing.assert_allclose(block.nox_road_ugm3[:, hour], nox, rtol=1e-3, atol=1e-5 * scale)
        nox, primary = nox / 1.8804, primary / 1.8804
        no2 = primary + np.minimum(nox - primary, background.o3[hour]) + background.no2[hour]
        np.testing.assert_allclose(block.no2_ppb[:, hour], no2, rtol=1e-3)
    assert (block.worst is None) == (calms == "leave-out")


def test_a_calm_hour_runs_in_the_direction_that_makes_most_no2(
    segments: Segments,
    strengths: LinkStrengths,
    weather: WeatherHours,
    background: Background,
    receptors: Receptors,
) -> None:
    """Every 2 degrees, 1 m/s at the plume, chosen by NO2 for each receptor and hour."""
    states = weather_states(weather, calms="both")
    tables = responses(segments, strengths, receptors, states, terrain="open")
    (block,) = hours(tables, strengths, weather, background, Conversion("ozone-limited", 1.8804))
    worst = block.worst
    assert worst is not None
    assert worst.hours.tolist() == CALM
    for place, hour in enumerate(CALM):
        tried = np.array(
            [
                plain_hour(
                    segments,
                    strengths,
                    receptors,
                    hour,
                    wind_from=direction,
                    wind_speed=np.ones(2),
                    weather=weather,
                )
                for direction in np.arange(0.0, 360.0, 2.0)
            ]
        )
        nox, primary = tried[:, 0] / 1.8804, tried[:, 1] / 1.8804
        no2 = primary + np.minimum(nox - primary, background.o3[hour]) + background.no2[hour]
        np.testing.assert_allclose(worst.no2_ppb[:, place], no2.max(axis=0), rtol=1e-3)


def test_states_are_distinct_and_shared(weather: WeatherHours) -> None:
    states = weather_states(weather, calms="both")
    rows = np.column_stack([states.wind_from, states.stability])
    ordinary = rows[: states.calm_first.min()]
    assert len(np.unique(ordinary, axis=0)) == len(ordinary)
    for hour in np.flatnonzero(~weather.calm & ~weather.missing):
        own = (weather.wind_from[hour], weather.stability[hour])
        assert tuple(rows[states.of_hour[hour]]) == own
    assert states.directions == DIRECTIONS == 180
    assert (states.of_hour[weather.calm | weather.missing] == -1).all()


def test_a_lid_is_no_state_of_its_own(weather: WeatherHours) -> None:
    """Every hour has another lid; the states stay those of direction and class."""
    lids = 100.0 + np.arange(HOURS)
    under = weather_states(replace(weather, mixing_height=lids), calms="both")
    free = weather_states(replace(weather, mixing_height=np.full(HOURS, np.inf)), calms="both")
    assert len(under) == len(free)
    blowing = ~weather.calm & ~weather.missing
    np.testing.assert_array_equal(
        under.lids.mixing_height[under.lids.of_hour[blowing]], lids[blowing]
    )
    assert len(free.lids.wind_from) == 0
    assert (free.lids.of_hour == -1).all()


def test_a_week_of_hourly_lids_is_the_integral_hour_by_hour(
    segments: Segments, strengths: LinkStrengths, receptors: Receptors
) -> None:
    """Lids low enough to be felt within a kilometre in unstable air, another each hour."""
    hours_of_week, rng = 168, np.random.default_rng(11)
    none = np.zeros(hours_of_week, dtype=bool)
    week = WeatherHours(
        wind_from=rng.choice(np.arange(0.0, 360.0, 10.0), hours_of_week),
        wind_speed=rng.uniform(1.0, 5.0, (2, hours_of_week)),
        stability=rng.integers(0, 6, hours_of_week),
        mixing_height=rng.uniform(60.0, 900.0, hours_of_week),
        calm=none,
        missing=none,
        raised=none,
        counts={},
    )
    shape = rng.uniform(0.2, 2.0, (1, 2, hours_of_week))
    weekly = replace(strengths, shape=np.repeat(shape, 2, axis=0))
    air = Background(o3=np.full(hours_of_week, 20.0), no2=np.full(hours_of_week, 5.0), no=None)
    states = weather_states(week, calms="leave-out")
    tables = list(responses(segments, weekly, receptors, states, terrain="open"))
    felt = tables[0].lid_row >= 0
    assert 0 < felt.sum() < felt.size, "some lids are felt and some are not"
    assert len(states) < 216
    (block,) = hours(tables, weekly, week, air, Conversion("ozone-limited", 1.8804))
    for hour in range(hours_of_week):
        nox = plain_hour(
            segments,
            weekly,
            receptors,
            hour,
            wind_from=week.wind_from[hour],
            wind_speed=week.wind_speed[:, hour],
            weather=week,
        )[0]
        np.testing.assert_allclose(
            block.nox_road_ugm3[:, hour], nox, rtol=1e-3, atol=1e-5 * nox.max()
        )
    kept = keep(
        segments,
        weekly,
        receptors,
        states,
        chosen=tuple(range(len(receptors))),
        terrain="open",
        calms_at=np.ones(len(receptors), dtype=bool),
        group=None,
    )
    tables = regrouped(kept, weekly)
    (again,) = hours(tables, weekly, week, air, Conversion("ozone-limited", 1.8804))
    np.testing.assert_allclose(again.nox_road_ugm3, block.nox_road_ugm3, rtol=2e-5, atol=1e-9)
    shares = 1e6 * link_means(kept, weekly, week)[0].sum(axis=0)
    np.testing.assert_allclose(shares, block.nox_road_ugm3.mean(axis=1), rtol=1e-5)
