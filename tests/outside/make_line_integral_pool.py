"""Write data/line_integral_pool.npz: line integrals by scipy's adaptive quadrature.

Imports nothing from the package. Briggs' curves (Briggs 1973, ATDL contribution 79,
as reprinted by Gifford 1976) and the integrand are written out again here.

    python tests/outside/make_line_integral_pool.py
"""

from __future__ import annotations

import itertools
import math
from pathlib import Path

import numpy as np
from scipy.integrate import quad

POOL = Path(__file__).parent / "data" / "line_integral_pool.npz"
SEED = 20250117
KINDS = ("anywhere", "axis", "inside", "beyond", "parallel", "roadside")
PER_KIND = 900

CROSSWIND = {
    "open": {"A": 0.22, "B": 0.16, "C": 0.11, "D": 0.08, "E": 0.06, "F": 0.04},
    "urban": {"A": 0.32, "B": 0.32, "C": 0.22, "D": 0.16, "E": 0.11, "F": 0.11},
}
BEND = {"open": 1e-4, "urban": 4e-4}
VERTICAL = {
    "open": {
        "A": lambda x: 0.20 * x,
        "B": lambda x: 0.12 * x,
        "C": lambda x: 0.08 * x / math.sqrt(1 + 0.0002 * x),
        "D": lambda x: 0.06 * x / math.sqrt(1 + 0.0015 * x),
        "E": lambda x: 0.03 * x / (1 + 0.0003 * x),
        "F": lambda x: 0.016 * x / (1 + 0.0003 * x),
    },
    "urban": {
        "A": lambda x: 0.24 * x * math.sqrt(1 + 0.001 * x),
        "B": lambda x: 0.24 * x * math.sqrt(1 + 0.001 * x),
        "C": lambda x: 0.20 * x,
        "D": lambda x: 0.14 * x / math.sqrt(1 + 0.0003 * x),
        "E": lambda x: 0.08 * x / math.sqrt(1 + 0.0015 * x),
        "F": lambda x: 0.08 * x / math.sqrt(1 + 0.0015 * x),
    },
}


def vertical_sum(z, h, sz, lid):
    """Images of source and ground in the lid, as many as reach nine spreads."""
    if math.isinf(lid):
        shifts = [0.0]
    else:
        most = math.ceil(9 * sz / (2 * lid)) + 2
        shifts = [2 * n * lid for n in range(-most, most + 1)]
    return sum(
        math.exp(-0.5 * ((z - h + s) / sz) ** 2) + math.exp(-0.5 * ((z + h + s) / sz) ** 2)
        for s in shifts
    )


def line_integral(case):
    """Concentration per g/m/s at the case's receptor."""
    down = np.array([-math.sin(math.radians(case["wind_from"])),
                     -math.cos(math.radians(case["wind_from"]))])  # fmt: skip
    side = np.array([-down[1], down[0]])
    start = np.array([case["x0"], case["y0"]])
    end = np.array([case["x1"], case["y1"]])
    receptor = np.array([case["x"], case["y"]])
    length = float(np.hypot(*(end - start)))
    along = (end - start) / length
    d0, c0 = float((receptor - start) @ down), float((receptor - start) @ side)
    dd, dc = float(-along @ down), float(-along @ side)
    a, b = CROSSWIND[case["terrain"]][case["stability"]], BEND[case["terrain"]]
    rise = VERTICAL[case["terrain"]][case["stability"]]
    sy0, sz0 = case["sigma_y0"], case["sigma_z0"]
    if case["z"] > case["lid"] or case["height"] > case["lid"]:
        return 0.0

    def spread_y(d):
        return math.hypot(sy0, a * d / math.sqrt(1 + b * d))

    def integrand(s):
        d, c = d0 + dd * s, c0 + dc * s
        if d <= 0.0:
            return 0.0
        sy, sz = spread_y(d), math.hypot(sz0, rise(d))
        if sy == 0.0 or abs(c) > 38 * sy:
            return 0.0
        tall = vertical_sum(case["z"], case["height"], sz, case["lid"])
        return math.exp(-0.5 * (c / sy) ** 2) * tall / (2 * math.pi * case["speed"] * sy * sz)

    breaks = {0.0, length}
    onset = -d0 / dd if dd else math.inf
    breaks.add(onset)
    centre = -c0 / dc if dc else math.inf
    breaks.add(centre)
    if math.isfinite(centre) and d0 + dd * centre > 0.0:
        sy = spread_y(d0 + dd * centre)
        breaks |= {centre + k * sy / abs(dc) for k in (-12, -7, -4, -2, -1, 1, 2, 4, 7, 12)}
    if dd:
        breaks |= {(10.0**p - d0) / dd for p in np.arange(-6.0, 4.01, 0.2)}
    inner = sorted(p for p in breaks if 0.0 <= p <= length)
    total = 0.0
    for lo, hi in itertools.pairwise(inner):
        total += quad(integrand, lo, hi, epsabs=1e-16, epsrel=1e-11, limit=200)[0]
    return total


def random_case(kind, random):
    """One geometry of a kind, with everything else drawn at random."""
    length = math.exp(random.uniform(math.log(5), math.log(3000)))
    bearing = random.uniform(0, 360)
    reach = math.exp(random.uniform(math.log(1), math.log(2000)))
    sigma_y0 = float(random.choice([0.0, random.uniform(0.02, 10)]))
    turn = random.uniform(0, 360)
    along, across = random.uniform(-0.3, 1.3) * length, reach * random.choice([-1, 1])
    if kind == "axis":
        along, across = length + reach, 0.0
        turn = 180 + random.choice([0, 1e-6, -1e-4, 0.01, 1, -5])
    elif kind == "inside":
        sigma_y0 = random.uniform(0.3, 10)
        along, across = random.uniform(0, 1) * length, random.uniform(-1, 1) * sigma_y0
    elif kind == "beyond":
        along, across = length + reach, random.normal() * 0.1 * reach
        turn = 180 + random.normal() * 15
    elif kind == "parallel":
        turn = random.choice([0, 180]) + random.choice([0, 1e-6, -1e-6, 1e-3, -0.1, 1, 3, -8])
    elif kind == "roadside":
        along, across = random.uniform(0, 1) * length, random.uniform(1, 60)
        turn = random.uniform(180, 360)
    east, north = math.sin(math.radians(bearing)), math.cos(math.radians(bearing))
    x0, y0 = random.uniform(-1000, 1000), random.uniform(-1000, 1000)
    return {
        "kind": kind,
        "terrain": str(random.choice(["open", "urban"])),
        "stability": str(random.choice(list("ABCDEF"))),
        "wind_from": (bearing + turn) % 360,
        "speed": random.uniform(0.5, 9),
        "x0": x0,
        "y0": y0,
        "x1": x0 + length * east,
        "y1": y0 + length * north,
        "x": x0 + along * east + across * north,
        "y": y0 + along * north - across * east,
        "z": float(random.choice([0, 1.5, random.uniform(0, 30)])),
        "height": float(random.choice([0, 1.3, random.uniform(0, 8)])),
        "sigma_z0": random.uniform(0.5, 4),
        "sigma_y0": sigma_y0,
        "lid": float(random.choice([math.inf, math.inf, random.uniform(60, 600)])),
    }


def main():
    random = np.random.default_rng(SEED)
    rows = []
    for kind in KINDS:
        kept = 0
        while kept < PER_KIND:
            case = {k: float(v) if not isinstance(v, str) else v
                    for k, v in random_case(kind, random).items()}  # fmt: skip
            case["concentration"] = line_integral(case)
            scale = 2 / (math.sqrt(2 * math.pi) * case["speed"] * case["sigma_z0"])
            # one in ten of those that get (almost) nothing stays in the pool
            if case["concentration"] > 1e-6 * scale or random.uniform() < 0.05:
                rows.append(case)
                kept += 1
    columns = {name: np.array([row[name] for row in rows]) for name in rows[0]}
    np.savez_compressed(POOL, **columns)


if __name__ == "__main__":
    main()
