"""Receptors from points, sites and a grid, in that order."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any, Final

import numpy as np
import shapely

from roaddisp.geometry.receptors import (
    cell_positions,
    count_inside,
    grid_cells,
    grid_extent,
    inside_points,
    nearest_edge,
    on_road,
    outline_points,
)
from roaddisp.model import FloatArray, Grid, IntArray, Network, Receptors, Site
from roaddisp.study.columns import TableView
from roaddisp.study.layers import geometries
from roaddisp.study.problems import Problems, listed
from roaddisp.study.projection import WGS84, layer_crs, moved

MOST_CELLS: Final = 40_000_000
MOST_RECEPTORS: Final = 3_000_000
_FAR: Final = 3000.0  # m


@dataclass
class Gathered:
    """Receptors gathered so far, before the roads flag them."""

    receptor: list[str] = field(default_factory=list)
    site: list[str] = field(default_factory=list)
    kind: list[str] = field(default_factory=list)
    x: list[FloatArray] = field(default_factory=list)
    y: list[FloatArray] = field(default_factory=list)
    z: list[FloatArray] = field(default_factory=list)
    cell: list[IntArray] = field(default_factory=list)
    grid: Grid | None = None
    sites: tuple[Site, ...] = ()
    sound: bool = True

    def add(
        self,
        ids: Sequence[str],
        site: Sequence[str],
        kind: Sequence[str],
        x: FloatArray,
        y: FloatArray,
        z: FloatArray,
        cell: IntArray | None = None,
    ) -> None:
        """Add receptors behind those there are."""
        self.receptor += ids
        self.site += site
        self.kind += kind
        self.x.append(x)
        self.y.append(y)
        self.z.append(z)
        self.cell.append(np.full((len(ids), 2), -1) if cell is None else cell)


def add_points(gathered: Gathered, view: TableView, crs: Any, height: float) -> None:
    """Add the points of a layer or a CSV."""
    before = view.problems.errors
    ids, sites, kinds = view.words("receptor"), view.words("site"), view.words("kind")
    heights = view.numbers("height")
    first: dict[str, int] = {}
    twice = [row for row, name in enumerate(ids) if name and first.setdefault(name, row) != row]
    if twice:
        what = "feature" if view.table.is_layer else "row"
        view.error(
            "an id that stands twice",
            "receptor",
            twice[0],
            value=ids[twice[0]],
            allowed="ids that are unique",
            mend=f"{what} {first[ids[twice[0]]] + 1} has it too: rename or delete one of them",
            count=len(twice),
        )
    place = _layer_points(view, crs) if view.table.is_layer else _csv_points(view, crs)
    if place is None or view.problems.errors > before or not view.complete:
        gathered.sound = False
        return
    x, y = place
    lost = np.flatnonzero(~np.isfinite(x) | ~np.isfinite(y))
    if lost.size:
        gathered.sound = False
        view.error(
            "coordinates that cannot be brought into the study's CRS",
            "receptor",
            int(lost[0]),
            value=ids[int(lost[0])],
            allowed=f"a place that {crs.to_string()} covers",
            mend="look whether the CRS is the one the coordinates are in",
            count=lost.size,
        )
        return
    z = np.where(np.isnan(heights), height, heights)
    gathered.add(ids, sites, kinds, x, y, z)


def _layer_points(view: TableView, crs: Any) -> tuple[FloatArray, FloatArray] | None:
    shapes = geometries(view.table, ("Point",), view.problems)
    source = layer_crs(view.table, view.problems)
    if source is None or None in shapes:
        return None
    points = shapely.get_coordinates(shapes)
    return moved(points[:, 0], points[:, 1], source, crs)


def _csv_points(view: TableView, crs: Any) -> tuple[FloatArray, FloatArray] | None:
    metric, degrees = ("x", "y"), ("longitude", "latitude")
    have = [pair for pair in (metric, degrees) if view.has(pair[0]) or view.has(pair[1])]
    if len(have) != 1 or not all(view.has(name) for name in have[0]):
        view.problems.error(
            "the points give no place" if not have else "the place of the points is not clear",
            file=view.table.file,
            place=view.table.place(),
            value=listed(view.table.names),
            allowed="columns 'x [m]' and 'y [m]' in the study CRS, or 'longitude' and 'latitude'",
            mend="give one of the two pairs",
        )
        return None
    first, second = (view.numbers(name) for name in have[0])
    for name, values in zip(have[0], (first, second), strict=True):
        empty = np.flatnonzero(np.isnan(values))
        if empty.size and view.clean:
            view.error(
                "an empty cell",
                name,
                int(empty[0]),
                allowed="a value in every row",
                mend="fill it in",
                count=empty.size,
            )
    if have[0] == metric:
        return first, second
    return moved(first, second, WGS84, crs)


def add_sites(
    gathered: Gathered, view: TableView, crs: Any, height: float, *, outline: float, inside: float
) -> None:
    """Add the receptors of sites: along their outlines, then inside."""
    before = view.problems.errors
    names, kinds = view.words("site"), view.words("kind")
    shapes = geometries(view.table, ("Polygon", "MultiPolygon"), view.problems)
    source = layer_crs(view.table, view.problems)
    first: dict[str, int] = {}
    twice = [row for row, name in enumerate(names) if name and first.setdefault(name, row) != row]
    if twice:
        view.error(
            "a site that stands twice",
            "site",
            twice[0],
            value=names[twice[0]],
            allowed="one feature a site",
            mend="join its parts to one multipolygon",
            count=len(twice),
        )
    if source is None or view.problems.errors > before or not view.complete:
        gathered.sound = False
        return
    sites = []
    for row, (name, kind, shape) in enumerate(zip(names, kinds, shapes, strict=True)):
        polygons = _rings(shape, source, crs)
        if not all(np.isfinite(ring).all() for polygon in polygons for ring in polygon):
            view.error(
                "coordinates that cannot be brought into the study's CRS",
                "site",
                row,
                value=name,
                allowed=f"a place that {crs.to_string()} covers",
                mend="look whether the layer's CRS is right",
            )
            gathered.sound = False
            continue
        if sum(count_inside([polygon], inside) for polygon in polygons) > MOST_CELLS:
            view.error(
                "a site too large for the spacing of its receptors",
                "site",
                row,
                value=name,
                allowed=f"at most {MOST_RECEPTORS} receptors",
                mend="widen inside_spacing and outline_spacing in [receptors]",
            )
            gathered.sound = False
            continue
        points = np.concatenate(
            [outline_points(polygons, outline), inside_points(polygons, inside)]
        )
        count = len(points)
        ids = [f"{name}-{n}" for n in range(1, count + 1)]
        gathered.add(
            ids, [name] * count, [kind] * count, points[:, 0], points[:, 1], np.full(count, height)
        )
        sites.append(Site(name, kind, tuple(polygons)))
    gathered.sites = tuple(sites)


def _rings(shape: Any, source: Any, crs: Any) -> list[tuple[FloatArray, ...]]:
    polygons = []
    for part in shapely.get_parts(shape):
        rings = []
        for ring in (part.exterior, *part.interiors):
            points = shapely.get_coordinates(ring)
            rings.append(np.column_stack(moved(points[:, 0], points[:, 1], source, crs)))
        polygons.append(tuple(rings))
    return polygons


def add_grid(
    gathered: Gathered,
    networks: Sequence[Network],
    grid: Any,
    height: float,
    problems: Problems,
    *,
    file: str,
    place: str,
) -> None:
    """Add the cells of a grid around the roads of all scenarios."""
    lines = [link for network in networks for link in network.lines]
    width = np.concatenate([network.width for network in networks])
    extent = grid_extent(lines, width, spacing=grid.spacing, within=grid.within)
    size = extent.rows * extent.columns
    if 0 < size <= MOST_CELLS:
        taken = grid_cells(lines, width, extent, within=grid.within)
        cell = np.argwhere(taken).astype(np.int64)
        size = len(cell)
    if not 0 < size <= MOST_RECEPTORS:
        message = "too many cells" if size > 0 else "the grid has no cell near a road"
        problems.error(
            f"receptors.grid: {message}",
            file=file,
            place=place,
            value=f"{max(size, 0)} cells of {grid.spacing:g} m within {grid.within:g} m",
            allowed=f"1 to {MOST_RECEPTORS} cells, in a frame of at most {MOST_CELLS}",
            mend="widen the spacing or narrow the distance" if size > 0 else "narrow the spacing",
        )
        gathered.sound = False
        return
    x, y = cell_positions(extent, cell)
    ids = [f"grid-{row}-{column}" for row, column in cell.tolist()]
    empty = [""] * len(ids)
    gathered.add(ids, empty, ["grid"] * len(ids), x, y, np.full(len(ids), height), cell)
    gathered.grid = extent


def finish(
    gathered: Gathered, network: Network, crs: Any, problems: Problems, *, file: str, place: str
) -> Receptors | None:
    """Make the receptors of a scenario: placed on the earth, and flagged by its roads."""
    ids = gathered.receptor
    if not ids:
        problems.error(
            "receptors: there is none",
            file=file,
            place=place,
            allowed="at least one of points, sites and grid",
            mend="add points, sites or a grid",
        )
        return None
    seen: set[str] = set()
    twice = [name for name in ids if name in seen or seen.add(name)]  # type: ignore[func-returns-value]
    if twice:
        problems.error(
            "receptors: points, sites and grid make the same id",
            file=file,
            place=place,
            value=listed(twice),
            allowed="ids that are unique",
            mend="rename the points or the sites",
            count=len(twice),
        )
        return None
    x, y, z = (np.concatenate(parts) for parts in (gathered.x, gathered.y, gathered.z))
    longitude, latitude = moved(x, y, crs, WGS84)
    flagged = on_road(x, y, network.lines, network.width)
    return Receptors(
        tuple(ids),
        tuple(gathered.site),
        tuple(gathered.kind),
        x,
        y,
        z,
        longitude,
        latitude,
        flagged,
        gathered.grid,
        np.concatenate(gathered.cell),
    )


def caution_receptors(
    receptors: Receptors, network: Network, lid: float, problems: Problems, *, file: str, place: str
) -> None:
    """Note receptors on the road, far from every road, or above the lid."""
    listed_points = receptors.on_road & (receptors.cell[:, 0] < 0)
    for which, what in (
        (listed_points, "receptors on the road: they keep their row, and no standard judges them"),
        (
            receptors.on_road & ~listed_points,
            "grid cells on the road: they keep their value, flagged",
        ),
    ):
        rows = np.flatnonzero(which)
        if rows.size:
            problems.caution(
                f"receptors: {what}",
                file=file,
                place=place,
                count=rows.size,
                value=listed([receptors.receptor[row] for row in rows[:5]]),
                mend="move them to where people are, or accept it",
            )
    distance = nearest_edge(receptors.x, receptors.y, network.lines, network.width)
    if distance > _FAR:
        problems.caution(
            "receptors: roads and receptors do not overlap",
            file=file,
            place=place,
            value=f"{distance / 1000:.3g} km from the nearest receptor to the nearest road",
            mend="look whether the CRS of both layers is right",
        )
    above = np.flatnonzero(receptors.z > lid)
    if above.size:
        problems.caution(
            "receptors: above the lid in some hours, in which they receive nothing",
            file=file,
            place=place,
            count=above.size,
            value=f"{receptors.receptor[above[0]]}, "
            f"{receptors.z[above[0]]:g} m; lowest lid {lid:g} m",
            mend="look whether heights and mixing heights are in the right unit",
        )
