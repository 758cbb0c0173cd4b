"""Profiles and hourly counts."""

from __future__ import annotations

import numpy as np

from roaddisp.model import BoolArray, Clock, Counts, FloatArray, IntArray, Profiles
from roaddisp.study.columns import TableView
from roaddisp.study.hours import TimeRules, check_order, lines_up, places_on, read_times
from roaddisp.study.problems import listed, nearest
from roaddisp.study.table_types import DAY_TYPES
from roaddisp.study.times import minutes_of

_SUM = 1e-3
_CALENDAR_MEAN = 0.01


def read_profiles(view: TableView) -> Profiles | None:
    """Make profiles whole: every month, day type and hour; None where a row was refused."""
    names, days = view.words("profile"), view.words("day_type")
    hours, shares = view.numbers("hour"), view.numbers("share")
    months, factors = view.numbers("month"), view.numbers("day_factor")
    if not (view.complete and view.clean):
        return None
    groups: dict[tuple[str, int, str], list[int]] = {}
    for row, (name, month, day) in enumerate(zip(names, months, days, strict=True)):
        groups.setdefault((name, 0 if np.isnan(month) else int(month), day), []).append(row)
    share: dict[tuple[str, int, str], FloatArray] = {}
    factor: dict[tuple[str, int, str], float] = {}
    for key, rows in groups.items():
        _check_day(view, key, rows, hours, shares, factors)
        day_shares = np.zeros(24)
        day_shares[hours[rows].astype(int)] = shares[rows]
        share[key] = day_shares
        given = factors[rows][0]
        factor[key] = 1.0 if np.isnan(given) else float(given)
    every = tuple(dict.fromkeys(names))
    chosen = _whole(view, every, groups)
    if not view.clean:
        return None
    shape = (len(every), 12, 3)
    return Profiles(
        every,
        np.array([share[key] for key in chosen]).reshape(*shape, 24),
        np.array([factor[key] for key in chosen]).reshape(shape),
    )


def _check_day(
    view: TableView,
    key: tuple[str, int, str],
    rows: list[int],
    hours: FloatArray,
    shares: FloatArray,
    factors: FloatArray,
) -> None:
    name, month, day = key
    what = f"profile {name!r}, {day}" + (f", month {month}" if month else "")
    counted = hours[rows].astype(int).tolist()
    first: dict[int, int] = {}
    twice = [r for r, hour in zip(rows, counted, strict=True) if first.setdefault(hour, r) != r]
    lacking = sorted(set(range(24)) - set(counted))
    if twice:
        view.error(
            f"{what}: an hour stands twice",
            "hour",
            twice[0],
            value=f"{hours[twice[0]]:g}",
            allowed="each hour from 0 to 23 once",
            mend="delete one of the rows",
            count=len(twice),
        )
    if lacking:
        view.error(
            f"{what}: hours are missing",
            "hour",
            rows[0],
            value=f"missing {listed(map(str, lacking), 24)}",
            allowed="each hour from 0 to 23 once",
            mend="add the rows",
        )
    total = float(shares[rows].sum())
    if not twice and not lacking and abs(total - 1.0) > _SUM:
        mend = "divide each share by the sum"
        if abs(total - 100.0) < 1.0:
            mend = 'the shares look like percent: write "share [%]"'
        view.error(
            f"{what}: the shares do not sum to 1",
            "share",
            rows[0],
            value=f"{total:.6g}",
            allowed="1 within 0.001",
            mend=mend,
        )
    given = factors[rows]
    if np.isnan(given).any() != np.isnan(given).all() or np.ptp(np.nan_to_num(given)) > 1e-9:
        view.error(
            f"{what}: day_factor changes within the day",
            "day_factor",
            rows[0],
            value=listed(f"{each:g}" for each in sorted(set(given.tolist()))),
            allowed="one value in all rows of the day",
            mend="write the same in each row",
        )


def _whole(
    view: TableView, every: tuple[str, ...], groups: dict[tuple[str, int, str], list[int]]
) -> list[tuple[str, int, str]]:
    """Choose the rows that stand for each month and day type: the most particular ones."""
    chosen = []
    for name in every:
        for month in range(1, 13):
            for day in DAY_TYPES:
                ways = [(name, m, d) for m in (month, 0) for d in (day, "all")]
                found = next((key for key in ways if key in groups), None)
                if found is None:
                    row = next(rows[0] for key, rows in groups.items() if key[0] == name)
                    view.error(
                        f"profile {name!r} has no rows for a {day} in month {month}",
                        "day_type",
                        row,
                        allowed="rows for every day of the year",
                        mend="add the rows, or rows of day_type 'all' or without a month",
                    )
                    return []
                chosen.append(found)
    return chosen


def check_day_factors(profiles: Profiles, view: TableView, clock: Clock) -> None:
    """Hold the calendar mean of ``day_factor`` to 1 within 1 %, in every year of the run."""
    first = int(str(clock.civil[0])[:4])
    last = int(str(clock.civil[-1])[:4])
    names = view.words("profile")
    for number, name in enumerate(profiles.names):
        for year in range(first, last + 1):
            days = np.arange(f"{year}-01-01", f"{year + 1}-01-01", dtype="datetime64[D]")
            weekday = (days.astype(np.int64) + 3) % 7  # 0 is Monday
            month = days.astype("datetime64[M]").astype(np.int64) % 12
            mean = float(profiles.day_factor[number, month, np.maximum(weekday - 4, 0)].mean())
            if abs(mean - 1.0) > _CALENDAR_MEAN:
                view.error(
                    f"profile {name!r}: the mean of day_factor over {year} is not 1",
                    "day_factor",
                    names.index(name),
                    value=f"{mean:.4f}",
                    allowed="0.99 to 1.01",
                    mend="divide each day_factor by the mean",
                )
                break


def counted_links(view: TableView) -> frozenset[str]:
    """Name the links that a table of counts has."""
    return frozenset(view.words("link")) - {""}


def read_counts(
    view: TableView,
    rules: TimeRules,
    clock: Clock | None,
    offset: int | None,
    *,
    links: tuple[str, ...] | None,
    link_speed: FloatArray | None,
    known_classes: tuple[str, ...] | None,
) -> Counts | None:
    """Lay counts on the run's hours; None where a row was refused.

    Parameters
    ----------
    view : TableView
    rules : TimeRules
    clock : Clock or None
        Without one the table is checked for itself.
    offset : int [minutes] or None
        Of local standard time.
    links : tuple of str (L,), or None where the roads could not be read
    link_speed : (L,) [m/s] or None
        Taken where a row gives no speed.
    known_classes : tuple of str or None
        Classes the factors have; None where they could not be read.
    """
    names, classes_at = view.words("link"), view.words("vehicle_class")
    vehicles, speed = view.numbers("vehicles"), view.numbers("speed")
    series = list(zip(names, classes_at, strict=True))
    instants = read_times(view, rules, offset=offset, series=series)
    if not instants.faults:
        check_order(view, instants.utc, series, strict=False)
    if links is not None:
        _check_names(view, "link", names, links)
    classes = _check_classes(view, classes_at, known_classes)
    if clock is not None:
        lines_up(view, instants.utc, int(minutes_of(clock)[0]))
    if not (view.complete and view.clean) or classes is None:
        return None
    if clock is None or links is None or link_speed is None:
        return None
    place = {link: number for number, link in enumerate(links)}
    link = np.array([place[name] for name in names], dtype=np.int64)
    hour = places_on(clock, instants.utc, view, "counts")
    if hour is None:
        return None
    of_run = hour >= 0
    number = {each: n for n, each in enumerate(classes)}
    which = np.array([number.get(each, 0) for each in classes_at], dtype=np.int64)
    table = np.full((len(links), max(len(classes), 1), clock.standard.size), np.nan)
    table[link[of_run], which[of_run], hour[of_run]] = vehicles[of_run]
    if classes:
        runs = np.zeros(table.shape[:2], dtype=bool)
        runs[link, which] = True
        counted = np.isfinite(table).any(axis=1)
        table = np.where(~runs[:, :, None] & counted[:, None, :], 0.0, table)
    _caution_gaps(view, table, link, links)
    speeds = _speeds(view, speed, link, hour, link_speed, clock.standard.size)
    return Counts(table if classes else table[:, 0], classes or None, speeds)


def _check_names(view: TableView, column: str, words: list[str], known: tuple[str, ...]) -> None:
    have = set(known)
    unknown = [row for row, word in enumerate(words) if word and word not in have]
    if unknown:
        row = unknown[0]
        near = nearest(words[row], known)
        view.error(
            f"an unknown {column}",
            column,
            row,
            value=words[row],
            allowed=listed(known),
            mend=f"did you mean {near!r}?" if near else "correct or delete the rows",
            count=len(unknown),
        )


def _check_classes(
    view: TableView, words: list[str], known: tuple[str, ...] | None
) -> tuple[str, ...] | None:
    if not any(words):
        return ()
    empty = [row for row, word in enumerate(words) if not word]
    if empty:
        view.error(
            "a row without a class, where others have one",
            "vehicle_class",
            empty[0],
            allowed="a class in every row, or in none",
            mend="fill it in",
            count=len(empty),
        )
        return None
    if known is None:
        return None
    _check_names(view, "vehicle_class", words, known)
    return tuple(dict.fromkeys(words)) if view.clean else None


def _caution_gaps(
    view: TableView, table: FloatArray, link: IntArray, links: tuple[str, ...]
) -> None:
    there = np.unique(link)
    gaps: BoolArray = np.asarray(np.isnan(table[there]).any(axis=1), dtype=bool)
    if gaps.any():
        first = there[int(np.argmax(np.any(gaps, axis=1)))]
        view.caution(
            f"hours without a count: {int(gaps.sum())} of {gaps.size} hours of the links counted",
            "vehicles",
            value=f"first of link {links[first]!r}",
            mend="fill the gaps, or accept that these hours are left out",
        )


def _speeds(
    view: TableView,
    speed: FloatArray,
    link: IntArray,
    hour: IntArray,
    link_speed: FloatArray,
    hours: int,
) -> FloatArray | None:
    if not view.has("speed") or np.isnan(speed).all():
        return None
    of_run = (hour >= 0) & np.isfinite(speed)
    table = np.full((link_speed.size, hours), np.nan)
    table[link[of_run], hour[of_run]] = speed[of_run]
    differ = of_run.copy()
    differ[of_run] = np.abs(table[link[of_run], hour[of_run]] - speed[of_run]) > 1e-6
    if differ.any():
        row = int(np.argmax(differ))
        view.error(
            "classes of one hour have different speeds",
            "speed",
            row,
            value=f"{speed[row]:.4g} m/s",
            allowed="one speed for a link and hour",
            mend="write the mean speed of the traffic",
            count=int(differ.sum()),
        )
    return np.where(np.isnan(table), link_speed[:, None], table)
