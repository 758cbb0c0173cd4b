"""Roads of real width as parallel lines."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from roaddisp.dispersion.kernel import windowed_table
from roaddisp.dispersion.reference import unit_concentration
from roaddisp.geometry.segments import line_windows, road_segments

BEND = [[0.0, 0.0], [90.0, 0.0], [90.0, 0.0], [160.0, 120.0]]


def lengths(ends):
    return np.hypot(*(ends[:, 1] - ends[:, 0]).T)


@given(st.floats(0.1, 60.0), st.floats(0.0, 3000.0))
def test_every_distance_is_served_by_one_set_that_emits_what_the_link_does(width, distance):
    segments = road_segments([[BEND]], width)
    serves = (segments.near <= distance) & (distance < segments.far)
    emitted = (segments.weight * lengths(segments.ends))[serves].sum()
    assert emitted == pytest.approx(90.0 + math.hypot(70.0, 120.0), rel=1e-9)


def test_lines_lie_at_the_centres_of_equal_strips():
    segments = road_segments([[[[0.0, 0.0], [0.0, 500.0]]]], 24.0)
    four = np.isclose(segments.weight, 0.25)
    assert sorted(segments.ends[four, 0, 0]) == pytest.approx([-9.0, -3.0, 3.0, 9.0])
    assert segments.sigma_y0[four] == pytest.approx(24.0 / (4 * math.sqrt(12.0)))
    assert segments.ends[four, :, 1] == pytest.approx(np.tile([0.0, 500.0], (4, 1)))


def test_a_receptor_near_the_edge_or_on_the_road_gets_the_finest_set():
    for width in (0.1, 7.2, 24.0, 60.0):
        windows = line_windows(width)
        assert windows[-1][1] == 0.0
        assert windows[-1][2] > 5.0
        assert windows[0][2] == math.inf


def test_pieces_near_one_chord_share_their_windows():
    gentle = [[0.0, 0.0], [100.0, 4.0], [200.0, 5.0], [300.0, 0.0]]
    segments = road_segments([[gentle]], 24.0)
    assert np.unique(segments.piece.reshape(-1, 4), axis=0).tolist() == [[0.0, 0.0, 300.0, 0.0]]
    sharp = road_segments([[BEND]], 24.0)
    assert len(np.unique(sharp.piece.reshape(-1, 4), axis=0)) == 2


def test_links_and_parts_keep_their_number():
    one, two = [[0.0, 0.0], [50.0, 0.0]], [[0.0, 9.0], [50.0, 9.0]]
    segments = road_segments([[one], [two, BEND]], [0.1, 0.2])
    assert segments.link.tolist() == [0, 1, 1, 1]
    assert segments.sigma_y0 == pytest.approx(np.array([0.1, 0.2, 0.2, 0.2]) / math.sqrt(12.0))


def test_a_line_without_length_makes_no_segment():
    segments = road_segments([[[[3.0, 3.0], [3.0, 3.0]]], []], 10.0)
    assert segments.ends.shape == segments.piece.shape == (0, 2, 2)


@pytest.mark.parametrize(
    ("width", "line", "message"),
    [
        (0.0, BEND, r"source_width\[0\]: 0 m; allowed: above 0 m"),
        (math.nan, BEND, r"source_width\[0\]: nan m; allowed"),
        ([1.0, 2.0], BEND, r"source_width: shape \(2,\); allowed: a scalar or \(1,\)"),
        (5.0, [[0.0, 0.0, 1.0]], r"lines\[0\]\[0\]: shape \(1, 3\); allowed: \(N, 2\)"),
        (5.0, [[0.0, math.inf]], r"lines\[0\]\[0\].*finite"),
    ],
)
def test_what_cannot_be_is_refused(width, line, message):
    with pytest.raises(ValueError, match=message):
        road_segments([[line]], width)


def response(segments, receptors, wind_from, code, terrain):
    count = len(segments.ends)
    return windowed_table(
        receptors,
        segments.ends,
        wind_from=wind_from,
        stability_codes=np.full(len(wind_from), code),
        strength=segments.weight[None],
        group=np.zeros(count, dtype=np.int64),
        n_groups=1,
        terrain=terrain,
        height=np.full(count, 1.3),
        sigma_z0=np.full(count, 1.2),
        sigma_y0=segments.sigma_y0,
        mixing_height=np.full(len(wind_from), np.inf),
        piece=segments.piece,
        near=segments.near,
        far=segments.far,
        across_only=True,
    )[:, 0, 0]


def fine_strip(width, half, receptors, wind_from, stability, terrain, lines=120):
    """The road as 120 lines, by the reference integral: what "fully spread" means.

    The lines have no width of their own to speak of: at 5 m and more from the edge
    their spacing, a hundredth of the road, is no longer seen.
    """
    offset = ((np.arange(lines) + 0.5) / lines - 0.5) * width
    ends = np.stack(
        [
            np.column_stack([offset, -half + 0 * offset]),
            np.column_stack([offset, half + 0 * offset]),
        ],
        axis=1,
    )
    return np.array(
        [
            unit_concentration(
                receptors, ends, wind_from=direction, wind_speed=1.0, stability=stability,
                terrain=terrain, sigma_y0=width / (lines * math.sqrt(12.0)),
            ).mean(axis=1)
            for direction in wind_from
        ]
    )  # fmt: skip


@pytest.mark.parametrize("width", [0.1, 4.0, 11.0, 24.0, 60.0])
@pytest.mark.parametrize(("terrain", "stability"), [("open", "F"), ("open", "C"), ("urban", "E")])
def test_receptors_5_m_from_the_edge_see_the_fully_spread_strip(width, terrain, stability):
    """Within 1 % beside a road, from across to along it, above a hundredth of the largest."""
    edge = np.array([5.0, 7.0, 11.0, 19.0, 33.0, 61.0, 120.0])
    receptors = np.column_stack([edge + width / 2, np.full(7, 20.0), np.full(7, 1.5)])
    wind_from = np.array([270.0, 240.0, 215.0, 195.0, 186.0, 182.0, 180.0])
    road = road_segments([[[[0.0, -800.0], [0.0, 800.0]]]], width)
    code = "ABCDEF".index(stability)
    made = response(road, receptors, wind_from, code, terrain)
    exact = fine_strip(width, 800.0, receptors, wind_from, stability, terrain)
    counts = exact > 0.01 * exact.max(axis=0)
    assert np.abs(made / np.where(counts, exact, np.inf) - counts).max() < 0.01


def test_opposite_the_end_of_a_road_the_strip_keeps_its_corner():
    """Within 1 % above a tenth of the largest, where a plume's edge passes the receptor."""
    edge = np.array([5.0, 15.0, 40.0, 100.0])
    receptors = np.column_stack([edge + 12.0, np.full(4, 200.0), np.full(4, 1.5)])
    wind_from = np.arange(180.0, 300.0, 5.0)
    road = road_segments([[[[0.0, -200.0], [0.0, 200.0]]]], 24.0)
    made = response(road, receptors, wind_from, 4, "open")
    exact = fine_strip(24.0, 200.0, receptors, wind_from, "E", "open")
    counts = exact > 0.1 * exact.max(axis=0)
    assert np.abs(made / np.where(counts, exact, np.inf) - counts).max() < 0.01


def test_a_value_never_depends_on_other_receptors():
    """Few receptors and many are cut into blocks differently; 2e-5 is float32 rounding."""
    random = np.random.default_rng(3)
    receptors = np.column_stack([random.uniform(-300, 300, (400, 2)), np.full(400, 1.5)])
    road, wind_from = road_segments([[BEND]], 24.0), np.array([200.0, 275.0])
    together = response(road, receptors, wind_from, 3, "urban")
    alone = response(road, receptors[37:38], wind_from, 3, "urban")
    assert alone[:, 0] == pytest.approx(together[:, 37], rel=2e-5)
