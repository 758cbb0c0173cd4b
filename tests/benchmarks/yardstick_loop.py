"""Yardstick: a plain compiled double loop with a fixed 64-point rule.

Receptors and segments in two loops, Gauss-Legendre over the whole segment, in
float64, compiled by numba with its threads over the receptors. No trimming, no
pruning, no choice of nodes; a node upwind is passed over.
"""

from __future__ import annotations

import math

import numba
import numpy as np
from cases import Case

from roaddisp.dispersion.compiling import ONE_AT_A_TIME
from roaddisp.dispersion.curves import coefficients
from roaddisp.model import FloatArray, IntArray

NODES, WEIGHTS = np.polynomial.legendre.leggauss(64)


def response_table(case: Case) -> FloatArray:
    """Table (W, G, R) at 1 m/s; no lids."""
    table = np.zeros((len(case.wind_from), int(case.group.max()) + 1, len(case.receptors)))
    codes = np.array(["ABCDEF".index(letter) for letter in case.stability])
    with ONE_AT_A_TIME:
        _fill(
            table,
            case.receptors,
            case.segments,
            np.radians(case.wind_from),
            coefficients(case.terrain)[codes].reshape(-1, 6),
            case.strength,
            case.group,
            case.height,
            case.sigma_z0,
            case.sigma_y0,
        )
    return table


@numba.njit(fastmath=True, error_model="numpy")
def _spread_squared(d: float, a: float, b: float, power: float) -> float:
    grown = a * a * d * d
    bend = 1.0 + b * d
    if power == 0.0:
        return grown
    if power == -1.0:
        return grown / (bend * bend)
    return grown / bend if power < 0.0 else grown * bend


@numba.njit(parallel=True, fastmath=True, error_model="numpy")
def _fill(
    table: FloatArray,
    receptors: FloatArray,
    segments: FloatArray,
    wind_from: FloatArray,
    curves: FloatArray,
    strength: FloatArray,
    group: IntArray,
    h: float,
    sigma_z0: float,
    sigma_y0: float,
) -> None:
    for r in numba.prange(len(receptors)):
        x, y, z = receptors[r]
        for s in range(len(segments)):
            x0, y0 = segments[s, 0]
            x1, y1 = segments[s, 1]
            length = math.hypot(x1 - x0, y1 - y0)
            for w in range(len(wind_from)):
                down_x, down_y = -math.sin(wind_from[w]), -math.cos(wind_from[w])
                ay, by, py, az, bz, pz = curves[w]
                total = 0.0
                for node in range(64):
                    share = 0.5 * (1.0 + NODES[node])
                    dx = x - x0 - share * (x1 - x0)
                    dy = y - y0 - share * (y1 - y0)
                    d = dx * down_x + dy * down_y
                    if d <= 0.0:
                        continue
                    c = dy * down_x - dx * down_y
                    sy2 = sigma_y0 * sigma_y0 + _spread_squared(d, ay, by, py)
                    sz2 = sigma_z0 * sigma_z0 + _spread_squared(d, az, bz, pz)
                    heights = math.exp(-0.5 * (z - h) ** 2 / sz2)
                    heights += math.exp(-0.5 * (z + h) ** 2 / sz2)
                    plume = math.exp(-0.5 * c * c / sy2) * heights / math.sqrt(sy2 * sz2)
                    total += 0.5 * WEIGHTS[node] * plume
                table[w, group[s], r] += strength[s] * length * total / (2.0 * math.pi)
