"""Broken tables: traffic, fleet, weather, air and receptors."""

from __future__ import annotations

from collections.abc import Callable
from functools import partial
from operator import methodcaller
from typing import Any, NamedTuple

import pytest


class Broken(NamedTuple):
    """How a good study is broken, and parts of the problem it must give."""

    how: Callable[[Any], None]
    file: str
    message: str
    place: str = ""
    value: str = ""
    allowed: str = ""
    mend: str = ""
    count: int = 1


def both(*ways: Callable[[Any], None]) -> Callable[[Any], None]:
    def how(study: Any) -> None:
        for way in ways:
            way(study)

    return how


toml = partial(methodcaller, "toml")
edit = partial(methodcaller, "edit")
write = partial(methodcaller, "write")
cells = partial(methodcaller, "cells")
swap_rows = partial(methodcaller, "swap_rows")
bytes_of = partial(methodcaller, "bytes_of")

COUNTS = "link,time,vehicles\nmain,2023-03-01T00:00,900\n"

BROKEN = {
    "shares of a day that do not sum to 1": Broken(
        cells("profiles.csv", slice(3, 4), 3, "0.05"), "profiles.csv",
        "profile 'town', all: the shares do not sum to 1", "row 1, line 2, column 'share'",
        "1.0083", "1 within 0.001", "divide each share by the sum",
    ),
    "an hour of the day twice": Broken(
        cells("profiles.csv", slice(3, 4), 2, "2"), "profiles.csv",
        "profile 'town', all: an hour stands twice", "row 4, line 5, column 'hour'", "2",
    ),
    "an hour beyond the day": Broken(
        cells("profiles.csv", slice(23, 24), 2, "24"), "profiles.csv", "a value out of range",
        "row 24, line 25, column 'hour'", "24", "a whole number, 0 to 23",
    ),
    "an unknown day type": Broken(
        cells("profiles.csv", slice(0, None), 1, "Weekday"), "profiles.csv", "unknown day_type",
        "row 1, line 2, column 'day_type'", "Weekday", "all, weekday, saturday, sunday",
        "did you mean 'weekday'?", 24,
    ),
    "days that no profile has": Broken(
        cells("profiles.csv", slice(0, None), 1, "weekday"), "profiles.csv",
        "profile 'town' has no rows for a saturday in month 1", allowed="every day of the year",
    ),
    "a day factor whose mean is not 1": Broken(
        bytes_of("profiles.csv", lambda b: b.replace(b"share\n", b"share,day_factor\n")
                 .replace(b"0.041667\n", b"0.041667,1.1\n")),
        "profiles.csv", "profile 'town': the mean of day_factor over 2023 is not 1",
        "column 'day_factor'", "1.1000", "0.99 to 1.01",
    ),
    "shares of a fleet that do not sum to 1": Broken(
        edit("mix.csv", "0.85", "0.75"), "mix.csv", "fleet 'town': the shares do not sum to 1",
        "row 1, line 2, column 'share'", "0.9", "1 within 0.001",
    ),
    "shares in percent without saying so": Broken(
        edit("mix.csv", "0.85", "85"), "mix.csv", "a value out of range", "row 1, line 2", "85",
        "0 to 1",
    ),
    "a class of one's own without a group": Broken(
        edit("factors.csv", "rigid_truck,30", "tram_bus,30"), "factors.csv",
        "class 'tram_bus' is not one of ours and declares no group", "row 5, line 6", "tram_bus",
        "light or heavy", "add the column 'group'",
    ),
    "factors in an unknown unit": Broken(
        edit("factors.csv", "nox [g/km]", "nox [lb/mi]"), "factors.csv",
        "'lb/mi' is not a unit of emission factor", "column 'nox [lb/mi]'", "[lb/mi]",
        "g/km, mg/km, g/mi",
    ),
    "factors without a unit": Broken(
        edit("factors.csv", "nox [g/km]", "nox"), "factors.csv", "numbers without a unit",
        "row 1, line 2, column 'nox'", "0.40", "g/km, mg/km, g/mi", 'the header "nox [g/km]"',
    ),
    "a column missing": Broken(
        edit("factors.csv", "no2_fraction", "f_no2"), "factors.csv",
        "the column 'no2_fraction'", allowed="'no2_fraction'",
        mend="the columns there are: vehicle_class",
    ),
    "a count of an unknown link": Broken(
        both(toml('profiles = "profiles.csv"', 'profiles = "profiles.csv"\ncounts = "counts.csv"'),
             write("counts.csv", COUNTS.replace("main,", "mian,"))),
        "counts.csv", "an unknown link", "row 1, line 2, column 'link'", "mian", "main, side",
        "did you mean 'main'?",
    ),
    "a negative count": Broken(
        both(toml('profiles = "profiles.csv"', 'profiles = "profiles.csv"\ncounts = "counts.csv"'),
             write("counts.csv", COUNTS.replace("900", "-9"))),
        "counts.csv", "a value out of range", "row 1, line 2, column 'vehicles'", "-9",
        "0 to 100000",
    ),
    "a direction beyond the circle": Broken(
        cells("weather.csv", slice(4, 5), 1, "370"), "weather.csv", "a value out of range",
        "row 5, line 6, column 'wind_from [deg]'", "370", "0 to 360 deg",
    ),
    "wind that is no number": Broken(
        cells("weather.csv", slice(4, 7), 2, "NaN"), "weather.csv", "not a number",
        "row 5, line 6, column 'wind_speed [m/s]'", "NaN", "a finite decimal number",
        "leave the place empty", 3,
    ),
    "wind that is infinite": Broken(
        cells("weather.csv", slice(4, 5), 2, "inf"), "weather.csv", "not a number", "row 5",
        "inf",
    ),
    "wind with a decimal comma": Broken(
        cells("weather.csv", slice(4, 5), 2, '"1,5"'), "weather.csv", "not a number", "row 5",
        "1,5", mend="decimal point",
    ),
    "wind of no gale": Broken(
        cells("weather.csv", slice(0, None), 2, "180"), "weather.csv", "a value out of range",
        "row 1", "180", "0 to 75 m/s", "unit of the column", 48,
    ),
    "temperature in another unit": Broken(
        cells("weather.csv", slice(0, None), 3, "283.4"), "weather.csv", "a value out of range",
        "row 1, line 2, column 'temperature [degC]'", "283.4", "180 to 340 K", count=48,
    ),
    "an unknown class": Broken(
        cells("weather.csv", slice(9, 10), 4, "G"), "weather.csv", "unknown stability",
        "row 10, line 11", "G", "A, B, C, D, E, F",
    ),
    "neither class nor cloud": Broken(
        bytes_of("weather.csv", lambda b: b.replace(b"stability", b"letter")), "weather.csv",
        "neither stability nor cloud is given", allowed="'stability'",
    ),
    "a time that cannot be read": Broken(
        cells("weather.csv", slice(4, 5), 0, "01.03.2023 04:00"), "weather.csv",
        "a time that cannot be read", "row 5, line 6, column 'time'", "01.03.2023 04:00",
        "ISO 8601",
    ),
    "a time within the hour": Broken(
        cells("weather.csv", slice(4, 5), 0, "2023-03-01T04:30"), "weather.csv",
        "not on the whole hour", "row 5, line 6", "2023-03-01T04:30",
    ),
    "an hour twice": Broken(
        cells("weather.csv", slice(4, 5), 0, "2023-03-01T03:00"), "weather.csv",
        "an hour that stands twice", "row 5, line 6, column 'time'", "2023-03-01T03:00",
    ),
    "hours out of order": Broken(
        swap_rows("weather.csv", 5), "weather.csv", "a time earlier than the row above it",
        "row 6, line 7, column 'time'", "2023-03-01T04:00", "order of time",
    ),
    "a year mistyped": Broken(
        cells("weather.csv", slice(47, 48), 0, "2123-03-02T23:00"), "weather.csv",
        "hours from the first row to the last", "row 48", "2123-03-02T23:00", "at most",
    ),
    "an hour that spring skips": Broken(
        both(toml('file = "weather.csv"\nclock = "standard"', 'file = "weather.csv"'),
             cells("weather.csv", slice(47, 48), 0, "2023-03-26T02:00")),
        "weather.csv", "a local time that does not exist", "row 48, line 49, column 'time'",
        "2023-03-26T02:00", mend='clock = "standard"',
    ),
    "ozone in ppm that says ppb": Broken(
        cells("air.csv", slice(0, None), 1, "0.031"), "air.csv", "ozone in the wrong unit",
        "row 1, line 2, column 'o3 [ppb]'", "0.031 ppb", mend="o3 [ppm]",
    ),
    "ozone in ppb that says ppm": Broken(
        edit("air.csv", "o3 [ppb]", "o3 [ppm]"), "air.csv", "a value out of range",
        "row 1, line 2, column 'o3 [ppm]'", "20.5", "-5 to 1000 ppb", "unit of the column", 48,
    ),
    "NO2 far below zero": Broken(
        cells("air.csv", slice(2, 3), 2, "-9.9"), "air.csv", "a value out of range",
        "row 3, line 4, column 'no2 [ppb]'", "-9.9", "-5 to 2000 ppb",
    ),
    "air of another year": Broken(
        bytes_of("air.csv", lambda b: b.replace(b"2023-", b"2022-")), "air.csv",
        "no row lies in the hours of the weather", "row 1", "2022-03-01T00:00",
        "2023-03-01T00:00 to 2023-03-02T23:00",
    ),
    "a receptor twice": Broken(
        edit("points.csv", "gate,", "yard,"), "points.csv", "an id that stands twice",
        "row 2, line 3, column 'receptor'", "yard", "unique", "row 1 has it too",
    ),
    "an unknown kind": Broken(
        edit("points.csv", "playground", "Playground"), "points.csv", "unknown kind",
        "row 1, line 2, column 'kind'", "Playground", "classroom, playground",
        "did you mean 'playground'?",
    ),
    "points without a place": Broken(
        edit("points.csv", "x [m],y [m]", "east [m],north [m]"), "points.csv",
        "the points give no place", allowed="'longitude' and 'latitude'",
    ),
    "a latitude beyond the pole": Broken(
        write("points.csv", "receptor,longitude,latitude\nyard,13.3,95\n"),
        "points.csv", "a value out of range", "row 1, line 2, column 'latitude'", "95",
        "-90 to 90",
    ),
    "an empty id": Broken(
        edit("points.csv", "gate,", ","), "points.csv", "an empty cell",
        "row 2, line 3, column 'receptor'",
    ),
}  # fmt: skip


@pytest.mark.parametrize("name", BROKEN)
def test_broken_study_gives_its_message(study: Any, name: str) -> None:
    """The fault is named with file, place, value, what is allowed and the mend."""
    broken = BROKEN[name]
    broken.how(study)
    study.must_say(**broken._asdict())
