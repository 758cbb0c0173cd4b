"""One link, one receptor, one day, from counts to ppb, worked apart from the package.

Run as a script it writes ``data/worked_day.csv``; it imports nothing from
roaddisp. Every number of the day is invented; every formula is written out
again from its source:

- line strength: vehicles/h x g/km / 3.6e6 = g/m/s;
- spread of rural class curves: Briggs 1973, as reprinted by Gifford 1976;
- wind profile exponents: Irwin 1979 (from memory);
- point plume with ground reflection: Turner 1970 eq. 3.1 (from memory);
- ozone limiting: Cole & Summerhays 1979 (from memory).

The road is taken twice: 0.1 m wide (a line) and 24 m wide, there as a strip
spread evenly over its width, by Gauss-Legendre integration across it.
"""

from __future__ import annotations

import csv
import math
from itertools import pairwise
from pathlib import Path

import numpy as np
from scipy.integrate import quad

LINK = ((500_000.0, 4_400_000.0), (500_640.0, 4_400_290.0))
RECEPTOR = (500_408.0, 4_400_163.0)
RECEPTOR_HEIGHT = 1.5
AADT = 42_000.0
HEAVY_SHARE = 0.07
SPEED_KMH = 76.0
# vehicle class: (km/h, NOx g/km, NO2 fraction) at two speeds, so that any monotone
# interpolation is the straight line
FACTORS = {
    "car": ((60.0, 0.31, 0.22), (100.0, 0.27, 0.22)),
    "articulated_truck": ((60.0, 3.9, 0.09), (100.0, 2.7, 0.09)),
}
SHARES = [
    0.009, 0.006, 0.005, 0.006, 0.011, 0.026, 0.058, 0.077, 0.070, 0.052, 0.048, 0.050,
    0.053, 0.054, 0.058, 0.066, 0.076, 0.082, 0.062, 0.043, 0.032, 0.025, 0.019, 0.012,
]  # fmt: skip
DATE = "2025-01-15"
WIND_FROM = [
    330, 320, 345, 300, 280, 340, 335, 325, 350, 310, 290, 250,
    245, 245.6, 246, 200, 150, 355, 340, 330, 320, 315, 5, 338,
]  # fmt: skip
WIND_SPEED = [
    1.4, 1.1, 0.8, 1.3, 2.0, 2.6, 2.2, 1.8, 2.9, 3.4, 4.1, 3.0,
    2.2, 2.4, 3.8, 4.4, 5.2, 3.6, 2.8, 2.4, 1.9, 1.6, 1.2, 1.5,
]  # fmt: skip
STABILITY = list("FFFFEEEDDCCBBABCCDEEEFFF")
OZONE = [
    24, 25, 27, 26, 22, 16, 8, 6, 9, 15, 22, 28,
    33, 36, 37, 35, 30, 22, 17, 15, 16, 18, 20, 22,
]  # fmt: skip
NO2_BACKGROUND = [
    9, 8, 7, 8, 11, 16, 24, 27, 25, 20, 16, 13,
    11, 10, 10, 11, 14, 19, 22, 22, 20, 17, 14, 11,
]  # fmt: skip
ANEMOMETER_HEIGHT = 10.0
UGM3_PER_PPB = 1.8804

EXPONENT = dict(zip("ABCDEF", (0.07, 0.07, 0.10, 0.15, 0.35, 0.55), strict=True))
SIGMA_Y = dict(zip("ABCDEF", (0.22, 0.16, 0.11, 0.08, 0.06, 0.04), strict=True))
SIGMA_Z = {
    "A": lambda x: 0.20 * x,
    "B": lambda x: 0.12 * x,
    "C": lambda x: 0.08 * x / math.sqrt(1 + 0.0002 * x),
    "D": lambda x: 0.06 * x / math.sqrt(1 + 0.0015 * x),
    "E": lambda x: 0.03 * x / (1 + 0.0003 * x),
    "F": lambda x: 0.016 * x / (1 + 0.0003 * x),
}


def point_plume(d: float, c: float, letter: str, source_height: float, sigma_z0: float) -> float:
    """C u / Q [1/m2] at downwind distance d and crosswind offset c."""
    sy = SIGMA_Y[letter] * d / math.sqrt(1 + 0.0001 * d)
    sz = math.hypot(sigma_z0, SIGMA_Z[letter](d))
    below, above = RECEPTOR_HEIGHT - source_height, RECEPTOR_HEIGHT + source_height
    vertical = math.exp(-(below**2) / (2 * sz**2)) + math.exp(-(above**2) / (2 * sz**2))
    return math.exp(-(c**2) / (2 * sy**2)) * vertical / (2 * math.pi * sy * sz)


def line(offset: float, wind_from: float, letter: str, height: float, sigma_z0: float) -> float:
    """Integrate point plumes along the link, shifted sideways by ``offset`` [m]."""
    (x1, y1), (x2, y2) = LINK
    length = math.hypot(x2 - x1, y2 - y1)
    ex, ey = (x2 - x1) / length, (y2 - y1) / length
    x0, y0 = x1 - ey * offset, y1 + ex * offset
    bearing = math.radians(wind_from)
    wx, wy = -math.sin(bearing), -math.cos(bearing)

    def offsets(s: float) -> tuple[float, float]:
        rx, ry = RECEPTOR[0] - (x0 + ex * s), RECEPTOR[1] - (y0 + ey * s)
        return rx * wx + ry * wy, -rx * wy + ry * wx

    def integrand(s: float) -> float:
        d, c = offsets(s)
        return point_plume(d, c, letter, height, sigma_z0) if d > 0 else 0.0

    d0, c0 = offsets(0.0)
    d_rate, c_rate = -(ex * wx + ey * wy), ex * wy - ey * wx
    breaks = {0.0, length}
    if d_rate:
        onset = -d0 / d_rate
        ladder = [0.0, *np.geomspace(1e-3, length, 25)]
        breaks |= {onset + sign * step for step in ladder for sign in (-1, 1)}
    if c_rate:
        axis = -c0 / c_rate
        breaks |= {axis + sign * step for step in np.geomspace(0.1, length, 25) for sign in (-1, 1)}
        breaks.add(axis)
    cuts = sorted(cut for cut in breaks if 0.0 <= cut <= length)
    return sum(
        quad(integrand, a, b, epsabs=1e-13, epsrel=1e-9, limit=100)[0] for a, b in pairwise(cuts)
    )


def strip(width: float, nodes: int, *where: float | str) -> float:
    """Average the line integral over offsets spread evenly across the width."""
    if nodes == 1:
        return line(0.0, *where)
    points, weights = np.polynomial.legendre.leggauss(nodes)
    return sum(w / 2 * line(width / 2 * p, *where) for p, w in zip(points, weights, strict=True))


def work(width: float, nodes: int) -> list[dict[str, float | str]]:
    nox_gkm, no2_gkm = {}, {}
    for name, ((v1, n1, f1), (v2, n2, f2)) in FACTORS.items():
        along = (SPEED_KMH - v1) / (v2 - v1)
        nox_gkm[name] = n1 + along * (n2 - n1)
        no2_gkm[name] = nox_gkm[name] * (f1 + along * (f2 - f1))
    share = {"car": 1 - HEAVY_SHARE, "articulated_truck": HEAVY_SHARE}
    nox = sum(share[name] * nox_gkm[name] for name in FACTORS)
    no2 = sum(share[name] * no2_gkm[name] for name in FACTORS)
    heavy = share["articulated_truck"] * nox_gkm["articulated_truck"] / nox
    height = (1 - heavy) * 1.3 + heavy * 3.4
    sigma_z0 = (1 - heavy) * 1.2 + heavy * 3.2
    wind_height = round(max(height, 2.0), 1)
    rows: list[dict[str, float | str]] = []
    for hour in range(24):
        letter = STABILITY[hour]
        wind = max(WIND_SPEED[hour], 1.0)
        wind = max(wind * (wind_height / ANEMOMETER_HEIGHT) ** EXPONENT[letter], 1.0)
        seen = strip(width, nodes, WIND_FROM[hour], letter, height, sigma_z0) / wind
        vehicles = AADT * SHARES[hour]
        nox_ugm3 = vehicles * nox / 3.6e6 * seen * 1e6
        primary_ppb = vehicles * no2 / 3.6e6 * seen * 1e6 / UGM3_PER_PPB
        nox_ppb = nox_ugm3 / UGM3_PER_PPB
        no2_ppb = primary_ppb + min(nox_ppb - primary_ppb, OZONE[hour]) + NO2_BACKGROUND[hour]
        rows.append(
            {
                "width_m": width,
                "hour": hour,
                "nox_road_ugm3": nox_ugm3,
                "no2_primary_road_ppb": primary_ppb,
                "no2_ppb": no2_ppb,
            }
        )
    return rows


if __name__ == "__main__":
    assert abs(sum(SHARES) - 1) < 1e-9, sum(SHARES)
    rows = work(0.1, 1) + work(24.0, 24)
    with (Path(__file__).parent / "data" / "worked_day.csv").open("w", newline="") as file:
        writer = csv.DictWriter(file, rows[0].keys(), lineterminator="\n")
        writer.writeheader()
        for row in rows:
            writer.writerow({k: f"{v:.9g}" for k, v in row.items()})
