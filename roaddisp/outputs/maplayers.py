"""The layers of the map: concentration, limits, sites, roads and points."""

from __future__ import annotations

import re
import textwrap
from typing import TYPE_CHECKING, Any, Final, NamedTuple

import numpy as np

from roaddisp.model import BoolArray, Float32Array, FloatArray, Grid, Result, Verdicts
from roaddisp.outputs import palette
from roaddisp.outputs.mapframe import Frame, place_names
from roaddisp.outputs.raster import on_grid

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

STATISTIC: Final = "no2_mean_ugm3"
"""What the map shades."""

_MOST_NAMES: Final = 24

_BEYOND: Final = "#d3cfc4"


class Mark(NamedTuple):
    """How a point of one verdict is drawn: shape first, so that greyscale tells it."""

    shape: str
    face: str
    size: float
    label: str


MARKS: Final = {
    "no": Mark("X", palette.INK, 130.0, "not met"),
    "undetermined": Mark("D", "#ffffff", 66.0, "undetermined"),
    "yes": Mark("o", "#ffffff", 78.0, "met"),
    "": Mark("s", "#ffffff", 22.0, "not judged"),
}


def _colour_scale(values: FloatArray) -> tuple[Any, Any, FloatArray]:
    from matplotlib.colors import BoundaryNorm, LinearSegmentedColormap

    limits = palette.levels(values, 10)
    colours = LinearSegmentedColormap.from_list("concentration", palette.ANCHORS, N=256)
    return colours, BoundaryNorm(limits, 256, extend="both"), limits


def draw_concentration(
    axes: Axes, figure: Figure, result: Result, frame: Frame
) -> tuple[list[Any], tuple[Any, Any] | None]:
    """Shade the grid and draw the key of its colours.

    Returns the legend's entries and, where there is no grid, the colours and their
    classes for the points.
    """
    receptors = result.scenario.receptors
    values = result.summary[STATISTIC].to_numpy(dtype=float)
    inside = frame.holds(receptors.x, receptors.y) & ~receptors.on_road
    colours, norm, limits = _colour_scale(values[inside])
    _draw_key(figure, result, colours, norm, limits, receptors.z[inside])
    if receptors.grid is None:
        return [], (colours, norm)
    return _shade(axes, receptors.grid, on_grid(receptors, values), (colours, norm), frame), None


def _shade(
    axes: Axes, grid: Grid, cells: Float32Array, scale: tuple[Any, Any], frame: Frame
) -> list[Any]:
    from matplotlib.patches import Patch

    half = grid.spacing / 2
    east = grid.west + grid.spacing * (grid.columns - 1)
    south = grid.north - grid.spacing * (grid.rows - 1)
    axes.imshow(
        cells,
        cmap=scale[0],
        norm=scale[1],
        extent=(grid.west - half, east + half, south - half, grid.north + half),
        interpolation="nearest",
        zorder=1,
    )
    axes.set_xlim(frame.west, frame.east)
    axes.set_ylim(frame.south, frame.north)
    x = grid.west + grid.spacing * np.arange(grid.columns)
    y = grid.north - grid.spacing * np.arange(grid.rows)
    empty = np.isnan(cells) & frame.holds(*np.meshgrid(x, y))
    corners = np.array([frame.west, frame.east]), np.array([frame.south, frame.north])
    covered = Frame(grid.west - half, south - half, east + half, grid.north + half)
    if not empty.any() and covered.holds(*corners).all():
        return []
    axes.patch.set(hatch="///", edgecolor=_BEYOND, linewidth=0.0)
    return [Patch(facecolor="#ffffff", edgecolor=_BEYOND, hatch="///", label="beyond the grid")]


def _draw_key(
    figure: Figure, result: Result, colours: Any, norm: Any, limits: FloatArray, heights: FloatArray
) -> None:
    from matplotlib.cm import ScalarMappable

    bar = figure.colorbar(
        ScalarMappable(norm, colours),
        cax=figure.add_axes((0.742, 0.778, 0.225, 0.022)),
        orientation="horizontal",
        extend="both",
        ticks=_ticks(limits),
    )
    bar.outline.set_linewidth(0.6)
    bar.ax.minorticks_off()
    bar.ax.tick_params(labelsize=9, length=3, width=0.6)
    years = result.statistics.years
    period = f"{years[0]}" if len(years) == 1 else f"worst year of {years[0]} to {years[-1]}"
    reference = result.scenario.options.reference.replace(" C", " \u00b0C")
    low, high = (heights.min(), heights.max()) if heights.size else (0.0, 0.0)
    above = f"{low:g}" if low == high else f"{low:g} to {high:g}"
    figure.text(
        0.742, 0.878, f"NO\u2082, mean of {period} [\u00b5g/m\u00b3]", fontsize=11.5,
        weight="bold", color=palette.INK, va="top",
    )  # fmt: skip
    figure.text(
        0.742,
        0.852,
        f"background and roads together,\n{above} m above ground, gas volume at {reference}",
        fontsize=9,
        color=palette.INK,
        va="top",
        linespacing=1.25,
    )


def _ticks(limits: FloatArray) -> FloatArray:
    """About six of the class limits, at whole multiples of some of their steps."""
    step = limits[1] - limits[0]
    every = max(1, round(len(limits) / 6))
    ticks: FloatArray = limits[np.round(limits / step).astype(np.int64) % every == 0]
    return ticks


def wrapped(text: str, width: int = 30) -> str:
    """Break a text into lines for the legend."""
    return "\n".join(textwrap.wrap(text, width)) or text


def draw_limits(axes: Axes, result: Result) -> list[Any]:
    """Lines on which a standard's value at the grid passes its limit."""
    from matplotlib.lines import Line2D

    receptors, grid = result.scenario.receptors, result.scenario.receptors.grid
    if grid is None:
        return []
    handles = []
    x = grid.west + grid.spacing * np.arange(grid.columns)
    y = grid.north - grid.spacing * np.arange(grid.rows)
    for verdict, dash in zip(result.verdicts, ("-", "--", ":"), strict=False):
        cells = np.ma.masked_invalid(on_grid(receptors, verdict.value))
        # met up to the limit itself, whatever its last digit
        edge = verdict.limit + 0.5 * 10.0**-verdict.decimals
        if cells.count() == 0 or not cells.min() < edge < cells.max():
            continue
        axes.contour(x, y, cells, levels=[edge], colors="#ffffff", linewidths=3.4, zorder=3)
        axes.contour(
            x, y, cells, levels=[edge], colors=palette.INK, linewidths=1.7, linestyles=dash,
            zorder=3.1,
        )  # fmt: skip
        limit = f"{verdict.limit:.{verdict.decimals}f} {shown_unit(verdict)}"
        handles.append(
            Line2D([], [], color=palette.INK, lw=1.7, ls=dash,
                   label=f"{verdict.standard} at its limit,\n{limit}")
        )  # fmt: skip
    return handles


def shown_unit(verdict: Verdicts) -> str:
    """Write the unit of a standard as print sets it."""
    return verdict.unit.replace("ug/m3", "\u00b5g/m\u00b3")


def draw_sites(axes: Axes, result: Result) -> list[Any]:
    """Outline the sites; returns the legend's entries."""
    from matplotlib.patches import Patch, PathPatch
    from matplotlib.path import Path as Outline

    for site in result.scenario.sites:
        for rings in site.polygons:
            # a closed path spends its last vertex on the way back to the first
            outline = Outline.make_compound_path(
                *[Outline(np.vstack([ring, ring[:1]]), closed=True) for ring in rings]
            )
            axes.add_patch(
                PathPatch(outline, facecolor="none", edgecolor="#ffffff", lw=4.4, zorder=4)
            )
            axes.add_patch(
                PathPatch(outline, facecolor="none", edgecolor=palette.SITE, lw=2.2, zorder=4.1)
            )
    if not result.scenario.sites:
        return []
    label = "site" if len(result.scenario.sites) > 1 else result.scenario.sites[0].site
    return [Patch(facecolor="none", edgecolor=palette.SITE, lw=2.2, label=wrapped(label))]


def draw_roads(axes: Axes, result: Result, frame: Frame) -> list[Any]:
    """Roads at their true width, each name once, along the longest stretch in view."""
    from matplotlib.patches import Patch, Polygon
    from shapely import LineString, box

    window = box(frame.west, frame.south, frame.east, frame.north)
    stretches: dict[str, LineString] = {}
    network = result.scenario.network
    for name, link, lines, width in zip(
        network.name, network.link, network.lines, network.width, strict=True
    ):
        for vertices in lines:
            line = LineString(vertices)
            way = line.buffer(width / 2, cap_style="flat", join_style="round")
            for part in getattr(way, "geoms", [way]):
                axes.add_patch(
                    Polygon(np.asarray(part.exterior.coords), closed=True,
                            facecolor=palette.ROAD, edgecolor="#ffffff", lw=0.7, zorder=5)
                )  # fmt: skip
            seen = line.intersection(window)
            for part in getattr(seen, "geoms", [seen]):
                label = name or link
                if part.length > stretches.get(label, LineString()).length:
                    stretches[label] = part
    taken: list[FloatArray] = []
    for label, stretch in stretches.items():
        _name_road(axes, label, stretch, frame, taken)
    return [Patch(facecolor=palette.ROAD, edgecolor="#ffffff", label="road, true width")]


def _name_road(axes: Axes, label: str, stretch: Any, frame: Frame, taken: list[FloatArray]) -> None:
    """Write a name along its road, as far from the names in `taken` as the road allows."""
    from matplotlib.patheffects import withStroke

    # about the length of the words at this size, so that they stay on the road
    reach = 0.0105 * (frame.east - frame.west) * len(label)
    if stretch.length < reach:
        return
    places = [
        min(max(share * stretch.length, reach / 2), stretch.length - reach / 2)
        for share in (0.80, 0.50, 0.20)
    ]

    def clearance(place: float) -> float:
        at = np.asarray(stretch.interpolate(place).coords[0])
        return min((float(np.hypot(*(at - other))) for other in taken), default=0.0)

    at = max(places, key=clearance)
    before, middle, after = (
        np.asarray(stretch.interpolate(place).coords[0])
        for place in (at - reach / 2, at, at + reach / 2)
    )
    taken.append(middle)
    run = after - before
    angle = float(np.degrees(np.arctan2(run[1], run[0])))
    angle = (angle + 90.0) % 180.0 - 90.0
    axes.text(
        middle[0],
        middle[1],
        label,
        rotation=angle,
        rotation_mode="anchor",
        ha="center",
        va="center_baseline",
        fontsize=9.5,
        color=palette.INK,
        style="italic",
        zorder=9,
        clip_on=True,
        parse_math=False,
        path_effects=[withStroke(linewidth=3.0, foreground="#ffffff")],
    )


def named_points(result: Result) -> BoolArray:
    """(R,) bool: receptors the user placed, not those of a grid or laid over a site."""
    receptors = result.scenario.receptors
    sites = {site.site for site in result.scenario.sites}
    numbered = re.compile(r"(.*)-\d+")
    made = [
        match is not None and match[1] in sites
        for match in (numbered.fullmatch(name) for name in receptors.receptor)
    ]
    named: BoolArray = (receptors.cell[:, 0] < 0) & ~np.array(made, dtype=bool)
    return named


def draw_points(axes: Axes, result: Result, frame: Frame, *, coloured: Any) -> list[Any]:
    """Mark receptors by the verdict of the first standard, and name those the user placed."""
    from matplotlib.lines import Line2D

    receptors = result.scenario.receptors
    named = named_points(result)
    placed = (receptors.cell[:, 0] < 0) & frame.holds(receptors.x, receptors.y)
    first = result.verdicts[0] if result.verdicts else None
    met = np.array(first.met if first else [""] * len(receptors), dtype=object)
    values = result.summary[STATISTIC].to_numpy(dtype=float)
    handles = []
    for verdict, mark in MARKS.items():
        chosen = placed & (met == verdict)
        if not chosen.any():
            continue
        size = np.where(named[chosen], mark.size, mark.size / 9)
        look: dict[str, Any] = {"c": mark.face}
        if coloured is not None:
            look = {"c": values[chosen], "cmap": coloured[0], "norm": coloured[1]}
        edge = "#ffffff" if mark.shape == "X" else palette.INK
        axes.scatter(
            receptors.x[chosen],
            receptors.y[chosen],
            s=size,
            marker=mark.shape,
            edgecolors=edge,
            linewidths=np.where(named[chosen], 1.2, 0.4).tolist(),
            zorder=7,
            **look,
        )
        label = f"{first.standard}: {mark.label}" if first else "receptor"
        handles.append(
            Line2D([], [], ls="", marker=mark.shape, ms=9 if verdict else 5, mec=palette.INK,
                   mfc=mark.face, label=label)
        )  # fmt: skip
    shown = np.flatnonzero(named & placed)
    if 0 < len(shown) <= _MOST_NAMES:
        labels = [receptors.receptor[index] for index in shown]
        place_names(axes, receptors.x[shown], receptors.y[shown], labels)
    return handles
