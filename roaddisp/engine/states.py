"""The distinct weather states among the hours of a run.

Concentration is linear in line strength and in 1/wind speed, so what a receptor
sees of a link depends on an hour only through the wind direction, the stability
and the lid. Hours that share these share one response.
"""

from __future__ import annotations

import numpy as np

from roaddisp.constants import CALM_DIRECTION_STEP
from roaddisp.model import CalmRule, FloatArray, IntArray, LidStates, WeatherHours, WeatherStates

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
        same stability share them.

    Returns
    -------
    WeatherStates
    """
    ordinary = np.flatnonzero(~weather.calm & ~weather.missing)
    calm = np.flatnonzero(weather.calm & ~weather.missing)
    if calms == "leave-out":
        calm = calm[:0]

    states, state_of = _distinct(weather.wind_from[ordinary], weather.stability[ordinary])
    of_hour = np.full(weather.calm.size, -1, dtype=np.int64)
    of_hour[ordinary] = state_of
    airs, air_of = _distinct(weather.stability[calm])
    every = np.concatenate([states, _in_every_direction(airs)])
    return WeatherStates(
        wind_from=every[:, 0],
        stability=every[:, 1].astype(np.int64),
        of_hour=of_hour,
        calm_hours=calm,
        calm_first=len(states) + air_of * DIRECTIONS,
        directions=DIRECTIONS,
        lids=_lid_states(weather, ordinary, calm),
    )


def _lid_states(weather: WeatherHours, ordinary: IntArray, calm: IntArray) -> LidStates:
    lid = weather.mixing_height
    under, calm_under = ordinary[np.isfinite(lid[ordinary])], np.isfinite(lid[calm])
    states, state_of = _distinct(weather.wind_from[under], weather.stability[under], lid[under])
    of_hour = np.full(lid.size, -1, dtype=np.int64)
    of_hour[under] = state_of
    chosen = calm[calm_under]
    airs, air_of = _distinct(weather.stability[chosen], lid[chosen])
    calm_first = np.full(calm.size, -1, dtype=np.int64)
    calm_first[calm_under] = len(states) + air_of * DIRECTIONS
    every = np.concatenate([states, _in_every_direction(airs)])
    return LidStates(
        wind_from=every[:, 0],
        stability=every[:, 1].astype(np.int64),
        mixing_height=every[:, 2],
        of_hour=of_hour,
        calm_first=calm_first,
    )


def _in_every_direction(airs: FloatArray) -> FloatArray:
    """Put each row (N, M) under every direction tried: (N DIRECTIONS, M + 1)."""
    tried = np.tile(np.arange(DIRECTIONS) * CALM_DIRECTION_STEP, len(airs))
    return np.column_stack([tried, np.repeat(airs, DIRECTIONS, axis=0)])


def _distinct(*columns: FloatArray | IntArray) -> tuple[FloatArray, IntArray]:
    """Return the distinct rows (N, M) and, for each input row, which one it is."""
    rows = np.column_stack([np.asarray(column, dtype=np.float64) for column in columns])
    if len(rows) == 0:
        return rows, np.zeros(0, dtype=np.int64)
    distinct, index = np.unique(rows, axis=0, return_inverse=True)
    return distinct, index.reshape(-1).astype(np.int64)
