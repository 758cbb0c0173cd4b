"""What physics guarantees of `unit_concentration`, and what it refuses."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from roaddisp.dispersion.reference import unit_concentration

ROAD = [[[-60.0, -200.0], [-20.0, 350.0]]]
RECEPTOR = [[10.0, 30.0, 1.5]]
WEATHER = {"wind_from": 250.0, "wind_speed": 2.5, "stability": "D"}
FLOOR = 1e-6 * 2 / (math.sqrt(2 * math.pi) * 1.2)

angles = st.floats(0.0, 360.0)
places = st.floats(-800.0, 800.0)
classes = st.sampled_from("ABCDEF")
terrains = st.sampled_from(["open", "urban"])


def turned(points, degrees):
    """Rotate plan coordinates clockwise, as directions of wind are counted."""
    angle = math.radians(degrees)
    x, y = points[..., 0].copy(), points[..., 1].copy()
    points[..., 0] = x * math.cos(angle) + y * math.sin(angle)
    points[..., 1] = y * math.cos(angle) - x * math.sin(angle)
    return points


def test_shape_is_receptors_by_segments():
    receptors = np.array([[0.0, 0.0, 1.5], [50.0, 0.0, 0.0], [90.0, 9.0, 4.0]])
    table = unit_concentration(receptors, ROAD * 2, **WEATHER)
    assert table.shape == (3, 2)
    assert table.dtype == np.float64
    assert unit_concentration(np.zeros((0, 3)), ROAD, **WEATHER).shape == (0, 1)
    assert unit_concentration(RECEPTOR, np.zeros((0, 2, 2)), **WEATHER).shape == (1, 0)


@given(places, places, angles, angles, classes, terrains)
def test_turning_everything_changes_nothing(x, y, wind_from, turn, stability, terrain):
    """1e-5 is the promised accuracy; a sharp edge of a plume is not between the two."""
    kind = {"wind_speed": 1.0, "stability": stability, "terrain": terrain, "sigma_y0": 2.0}
    here = unit_concentration([[x, y, 1.5]], ROAD, wind_from=wind_from, **kind)[0, 0]
    there = unit_concentration(
        turned(np.array([[x, y, 1.5]]), turn),
        turned(np.array(ROAD), turn),
        wind_from=wind_from + turn,
        **kind,
    )[0, 0]
    assert abs(here - there) <= 1e-5 * max(here, FLOOR)


@given(places, places, angles, st.floats(0.01, 0.99), classes)
def test_splitting_a_segment_changes_nothing(x, y, wind_from, share, stability):
    kind = {"wind_from": wind_from, "wind_speed": 1.0, "stability": stability, "sigma_y0": 1.0}
    whole = unit_concentration([[x, y, 1.5]], ROAD, **kind)[0, 0]
    start, end = np.array(ROAD[0])
    middle = start + share * (end - start)
    parts = unit_concentration([[x, y, 1.5]], [[start, middle], [middle, end]], **kind)[0].sum()
    assert abs(whole - parts) <= 1e-5 * max(whole, FLOOR)


@given(st.floats(0.3, 30.0))
def test_concentration_goes_as_one_over_wind_speed(speed):
    one = unit_concentration(RECEPTOR, ROAD, **(WEATHER | {"wind_speed": 1.0}))
    assert unit_concentration(RECEPTOR, ROAD, **(WEATHER | {"wind_speed": speed})) == (
        pytest.approx(one / speed, rel=1e-12)
    )


def test_ends_may_be_swapped_and_the_road_mirrored():
    swapped = [[ROAD[0][1], ROAD[0][0]]]
    here = unit_concentration(RECEPTOR, ROAD, **WEATHER)
    assert unit_concentration(RECEPTOR, swapped, **WEATHER) == pytest.approx(here, rel=1e-9)
    mirrored = np.array(ROAD) * [1.0, -1.0]
    there = unit_concentration(
        [[10.0, -30.0, 1.5]], mirrored, **(WEATHER | {"wind_from": 180.0 - 250.0})
    )
    assert there == pytest.approx(here, rel=1e-9)


def test_nothing_reaches_a_receptor_upwind():
    assert unit_concentration([[-900.0, 30.0, 1.5]], ROAD, **WEATHER)[0, 0] == 0.0


def test_a_segment_without_length_gives_nothing():
    assert unit_concentration(RECEPTOR, [[[1.0, 2.0], [1.0, 2.0]]], **WEATHER)[0, 0] == 0.0


def test_above_the_lid_nothing_is_received_or_given():
    assert unit_concentration([[10.0, 30.0, 61.0]], ROAD, mixing_height=60.0, **WEATHER) == 0.0
    assert unit_concentration(RECEPTOR, ROAD, height=61.0, mixing_height=60.0, **WEATHER) == 0.0


def test_a_high_lid_is_no_lid_and_a_low_one_traps():
    free = unit_concentration([[1500.0, 30.0, 1.5]], ROAD, **WEATHER)[0, 0]
    high = unit_concentration([[1500.0, 30.0, 1.5]], ROAD, mixing_height=5000.0, **WEATHER)[0, 0]
    low = unit_concentration([[1500.0, 30.0, 1.5]], ROAD, mixing_height=60.0, **WEATHER)[0, 0]
    assert high == pytest.approx(free, rel=1e-9)
    assert low > 1.01 * free


def test_a_receptor_on_a_line_without_width_is_refused_by_name():
    on_line = [[99.0, 0.0, 1.5], [-40.0, 75.0, 1.5]]
    with pytest.raises(ValueError, match=r"receptors\[1\] lies on segments\[0\] in plan"):
        unit_concentration(on_line, ROAD, **WEATHER)
    assert unit_concentration(on_line, ROAD, sigma_y0=2.0, **WEATHER)[1, 0] > 0.0


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"receptors": [[0.0, 0.0]]}, r"receptors: shape \(1, 2\); allowed: \(R, 3\)"),
        ({"receptors": [[0.0, np.nan, 1.0]]}, r"receptors\[0, 1\]: nan; allowed: a finite"),
        ({"receptors": [[0.0, 0.0, -1.0]]}, r"receptors\[0, 2\]: -1 m; allowed: a height of 0"),
        ({"segments": [[0.0, 0.0]]}, r"segments: shape \(1, 2\); allowed: \(S, 2, 2\)"),
        ({"wind_speed": 0.0}, "wind_speed: 0.0; allowed: one number above 0 m/s"),
        ({"wind_from": np.inf}, "wind_from: inf; allowed: a finite number"),
        ({"wind_from": [1.0, 2.0]}, "wind_from: 2 values; allowed: one direction"),
        ({"stability": "d"}, "stability: 'd'; allowed: one of A, B, C, D, E, F"),
        ({"stability": ["A", "B"]}, "stability: 2 values; allowed: one class letter"),
        ({"terrain": "forest"}, "terrain: 'forest'; allowed: 'open', 'urban'"),
        ({"height": -0.1}, "height: -0.1; allowed: 0 and more"),
        ({"height": [1.0, 2.0]}, r"height: shape \(2,\); allowed: a scalar or \(1,\)"),
        ({"sigma_z0": 0.0}, "sigma_z0: 0; allowed: above 0"),
        ({"sigma_y0": [-2.0]}, "sigma_y0: -2; allowed: 0 and more"),
        ({"mixing_height": 0.0}, "mixing_height: 0 m; allowed: above 0 m, inf for no lid"),
        ({"mixing_height": np.nan}, "mixing_height: nan m; allowed: above 0 m"),
    ],
)
def test_arguments_out_of_range_are_refused(changes, message):
    arguments = {"receptors": RECEPTOR, "segments": ROAD, **WEATHER} | changes
    with pytest.raises(ValueError, match=message):
        unit_concentration(arguments.pop("receptors"), arguments.pop("segments"), **arguments)
