"""The map of a run: NO2 around the roads, sites, and the verdict at each point."""

from __future__ import annotations

import textwrap
import warnings
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

import numpy as np

from roaddisp.model import Result
from roaddisp.outputs import palette
from roaddisp.outputs.cautions import cautions
from roaddisp.outputs.mapframe import draw_north_arrow, draw_scale_bar, frame_of
from roaddisp.outputs.maplayers import (
    draw_concentration,
    draw_limits,
    draw_points,
    draw_roads,
    draw_sites,
    shown_unit,
)

if TYPE_CHECKING:
    from matplotlib.figure import Figure

SIZE: Final = (12.0, 8.4)
"""in; at 150 dots an inch 1,800 by 1,260 pixels."""


def write_map(result: Result, path: Path) -> None:
    """Write ``map.png``.

    Parameters
    ----------
    result : Result
    path : Path
    """
    with warnings.catch_warnings():
        # a title in a script that the font lacks is drawn with empty boxes
        warnings.filterwarnings("ignore", "Glyph .* missing", UserWarning)
        figure = draw_map(result)
        figure.savefig(path, dpi=150, format="png", facecolor=palette.PAPER)


def draw_map(result: Result) -> Figure:
    """Draw the map without any window or global state.

    Parameters
    ----------
    result : Result

    Returns
    -------
    matplotlib.figure.Figure
    """
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    figure = Figure(figsize=SIZE, facecolor=palette.PAPER)
    FigureCanvasAgg(figure)
    axes = figure.add_axes((0.025, 0.095, 0.70, 0.805))
    frame = frame_of(result, 0.70 * SIZE[0] / (0.805 * SIZE[1]))
    axes.set_xlim(frame.west, frame.east)
    axes.set_ylim(frame.south, frame.north)
    axes.set_aspect("equal")
    axes.set_xticks([])
    axes.set_yticks([])
    axes.set_facecolor("#ffffff")
    for spine in axes.spines.values():
        spine.set_color(palette.INK)
        spine.set_linewidth(0.8)

    beyond, scale = draw_concentration(axes, figure, result, frame)
    handles: list[Any] = []
    handles += draw_limits(axes, result)
    handles += draw_sites(axes, result)
    handles += draw_roads(axes, result, frame)
    handles += draw_points(axes, result, frame, coloured=scale)
    handles += beyond
    draw_scale_bar(axes, frame)
    draw_north_arrow(axes, frame)
    _write_words(figure, result)
    figure.legend(
        handles=handles,
        loc="upper left",
        bbox_to_anchor=(0.738, 0.70),
        frameon=False,
        fontsize=10,
        handlelength=2.0,
        labelspacing=0.75,
        borderaxespad=0.0,
    )
    return figure


# --- words --------------------------------------------------------------------------


def _write_words(figure: Figure, result: Result) -> None:
    title = "\n".join(textwrap.wrap(result.study.title, 84)[:2])
    figure.text(
        0.025, 0.975, title, fontsize=17, weight="bold", color=palette.INK, va="top",
        parse_math=False,
    )  # fmt: skip
    options = result.scenario.options
    factors = "built-in emission factors" if result.scenario.factors.built_in else ""
    parts = [
        f"scenario {result.scenario.name}",
        f"traffic and fleet of {options.year}",
        f"NO\u2082 {options.conversion}",
        f"{options.terrain} terrain",
        result.study.crs,
        factors,
    ]
    figure.text(
        0.025, 0.926, "   \u00b7   ".join(part for part in parts if part), fontsize=10.5,
        color=palette.INK, va="top", parse_math=False,
    )  # fmt: skip
    figure.text(
        0.025, 0.072, textwrap.fill(" ".join(cautions(result)), 176), fontsize=8.8,
        color=palette.INK, va="top", linespacing=1.35,
    )  # fmt: skip
    _write_verdicts(figure, result)


def _write_verdicts(figure: Figure, result: Result) -> None:
    """How many of the receptors each standard judges meet it, and the worst of them."""
    lines = []
    for verdict in result.verdicts[:4]:
        judged = np.array([bool(met) for met in verdict.met])
        values = np.where(judged, verdict.value, np.nan)
        met = sum(word == "yes" for word in verdict.met)
        text = f"met at {met} of {judged.sum()} receptors judged"
        if np.isfinite(values).any():
            worst = int(np.nanargmax(values))
            name = textwrap.shorten(result.scenario.receptors.receptor[worst], 26)
            text += f"\nhighest {values[worst]:.{verdict.decimals}f} {shown_unit(verdict)}, {name}"
        limit = f"{verdict.limit:.{verdict.decimals}f} {shown_unit(verdict)}"
        lines.append(f"{verdict.standard}, limit {limit}\n{text}")
    figure.text(
        0.742, 0.10, "\n\n".join(lines), fontsize=9.5, color=palette.INK, va="bottom",
        linespacing=1.35, parse_math=False,
    )  # fmt: skip
