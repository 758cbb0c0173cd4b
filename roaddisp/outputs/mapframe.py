"""The frame of a map: its window, scale bar, north arrow and the names of points."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

from roaddisp.model import BoolArray, FloatArray, Result
from roaddisp.outputs import palette

if TYPE_CHECKING:
    from matplotlib.axes import Axes

_MARGIN: Final = 120.0
_LEAST: Final = 300.0


@dataclass(frozen=True)
class Frame:
    """Window of a map in the study CRS [m]."""

    west: float
    south: float
    east: float
    north: float

    def holds(self, x: FloatArray, y: FloatArray) -> BoolArray:
        """Which points lie in the window."""
        inside: BoolArray = (
            (x >= self.west) & (x <= self.east) & (y >= self.south) & (y <= self.north)
        )
        return inside


def frame_of(result: Result, aspect: float) -> Frame:
    """Window that shows sites and points with room around them, and the roads beside.

    Parameters
    ----------
    result : Result
    aspect : float
        Width of the map over its height.

    Returns
    -------
    Frame
        Of that aspect. Without sites and points it holds the whole grid or network.
    """
    receptors = result.scenario.receptors
    placed = receptors.cell[:, 0] < 0
    parts = [np.column_stack([receptors.x[placed], receptors.y[placed]])]
    parts += [rings[0] for site in result.scenario.sites for rings in site.polygons]
    places = np.vstack(parts)
    if not len(places):
        places = np.column_stack([receptors.x, receptors.y])
    if not len(places):
        places = np.vstack([part for link in result.scenario.network.lines for part in link])
    low, high = places.min(axis=0), places.max(axis=0)
    centre = (low + high) / 2
    width, height = np.maximum(high - low + 2 * _MARGIN, _LEAST)
    width, height = max(width, height * aspect), max(height, width / aspect)
    return Frame(
        west=centre[0] - width / 2,
        south=centre[1] - height / 2,
        east=centre[0] + width / 2,
        north=centre[1] + height / 2,
    )


def scale_length(width: float) -> float:
    """Round length [m] of a scale bar for a map of some width: 1, 2 or 5 times a power of ten.

    >>> scale_length(950.0)
    200.0
    """
    aim = width / 4
    power = 10.0 ** np.floor(np.log10(aim))
    return float(max(step * power for step in (1.0, 2.0, 5.0) if step * power <= aim))


def draw_scale_bar(axes: Axes, frame: Frame) -> None:
    """Scale bar in metres, lower left, on a light ground."""
    from matplotlib.patches import Rectangle

    width, height = frame.east - frame.west, frame.north - frame.south
    length = scale_length(width)
    left, bottom = frame.west + 0.03 * width, frame.south + 0.035 * height
    thick = 0.011 * height
    axes.add_patch(
        Rectangle(
            (left - 0.02 * width, bottom - 0.02 * height),
            length + 0.055 * width,
            0.078 * height,
            facecolor="#ffffff",
            alpha=0.85,
            lw=0,
            zorder=10,
        )
    )
    for part, face in enumerate((palette.INK, "#ffffff")):
        axes.add_patch(
            Rectangle(
                (left + part * length / 2, bottom),
                length / 2,
                thick,
                facecolor=face,
                edgecolor=palette.INK,
                lw=0.8,
                zorder=11,
            )
        )
    for share, words in ((0.0, "0"), (0.5, f"{length / 2:g}"), (1.0, f"{length:g} m")):
        axes.text(
            left + share * length,
            bottom + 2.0 * thick,
            words,
            fontsize=9,
            ha="center",
            va="bottom",
            color=palette.INK,
            zorder=11,
        )


def draw_north_arrow(axes: Axes, frame: Frame) -> None:
    """Arrow to grid north, upper left."""
    from matplotlib.patches import Polygon, Rectangle

    width, height = frame.east - frame.west, frame.north - frame.south
    unit = 0.045 * height
    x, y = frame.west + 0.035 * width, frame.north - 0.085 * height
    axes.add_patch(
        Rectangle(
            (x - 0.6 * unit, y - 0.75 * unit),
            1.2 * unit,
            2.4 * unit,
            facecolor="#ffffff",
            alpha=0.85,
            lw=0,
            zorder=10,
        )
    )
    for side, face in ((-1, palette.INK), (1, "#ffffff")):
        axes.add_patch(
            Polygon(
                [
                    (x, y + 0.75 * unit),
                    (x + side * 0.38 * unit, y - 0.55 * unit),
                    (x, y - 0.2 * unit),
                ],
                facecolor=face,
                edgecolor=palette.INK,
                lw=0.8,
                zorder=11,
            )
        )
    axes.text(
        x, y + 0.8 * unit, "N", fontsize=11, weight="bold", ha="center", va="bottom",
        color=palette.INK, zorder=11,
    )  # fmt: skip


_PLACES: Final = (
    # offset in points, horizontal and vertical alignment; the first that is free wins
    (9, 0, "left", "center"),
    (-9, 0, "right", "center"),
    (0, 9, "center", "bottom"),
    (0, -9, "center", "top"),
    (7, 8, "left", "bottom"),
    (7, -8, "left", "top"),
    (-7, 8, "right", "bottom"),
    (-7, -8, "right", "top"),
)


def place_names(axes: Axes, x: FloatArray, y: FloatArray, names: list[str]) -> None:
    """Write names beside points where they cover neither each other nor a point.

    A name for which no place is free is left out; its point stays.
    """
    from matplotlib.patheffects import withStroke
    from matplotlib.transforms import Bbox

    figure = axes.figure
    points = axes.transData.transform(np.column_stack([x, y]))
    half = 7.0 * figure.dpi / 72
    taken = [Bbox.from_extents(px - half, py - half, px + half, py + half) for px, py in points]
    words = [text for text in axes.texts if text.get_text() not in {"N"}]
    taken += [text.get_window_extent() for text in words if not text.get_rotation()]
    window = axes.get_window_extent()
    for own, (px, py, name) in enumerate(zip(x, y, names, strict=True)):
        for across, up, horizontal, vertical in _PLACES:
            text = axes.annotate(
                name, (px, py), (across, up), textcoords="offset points", ha=horizontal,
                va=vertical, fontsize=9.5, color=palette.INK, zorder=12, parse_math=False,
                path_effects=[withStroke(linewidth=3.0, foreground="#ffffff")],
            )  # fmt: skip
            extent = text.get_window_extent()
            others = taken[:own] + taken[own + 1 :]
            inside = window.containsx(extent.x0) and window.containsx(extent.x1)
            if inside and not any(extent.overlaps(box) for box in others):
                taken.append(extent)
                break
            text.remove()
