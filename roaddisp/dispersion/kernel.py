"""Response tables: what each receptor sees of each group of segments, per weather state."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from typing import Final

import numba
import numpy as np
import numpy.typing as npt

from roaddisp.dispersion import arguments, stages
from roaddisp.dispersion.columns import BLOCK
from roaddisp.dispersion.compiling import ONE_AT_A_TIME, is_kept, using_threads
from roaddisp.dispersion.curves import coefficients
from roaddisp.model import Float32Array, FloatArray, IntArray, Terrain

LEAST_BLOCK: Final = 32
BLOCKS_WANTED: Final = 16
"""Few receptors are cut into this many blocks, so that threads have work to share."""

BLOCKS_TOGETHER: Final = 8
"""Blocks in one call of the compiled code, at least: enough to share among threads."""
PAIRS_AT_ONCE: Final = 25_000_000
"""Pairs times states in one call: some 0.2 s of one thread's work."""


def response_table(
    receptors: npt.ArrayLike,
    segments: npt.ArrayLike,
    *,
    wind_from: npt.ArrayLike,
    stability: str | Sequence[str] | npt.NDArray[np.str_],
    strength: npt.ArrayLike,
    group: npt.ArrayLike,
    terrain: Terrain = "open",
    height: npt.ArrayLike = 1.3,
    sigma_z0: npt.ArrayLike = 1.2,
    sigma_y0: npt.ArrayLike = 0.0,
    mixing_height: npt.ArrayLike = math.inf,
    threads: int | None = None,
) -> Float32Array:
    """Concentration of groups of segments at 1 m/s, for many weather states at once.

    Parameters
    ----------
    receptors : (R, 3) array_like
        x, y and height above ground [m].
    segments : (S, 2, 2) array_like
        End points, x and y [m].
    wind_from : (W,) array_like
        Direction the wind comes from in each state, clockwise from the y axis [deg].
    stability : (W,) sequence of str
        Class letters, "A" to "F".
    strength : (S,) or (K, S) array_like
        Line strength, or those of K tracers [g/m/s].
    group : (S,) array_like of int
        Group of each segment, from 0.
    terrain : "open" or "urban"
        Which of Briggs' curves.
    height : scalar or (S,)
        Release height above ground, not negative [m].
    sigma_z0, sigma_y0 : scalar or (S,)
        Initial spread, vertical (above 0) and crosswind (not negative) [m].
    mixing_height : scalar or (W,)
        Height of the lid, inf for none [m].
    threads : int, optional
        How many threads share the work, at least 1; all that numba was started
        with where not given or where that is fewer. The values do not depend on it.

    Returns
    -------
    (W, G, R) or (W, K, G, R) array of float32
        Sum over each group's segments of strength times concentration at 1 m/s
        [g/m3]; divide by the wind speed. ``G = group.max() + 1``.

    Raises
    ------
    ValueError
        For an argument out of its range, ``threads`` below 1, and for a receptor within
        1e-6 m of a segment in plan whose ``sigma_y0`` is 0.

    Notes
    -----
    The integral of `roaddisp.unit_concentration`, which gives the formula, by
    Gauss-Legendre in single precision with as many nodes as each case needs: within
    1e-3 of it above 1e-4 of ``2 / (sqrt(2 pi) sigma_z0)``, and within 5e-4 on sums
    over a network.

    Examples
    --------
    Two carriageways of one road, two wind directions:

    >>> roads = [[[-50.0, -1000.0], [-50.0, 1000.0]], [[-60.0, -1000.0], [-60.0, 1000.0]]]
    >>> table = response_table(
    ...     [[0.0, 0.0, 1.5]], roads, wind_from=[270.0, 90.0], stability=["D", "D"],
    ...     strength=[1e-4, 2e-4], group=[0, 0],
    ... )
    >>> (table * 1e6).round(1).tolist()  # ug/m3 at 1 m/s; nothing from downwind
    [[[59.400001525878906]], [[0.0]]]
    """
    points = arguments.receptor_points(receptors)
    ends = arguments.segment_ends(segments)
    count = len(ends)
    directions = arguments.wind_directions(wind_from)
    codes = arguments.class_codes("stability", stability)
    if len(codes) != len(directions):
        raise ValueError(
            f"stability: {len(codes)} values; allowed: one for each of the "
            f"{len(directions)} values of wind_from"
        )
    strengths = arguments.strengths(strength, count)
    groups = arguments.groups(group, count)
    spread = arguments.per_segment("sigma_y0", sigma_y0, count, positive=False)
    arguments.refuse_touching(points, ends, spread)
    table = windowed_table(
        points,
        ends,
        wind_from=directions,
        stability_codes=codes,
        strength=np.atleast_2d(strengths),
        group=groups,
        n_groups=int(groups.max(initial=-1)) + 1,
        terrain=terrain,
        height=arguments.per_segment("height", height, count, positive=False),
        sigma_z0=arguments.per_segment("sigma_z0", sigma_z0, count, positive=True),
        sigma_y0=spread,
        mixing_height=arguments.lids(mixing_height, len(directions)),
        piece=ends,
        near=np.zeros(count),
        far=np.full(count, math.inf),
        threads=threads,
    )
    return table if strengths.ndim == 2 else np.ascontiguousarray(table[:, 0])


def windowed_table(
    receptors: FloatArray,
    ends: FloatArray,
    *,
    wind_from: FloatArray,
    stability_codes: IntArray,
    strength: FloatArray,
    group: IntArray,
    n_groups: int,
    terrain: Terrain,
    height: FloatArray,
    sigma_z0: FloatArray,
    sigma_y0: FloatArray,
    mixing_height: FloatArray,
    piece: FloatArray,
    near: FloatArray,
    far: FloatArray,
    across_only: bool = False,
    touched_only: bool = False,
    threads: int | None = None,
) -> Float32Array:
    """`response_table` for the engine: each segment serves the receptors in its window.

    Parameters
    ----------
    receptors : (R, 3) [m]
    ends : (S, 2, 2) [m]
    wind_from : (W,) [deg]; stability_codes : (W,) int, 0 to 5; mixing_height : (W,) [m]
    strength : (K, S) [g/m/s]
    group : (S,) int, 0 to ``n_groups - 1``
    height, sigma_z0, sigma_y0 : (S,) [m]
    piece : (S, 2, 2) [m]
        The stretch of centreline a segment belongs to.
    near, far : (S,) [m]
        A pair counts where the receptor's plan distance from ``piece`` is in
        ``[near, far)``.
    across_only : bool
        ``sigma_y0`` is a spread across the segment alone, so that the plume gets
        its component across the wind, ``sigma_y0 |cos(angle of wind and segment)|``.
        For roads of real width: otherwise a road's ends are blurred along it.
    touched_only : bool
        Give the change that the lid makes instead: the sum, over the pairs whose lid
        is felt, of their value under the lid less that without. Added to the table
        of the same states without lids it gives the table under lids, to rounding.
    threads : int, optional
        As in `response_table`.

    Returns
    -------
    (W, K, G, R) array of float32 [g/m3 at 1 m/s]

    Raises
    ------
    ValueError
        Where a class code or a group is out of its range, and for ``threads`` below 1.

    Examples
    --------
    A segment that serves nobody within 10 m of its road:

    >>> import numpy as np
    >>> line, one = np.array([[[0.0, -500.0], [0.0, 500.0]]]), np.ones(1)
    >>> windowed_table(
    ...     np.array([[5.0, 0.0, 1.5], [15.0, 0.0, 1.5]]), line, wind_from=270 * one,
    ...     stability_codes=np.array([3]), strength=np.ones((1, 1)), group=np.array([0]),
    ...     n_groups=1, terrain="open", height=1.3 * one, sigma_z0=1.2 * one, sigma_y0=one,
    ...     mixing_height=np.inf * one, piece=line, near=10 * one, far=np.inf * one,
    ... )[0, 0, 0].round(2).tolist()
    [0.0, 0.3100000023841858]
    """
    _within("stability_codes", stability_codes, 6)
    _within("group", group, n_groups)
    table = np.zeros((len(wind_from), len(strength), n_groups, len(receptors)), dtype=np.float32)
    codes, curves = (
        np.array(stability_codes, dtype=np.int64),
        _rational(coefficients(terrain)),
    )
    states, turns = _by_direction(wind_from, curves[codes, 0])
    if touched_only:
        states = np.flatnonzero(np.isfinite(mixing_height)).astype(np.int64)
        turns = np.arange(len(states) + 1)
    if table.size == 0 or len(ends) == 0 or len(states) == 0:
        return table
    order = _along_curve(receptors[:, :2])
    size = min(BLOCK, max(LEAST_BLOCK, -(-len(receptors) // BLOCKS_WANTED)))
    points = _copy(receptors)[order]
    ends, piece, near, far = _copy(ends), _copy(piece), _copy(near), _copy(far)
    directions, lid = np.radians(_copy(wind_from)), _copy(mixing_height)
    amount = np.array(strength, dtype=np.float32, order="C")
    group = np.array(group, dtype=np.int64)
    height, sigma_z0, sigma_y0 = _copy(height), _copy(sigma_z0), _copy(sigma_y0)
    for part in _parts(len(receptors), size, len(ends), len(states)):
        with ONE_AT_A_TIME, using_threads(threads), numba.parallel_chunksize(1):
            stages.fill_table(
                table, points, size, *part, ends, piece, near, far, states, turns, directions,
                codes, lid, curves, amount, group, height, sigma_z0, sigma_y0,
                across_only, touched_only,
            )  # fmt: skip
    for row in table.reshape(-1, len(receptors)):
        row[order] = row.copy()
    return table


def _parts(
    receptors: int, size: int, segments: int, states: int
) -> Iterator[tuple[int, int, int, int]]:
    """Cut the work into calls that end soon, so that a run can be stopped between them.

    Gives first and last block, first and last segment. A receptor meets the segments
    in their order.
    """
    blocks = -(-receptors // size)
    together = min(blocks, max(BLOCKS_TOGETHER, PAIRS_AT_ONCE // (size * states)))
    some = max(1, PAIRS_AT_ONCE // (together * size * states))
    for block in range(0, blocks, together):
        for segment in range(0, segments, some):
            last = min(block + together, blocks), min(segment + some, segments)
            yield block, last[0], segment, last[1]


def _by_direction(wind_from: FloatArray, widths: Float32Array) -> tuple[IntArray, IntArray]:
    """Order of states by direction, the widest plume first, and where directions begin."""
    states = np.lexsort((-widths, wind_from)).astype(np.int64)
    turns = np.flatnonzero(np.diff(wind_from[states], prepend=np.nan) != 0.0)
    return states, np.append(turns, len(states)).astype(np.int64)


def needs_compiling() -> bool:
    """Whether the next table waits for the compiler (some 25 s, once per installation)."""
    return not is_kept(stages.fill_table)


def _copy(values: FloatArray) -> FloatArray:
    """Return a fresh array, so that compiled code always meets the same layout."""
    return np.array(values, dtype=np.float64, order="C")


def _within(name: str, values: IntArray, limit: int) -> None:
    if values.size and (values.min() < 0 or values.max() >= limit):
        raise ValueError(
            f"{name}: from {values.min()} to {values.max()}; allowed: 0 to {limit - 1}"
        )


def _rational(curves: FloatArray) -> Float32Array:
    """Coefficients of `columns.Curve` for each class: both curves as fractions in d.

    With p in {-1, -1/2, 0, 1/2}, (1 + b d)^2p is 1/(1 + e1 d + e2 d^2) or 1 + g d.
    """
    table = np.zeros((len(curves), 6), dtype=np.float32)
    for row, ((a, b, _), (az, bz, pz)) in enumerate(curves):
        falls = {
            -1.0: (2.0 * bz, bz * bz),
            -0.5: (bz, 0.0),
            0.0: (0.0, 0.0),
            0.5: (0.0, 0.0),
        }
        table[row] = (a, b, *falls[pz], az * az, bz if pz == 0.5 else 0.0)
    return table


def _along_curve(plan: FloatArray) -> IntArray:
    """Order of receptors along a space-filling (Morton) curve, so that blocks are compact."""
    low = plan.min(axis=0)
    span = max(float((plan.max(axis=0) - low).max()), 1.0)
    cell = ((plan - low) * (65535.0 / span)).astype(np.uint64)
    for shift, mask in (
        (8, 0x00FF00FF),
        (4, 0x0F0F0F0F),
        (2, 0x33333333),
        (1, 0x55555555),
    ):
        cell = (cell | (cell << np.uint64(shift))) & np.uint64(mask)
    place = cell[:, 0] | (cell[:, 1] << np.uint64(1))
    return np.argsort(place, kind="stable").astype(np.int64)
