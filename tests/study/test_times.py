"""Clocks: changes of summer time, offsets, hour-ending, zones off the hour."""

from __future__ import annotations

from typing import Any
from zoneinfo import ZoneInfo

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from roaddisp.study.times import NO_TIME, NOT_WHOLE, SKIPPED, UNPARSED, to_utc

BERLIN = ZoneInfo("Europe/Berlin")


def utc(cells: list[str], **how: Any) -> list[str]:
    """Bring times to UTC and write them."""
    how = {"clock": "local", "hour_ending": False, "zone": BERLIN, **how}
    instants = to_utc(cells, **how)
    assert instants.faults == []
    return [str(hour) for hour in instants.utc.astype("datetime64[m]")]


def test_autumn_hour_is_daylight_time_first() -> None:
    """29 October 2023, 03:00 CEST = 02:00 CET (EU summer-time directive 2000/84/EC)."""
    cells = ["2023-10-29T01:00", "2023-10-29T02:00", "2023-10-29T02:00", "2023-10-29T03:00"]
    assert utc(cells) == [
        "2023-10-28T23:00", "2023-10-29T00:00", "2023-10-29T01:00", "2023-10-29T02:00",
    ]  # fmt: skip


def test_autumn_hour_is_counted_for_each_link() -> None:
    cells = ["2023-10-29T02:00"] * 4
    assert utc(cells, series=["a", "b", "a", "b"]) == [
        "2023-10-29T00:00", "2023-10-29T00:00", "2023-10-29T01:00", "2023-10-29T01:00",
    ]  # fmt: skip


def test_spring_hour_does_not_exist() -> None:
    """12 March 2023, 02:00 MST = 03:00 MDT (US Energy Policy Act of 2005)."""
    denver = ZoneInfo("America/Denver")
    cells = ["2023-03-12T01:00", "2023-03-12T02:00", "2023-03-12T03:00"]
    instants = to_utc(cells, clock="local", hour_ending=False, zone=denver)
    assert instants.faults == [(1, SKIPPED)]
    assert instants.utc[1] == NO_TIME
    assert instants.utc[2] - instants.utc[0] == 60


def test_standard_clock_knows_no_summer() -> None:
    assert utc(["2023-07-01T12:00"], clock="standard") == ["2023-07-01T11:00"]
    assert utc(["2023-07-01T12:00"], clock="local") == ["2023-07-01T10:00"]
    assert utc(["2023-07-01T12:00"], clock="utc") == ["2023-07-01T12:00"]


def test_offset_in_the_time_comes_before_the_clock() -> None:
    cells = ["2023-07-01T12:00+05:30", "2023-07-01T12:00Z", "20230701T12-0700"]
    assert utc(cells, clock="utc") == ["2023-07-01T06:30", "2023-07-01T12:00", "2023-07-01T19:00"]


def test_hour_ending_is_what_the_clock_shows_at_the_end() -> None:
    """Across the autumn change the ends are 02:00 CEST, 02:00 CET and 03:00 CET."""
    cells = ["2023-10-29T02:00", "2023-10-29T02:00", "2023-10-29T03:00"]
    assert utc(cells, hour_ending=True) == [
        "2023-10-28T23:00", "2023-10-29T00:00", "2023-10-29T01:00",
    ]  # fmt: skip


def test_midnight_may_be_hour_24() -> None:
    """ISO 8601 writes the end of a day as 24:00."""
    assert utc(["2023-01-31T24:00"], clock="utc", hour_ending=True) == ["2023-01-31T23:00"]


@pytest.mark.parametrize(
    "text",
    ["2023-03-25", "25.03.2023 14:00", "2023-13-01T00:00", "2023-02-29T00:00", "2023-03-25T25:00",
     "", "2023-03-25T14:00+99:00", "2023-03-25T14:00 CET", "noon", "2023-W12-6T14:00"],
)  # fmt: skip
def test_what_is_no_time_is_refused(text: str) -> None:
    instants = to_utc([text, "2023-01-01T00:00"], clock="utc", hour_ending=False, zone=BERLIN)
    assert instants.faults == [(0, UNPARSED)]


def test_time_within_the_hour_is_refused() -> None:
    instants = to_utc(["2023-01-01T00:59"] * 2, clock="utc", hour_ending=False, zone=BERLIN)
    assert instants.faults == [(0, NOT_WHOLE), (1, NOT_WHOLE)]


@given(st.lists(st.text(max_size=25), min_size=1, max_size=5))
def test_any_text_is_a_time_or_refused(cells: list[str]) -> None:
    instants = to_utc(cells, clock="local", hour_ending=False, zone=BERLIN)
    refused = {row for row, _ in instants.faults}
    assert all((instants.utc[row] == NO_TIME) == (row in refused) for row in range(len(cells)))


@given(st.integers(0, 24 * 365 * 20), st.sampled_from(
    ["Europe/Berlin", "America/Denver", "Australia/Adelaide", "Asia/Kolkata", "Africa/Casablanca"]
))  # fmt: skip
def test_local_clock_comes_back(hour: int, name: str) -> None:
    """What the clock shows at an instant is read as that instant, or the one it repeats."""
    zone = ZoneInfo(name)
    minute = 473_385_600 // 60 + 60 * hour  # from 1985 on
    import datetime as dt

    shown = dt.datetime.fromtimestamp(minute * 60, zone).replace(tzinfo=None)
    if shown.minute:
        shown = shown.replace(minute=0)
        return
    got = to_utc([shown.isoformat()] * 2, clock="local", hour_ending=False, zone=zone).utc.tolist()
    assert minute in got


def test_half_hour_zone_takes_files_of_one_clock(study: Any) -> None:
    """Kolkata is 5:30 ahead: UTC hours begin at half past, and then all files must."""
    study.edit("study.toml", "Europe/Berlin", "Asia/Kolkata")
    study.edit("study.toml", 'file = "weather.csv"\nclock = "standard"',
               'file = "weather.csv"\nclock = "utc"')  # fmt: skip
    (problem,) = study.errors()
    assert problem.message.startswith("hours that begin at other minutes")
    assert problem.file == "air.csv"
    study.edit("study.toml", 'file = "air.csv"\nclock = "standard"',
               'file = "air.csv"\nclock = "utc"')  # fmt: skip
    clock = study.base().clock
    assert clock.utc_offset == 5.5
    assert str(clock.standard[0]) == "2023-03-01T05:30"
    assert str(clock.utc[0]) == "2023-03-01T00:00"


@pytest.mark.parametrize(
    ("zone", "start", "offset", "first"),
    [
        ("Europe/Berlin", "2023-07-01T00:00", 1.0, "2023-06-30T23:00"),
        ("Australia/Sydney", "2023-01-10T00:00", 10.0, "2023-01-09T23:00"),
        ("Europe/Dublin", "2023-07-01T00:00", 0.0, "2023-06-30T23:00"),
        ("America/Phoenix", "2023-07-01T00:00", -7.0, "2023-07-01T00:00"),
    ],
)
def test_axis_is_local_standard_time(
    study: Any, zone: str, start: str, offset: float, first: str
) -> None:
    """Standard time is the smaller offset of January and July, in either hemisphere."""
    study.edit("study.toml", "Europe/Berlin", zone)
    for name in ("weather", "air"):
        study.write(f"{name}.csv", getattr(study, name)(study.hours(48, start)))
        study.edit("study.toml", f'file = "{name}.csv"\nclock = "standard"', f'file = "{name}.csv"')
    clock = study.base().clock
    assert clock.utc_offset == offset
    assert str(clock.standard[0]) == first
    assert str(clock.civil[0]) == start
    assert np.all(np.diff(clock.standard) == np.timedelta64(60, "m"))


def test_files_of_different_clocks_meet_on_the_axis(study: Any) -> None:
    """Ozone of 00:00 UTC belongs to 01:00 standard time in Berlin."""
    study.edit("study.toml", 'file = "air.csv"\nclock = "standard"',
               'file = "air.csv"\nclock = "utc"')  # fmt: skip
    base = study.base()
    assert np.isnan(base.background.o3[0])
    assert base.background.o3[1] == 20.5
