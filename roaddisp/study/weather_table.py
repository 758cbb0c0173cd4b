"""Weather of our own table; it also makes the axis of the run."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from roaddisp.model import STABILITY_CLASSES, Clock, FloatArray, IntArray, StationHours
from roaddisp.study.columns import TableView
from roaddisp.study.hours import TimeRules, axis_of, caution_missing, read_times
from roaddisp.study.times import standard_offset


@dataclass(frozen=True)
class Weather:
    """What a weather table gives a run.

    Attributes
    ----------
    clock : Clock
    offset : int [minutes]
        Local standard time ahead of UTC.
    first_year : int
    hours : mapping
        Fields of `StationHours` but the place.
    """

    clock: Clock
    offset: int
    first_year: int
    hours: dict[str, Any]

    def at(self, longitude: float, latitude: float) -> StationHours:
        """Take the station's hours with the place where the sun is reckoned."""
        return StationHours(**self.hours, latitude=latitude, longitude=longitude)


def read_weather(view: TableView, rules: TimeRules) -> Weather | None:
    """Lay a weather table on its own axis; None where a row was refused."""
    columns = {
        name: view.numbers(name)
        for name in (
            "wind_from",
            "wind_speed",
            "temperature",
            "cloud",
            "ceiling",
            "mixing_height",
            "pressure",
        )
    }
    letters = view.words("stability")
    _check_sky(view)
    instants = read_times(view, rules)
    if not view.complete or not instants.first_year:
        return None
    offset = standard_offset(rules.zone, instants.first_year)
    axis = axis_of(view, instants, rules.zone, offset)
    if axis is None or not view.clean:
        return None
    clock, hour = axis
    size = clock.standard.size

    def laid(name: str, nothing: float = np.nan) -> FloatArray:
        values = np.full(size, np.nan)
        values[hour] = columns[name]
        return values if np.isnan(nothing) else np.where(np.isnan(values), nothing, values)

    by_letter = view.has("stability")
    hours = {
        "wind_from": laid("wind_from"),
        "wind_speed": laid("wind_speed"),
        "temperature": laid("temperature"),
        "stability": _codes(letters, hour, size) if by_letter else None,
        "cloud": None if by_letter else laid("cloud"),
        "ceiling": None if by_letter else laid("ceiling", np.inf),
        "mixing_height": laid("mixing_height", np.inf),
        "pressure": laid("pressure"),
    }
    weather = Weather(clock, offset, instants.first_year, hours)
    _caution(view, weather, hour)
    return weather


def _check_sky(view: TableView) -> None:
    if view.has("stability") or view.has("cloud"):
        if view.has("stability") and view.has("cloud"):
            view.caution(
                "stability is given: the cloud column is not used",
                "cloud",
                mend="leave out stability to derive it from cloud",
            )
        return
    view.complete = False
    if not view.clean and view.has("solar"):
        return
    view.problems.error(
        "neither stability nor cloud is given",
        file=view.table.file,
        place=view.table.place(),
        allowed="a column 'stability' (A to F), or 'cloud [tenths]' with 'ceiling [m]'",
        mend="add one of them",
    )


def _codes(letters: list[str], hour: IntArray, size: int) -> IntArray:
    codes = np.full(size, -1, dtype=np.int64)
    codes[hour] = [STABILITY_CLASSES.find(letter) if letter else -1 for letter in letters]
    return codes


def _caution(view: TableView, weather: Weather, hour: IntArray) -> None:
    clock, hours = weather.clock, weather.hours
    absent = np.ones(clock.standard.size, dtype=bool)
    absent[hour] = False
    caution_missing(view, clock, absent, "a row")
    for name in ("wind_speed", "temperature", "stability", "cloud"):
        values = hours[name]
        if values is not None:
            missing = values < 0 if name == "stability" else np.isnan(values)
            caution_missing(view, clock, missing & ~absent, name, name)
    direction = np.isnan(hours["wind_from"]) & ~absent & (hours["wind_speed"] >= 1.0)
    caution_missing(view, clock, direction, "wind_from, with wind of 1 m/s or more,", "wind_from")
