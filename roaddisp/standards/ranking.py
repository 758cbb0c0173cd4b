"""The compiled loop over receptors behind `roaddisp.standards.statistics`."""

from __future__ import annotations

import numba as nb
import numpy as np

from roaddisp.dispersion.compiling import parallel_compiled
from roaddisp.model import BoolArray, FloatArray, IntArray

COLUMNS = 10


@parallel_compiled
def statistics_of_years(
    nox: FloatArray,
    no2: FloatArray,
    calm: BoolArray,
    raised: BoolArray,
    no2_background: FloatArray,
    nox_background: FloatArray,
    year_day: IntArray,
    day_hour: IntArray,
    least_hours: int,
    rank: int,
) -> FloatArray:
    """Reduce the hours of every receptor and year: (COLUMNS, Y, R).

    The columns are mean NOx of the roads, mean NO2, mean NO2 less
    background, means of the roads' NOx and of the background's over the same hours,
    highest hour, 98th percentile of daily maxima, ``rank``-th highest hour, and how
    many of the hours down to that percentile and that rank are ``raised`` ones.
    """
    receptors = no2.shape[0]
    years = year_day.size - 1
    longest = 0
    for y in range(years):
        longest = max(longest, year_day[y + 1] - year_day[y])
    out = np.full((COLUMNS, years, receptors), np.nan)
    for r in nb.prange(receptors):
        daily = np.empty(longest)
        hour_of = np.empty(longest, dtype=np.int64)
        top = np.empty(rank)
        top_hour = np.empty(rank, dtype=np.int64)
        for y in range(years):
            sums = np.zeros(5)
            count_nox, count_no2, count_total = 0, 0, 0
            ranked = 0
            top[:] = -np.inf
            for d in range(year_day[y], year_day[y + 1]):
                here = 0
                highest = -np.inf
                when = 0
                for t in range(day_hour[d], day_hour[d + 1]):
                    road = nox[r, t]
                    if not np.isnan(road):
                        sums[0] += road
                        count_nox += 1
                        if not np.isnan(nox_background[t]):
                            sums[3] += road
                            sums[4] += nox_background[t]
                            count_total += 1
                    value = no2[r, t]
                    if np.isnan(value):
                        if calm[t]:
                            here += 1
                        continue
                    here += 1
                    sums[1] += value
                    sums[2] += value - no2_background[t]
                    count_no2 += 1
                    if value > highest:
                        highest = value
                        when = t
                    if value > top[rank - 1]:
                        k = rank - 1
                        while k > 0 and top[k - 1] < value:
                            top[k] = top[k - 1]
                            top_hour[k] = top_hour[k - 1]
                            k -= 1
                        top[k] = value
                        top_hour[k] = t
                if here >= least_hours and highest > -np.inf:
                    daily[ranked] = highest
                    hour_of[ranked] = when
                    ranked += 1
            if count_nox > 0:
                out[0, y, r] = sums[0] / count_nox
            if count_total > 0:
                out[3, y, r] = sums[3] / count_total
                out[4, y, r] = sums[4] / count_total
            if count_no2 > 0:
                out[1, y, r] = sums[1] / count_no2
                out[2, y, r] = sums[2] / count_no2
                out[5, y, r] = top[0]
            if ranked > 0:
                nth = -(-2 * ranked // 100)
                order = np.argsort(daily[:ranked])
                out[6, y, r] = daily[order[ranked - nth]]
                out[8, y, r] = raised[hour_of[order[ranked - nth :]]].sum()
            if count_no2 >= rank:
                out[7, y, r] = top[rank - 1]
                out[9, y, r] = raised[top_hour].sum()
    return out
