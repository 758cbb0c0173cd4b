"""Receptors on outlines, inside sites, around roads; and the travelled way."""

from __future__ import annotations

import numpy as np
import pytest
import shapely

from roaddisp.geometry.receptors import (
    cell_positions,
    grid_cells,
    grid_extent,
    inside_points,
    nearest_edge,
    on_road,
    outline_points,
)

SQUARE = np.array([(3.0, 7.0), (63.0, 7.0), (63.0, 67.0), (3.0, 67.0), (3.0, 7.0)])
YARD = np.array([(13.0, 17.0), (33.0, 17.0), (33.0, 37.0), (13.0, 37.0), (13.0, 17.0)])
BEND = [[np.array([(0.0, 0.0), (400.0, 30.0), (500.0, 300.0)])]]


def test_outline_is_walked_at_the_spacing() -> None:
    """240 m around at 20 m are 12 points, each on the ring."""
    points = outline_points([(SQUARE,)], 20.0)
    assert len(points) == 12
    assert points[0].tolist() == [3.0, 7.0]
    ring = shapely.LinearRing(SQUARE)
    assert shapely.distance(ring, shapely.points(points)).max() < 1e-9
    assert np.allclose(np.hypot(*np.diff(points, axis=0).T), 20.0)


def test_outline_that_the_spacing_does_not_divide_ends_short() -> None:
    """240 m at 50 m: points at 0, 50, 100, 150, 200 m."""
    assert len(outline_points([(SQUARE,)], 50.0)) == 5


def test_inside_points_keep_out_of_courtyards() -> None:
    points = inside_points([(SQUARE, YARD)], 10.0)
    shape = shapely.Polygon(SQUARE, [YARD])
    assert shapely.contains(shape, shapely.points(points)).all()
    assert len(points) == 6 * 6 - 4
    assert np.all(points % 10.0 == 0.0)
    assert points[0].tolist() == [10.0, 60.0]  # the north-west comes first


@pytest.mark.parametrize(("spacing", "within"), [(20.0, 100.0), (35.0, 60.0), (12.5, 0.0)])
def test_grid_has_exactly_the_cells_near_the_roads(spacing: float, within: float) -> None:
    """Against shapely's distance, cell by cell, on a frame that is larger all around."""
    width = np.array([24.0])
    grid = grid_extent(BEND, width, spacing=spacing, within=within)
    taken = grid_cells(BEND, width, grid, within=within)
    cell = np.argwhere(taken)
    x, y = cell_positions(grid, cell)
    line = shapely.LineString(BEND[0][0])
    east = spacing * np.arange(-40, 80)
    every = np.array([(a, b) for a in east for b in east])
    near = shapely.distance(line, shapely.points(every)) <= 12.0 + within
    assert {tuple(place) for place in every[near]} == set(zip(x, y, strict=True))
    # the frame is tight: its first and last row and column are in use
    assert taken.any(axis=1)[[0, -1]].all() or within == 0.0
    assert np.all(x % spacing == 0)


def test_row_0_is_northernmost_and_column_0_westernmost() -> None:
    grid = grid_extent(BEND, np.array([10.0]), spacing=50.0, within=100.0)
    x, y = cell_positions(grid, np.array([[0, 0], [1, 2]]))
    assert x.tolist() == [grid.west, grid.west + 100.0]
    assert y.tolist() == [grid.north, grid.north - 50.0]


def test_travelled_way_is_a_strip_with_square_ends() -> None:
    road = [[np.array([(0.0, 0.0), (100.0, 0.0)])]]
    x = np.array([50.0, 50.0, 50.0, 0.5, -0.5, -0.5, 101.0])
    y = np.array([0.0, 6.99, 7.0, 6.9, 0.0, 6.9, 0.0])
    flags = on_road(x, y, road, np.array([14.0]))
    assert flags.tolist() == [True, True, False, True, False, False, False]


def test_travelled_way_follows_each_link_s_own_width() -> None:
    roads = [
        [np.array([(0.0, 0.0), (100.0, 0.0)])],
        [np.array([(0.0, 50.0), (40.0, 50.0)]), np.array([(60.0, 50.0), (100.0, 50.0)])],
    ]
    x = np.array([20.0, 20.0, 50.0, 80.0])
    y = np.array([5.0, 55.0, 50.0, 51.0])
    assert on_road(x, y, roads, np.array([4.0, 12.0])).tolist() == [False, True, False, True]


def test_nearest_edge_counts_from_the_edge() -> None:
    road = [[np.array([(0.0, 0.0), (100.0, 0.0)])]]
    assert (
        nearest_edge(np.array([50.0, 50.0]), np.array([90.0, -40.0]), road, np.array([10.0]))
        == 35.0
    )


def test_no_receptors_is_no_trouble() -> None:
    assert on_road(np.empty(0), np.empty(0), BEND, np.array([10.0])).shape == (0,)
