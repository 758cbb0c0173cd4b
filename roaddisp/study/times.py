"""Times at the door: ISO 8601 text to UTC, and the axis of hours a run has.

Instants are int64 minutes since 1970 in UTC. A time by the local clock that
stands twice (the hour that autumn repeats) is daylight time where it comes
first; one that the clock skips is no time at all.
"""

from __future__ import annotations

import re
from collections.abc import Hashable, Sequence
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta, tzinfo
from typing import Final
from zoneinfo import ZoneInfo, ZoneInfoNotFoundError

import numpy as np

from roaddisp.model import Clock, IntArray

NO_TIME: Final = np.iinfo(np.int64).min
"""Stands where a time could not be taken."""

_ISO = re.compile(
    r"(\d{4})-?(\d{2})-?(\d{2})[T ](\d{2})(?::?(\d{2})(?::?(\d{2})(?:[.,]0+)?)?)?"
    r"(Z|[+-]\d{2}(?::?\d{2})?)?",
    re.ASCII,
)
_EPOCH = datetime(1970, 1, 1, tzinfo=UTC)


def find_zone(name: str) -> ZoneInfo | None:
    """Find a time zone by its IANA name, None where there is none.

    >>> find_zone("Europe/Berlin").key
    'Europe/Berlin'
    """
    try:
        return ZoneInfo(name)
    except (ZoneInfoNotFoundError, ValueError, OSError):
        return None


def standard_offset(zone: ZoneInfo, year: int) -> int:
    """Take the standard time of a zone: the smaller of its offsets in January and July.

    Returns
    -------
    int [minutes ahead of UTC]

    Examples
    --------
    >>> standard_offset(ZoneInfo("America/Denver"), 2023)
    -420
    """
    offsets = [
        datetime(year, month, 15, 12, tzinfo=zone).utcoffset() or timedelta(0) for month in (1, 7)
    ]
    return int(min(offsets).total_seconds() // 60)


@dataclass(frozen=True)
class Fault:
    """Why a time was refused."""

    message: str
    allowed: str
    mend: str


UNPARSED: Final = Fault(
    "a time that cannot be read",
    "ISO 8601, as 2023-03-25T14:00 or 2023-03-25T14:00+01:00",
    "write year-month-day, T and the hour",
)
NOT_WHOLE: Final = Fault(
    "a time that is not on the whole hour",
    "minutes and seconds of zero",
    "average the values to hours",
)
SKIPPED: Final = Fault(
    "a local time that does not exist: the clock skips it in spring",
    "a time the clock shows",
    'write clock = "standard" or "utc" in study.toml where the file is in one of them',
)


@dataclass(frozen=True)
class Stamp:
    """A time as written: naive local minutes, and minutes ahead of UTC where it says so."""

    naive: datetime
    offset: int | None


def parse_time(text: str) -> Stamp | Fault:
    """Read one ISO 8601 date and time on the whole hour.

    >>> parse_time("2023-03-25T14:00Z")
    Stamp(naive=datetime.datetime(2023, 3, 25, 14, 0), offset=0)
    """
    found = _ISO.fullmatch(text.strip())
    if found is None:
        return UNPARSED
    year, month, day, hour, minute, second, offset = found.groups()
    try:
        naive = datetime(int(year), int(month), int(day))  # noqa: DTZ001
    except ValueError:
        return UNPARSED
    hours, minutes, seconds = int(hour), int(minute or 0), int(second or 0)
    if hours > 24 or minutes > 59 or seconds > 59 or not 1900 <= naive.year <= 2200:
        return UNPARSED
    if minutes or seconds:
        return NOT_WHOLE
    ahead = _offset_minutes(offset) if offset else None
    if ahead is not None and abs(ahead) >= 24 * 60:
        return UNPARSED
    return Stamp(naive + timedelta(hours=hours), ahead)


def _offset_minutes(text: str) -> int:
    if text == "Z":
        return 0
    digits = text[1:].replace(":", "")
    minutes = int(digits[:2]) * 60 + int(digits[2:] or 0)
    return -minutes if text[0] == "-" else minutes


def _minutes(naive: datetime, zone: tzinfo = UTC) -> int:
    return int((naive.replace(tzinfo=zone) - _EPOCH).total_seconds() // 60)


def _local(naive: datetime, zone: ZoneInfo) -> tuple[int, ...]:
    """Say which instants show a local time: none, one, or two in their order."""
    shown = {_minutes(naive.replace(fold=fold), zone) for fold in (0, 1)}
    real = [
        minute
        for minute in sorted(shown)
        if (_EPOCH + timedelta(minutes=minute)).astimezone(zone).replace(tzinfo=None) == naive
    ]
    return tuple(real)


@dataclass(frozen=True)
class Instants:
    """Times of a column in UTC.

    Attributes
    ----------
    utc : (N,) int64 minutes, the beginning of the hour; `NO_TIME` where refused
    faults : list of (row, Fault)
    first_year : int
        Year of the first time that could be read; 0 where there is none.
    """

    utc: IntArray
    faults: list[tuple[int, Fault]]
    first_year: int


def to_utc(
    cells: Sequence[str],
    *,
    clock: str,
    hour_ending: bool,
    zone: ZoneInfo,
    offset: int | None = None,
    series: Sequence[Hashable] | None = None,
) -> Instants:
    """Bring a column of times to UTC.

    Parameters
    ----------
    cells : sequence of str (N,)
    clock : "local", "standard" or "utc"
        Of times that carry no offset themselves.
    hour_ending : bool
        Whether a time is what the clock shows at the end of the hour.
    zone : ZoneInfo
    offset : int [minutes], optional
        Of local standard time; by default that of the first time's year.
    series : sequence (N,), optional
        What each row belongs to (a link): a repeated hour is counted within it.

    Returns
    -------
    Instants

    Examples
    --------
    >>> berlin = ZoneInfo("Europe/Berlin")
    >>> autumn = ["2023-10-29T02:00", "2023-10-29T02:00"]
    >>> instants = to_utc(autumn, clock="local", hour_ending=False, zone=berlin)
    >>> [str(hour) for hour in instants.utc.astype("datetime64[m]")]
    ['2023-10-29T00:00', '2023-10-29T01:00']
    """
    stamps = {cell: parse_time(cell) for cell in dict.fromkeys(cells)}
    first = next((each for each in stamps.values() if isinstance(each, Stamp)), None)
    if first is None:
        refused = {cell: each for cell, each in stamps.items() if isinstance(each, Fault)}
        faults = [(row, refused[cell]) for row, cell in enumerate(cells)]
        return Instants(np.full(len(cells), NO_TIME), faults, 0)
    if offset is None:
        offset = standard_offset(zone, first.naive.year)
    choices: dict[str, tuple[int, ...] | Fault] = {}
    for cell, stamp in stamps.items():
        choices[cell] = _instants(stamp, clock, zone, offset)
    utc = np.full(len(cells), NO_TIME)
    faults = []
    seen: dict[tuple[Hashable, str], int] = {}
    for row, cell in enumerate(cells):
        choice = choices[cell]
        if isinstance(choice, Fault):
            faults.append((row, choice))
        elif len(choice) == 1:
            utc[row] = choice[0]
        else:
            key = (series[row] if series is not None else None, cell)
            utc[row] = choice[min(seen.get(key, 0), 1)]
            seen[key] = seen.get(key, 0) + 1
    if hour_ending:
        utc[utc != NO_TIME] -= 60
    return Instants(utc, faults, first.naive.year)


def _instants(
    stamp: Stamp | Fault, clock: str, zone: ZoneInfo, offset: int
) -> tuple[int, ...] | Fault:
    if isinstance(stamp, Fault):
        return stamp
    if stamp.offset is not None:
        return (_minutes(stamp.naive) - stamp.offset,)
    if clock == "utc":
        return (_minutes(stamp.naive),)
    if clock == "standard":
        return (_minutes(stamp.naive) - offset,)
    return _local(stamp.naive, zone) or SKIPPED


def make_clock(first: int, hours: int, zone: ZoneInfo, offset: int) -> Clock:
    """Make the axis of a run.

    Parameters
    ----------
    first : int [minutes]
        Beginning of the first hour, UTC.
    hours : int
    zone : ZoneInfo
    offset : int [minutes]
        Local standard time ahead of UTC.

    Returns
    -------
    Clock
    """
    utc = first + 60 * np.arange(hours, dtype=np.int64)
    civil = utc + np.array([_civil_offset(int(minute), zone) for minute in utc], dtype=np.int64)
    return Clock(
        (utc + offset).astype("datetime64[m]"),
        civil.astype("datetime64[m]"),
        offset / 60.0,
        zone.key,
    )


def _civil_offset(minute: int, zone: ZoneInfo) -> int:
    ahead = (_EPOCH + timedelta(minutes=minute)).astimezone(zone).utcoffset()
    return int((ahead or timedelta(0)).total_seconds() // 60)


def minutes_of(clock: Clock) -> IntArray:
    """Take the hours of a run as UTC minutes."""
    minutes: IntArray = clock.utc.astype("datetime64[m]").astype(np.int64)
    return minutes
