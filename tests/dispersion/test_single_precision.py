"""What float32 costs: the same stretch of line and the same nodes, summed in float64."""

from __future__ import annotations

import math

import numpy as np
import pytest

from roaddisp.dispersion import columns, stages
from roaddisp.dispersion.curves import coefficients
from roaddisp.dispersion.kernel import _rational, response_table
from roaddisp.dispersion.reach import aim, gather

START, END = np.array([-310.0, 40.0]), np.array([280.0, -170.0])
HEIGHT, SIGMA_Z0, SIGMA_Y0 = 1.3, 1.2, 2.0


def receptors():
    """Near the line and far from it, low and high, far from the origin of the plane."""
    random = np.random.default_rng(11)
    places = START + random.uniform(0.0, 1.0, (400, 1)) * (END - START)
    reach = np.exp(random.uniform(math.log(2.0), math.log(2000.0), (400, 1)))
    bearing = random.uniform(0.0, 2.0 * math.pi, 400)
    plan = places + reach * np.column_stack([np.sin(bearing), np.cos(bearing)])
    return np.column_stack([plan, random.choice([0.0, 1.5, 4.0, 12.0], 400)])


def as_compiled(points, wind_from, code, curves):
    """Let the compiled stages choose, for each live line: pair, first, last, nodes."""
    work = stages.room()
    ends = np.stack([START, END])
    pairs = gather(work, points, 0, len(points), ends, ends, 0.0, math.inf)
    length = math.dist(START, END)
    along = (END - START) / length
    down = np.array([-math.sin(wind_from), -math.cos(wind_from)])
    d_rate, c_rate = -along @ down, -(along[1] * down[0] - along[0] * down[1])
    flip = 1.0 if d_rate >= 0.0 else -1.0
    f32 = np.float32
    line = columns.Line(
        f32(flip * d_rate), f32(flip * c_rate), f32(SIGMA_Y0), f32(SIGMA_Z0), f32(HEIGHT)
    )
    curve = tuple(curves[code])
    live = aim(work, pairs, f32(down[0]), f32(down[1]), f32(flip), line, curve[0])
    lines = stages.prepare(work, live, f32(12.0), line, curve)

    def column(start):
        return work.scratch[int(start) : int(start) + lines].astype(np.float64)

    nodes = np.array(columns.RULES)[work.kind[:lines]]
    return work.live[:lines], column(columns.IN_FIRST), column(columns.IN_LAST), nodes, flip


def summed(point, first, last, count, flip, wind_from, curve):
    """Sum one line's nodes in float64, from the formulas of docs/integral.md."""
    (ay, by, py), (az, bz, pz) = curve
    length = math.dist(START, END)
    along = (END - START) / length
    down = np.array([-math.sin(wind_from), -math.cos(wind_from)])
    side = np.array([-down[1], down[0]])
    foot = START + np.clip((point[:2] - START) @ along, 0.0, length) * along
    d_rate, c_rate = -flip * (along @ down), -flip * (along @ side)
    d_lo = max((point[:2] - foot) @ down + first * d_rate, 0.0)
    c_lo = (point[:2] - foot) @ side + first * c_rate
    length = last - first
    d_hi, c_hi = d_lo + length * d_rate, c_lo + length * c_rate
    least = 0.0 if c_lo * c_hi <= 0.0 else min(abs(c_lo), abs(c_hi))
    delta = max(min(math.hypot(SIGMA_Y0, least) / ay, 4.0 * SIGMA_Z0 / az), 1e-9)
    keep = (d_lo + delta) / (d_hi + delta)
    x, weight = np.polynomial.legendre.leggauss(count)
    xi, weight = 0.5 * (x + 1.0), 0.5 * weight
    grow = 1.0 / (1.0 - (1.0 - keep) * xi)
    d = d_lo + (d_hi - d_lo) * xi * keep * grow
    c = c_lo + (c_hi - c_lo) * xi * keep * grow
    sy = np.hypot(SIGMA_Y0, ay * d * (1.0 + by * d) ** py)
    sz = np.hypot(SIGMA_Z0, az * d * (1.0 + bz * d) ** pz)
    tall = np.exp(-0.5 * ((point[2] - HEIGHT) / sz) ** 2)
    tall += np.exp(-0.5 * ((point[2] + HEIGHT) / sz) ** 2)
    plume = np.exp(-0.5 * (c / sy) ** 2) * tall / (2.0 * math.pi * sy * sz)
    return length * keep * float(weight @ (grow**2 * plume))


@pytest.mark.parametrize("terrain", ["open", "urban"])
@pytest.mark.parametrize("letter", "ABCDEF")
def test_tables_agree_with_the_same_nodes_in_float64(terrain, letter):
    """1e-4 of the value, above 1e-4 of 2/(sqrt(2 pi) sigma_z0)."""
    points, code = receptors(), "ABCDEF".index(letter)
    floor = 1e-4 * 2.0 / (math.sqrt(2.0 * math.pi) * SIGMA_Z0)
    seen = 0
    for direction in (20.0, 109.6, 200.0, 288.0):
        expected = np.zeros(len(points))
        chosen = as_compiled(
            points, math.radians(direction), code, _rational(coefficients(terrain))
        )
        *lines, flip = chosen
        for pair, first, last, count in zip(*lines, strict=True):
            expected[pair] += summed(
                points[pair], first, last, int(count), flip, math.radians(direction),
                coefficients(terrain)[code],
            )  # fmt: skip
        made = response_table(
            points, [[START, END]], wind_from=[direction], stability=[letter], strength=[1.0],
            group=[0], terrain=terrain, height=HEIGHT, sigma_z0=SIGMA_Z0, sigma_y0=SIGMA_Y0,
            threads=1,
        )[0, 0]  # fmt: skip
        assert np.all(np.abs(made - expected) <= 1e-4 * np.maximum(expected, floor))
        seen += int((expected > floor).sum())
    assert seen > 60
