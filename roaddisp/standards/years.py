"""Days and years as the rules count them, and whether they are complete."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from roaddisp.model import BoolArray, Clock, FloatArray, IntArray, TimeArray
from roaddisp.standards.rules import Standard

HOURS_OF_A_DAY: Final = 18
"""Hours that make a day count (40 CFR 50 App. S, from memory)."""

_FRINGE: Final = 24


@dataclass(frozen=True)
class JudgedHours:
    """The run's hours cut into days and years of local standard time.

    Attributes
    ----------
    years : (Y,) int
    year_day : (Y + 1,) int
        First day of each year, and the end.
    day_hour : (D + 1,) int
        First hour of each day, and the end.
    dates : (D,) datetime64[D]
    """

    years: IntArray
    year_day: IntArray
    day_hour: IntArray
    dates: TimeArray

    @property
    def hours(self) -> int:
        """How many hours there are."""
        return int(self.day_hour[-1])


def judged_years(standard_time: TimeArray) -> tuple[IntArray, IntArray]:
    """Year to which each hour counts.

    Calendar years of local standard time. A fringe of less than 24 hours at
    either end, which a difference of clocks leaves, joins its neighbour.

    Parameters
    ----------
    standard_time : (T,) datetime64
        Hour-beginning, in order.

    Returns
    -------
    year : (T,) int
    years : (Y,) int

    Raises
    ------
    ValueError
        Where there are no hours.

    Examples
    --------
    >>> import numpy as np
    >>> hours = np.datetime64("2022-12-31T17", "h") + np.arange(8760)
    >>> judged_years(hours)[1]
    array([2023])
    """
    if not len(standard_time):
        raise ValueError("there are no hours to judge")
    year = np.asarray(standard_time).astype("datetime64[Y]").astype(np.int64) + 1970
    years, hours = np.unique(year, return_counts=True)
    if years.size > 1 and hours[0] < _FRINGE:
        year = np.where(year == years[0], years[1], year)
        years = years[1:]
    if years.size > 1 and hours[-1] < _FRINGE:
        year = np.where(year == years[-1], years[-2], year)
        years = years[:-1]
    return year, years


def judged_hours(standard_time: TimeArray) -> JudgedHours:
    """Cut hours into days and years of local standard time.

    Parameters
    ----------
    standard_time : (T,) datetime64
        Hour-beginning, without a gap.

    Returns
    -------
    JudgedHours

    Examples
    --------
    >>> import numpy as np
    >>> cut = judged_hours(np.datetime64("2024-12-31T00", "h") + np.arange(48))
    >>> cut.years, cut.year_day, cut.day_hour
    (array([2024, 2025]), array([0, 1, 2]), array([ 0, 24, 48]))
    """
    year, years = judged_years(standard_time)
    dates, first_hour = np.unique(
        np.asarray(standard_time).astype("datetime64[D]"), return_index=True
    )
    year_of_day = year[first_hour]
    return JudgedHours(
        years=years,
        year_day=np.append(np.searchsorted(year_of_day, years), dates.size),
        day_hour=np.append(first_hour, year.size),
        dates=dates,
    )


@dataclass(frozen=True)
class Completeness:
    """How much of each judged year is there.

    Attributes
    ----------
    years : (Y,) int
    hours : (Y,)
        Hours present over the hours of the calendar year.
    quarters : (Y, 4)
        Days with 18 hours or more over the days of the quarter.
    """

    years: IntArray
    hours: FloatArray
    quarters: FloatArray

    def lack(self, rule: Standard) -> str:
        """Say which years are incomplete by a standard's rule.

        Parameters
        ----------
        rule : Standard

        Returns
        -------
        str
            Empty where every year is complete.

        Examples
        --------
        >>> import numpy as np
        >>> from roaddisp.standards.rules import standard
        >>> thin = Completeness(np.array([2023]), np.array([0.6]), np.ones((1, 4)))
        >>> thin.lack(standard("us-naaqs-annual")).split(";")[0]
        'incomplete data: 2023 has 60.0 % of its hours'
        """
        lacking = []
        for place, year in enumerate(self.years):
            if rule.completeness == "hours-of-year":
                if self.hours[place] < rule.share_required:
                    lacking.append(f"{year} has {_percent(self.hours[place])} of its hours")
            else:
                short = np.flatnonzero(self.quarters[place] < rule.share_required)
                lacking += [
                    f"quarter {quarter + 1} of {year} has "
                    f"{_percent(self.quarters[place, quarter])} of its days"
                    for quarter in short
                ]
        if not lacking:
            return ""
        return f"incomplete data: {', '.join(lacking)}; the rule asks {rule.required}"


def completeness(present: BoolArray, clock: Clock) -> Completeness:
    """Count what is there of each judged year.

    Parameters
    ----------
    present : (T,) bool
        Hours that have a value or are calm.
    clock : Clock

    Returns
    -------
    Completeness
        Shares of the calendar year and its quarters, whether the run covers them
        or not; a fringe joined to a year adds nothing to them.

    Examples
    --------
    >>> import numpy as np
    >>> hours = np.datetime64("2023-01-01T00", "h") + np.arange(90 * 24)
    >>> clock = Clock(hours, hours, utc_offset=0.0, timezone="UTC")
    >>> completeness(np.ones(90 * 24, dtype=bool), clock).quarters
    array([[1., 0., 0., 0.]])
    """
    hours = judged_hours(clock.standard)
    hours_of_day = np.add.reduceat(np.asarray(present, dtype=np.int64), hours.day_hour[:-1])
    year_of_date = hours.dates.astype("datetime64[Y]").astype(np.int64) + 1970
    month = hours.dates.astype("datetime64[M]").astype(np.int64) % 12
    share = np.zeros(hours.years.size)
    quarters = np.zeros((hours.years.size, 4))
    for place, year in enumerate(hours.years):
        of_year = year_of_date == year
        starts = np.array(
            [f"{year}-01", f"{year}-04", f"{year}-07", f"{year}-10", f"{year + 1}-01"],
            dtype="datetime64[D]",
        )
        quarter_days = np.diff(starts).astype(np.int64)
        share[place] = hours_of_day[of_year].sum() / (24 * quarter_days.sum())
        complete = of_year & (hours_of_day >= HOURS_OF_A_DAY)
        quarters[place] = np.bincount(month[complete] // 3, minlength=4) / quarter_days
    return Completeness(years=hours.years, hours=share, quarters=quarters)


def _percent(share: float) -> str:
    # downwards, so that a share just short of the rule never reads as enough
    return f"{np.floor(round(1000 * share, 6)) / 10:.1f} %"
