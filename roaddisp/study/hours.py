"""Hourly tables on the axis of the run: the weather makes it, the others follow."""

from __future__ import annotations

from collections.abc import Hashable, Sequence
from dataclasses import dataclass
from typing import Final
from zoneinfo import ZoneInfo

import numpy as np

from roaddisp.model import BoolArray, Clock, IntArray
from roaddisp.study.columns import TableView
from roaddisp.study.times import NO_TIME, Fault, Instants, make_clock, minutes_of, to_utc

_LONGEST_RUN: Final = 12 * 8784  # hours


@dataclass(frozen=True)
class TimeRules:
    """How the times of a table are to be read."""

    clock: str
    hour_ending: bool
    zone: ZoneInfo


def read_times(
    view: TableView,
    rules: TimeRules,
    *,
    offset: int | None = None,
    series: Sequence[Hashable] | None = None,
) -> Instants:
    """Take the column ``time`` of a table; note every time that cannot be taken."""
    cells = view.words("time")
    instants = to_utc(
        cells,
        clock=rules.clock,
        hour_ending=rules.hour_ending,
        zone=rules.zone,
        offset=offset,
        series=series,
    )
    first: dict[Fault, tuple[int, int]] = {}
    for row, fault in instants.faults:
        if cells[row]:
            at, count = first.get(fault, (row, 0))
            first[fault] = (at, count + 1)
    for fault, (row, count) in first.items():
        view.error(
            fault.message,
            "time",
            row,
            value=cells[row],
            allowed=fault.allowed,
            mend=fault.mend,
            count=count,
        )
    return instants


def check_order(
    view: TableView, utc: IntArray, series: Sequence[Hashable] | None = None, *, strict: bool
) -> bool:
    """Note times that repeat within a series and, with ``strict``, that go back."""
    cells = view.words("time")
    seen: set[tuple[Hashable, int]] = set()
    latest = NO_TIME
    repeats: list[int] = []
    back: list[int] = []
    for row, minute in enumerate(utc.tolist()):
        if minute == NO_TIME:
            continue
        key = (series[row] if series is not None else None, minute)
        if key in seen:
            repeats.append(row)
        elif strict and minute < latest:
            back.append(row)
        seen.add(key)
        latest = max(latest, minute)
    if repeats:
        view.error(
            "an hour that stands twice",
            "time",
            repeats[0],
            value=cells[repeats[0]],
            allowed="each hour once" + (" for each link and class" if series is not None else ""),
            mend="delete one of the rows; or look whether the clock in study.toml is right",
            count=len(repeats),
        )
    if back:
        view.error(
            "a time earlier than the row above it",
            "time",
            back[0],
            value=cells[back[0]],
            allowed="rows in the order of time",
            mend="sort the rows by time",
            count=len(back),
        )
    return not repeats and not back


def lines_up(view: TableView, utc: IntArray, first: int) -> bool:
    """Note times whose hours begin at other minutes than the run's."""
    off = np.flatnonzero((utc != NO_TIME) & ((utc - first) % 60 != 0))
    if off.size:
        row = int(off[0])
        view.error(
            "hours that begin at other minutes than those of the weather",
            "time",
            row,
            value=view.words("time")[row],
            allowed="hours that begin when those of the weather do",
            mend="look at the clocks in study.toml: a zone half an hour off UTC needs files in "
            "one clock",
            count=off.size,
        )
    return not off.size


def axis_of(
    view: TableView, instants: Instants, zone: ZoneInfo, offset: int
) -> tuple[Clock, IntArray] | None:
    """Make the run's axis from the first to the last row, and the hour of each row on it."""
    utc = instants.utc
    if (
        instants.faults
        or not check_order(view, utc, strict=True)
        or not lines_up(view, utc, int(utc[0]))
    ):
        return None
    hours = int((utc[-1] - utc[0]) // 60) + 1
    if hours > _LONGEST_RUN:
        view.error(
            f"{hours} hours from the first row to the last",
            "time",
            len(view) - 1,
            value=view.words("time")[-1],
            allowed=f"at most {_LONGEST_RUN} (twelve years)",
            mend="look for a year that is mistyped",
        )
        return None
    clock = make_clock(int(utc[0]), hours, zone, offset)
    return clock, ((utc - utc[0]) // 60).astype(np.int64)


def places_on(clock: Clock, utc: IntArray, view: TableView, what: str) -> IntArray | None:
    """Find the hour of each time on the run's axis, -1 where it is not of the run.

    A table without a row of the run is an error, and None.
    """
    minutes = minutes_of(clock)
    hour = (utc - minutes[0]) // 60
    outside = (utc == NO_TIME) | (hour < 0) | (hour >= minutes.size)
    if outside.all():
        view.error(
            "no row lies in the hours of the weather",
            "time",
            0,
            value=view.words("time")[0],
            allowed=f"{clock.standard[0]} to {clock.standard[-1]} local standard time",
            mend=f"bring {what} and weather of the same time",
        )
        return None
    return np.where(outside, -1, hour).astype(np.int64)


def caution_missing(
    view: TableView, clock: Clock, missing: BoolArray, what: str, column: str = "time"
) -> None:
    """Count the hours of the run that lack something, and name the first of them."""
    count = int(missing.sum())
    if count:
        first = clock.standard[int(np.argmax(missing))]
        view.caution(
            f"{what} is missing in {count} of {missing.size} hours",
            column,
            value=f"first {first} local standard time",
            mend="fill the gap from the station's records, or accept that these hours are left out",
        )
