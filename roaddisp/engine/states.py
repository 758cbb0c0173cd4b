"""The distinct weather states among the hours of a run.

Concentration is linear in line strength and in 1/wind speed, so what a receptor
sees of a link depends on an hour only through the wind direction, the stability
and the lid. Hours that share these share one response.
"""

from __future__ import annotations

import numpy as np

from roaddisp.constants import CALM_DIRECTION_STEP
from roaddisp.model import CalmRule, FloatArray, IntArray, WeatherHours, WeatherStates

DIRECTIONS = round(360.0 / CALM_DIRECTION_STEP)
"""Directions tried in a calm hour."""


def weather_states(weather: WeatherHours, *, calms: CalmRule) -> WeatherStates:
    """Gather the distinct states of the hours, and those that calm hours need.

    Parameters
    ----------
    weather : WeatherHours
        (T,) hours.
    calms : "both", "leave-out" or "worst-direction"
        Unless calm hours are left out, each calm hour gets ``DIRECTIONS``
        consecutive states, one for each direction tried; calm hours of the
        same stability and lid share them.

    Returns
    -------
    WeatherStates
    """
    ordinary = np.flatnonzero(~weather.calm & ~weather.missing)
    calm = np.flatnonzero(weather.calm & ~weather.missing)
    if calms == "leave-out":
        calm = calm[:0]

    states, state_of = _distinct(
        weather.wind_from[ordinary], weather.stability[ordinary], weather.mixing_height[ordinary]
    )
    of_hour = np.full(weather.calm.size, -1, dtype=np.int64)
    of_hour[ordinary] = state_of

    airs, air_of = _distinct(
        np.zeros(calm.size), weather.stability[calm], weather.mixing_height[calm]
    )
    tried = np.arange(DIRECTIONS) * CALM_DIRECTION_STEP
    calm_states = np.repeat(airs, DIRECTIONS, axis=0)
    calm_states[:, 0] = np.tile(tried, len(airs))

    every = np.concatenate([states, calm_states])
    return WeatherStates(
        wind_from=every[:, 0],
        stability=every[:, 1].astype(np.int64),
        mixing_height=every[:, 2],
        of_hour=of_hour,
        calm_hours=calm,
        calm_first=len(states) + air_of * DIRECTIONS,
        directions=DIRECTIONS,
    )


def _distinct(
    wind_from: FloatArray, stability: IntArray, mixing_height: FloatArray
) -> tuple[FloatArray, IntArray]:
    """Return the distinct rows (N, 3) and, for each input row, which one it is."""
    rows = np.column_stack([wind_from, stability.astype(np.float64), mixing_height])
    if len(rows) == 0:
        return rows, np.zeros(0, dtype=np.int64)
    distinct, index = np.unique(rows, axis=0, return_inverse=True)
    return distinct, index.reshape(-1).astype(np.int64)
