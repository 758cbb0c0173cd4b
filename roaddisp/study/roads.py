"""Roads from a vector layer: checked, and brought into the study's CRS as a network."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
import shapely

from roaddisp.constants import DEFAULT_ROAD_WIDTH, LANE_WIDTH
from roaddisp.model import FloatArray, IntArray, Network
from roaddisp.study.columns import TableView
from roaddisp.study.layers import geometries
from roaddisp.study.problems import Problems, listed, nearest
from roaddisp.study.projection import WGS84, layer_crs, moved


@dataclass(frozen=True)
class RoadLayer:
    """Roads as the layer gives them, checked for themselves.

    Attributes
    ----------
    view : TableView
    shapes : list of geometry or None, in ``crs``
    crs : pyproj CRS
    columns : mapping of our column name to words or numbers
    """

    view: TableView
    shapes: list[Any]
    crs: Any
    columns: Mapping[str, Any]

    @property
    def sound(self) -> bool:
        """Whether a network can be made of it."""
        return self.view.complete and self.view.clean and None not in self.shapes

    def degrees(self) -> FloatArray:
        """(N, 2) longitude and latitude of every vertex that can be placed."""
        points = shapely.get_coordinates([shape for shape in self.shapes if shape is not None])
        longitude, latitude = moved(points[:, 0], points[:, 1], self.crs, WGS84)
        every = np.column_stack([longitude, latitude])
        placed: FloatArray = every[np.isfinite(every).all(axis=1)]
        return placed


def check_roads(view: TableView, problems: Problems) -> RoadLayer | None:
    """Check a road layer for itself: geometry, CRS, ids, columns.

    Returns
    -------
    RoadLayer or None
        None where the layer has no CRS or no usable geometry.
    """
    shapes = geometries(view.table, ("LineString", "MultiLineString"), problems)
    crs = layer_crs(view.table, problems)
    columns: dict[str, Any] = {
        name: view.words(name) for name in ("link", "name", "profile", "fleet")
    }
    for name in ("aadt", "speed", "heavy_share", "width", "lanes"):
        columns[name] = view.numbers(name)
    _check_unique(view, columns["link"])
    if crs is None or all(shape is None for shape in shapes):
        return None
    return RoadLayer(view, shapes, crs, columns)


def _check_unique(view: TableView, names: list[str]) -> None:
    first: dict[str, int] = {}
    twice = [row for row, name in enumerate(names) if name and first.setdefault(name, row) != row]
    if twice:
        row = twice[0]
        view.error(
            "an id that stands twice",
            "link",
            row,
            value=names[row],
            allowed="ids that are unique",
            mend=f"feature {first[names[row]] + 1} has it too: rename or delete one of them",
            count=len(twice),
        )


def make_network(
    layer: RoadLayer,
    crs: Any,
    *,
    profiles: tuple[str, ...] | None,
    fleets: tuple[str, ...] | None,
    counted: frozenset[str],
    counts_only: bool,
    problems: Problems,
) -> Network | None:
    """Make the network of a scenario.

    Parameters
    ----------
    layer : RoadLayer
    crs : pyproj CRS
        Of the study.
    profiles, fleets : tuple of str or None
        Names there are; None where their table could not be read.
    counted : frozenset of str
        Links that have hourly counts.
    counts_only : bool
        Whether the study has no profiles, so that an AADT alone is not enough.
    problems : Problems

    Returns
    -------
    Network or None
        None where something was refused.
    """
    view, columns = layer.view, layer.columns
    before = problems.errors
    lines = _lines(layer, crs)
    if lines is None:
        return None
    aadt = np.where([link in counted for link in columns["link"]], np.nan, columns["aadt"])
    _check_volumes(view, columns, aadt, counted, counts_only)
    profile = _indices(view, "profile", columns["profile"], profiles, np.isnan(aadt))
    fleet = _indices(view, "fleet", columns["fleet"], fleets, np.zeros(len(view), dtype=bool))
    lanes = columns["lanes"] * LANE_WIDTH
    width = np.where(np.isnan(columns["width"]), lanes, columns["width"])
    width = np.where(np.isnan(width), DEFAULT_ROAD_WIDTH, width)
    if problems.errors > before or not layer.sound:
        return None
    links = tuple(columns["link"])
    names = tuple(name or link for name, link in zip(columns["name"], links, strict=True))
    return Network(
        links, names, lines, width, aadt, columns["speed"], columns["heavy_share"], profile, fleet
    )


def _lines(layer: RoadLayer, crs: Any) -> tuple[tuple[FloatArray, ...], ...] | None:
    lost: list[int] = []
    lines: list[tuple[FloatArray, ...]] = []
    for row, shape in enumerate(layer.shapes):
        if shape is None:
            continue
        parts = []
        for part in shapely.get_parts(shape):
            points = shapely.get_coordinates(part)
            x, y = moved(points[:, 0], points[:, 1], layer.crs, crs)
            points = np.column_stack([x, y])
            keep = np.r_[True, np.any(points[1:] != points[:-1], axis=1)]
            parts.append(points[keep])
        if not all(np.isfinite(part).all() for part in parts):
            lost.append(row)
        lines.append(tuple(parts))
    if lost:
        layer.view.problems.error(
            "coordinates that cannot be brought into the study's CRS",
            file=layer.view.table.file,
            place=layer.view.table.place(lost[0]),
            value=layer.crs.to_string(),
            allowed=f"a place that {crs.to_string()} covers",
            mend="look whether the layer's CRS is the one its coordinates are in",
            count=len(lost),
        )
        return None
    return tuple(lines)


def _check_volumes(
    view: TableView,
    columns: Mapping[str, Any],
    aadt: FloatArray,
    counted: frozenset[str],
    counts_only: bool,
) -> None:
    links = columns["link"]
    without = [
        row
        for row, link in enumerate(links)
        if link not in counted and (counts_only or np.isnan(aadt[row]))
    ]
    if without and counts_only:
        view.error(
            "a link without counts, in a study without profiles",
            "link",
            without[0],
            value=links[without[0]],
            allowed="rows in the counts for each link, or profiles for those with an AADT",
            mend="add the counts, or name profiles in [traffic]",
            count=len(without),
        )
    elif without and (view.clean or not view.has("aadt")):
        row = without[0]
        view.error(
            "a link with neither AADT nor counts",
            "aadt",
            row,
            value=links[row],
            allowed="vehicles/day, or rows in the counts",
            mend="add one of them",
            count=len(without),
        )
    both = [row for row, link in enumerate(links) if link in counted and columns["aadt"][row] > 0]
    if both:
        view.caution(
            "links with AADT and counts: the counts are taken",
            "aadt",
            both[0],
            value=links[both[0]],
            count=len(both),
        )


def _indices(
    view: TableView, name: str, words: list[str], known: tuple[str, ...] | None, exempt: Any
) -> IntArray:
    """Find each link's profile or fleet by its name; -1 where it names none."""
    index = np.full(len(words), -1, dtype=np.int64)
    if known is None:
        return index
    place = {each: number for number, each in enumerate(known)}
    unknown = [row for row, word in enumerate(words) if word and word not in place]
    silent = [row for row, word in enumerate(words) if not word and not exempt[row]]
    for row, word in enumerate(words):
        index[row] = place.get(word, -1)
    if unknown:
        row = unknown[0]
        near = nearest(words[row], known)
        view.error(
            f"an unknown {name}",
            name,
            row,
            value=words[row],
            allowed=listed(known) or f"none: the study has no {name}s",
            mend=f"did you mean {near!r}?" if near else f"add it to the table of {name}s",
            count=len(unknown),
        )
    if silent and len(known) > 1:
        row = silent[0]
        view.error(
            f"a link that names no {name}, where there are several",
            name,
            row,
            allowed=listed(known),
            mend="name one for each link",
            count=len(silent),
        )
    return index


def road_centroid(network: Network, crs: Any) -> tuple[float, float]:
    """Longitude and latitude [deg] of the roads' centroid, by length."""
    centre = shapely.MultiLineString(
        [line.tolist() for link in network.lines for line in link]
    ).centroid
    longitude, latitude = moved(np.array([centre.x]), np.array([centre.y]), crs, WGS84)
    return float(longitude[0]), float(latitude[0])
