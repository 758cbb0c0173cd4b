"""Roads of real width as parallel lines, as many as a receptor's distance asks for."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from typing import Final

import numpy as np
import numpy.typing as npt

from roaddisp.model import FloatArray, Segments

LEAST_EDGE_DISTANCE: Final = 5.0
"""m from the edge; nearer receptors, and those on the road, get the finest set."""

STRIP_BASE, STRIP_GROWTH = 1.0, 0.14
"""A strip may be this wide [m], and so much wider for each metre from the edge."""

LINE_COUNTS: Final = (1, 2, 3, 4, 6, 8, 12, 16, 24, 32, 48)

STRAIGHT: Final = 10.0
"""m; pieces of a line that stay this near a chord share its windows."""


def road_segments(
    lines: Sequence[Sequence[npt.ArrayLike]], source_width: npt.ArrayLike
) -> Segments:
    """Parallel lines that stand for roads spread evenly over their width.

    Parameters
    ----------
    lines : sequence (L,) of sequences of (N, 2) arrays [m]
        The parts of each link: centrelines through their vertices.
    source_width : scalar or (L,)
        Width over which each link's emission is spread, above 0 [m].

    Returns
    -------
    Segments
        Several sets of lines for each piece between two vertices. A set cuts the
        width into n equal strips: a line at each strip's centre, as long as the
        piece, ``sigma_y0 = width / (n sqrt(12))``, ``weight = 1 / n``. Sets share out
        the receptors by plan distance, ``near <= distance < far``, so the choice for
        a receptor never depends on other receptors. ``piece`` is the chord from
        which the distance is taken: pieces that stay within 10 m of one chord share
        it, so that a receptor sees them all with the same n.

    Raises
    ------
    ValueError
        Where a width is not above 0, their number is not that of the links, or a
        line is not an (N, 2) array of finite numbers.

    Notes
    -----
    A receptor at distance e from the edge (at least 5 m) gets the least n of
    1, 2, 3, 4, 6, 8, 12, 16, 24, 32, 48 with ``width / n <= 1 m + 0.14 e``. The
    numbers were found by trial against strips of 200 lines, with the spread taken
    across the road alone (`windowed_table(..., across_only=True)`), over widths of
    0.1 to 60 m, edges 5 to 130 m away, every class, both terrains and winds from
    across to along the road, in states above a hundredth of a receptor's largest:
    within 0.2 % of the strip beside a long road for receptors at 1.5 m, 1.8 % at
    10 m; opposite the free end of a road, where a plume's edge may graze the
    receptor, within 2.5 %, and 0.4 % in states above a tenth of the largest.

    Examples
    --------
    A narrow road needs a single line, a wide one several near it:

    >>> road = [[[0.0, 0.0], [100.0, 0.0]]]
    >>> len(road_segments([road], 0.1).ends)
    1
    >>> wide = road_segments([road], 24.0)
    >>> [int((wide.near == near).sum()) for near in np.unique(wide.near)]
    [16, 12, 8, 6, 4, 3, 2, 1]
    """
    width = _widths(source_width, len(lines))
    rows = [
        (link, ends, count, chord, near, far, width[link])
        for link, parts in enumerate(lines)
        for part, vertices in enumerate(parts)
        for ends, count, chord, near, far in _line_sets(
            _vertices(vertices, link, part), float(width[link])
        )
    ]
    counts = np.array([row[2] for row in rows], dtype=np.int64)
    of_line = np.repeat(np.arange(len(rows)), counts)
    share = 1.0 / counts[of_line]
    across = np.array([row[6] for row in rows], dtype=np.float64)[of_line]
    return Segments(
        ends=np.concatenate([row[1] for row in rows]) if rows else np.zeros((0, 2, 2)),
        link=np.array([row[0] for row in rows], dtype=np.int64)[of_line],
        weight=share,
        sigma_y0=across * share / math.sqrt(12.0),
        piece=np.array([row[3] for row in rows], dtype=np.float64).reshape(-1, 2, 2)[of_line],
        near=np.array([row[4] for row in rows], dtype=np.float64)[of_line],
        far=np.array([row[5] for row in rows], dtype=np.float64)[of_line],
    )


def line_windows(width: float) -> list[tuple[int, float, float]]:
    """Numbers of lines, each with the distances from the edge it serves, far to near.

    >>> [(n, round(near, 1)) for n, near, _ in line_windows(7.2)]
    [(1, 44.3), (2, 18.6), (3, 10.0), (4, 5.7), (6, 0.0)]
    """
    windows = []
    far = math.inf
    for count in LINE_COUNTS:
        serves_from = (width / count - STRIP_BASE) / STRIP_GROWTH
        finest = serves_from <= LEAST_EDGE_DISTANCE or count == LINE_COUNTS[-1]
        near = 0.0 if finest else serves_from
        windows.append((count, near, far))
        if finest:
            break
        far = near
    return windows


def _line_sets(
    vertices: FloatArray, width: float
) -> Iterator[tuple[FloatArray, int, FloatArray, float, float]]:
    """For each piece and number of lines: the lines, the chord, and the window from it."""
    windows = line_windows(width)
    for first, last, bulge in _straight_runs(vertices):
        chord = vertices[[first, last]]
        for start, end in zip(vertices[first:last], vertices[first + 1 : last + 1], strict=True):
            along = (end - start) / np.hypot(*(end - start))
            normal = np.array([-along[1], along[0]])
            for count, near, far in windows:
                offset = ((np.arange(count) + 0.5) / count - 0.5) * width
                shift = offset[:, None] * normal
                ends = np.stack([start + shift, end + shift], axis=1)
                inner = near + width / 2.0 + bulge if near > 0.0 else 0.0
                yield ends, count, chord, inner, far + width / 2.0 + bulge


def _straight_runs(vertices: FloatArray) -> Iterator[tuple[int, int, float]]:
    """First and last vertex of runs that keep to a chord, and how far they stray from it."""
    first = 0
    while first < len(vertices) - 1:
        last, bulge = first + 1, 0.0
        for candidate in range(first + 2, len(vertices)):
            stray = _distance_from(
                vertices[first + 1 : candidate], vertices[first], vertices[candidate]
            )
            if stray > STRAIGHT:
                break
            last, bulge = candidate, stray
        yield first, last, bulge
        first = last


def _distance_from(points: FloatArray, start: FloatArray, end: FloatArray) -> float:
    """Largest distance of points from a stretch of line."""
    along = end - start
    squared = float(along @ along)
    offset = points - start
    share = np.clip(offset @ along / squared, 0.0, 1.0) if squared > 0.0 else np.zeros(len(points))
    return float(np.hypot(*(offset - share[:, None] * along).T).max())


def _widths(source_width: npt.ArrayLike, links: int) -> FloatArray:
    width = np.asarray(source_width, dtype=np.float64)
    if width.shape not in {(), (links,)}:
        raise ValueError(f"source_width: shape {width.shape}; allowed: a scalar or ({links},)")
    width = np.broadcast_to(width, (links,))
    wrong = ~(np.isfinite(width) & (width > 0.0))
    if wrong.any():
        link = int(wrong.argmax())
        raise ValueError(f"source_width[{link}]: {width[link]:g} m; allowed: above 0 m")
    return width


def _vertices(line: npt.ArrayLike, link: int, part: int) -> FloatArray:
    """Take a line's vertices without those that repeat the one before."""
    vertices = np.asarray(line, dtype=np.float64)
    if vertices.ndim != 2 or vertices.shape[1] != 2 or not np.isfinite(vertices).all():
        raise ValueError(
            f"lines[{link}][{part}]: shape {vertices.shape}; allowed: (N, 2) finite numbers [m]"
        )
    moved = np.any(np.diff(vertices, axis=0) != 0.0, axis=1)
    return vertices[np.concatenate([[True], moved])] if len(vertices) else vertices
