"""Where receptors go: outlines and insides of sites, grids around roads, the road itself."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise

import numpy as np
import numpy.typing as npt
import shapely

from roaddisp.model import BoolArray, FloatArray, Grid, IntArray

Ring = FloatArray
Polygon = tuple[Ring, ...]
Lines = Sequence[Sequence[FloatArray]]


def outline_points(polygons: Sequence[Polygon], spacing: float) -> FloatArray:
    """Points along every ring of a site, each ring from its first vertex on.

    Parameters
    ----------
    polygons : sequence of tuples of (N, 2) arrays [m]
        Rings, outer first, closed.
    spacing : float [m]
        Along the ring; the last gap of a ring may be shorter.

    Returns
    -------
    (P, 2) [m]

    Examples
    --------
    >>> square = np.array([[0, 0], [30, 0], [30, 30], [0, 30], [0, 0]], dtype=float)
    >>> len(outline_points([(square,)], 20.0))
    6
    """
    points = []
    for polygon in polygons:
        for ring in polygon:
            line = shapely.LineString(ring)
            count = max(int(np.ceil(line.length / spacing - 1e-9)), 1)
            along = shapely.line_interpolate_point(line, spacing * np.arange(count))
            points.append(shapely.get_coordinates(along))
    return np.concatenate(points) if points else np.empty((0, 2))


def inside_points(polygons: Sequence[Polygon], spacing: float) -> FloatArray:
    """Points inside a site, at multiples of the spacing, from the north-west on by rows.

    Parameters
    ----------
    polygons : sequence of tuples of (N, 2) arrays [m]
    spacing : float [m]

    Returns
    -------
    (P, 2) [m]
        Strictly inside; none on the outline.

    Examples
    --------
    >>> square = np.array([[0, 0], [30, 0], [30, 30], [0, 30], [0, 0]], dtype=float)
    >>> inside_points([(square,)], 20.0).tolist()
    [[20.0, 20.0]]
    """
    shape = shapely.MultiPolygon([(polygon[0], list(polygon[1:])) for polygon in polygons])
    west, south, east, north = shape.bounds
    x: FloatArray = spacing * np.arange(np.floor(west / spacing), np.ceil(east / spacing) + 1)
    y = spacing * np.arange(np.ceil(north / spacing), np.floor(south / spacing) - 1, -1)
    across, up = np.meshgrid(x, y)
    shapely.prepare(shape)
    within = shapely.contains_properly(shape, shapely.points(across, up))
    return np.column_stack([across[within], up[within]])


def count_inside(polygons: Sequence[Polygon], spacing: float) -> float:
    """Say how many points of a spacing the box around a site has."""
    rings = np.concatenate([polygon[0] for polygon in polygons])
    width, depth = rings.max(axis=0) - rings.min(axis=0)
    return float((width / spacing + 1) * (depth / spacing + 1))


def grid_extent(lines: Lines, width: FloatArray, *, spacing: float, within: float) -> Grid:
    """Find the smallest grid that holds every cell within a distance of the roads' edges.

    Parameters
    ----------
    lines : (L,) sequences of (N, 2) arrays [m]
    width : (L,) [m]
    spacing, within : float [m]

    Returns
    -------
    Grid
        Centres at multiples of the spacing.

    Examples
    --------
    >>> road = [[np.array([[0.0, 0.0], [100.0, 0.0]])]]
    >>> grid_extent(road, np.array([10.0]), spacing=20.0, within=15.0)
    Grid(west=-20.0, north=20.0, spacing=20.0, rows=3, columns=8)
    """
    reach = width / 2.0 + within
    low = np.array([np.concatenate(list(link)).min(axis=0) for link in lines]) - reach[:, None]
    high = np.array([np.concatenate(list(link)).max(axis=0) for link in lines]) + reach[:, None]
    west, south = np.ceil(low.min(axis=0) / spacing - 1e-9)
    east, north = np.floor(high.max(axis=0) / spacing + 1e-9)
    return Grid(
        float(west * spacing),
        float(north * spacing),
        spacing,
        int(north - south) + 1,
        int(east - west) + 1,
    )


def grid_cells(lines: Lines, width: FloatArray, grid: Grid, *, within: float) -> BoolArray:
    """Find the cells of a grid whose centre lies within a distance of a road's edge.

    Parameters
    ----------
    lines : (L,) sequences of (N, 2) arrays [m]
    width : (L,) [m]
    grid : Grid
    within : float [m]

    Returns
    -------
    (rows, columns) bool

    Examples
    --------
    >>> road = [[np.array([[0.0, 0.0], [40.0, 0.0]])]]
    >>> grid = grid_extent(road, np.array([10.0]), spacing=20.0, within=15.0)
    >>> grid_cells(road, np.array([10.0]), grid, within=15.0).astype(int)
    array([[0, 1, 1, 1, 0],
           [1, 1, 1, 1, 1],
           [0, 1, 1, 1, 0]])
    """
    taken = np.zeros((grid.rows, grid.columns), dtype=bool)
    for link, full in zip(lines, width, strict=True):
        reach = float(full) / 2.0 + within
        for line in link:
            for start, end in pairwise(line):
                _mark(taken, grid, start, end, reach)
    return taken


def _mark(taken: BoolArray, grid: Grid, start: FloatArray, end: FloatArray, reach: float) -> None:
    """Mark the cells within ``reach`` of a straight piece."""
    low, high = np.minimum(start, end) - reach, np.maximum(start, end) + reach
    left = max(int(np.floor((low[0] - grid.west) / grid.spacing)), 0)
    right = min(int(np.ceil((high[0] - grid.west) / grid.spacing)), grid.columns - 1)
    top = max(int(np.floor((grid.north - high[1]) / grid.spacing)), 0)
    bottom = min(int(np.ceil((grid.north - low[1]) / grid.spacing)), grid.rows - 1)
    x: FloatArray = grid.west + grid.spacing * np.arange(left, right + 1) - start[0]
    y = (grid.north - grid.spacing * np.arange(top, bottom + 1) - start[1])[:, None]
    along = end - start
    length2 = float(along @ along)
    share = np.clip((x * along[0] + y * along[1]) / length2, 0.0, 1.0) if length2 > 0 else 0.0
    distance2 = (x - share * along[0]) ** 2 + (y - share * along[1]) ** 2
    taken[top : bottom + 1, left : right + 1] |= distance2 <= reach**2 * (1 + 1e-12)


def cell_positions(grid: Grid, cell: IntArray) -> tuple[FloatArray, FloatArray]:
    """Take the centres of cells given as (R, 2) rows and columns.

    Examples
    --------
    >>> x, y = cell_positions(Grid(-20.0, 20.0, 20.0, 3, 8), np.array([[2, 1]]))
    >>> float(x[0]), float(y[0])
    (0.0, -20.0)
    """
    row, column = cell[:, 0].astype(float), cell[:, 1].astype(float)
    return grid.west + grid.spacing * column, grid.north - grid.spacing * row


def on_road(x: FloatArray, y: FloatArray, lines: Lines, width: FloatArray) -> BoolArray:
    """Say which receptors lie within the travelled way of a link.

    The travelled way is the strip of the link's width, cut off square at the
    ends of the link; its edge is not of it.

    Parameters
    ----------
    x, y : (R,) [m]
    lines : (L,) sequences of (N, 2) arrays [m]
    width : (L,) [m]

    Returns
    -------
    (R,) bool

    Examples
    --------
    >>> road = [[np.array([[0.0, 0.0], [100.0, 0.0]])]]
    >>> x, y = np.array([50.0, 50.0, -1.0]), np.array([4.9, 5.0, 0.0])
    >>> on_road(x, y, road, np.array([10.0])).tolist()
    [True, False, False]
    """
    flagged = np.zeros(len(x), dtype=bool)
    if not len(x):
        return flagged
    points, ways = _points(x, y), _ways(lines)
    half = np.asarray(width, dtype=float) / 2.0
    near, at = shapely.STRtree(points).query(ways, predicate="dwithin", distance=half)
    for link in np.unique(near):
        strip = shapely.buffer(ways[link], half[link], cap_style="flat", join_style="round")
        shapely.prepare(strip)
        candidates = at[near == link]
        inside = shapely.contains_properly(strip, points[candidates])
        edge = shapely.distance(ways[link], points[candidates]) < half[link] - 1e-9
        flagged[candidates[inside & edge]] = True
    return flagged


def nearest_edge(x: FloatArray, y: FloatArray, lines: Lines, width: FloatArray) -> float:
    """Find the least distance [m] between a receptor and the edge of a link."""
    points, ways = _points(x, y), _ways(lines)
    link = shapely.STRtree(ways).nearest(points)
    distance = shapely.distance(points, ways[link])
    return float(np.min(distance - np.asarray(width)[link] / 2.0))


def _points(x: FloatArray, y: FloatArray) -> npt.NDArray[np.object_]:
    return np.asarray(shapely.points(x, y), dtype=object)


def _ways(lines: Lines) -> npt.NDArray[np.object_]:
    """Make one geometry of each link's parts."""
    ways = np.empty(len(lines), dtype=object)
    ways[:] = [shapely.MultiLineString([line.tolist() for line in link]) for link in lines]
    return ways
