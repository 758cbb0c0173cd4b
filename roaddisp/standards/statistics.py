"""Statistics of a year of hours, as the standards define them."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import fields
from typing import Final

import numpy as np

from roaddisp.model import Background, BoolArray, Clock, FloatArray, Statistics
from roaddisp.standards.years import HOURS_OF_A_DAY, judged_hours

RANK_OF_18_PERMITTED: Final = 19
"""With 18 hours permitted above it, a level holds where the 19th highest meets it."""

_MEAN_OVER_YEARS: Final = ("no2_1h_p98_ppb", "no2_1h_p98_truncated_ppb")


def annual_98th_rank(days: int) -> int:
    """Rank, from the highest, that is the 98th percentile of daily maxima.

    Parameters
    ----------
    days : int
        Days of the year that have a maximum, 1 to 366.

    Returns
    -------
    int

    Raises
    ------
    ValueError
        Where days are fewer than 1.

    Notes
    -----
    40 CFR 50 App. S, Table 1 (from memory). In whole numbers: 0.02 x days in
    binary fractions misranks.

    Examples
    --------
    >>> annual_98th_rank(365)
    8
    """
    if days < 1:
        raise ValueError(f"days is {days}; allowed: 1 and more")
    return -(-2 * days // 100)


def truncated(ppb: FloatArray) -> FloatArray:
    """Hourly values as the US rule keeps them: further digits than 0.1 ppb cut off.

    Parameters
    ----------
    ppb : (...) [ppb]

    Returns
    -------
    (...) [ppb]

    Notes
    -----
    40 CFR 50 App. S (from memory). Values are first rounded to nine decimals, so
    that 100.1 held as 100.09999999999999 stays 100.1.

    Examples
    --------
    >>> import numpy as np
    >>> truncated(np.array([100.19, 100.1]))
    array([100.1, 100.1])
    """
    cut: FloatArray = np.floor(np.round(np.asarray(ppb) * 10, 9)) / 10
    return cut


def block_statistics(
    nox_road_ugm3: FloatArray,
    no2_ppb: FloatArray,
    *,
    clock: Clock,
    background: Background,
    calm: BoolArray,
    raised: BoolArray,
    ugm3_per_ppb: float,
) -> Statistics:
    """Statistics of a block of receptors.

    Parameters
    ----------
    nox_road_ugm3 : (R, T) [ug/m3]
    no2_ppb : (R, T) [ppb]
        Total; both NaN where there is no value.
    clock : Clock
        Of T hours.
    background : Background
    calm : (T,) bool
        Hours without a value for calm, which count as present. Where they were
        run in the worst direction they have one and count by it.
    raised : (T,) bool
        Hours whose wind a floor has raised, counted among those that make a statistic.
    ugm3_per_ppb : float
        Of the study, by which ``nox_road_ugm3`` is turned to ppb.

    Returns
    -------
    Statistics
        By year. Daily maxima are of days with 18 hours present or more and at
        least one value; percentile and rank are NaN where there are too few.

    Raises
    ------
    ValueError
        Where the arrays do not have the run's hours.

    Examples
    --------
    >>> import numpy as np
    >>> hours = np.datetime64("2024-05-14T00:00", "m") + 60 * np.arange(24)
    >>> made = block_statistics(
    ...     np.full((1, 24), 40.0),
    ...     np.arange(24.0)[None, :],
    ...     clock=Clock(hours, hours, utc_offset=0.0, timezone="UTC"),
    ...     background=Background(np.full(24, 30.0), np.full(24, 1.5), None),
    ...     calm=np.zeros(24, dtype=bool),
    ...     raised=np.zeros(24, dtype=bool),
    ...     ugm3_per_ppb=1.9125,
    ... )
    >>> made.no2_mean_ppb, made.no2_road_mean_ppb, made.no2_1h_p98_ppb
    (array([[11.5]]), array([[10.]]), array([[23.]]))
    """
    from roaddisp.dispersion.compiling import ONE_AT_A_TIME
    from roaddisp.standards.ranking import statistics_of_years

    hours = judged_hours(clock.standard)
    nox = np.ascontiguousarray(nox_road_ugm3, dtype=np.float64)
    no2 = np.ascontiguousarray(no2_ppb, dtype=np.float64)
    if not nox.shape == no2.shape == (no2.shape[0], hours.hours):
        raise ValueError(
            f"nox_road_ugm3 {nox.shape} and no2_ppb {no2.shape}; allowed: (R, {hours.hours}) both"
        )
    unknown = np.full(hours.hours, np.nan)
    no2_background = np.asarray(background.no2, dtype=np.float64)
    nox_background = unknown if background.no is None else no2_background + background.no
    with ONE_AT_A_TIME:
        columns = statistics_of_years(
            nox,
            no2,
            np.asarray(calm, dtype=np.bool_),
            np.asarray(raised, dtype=np.bool_),
            no2_background,
            nox_background,
            hours.year_day.astype(np.int64),
            hours.day_hour.astype(np.int64),
            HOURS_OF_A_DAY,
            RANK_OF_18_PERMITTED,
        )
    mean_nox, mean_no2, added, shared, under, highest, p98, nineteenth, *raised_in = columns
    return Statistics(
        years=hours.years,
        nox_road_mean_ugm3=mean_nox,
        no2_mean_ppb=mean_no2,
        no2_road_mean_ppb=added,
        nox_mean_ppb=shared / ugm3_per_ppb + under,
        no2_1h_max_ppb=highest,
        no2_1h_p98_ppb=p98,
        # cutting off digits keeps the order, so it may follow the ranking
        no2_1h_p98_truncated_ppb=truncated(p98),
        no2_1h_19th_ppb=nineteenth,
        raised_in_p98=raised_in[0],
        raised_in_19th=raised_in[1],
    )


def join_statistics(blocks: Iterable[Statistics]) -> Statistics:
    """Statistics of all receptors from those of blocks, in the blocks' order.

    Parameters
    ----------
    blocks : iterable of Statistics
        At least one; of the same years.

    Returns
    -------
    Statistics

    Raises
    ------
    ValueError
        Where there is no block, or their years differ.

    Examples
    --------
    >>> import numpy as np
    >>> block = Statistics(np.array([2023]), *(np.array([[10.0, 12.0]]) for _ in range(10)))
    >>> join_statistics([block, block]).no2_mean_ppb
    array([[10., 12., 10., 12.]])
    """
    parts = list(blocks)
    if not parts:
        raise ValueError("there are no statistics to join")
    if any(not np.array_equal(part.years, parts[0].years) for part in parts):
        raise ValueError("the blocks' statistics are of different years")
    columns = {
        field.name: np.concatenate([getattr(part, field.name) for part in parts], axis=1)
        for field in fields(Statistics)
        if field.name != "years"
    }
    return Statistics(years=parts[0].years, **columns)


def over_years(statistics: Statistics, column: str) -> FloatArray:
    """One value a receptor: percentiles as the mean of the years, others of the worst year.

    Parameters
    ----------
    statistics : Statistics
    column : str
        Name of a field of it.

    Returns
    -------
    (R,)
        Of the years that have a value; NaN where none has.

    Examples
    --------
    >>> import numpy as np
    >>> years = np.array([2022, 2023])
    >>> filled = Statistics(years, *(np.array([[10.0], [13.0]]) for _ in range(10)))
    >>> float(over_years(filled, "no2_1h_p98_ppb")[0]), float(over_years(filled, "no2_mean_ppb")[0])
    (11.5, 13.0)
    """
    values: FloatArray = getattr(statistics, column)
    known = ~np.isnan(values)
    if column in _MEAN_OVER_YEARS:
        combined = np.where(known, values, 0.0).sum(axis=0) / np.maximum(known.sum(axis=0), 1)
    else:
        combined = np.where(known, values, -np.inf).max(axis=0)
    return np.where(known.any(axis=0), combined, np.nan)
