"""Hourly traffic from an annual average and a profile."""

from __future__ import annotations

import numpy as np

from roaddisp.model import FloatArray, IntArray, Profiles, TimeArray

WEEKDAY, SATURDAY, SUNDAY = 0, 1, 2
"""Order of the day types on the axis of `Profiles`."""


def day_type(civil: TimeArray) -> IntArray:
    """Day type of each hour: 0 weekday, 1 Saturday, 2 Sunday.

    Public holidays count as the weekday they fall on.

    Parameters
    ----------
    civil : (T,) datetime64
        Hours by the civil clock.

    Returns
    -------
    (T,) int

    Examples
    --------
    >>> import numpy as np
    >>> day_type(np.array(["2024-03-01", "2024-03-02", "2024-03-03"], dtype="datetime64[m]"))
    array([0, 1, 2])
    """
    days = np.asarray(civil).astype("datetime64[D]").astype(np.int64)
    after_monday = (days + 3) % 7  # day 0 of the count, 1970-01-01, was a Thursday
    return np.maximum(after_monday - 4, 0)


def profile_shape(profiles: Profiles, civil: TimeArray) -> FloatArray:
    """Vehicles in each hour over AADT: the day's factor times the hour's share.

    Shares are not renormalised on days of 23 or 25 hours: the hour that the
    spring change leaves out carries no traffic, the one that autumn repeats
    carries its share twice.

    Parameters
    ----------
    profiles : Profiles
    civil : (T,) datetime64
        Hours by the civil clock.

    Returns
    -------
    (P, T) [1/h per vehicle/day]

    Examples
    --------
    >>> import numpy as np
    >>> flat = Profiles(("flat",), np.full((1, 12, 3, 24), 1 / 24), np.ones((1, 12, 3)))
    >>> shape = profile_shape(flat, np.array(["2024-03-01T08:00"], dtype="datetime64[m]"))
    >>> round(float(shape[0, 0]) * 24_000, 6)  # vehicles/h at 24,000 vehicles/day
    1000.0
    """
    times = np.asarray(civil)
    month = times.astype("datetime64[M]").astype(np.int64) % 12
    hour = times.astype("datetime64[h]").astype(np.int64) % 24
    kind = day_type(times)
    shape: FloatArray = profiles.day_factor[:, month, kind] * profiles.share[:, month, kind, hour]
    return shape
