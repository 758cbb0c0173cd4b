"""The line integral against scipy's adaptive quadrature.

The pool was made by make_line_integral_pool.py, which imports nothing from the
package: 5,400 segments of 5 m to 3 km with scipy.integrate.quad (QUADPACK), broken at
the onset, about the crosswind peak and on a ladder of distances.
"""

from __future__ import annotations

import functools
import math
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from roaddisp.dispersion.kernel import response_table
from roaddisp.dispersion.reference import unit_concentration

POOL = Path(__file__).parent / "data" / "line_integral_pool.npz"


@functools.cache
def pool():
    with np.load(POOL) as file:
        columns = {name: file[name].tolist() for name in file.files}
    return [dict(zip(columns, row, strict=True)) for row in zip(*columns.values(), strict=True)]


def place(case):
    return (
        [[case["x"], case["y"], case["z"]]],
        [[[case["x0"], case["y0"]], [case["x1"], case["y1"]]]],
    )


def source(case):
    return {
        "terrain": case["terrain"],
        "height": case["height"],
        "sigma_z0": case["sigma_z0"],
        "sigma_y0": case["sigma_y0"],
        "mixing_height": case["lid"],
    }


def scale(case):
    return 2.0 / (math.sqrt(2.0 * math.pi) * case["sigma_z0"])


def test_the_pool_holds_every_kind_class_and_terrain():
    cases = pool()
    assert len(cases) >= 5000
    assert {case["stability"] for case in cases} == set("ABCDEF")
    assert {case["terrain"] for case in cases} == {"open", "urban"}
    assert sum(math.isfinite(case["lid"]) for case in cases) >= 1000
    assert sum(case["concentration"] * case["speed"] > 1e-4 * scale(case) for case in cases) >= 4000


def test_unit_concentration_agrees_with_quadrature():
    """Within 1e-5, where a value is above 1e-6 of 2/(sqrt(2 pi) u sigma_z0)."""
    worst = 0.0
    for case in pool():
        receptors, segments = place(case)
        value = unit_concentration(
            receptors,
            segments,
            wind_from=case["wind_from"],
            wind_speed=case["speed"],
            stability=case["stability"],
            **source(case),
        )[0, 0]
        floor = 1e-6 * scale(case) / case["speed"]
        gap = abs(value - case["concentration"]) / max(case["concentration"], floor)
        worst = max(worst, gap)
    assert worst < 1e-5


def test_response_table_agrees_with_quadrature():
    """Within 1e-3, where a value is above 1e-4 of 2/(sqrt(2 pi) sigma_z0)."""
    worst = 0.0
    for case in pool():
        receptors, segments = place(case)
        value = response_table(
            receptors,
            segments,
            wind_from=[case["wind_from"]],
            stability=[case["stability"]],
            strength=[1.0],
            group=[0],
            threads=1,
            **source(case),
        )[0, 0, 0]
        expected = case["concentration"] * case["speed"]
        worst = max(worst, abs(value - expected) / max(expected, 1e-4 * scale(case)))
    assert worst < 1e-3


@given(
    length=st.floats(5.0, 3000.0),
    along=st.floats(-0.5, 1.5),
    across=st.floats(1.0, 2000.0),
    turn=st.one_of(st.floats(0.0, 360.0), st.sampled_from([0.0, 1e-6, 180.0, 90.0])),
    z=st.floats(0.0, 30.0),
    height=st.floats(0.0, 8.0),
    spread=st.tuples(st.floats(0.5, 4.0), st.floats(0.0, 10.0)),
    lid=st.one_of(st.just(math.inf), st.floats(60.0, 800.0)),
    stability=st.sampled_from("ABCDEF"),
    terrain=st.sampled_from(["open", "urban"]),
)
def test_response_table_agrees_with_the_reference(
    length, along, across, turn, z, height, spread, lid, stability, terrain
):
    """Within 1e-3, above 1e-4 of the scale; the reference is held by the pool above."""
    receptors, segments = [[across, along * length, z]], [[[0.0, 0.0], [0.0, length]]]
    kind = {
        "terrain": terrain,
        "height": height,
        "sigma_z0": spread[0],
        "sigma_y0": spread[1],
        "mixing_height": lid,
    }
    exact = unit_concentration(
        receptors, segments, wind_from=turn, wind_speed=1.0, stability=stability, **kind
    )[0, 0]
    made = response_table(
        receptors, segments, wind_from=[turn], stability=[stability], strength=[1.0], group=[0],
        threads=1, **kind,
    )[0, 0, 0]  # fmt: skip
    floor = 1e-4 * 2.0 / (math.sqrt(2.0 * math.pi) * spread[0])
    assert abs(made - exact) <= 1e-3 * max(exact, floor)


@pytest.mark.parametrize("stability", "ABCDEF")
@pytest.mark.parametrize("terrain", ["open", "urban"])
def test_network_sums_agree_with_the_reference(stability, terrain):
    """Within 5e-4, above 1e-4 of the scale; the reference is held by the pool above."""
    random = np.random.default_rng(41)
    start = random.uniform(-1500, 1500, (60, 2))
    bearing, length = random.uniform(0, 2 * np.pi, 60), random.uniform(20, 900, 60)
    end = start + length[:, None] * np.column_stack([np.sin(bearing), np.cos(bearing)])
    segments = np.stack([start, end], axis=1)
    receptors = np.column_stack([random.uniform(-1500, 1500, (60, 2)), np.full(60, 1.5)])
    spread, strength = random.uniform(0.5, 7, 60), random.uniform(0.2, 3, 60)
    directions = [3.0, 131.0, 254.0]
    table = response_table(
        receptors,
        segments,
        wind_from=directions,
        stability=[stability] * 3,
        strength=strength,
        group=np.zeros(60, dtype=int),
        terrain=terrain,
        sigma_y0=spread,
    )[:, 0]
    for state, direction in enumerate(directions):
        exact = strength @ (
            unit_concentration(
                receptors,
                segments,
                wind_from=direction,
                wind_speed=1.0,
                stability=stability,
                terrain=terrain,
                sigma_y0=spread,
            ).T
        )
        floor = 1e-4 * 2.0 / (math.sqrt(2.0 * math.pi) * 1.2)
        assert np.all(np.abs(table[state] - exact) <= 5e-4 * np.maximum(exact, floor))
