"""Yardstick: a road as 200 evenly spaced point sources, in numpy array code.

What a careful author writes without thinking about the integral. Its blocking is
part of it, since array code varies several-fold with the size of its temporaries:
one segment, one state and 32 receptors at a time, so that a temporary has 50 kB. Of
the sizes tried (1 to 1,280) this was the fastest; the others took up to six times as
long, 64 and more about twice.
"""

from __future__ import annotations

import numpy as np
from cases import Case

from roaddisp.dispersion.curves import coefficients
from roaddisp.model import FloatArray

POINTS = 200
RECEPTORS_AT_ONCE = 32


def response_table(case: Case, at_once: int = RECEPTORS_AT_ONCE) -> FloatArray:
    """Table (W, G, R) at 1 m/s, ``at_once`` receptors at a time; no lids."""
    table = np.zeros((len(case.wind_from), int(case.group.max()) + 1, len(case.receptors)))
    curves = coefficients(case.terrain)
    share = (np.arange(POINTS) + 0.5) / POINTS
    for w, (direction, letter) in enumerate(zip(case.wind_from, case.stability, strict=True)):
        crosswind, vertical = curves["ABCDEF".index(letter)]
        down = -np.array([np.sin(np.radians(direction)), np.cos(np.radians(direction))])
        for s, (start, end) in enumerate(case.segments):
            points = start + share[:, None] * (end - start)
            step = np.hypot(*(end - start)) / POINTS
            for first in range(0, len(case.receptors), at_once):
                block = slice(first, first + at_once)
                summed = _points_sum(case.receptors[block], points, down, crosswind, vertical, case)
                table[w, case.group[s], block] += case.strength[s] * step * summed
    return table


def _points_sum(
    receptors: FloatArray,
    points: FloatArray,
    down: FloatArray,
    crosswind: FloatArray,
    vertical: FloatArray,
    case: Case,
) -> FloatArray:
    """Sum of point sources of 1 g/s at each receptor, wind 1 m/s: (R,) [g/m3]."""
    dx = receptors[:, 0, None] - points[:, 0]
    dy = receptors[:, 1, None] - points[:, 1]
    d = dx * down[0] + dy * down[1]
    c = dy * down[0] - dx * down[1]
    upwind = d <= 0.0
    d = np.where(upwind, 0.0, d)
    sy2 = case.sigma_y0**2 + _spread(d, *crosswind) ** 2
    sz2 = case.sigma_z0**2 + _spread(d, *vertical) ** 2
    z = receptors[:, 2, None]
    heights = np.exp(-0.5 * (z - case.height) ** 2 / sz2)
    heights += np.exp(-0.5 * (z + case.height) ** 2 / sz2)
    plume = np.exp(-0.5 * c * c / sy2) * heights / (2.0 * np.pi * np.sqrt(sy2 * sz2))
    return np.where(upwind, 0.0, plume).sum(axis=1)


def _spread(d: FloatArray, a: float, b: float, power: float) -> FloatArray:
    if power == 0.0:
        return a * d
    bend = 1.0 + b * d
    if power == -1.0:
        return a * d / bend
    return a * d / np.sqrt(bend) if power < 0.0 else a * d * np.sqrt(bend)
