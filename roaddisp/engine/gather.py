"""Compiled loops that turn response tables into hours."""

from __future__ import annotations

import numba as nb
import numpy as np

from roaddisp.dispersion.compiling import parallel_sums_compiled
from roaddisp.model import Float32Array, FloatArray, IntArray


@parallel_sums_compiled
def gather_hours(
    table: Float32Array,
    weight: FloatArray,
    of_hour: IntArray,
    lid_of_hour: IntArray,
    units: FloatArray,
) -> FloatArray:
    """Sum the groups of each hour: (K, R, T), K being 2.

    ``table`` (R, W, K G) [g/m3 at 1 m/s], ``weight`` (T, K G) shape over wind speed
    [s/m], ``of_hour`` (T,) state of each hour, -1 for none (NaN results), ``lid_of_hour``
    (T,) row that its lid adds, -1 for none, ``units`` (K,) from g/m3 to the tracer's
    unit.
    """
    receptors, _, columns = table.shape
    groups = np.uint64(columns // 2)
    road = np.empty((2, receptors, of_hour.size))
    for r in nb.prange(receptors):
        for t in range(of_hour.size):
            if of_hour[t] < 0:
                road[0, r, t] = np.nan
                road[1, r, t] = np.nan
                continue
            w = np.uint64(of_hour[t])  # unsigned, so that no index is taken from the end
            nox = 0.0
            primary = 0.0
            for g in range(groups):
                nox += table[r, w, g] * weight[t, g]
                primary += table[r, w, g + groups] * weight[t, g + groups]
            if lid_of_hour[t] >= 0:
                w = np.uint64(lid_of_hour[t])
                for g in range(groups):
                    nox += table[r, w, g] * weight[t, g]
                    primary += table[r, w, g + groups] * weight[t, g + groups]
            road[0, r, t] = nox * units[0]
            road[1, r, t] = primary * units[1]
    return road


@parallel_sums_compiled
def gather_worst(
    table: Float32Array,
    weight: FloatArray,
    first: IntArray,
    lid_first: IntArray,
    directions: int,
    ozone: FloatArray,
    units: FloatArray,
) -> FloatArray:
    """Run calm hours in every direction and keep the one that makes most NO2.

    ``table`` (R, W, K G), ``weight`` (Tc, K G), ``first`` (Tc,) first state of each calm
    hour, ``lid_first`` (Tc,) first row that its lid adds, -1 for none, ``ozone`` (Tc,)
    [ppb], ``units`` (K,) as in `gather_hours`, the second to ppb. Returns (K, R, Tc).
    Background NO2 is the same in every direction, so the road's own NO2 decides.
    """
    receptors, _, columns = table.shape
    groups = np.uint64(columns // 2)
    hours = first.size
    road = np.empty((2, receptors, hours))
    for r in nb.prange(receptors):
        for t in range(hours):
            most = -1.0
            for direction in range(directions):
                w = np.uint64(first[t] + direction)
                nox = 0.0
                primary = 0.0
                for g in range(groups):
                    nox += table[r, w, g] * weight[t, g]
                    primary += table[r, w, g + groups] * weight[t, g + groups]
                if lid_first[t] >= 0:
                    w = np.uint64(lid_first[t] + direction)
                    for g in range(groups):
                        nox += table[r, w, g] * weight[t, g]
                        primary += table[r, w, g + groups] * weight[t, g + groups]
                nox *= units[1]
                primary *= units[1]
                made = primary + min(nox - primary, ozone[t])
                if not made <= most:
                    most = made
                    road[0, r, t] = nox / units[1] * units[0]
                    road[1, r, t] = primary
    return road
