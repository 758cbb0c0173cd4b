"""Compiled loops that turn response tables into hours."""

from __future__ import annotations

import numba as nb
import numpy as np

from roaddisp.dispersion.compiling import parallel_compiled
from roaddisp.model import Float32Array, FloatArray, IntArray


@parallel_compiled
def gather_hours(
    table: Float32Array, weight: FloatArray, of_hour: IntArray, units: FloatArray
) -> FloatArray:
    """Sum the groups of each hour: (K, R, T).

    ``table`` (R, W, K, G) [g/m3 at 1 m/s], ``weight`` (T, K, G) shape over wind
    speed [s/m], ``of_hour`` (T,) state of each hour, -1 for none (NaN results),
    ``units`` (K,) from g/m3 to the tracer's unit.
    """
    receptors, _, tracers, groups = table.shape
    hours = of_hour.size
    road = np.empty((tracers, receptors, hours))
    for r in nb.prange(receptors):
        for t in range(hours):
            w = of_hour[t]
            for k in range(tracers):
                if w < 0:
                    road[k, r, t] = np.nan
                    continue
                total = 0.0
                for g in range(groups):
                    total += table[r, w, k, g] * weight[t, k, g]
                road[k, r, t] = total * units[k]
    return road


@parallel_compiled
def gather_worst(
    table: Float32Array,
    weight: FloatArray,
    first: IntArray,
    directions: int,
    ozone: FloatArray,
    units: FloatArray,
) -> FloatArray:
    """Run calm hours in every direction and keep the one that makes most NO2.

    ``table`` (R, W, K, G), ``weight`` (Tc, K, G), ``first`` (Tc,) first state of
    each calm hour, ``ozone`` (Tc,) [ppb], ``units`` (K,) as in `gather_hours`, the
    second to ppb. Returns (K, R, Tc). Background NO2 is the same in every direction,
    so the road's own NO2 decides.
    """
    receptors, _, tracers, groups = table.shape
    hours = first.size
    road = np.empty((tracers, receptors, hours))
    for r in nb.prange(receptors):
        for t in range(hours):
            most = -1.0
            for w in range(first[t], first[t] + directions):
                nox = 0.0
                primary = 0.0
                for g in range(groups):
                    nox += table[r, w, 0, g] * weight[t, 0, g]
                    primary += table[r, w, 1, g] * weight[t, 1, g]
                nox *= units[1]
                primary *= units[1]
                made = primary + min(nox - primary, ozone[t])
                if not made <= most:
                    most = made
                    road[0, r, t] = nox / units[1] * units[0]
                    road[1, r, t] = primary
    return road
