"""The line integral in full precision: adaptive, and slow where it must be.

Each point of a segment is a Gaussian plume; `unit_concentration` integrates it
along the segment. The fast path in `roaddisp.dispersion.kernel` is held to this one.
"""

from __future__ import annotations

import math
from typing import Final

import numpy as np
import numpy.typing as npt

from roaddisp.dispersion import arguments
from roaddisp.dispersion.compiling import compiled
from roaddisp.dispersion.curves import coefficients
from roaddisp.model import FloatArray, Terrain

Plume = tuple[float, float, float, float, float, float, float, float, float, float]
"""ay, by, py, az, bz, pz of the curves, then sigma_y0^2, sigma_z0^2, source height, lid."""

Line = tuple[float, float, float, float, float]
"""Downwind and crosswind offset at the start, their rates along the line, receptor height."""

WIDEST: Final = 9.0
"""Crosswind standard deviations beyond which a plume gives nothing (e^-40)."""

CROSSINGS: Final = (1.0, 2.5, 4.5, WIDEST)
"""Standard deviations at which the line is broken."""

LADDER: Final = 3.0
"""Ratio of downwind distances between breaks."""

MOST_EDGES: Final = 80
STACK: Final = 64

RELATIVE: Final = 1e-8
ABSOLUTE: Final = 1e-14
"""Tolerance of a panel: of the line's value, and of 2/(sqrt(2 pi) sigma_z0)."""

_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(10)


def unit_concentration(
    receptors: npt.ArrayLike,
    segments: npt.ArrayLike,
    *,
    wind_from: float,
    wind_speed: float,
    stability: str,
    terrain: Terrain = "open",
    height: npt.ArrayLike = 1.3,
    sigma_z0: npt.ArrayLike = 1.2,
    sigma_y0: npt.ArrayLike = 0.0,
    mixing_height: float = math.inf,
) -> FloatArray:
    r"""Concentration at receptors beside segments that emit 1 g/m/s.

    Parameters
    ----------
    receptors : (R, 3) array_like
        x, y and height above ground [m].
    segments : (S, 2, 2) array_like
        End points, x and y [m].
    wind_from : float
        Direction the wind comes from, clockwise from the y axis [deg].
    wind_speed : float
        As the plume feels it, above 0 [m/s].
    stability : str
        Class letter, "A" to "F".
    terrain : "open" or "urban"
        Which of Briggs' curves.
    height : scalar or (S,)
        Release height above ground, not negative [m].
    sigma_z0, sigma_y0 : scalar or (S,)
        Initial spread, vertical (above 0) and crosswind (not negative) [m].
    mixing_height : float
        Height of the lid, inf for none [m].

    Returns
    -------
    (R, S) array
        Concentration per line strength, g/m3 for each g/m/s [s/m2]. Zero for a
        segment of zero length, and where receptor or source is above the lid.

    Raises
    ------
    ValueError
        For an argument out of its range, and for a receptor within 1e-6 m of a
        segment in plan whose ``sigma_y0`` is 0.

    Notes
    -----
    With downwind distance d > 0 and crosswind offset c of the receptor from a
    point of the segment,

    .. math::

        C = \frac{1}{2 \pi u} \int \frac{1}{\sigma_y \sigma_z}
            e^{-c^2 / 2 \sigma_y^2} \left[ e^{-(z - h)^2 / 2 \sigma_z^2}
            + e^{-(z + h)^2 / 2 \sigma_z^2} \right] ds

    with :math:`\sigma_y^2 = \sigma_{y0}^2 + \sigma_y(d)^2`, likewise for z, and
    further images where there is a lid. Nothing reaches a receptor upwind. The
    quadrature is adaptive, with breaks where the line enters, crosses and leaves
    the plume; relative error below 1e-5 above 1e-6 of
    :math:`2 / (\sqrt{2 \pi} u \sigma_{z0})`.

    References
    ----------
    Turner, D. B. (1970), Workbook of Atmospheric Dispersion Estimates, AP-26,
    eq. 3.1 (point source); Briggs, G. A. (1973), ATDL contribution 79 (spread).

    Examples
    --------
    A road 2 km long, 50 m upwind of a receptor, wind across it:

    >>> road = [[[-50.0, -1000.0], [-50.0, 1000.0]]]
    >>> unit_concentration(
    ...     [[0.0, 0.0, 1.5]], road, wind_from=270.0, wind_speed=2.0, stability="D"
    ... ).round(4)
    array([[0.1063]])
    """
    points = arguments.receptor_points(receptors)
    ends = arguments.segment_ends(segments)
    count = len(ends)
    direction = arguments.wind_directions(wind_from)
    if len(direction) != 1:
        raise ValueError(f"wind_from: {len(direction)} values; allowed: one direction [deg]")
    speed = arguments.positive_scalar("wind_speed", wind_speed, "m/s")
    codes = arguments.class_codes("stability", stability)
    if len(codes) != 1:
        raise ValueError(f"stability: {len(codes)} values; allowed: one class letter")
    curves = coefficients(terrain)[codes[0]].ravel()
    heights = arguments.per_segment("height", height, count, positive=False)
    vertical = arguments.per_segment("sigma_z0", sigma_z0, count, positive=True)
    crosswind = arguments.per_segment("sigma_y0", sigma_y0, count, positive=False)
    lid = float(arguments.lids(mixing_height, 1)[0])
    arguments.refuse_touching(points, ends, crosswind)
    table = _integrals(
        points, ends, math.radians(direction[0]), curves, heights, vertical, crosswind, lid
    )
    return table / speed


@compiled
def _spread_squared(distance: float, a: float, b: float, p: float) -> float:
    growth = a * distance
    bend = 1.0 + b * distance
    if p == -0.5:
        return growth * growth / bend
    if p == -1.0:
        return growth * growth / (bend * bend)
    if p == 0.5:
        return growth * growth * bend
    return growth * growth


@compiled
def _vertical_sum(z: float, h: float, variance: float, lid: float) -> float:
    """Exponentials of the plume and its images in ground and lid."""
    if lid == np.inf:
        near = math.exp(-0.5 * (z - h) ** 2 / variance)
        return near * (1.0 + math.exp(-2.0 * z * h / variance))
    total = 0.0
    if variance < 0.36 * lid * lid:
        for image in range(-4, 5):
            shift = 2.0 * image * lid
            total += math.exp(-0.5 * (z - h + shift) ** 2 / variance)
            total += math.exp(-0.5 * (z + h + shift) ** 2 / variance)
        return total
    # Poisson's formula turns the images into waves between ground and lid.
    for order in range(1, 6):
        wave = order * math.pi / lid
        damping = math.exp(-0.5 * wave * wave * variance)
        total += damping * math.cos(wave * z) * math.cos(wave * h)
    return math.sqrt(2.0 * math.pi * variance) / lid * (1.0 + 2.0 * total)


@compiled
def _panel(lo: float, hi: float, line: Line, plume: Plume) -> float:
    """Gauss-Legendre over one stretch of the line."""
    d0, c0, d_rate, c_rate, z = line
    ay, by, py, az, bz, pz, sy0_squared, sz0_squared, h, lid = plume
    half = 0.5 * (hi - lo)
    total = 0.0
    for node in range(len(_NODES)):
        s = lo + half * (1.0 + _NODES[node])
        d = d0 + d_rate * s
        c = c0 + c_rate * s
        sy_squared = sy0_squared + _spread_squared(d, ay, by, py)
        sz_squared = sz0_squared + _spread_squared(d, az, bz, pz)
        exponent = -0.5 * c * c / sy_squared
        if exponent > -700.0:
            vertical = _vertical_sum(z, h, sz_squared, lid)
            amplitude = math.exp(exponent) / math.sqrt(sy_squared * sz_squared)
            total += _WEIGHTS[node] * amplitude * vertical
    return total * half / (2.0 * math.pi)


@compiled
def _misses_plume(line: Line, plume: Plume, length: float) -> bool:
    """Whether the whole line lies on one side of the widest cone, beyond it."""
    d0, c0, d_rate, c_rate, _ = line
    sy0 = math.sqrt(plume[6])
    c1 = c0 + c_rate * length
    reach0 = WIDEST * (sy0 + plume[0] * d0)
    reach1 = WIDEST * (sy0 + plume[0] * (d0 + d_rate * length))
    return (c0 > reach0 and c1 > reach1) or (c0 < -reach0 and c1 < -reach1)


@compiled
def _add_edge(edges: FloatArray, count: int, s: float, length: float) -> int:
    if 0.0 < s < length and count < MOST_EDGES - 1:
        edges[count] = s
        return count + 1
    return count


@compiled
def _breaks(edges: FloatArray, line: Line, plume: Plume, length: float) -> int:
    """Fill the edges of the panels, ascending; return how many there are."""
    d0, c0, d_rate, c_rate, _ = line
    a, sy0_squared = plume[0], plume[6]
    edges[0] = 0.0
    count = 1
    if c_rate != 0.0:
        count = _add_edge(edges, count, -c0 / c_rate, length)
    for times in CROSSINGS:
        # c^2 = times^2 (sigma_y0^2 + a^2 d^2), a quadratic along the line
        wide = times * times
        two = c_rate * c_rate - wide * a * a * d_rate * d_rate
        one = c0 * c_rate - wide * a * a * d0 * d_rate
        none = c0 * c0 - wide * (sy0_squared + a * a * d0 * d0)
        inside = one * one - two * none
        if inside >= 0.0:
            root = -(one + math.copysign(math.sqrt(inside), one))
            if two != 0.0:
                count = _add_edge(edges, count, root / two, length)
            if root != 0.0:
                count = _add_edge(edges, count, none / root, length)
    if d_rate > 0.0:
        nearest = min(abs(c0), abs(c0 + c_rate * length))
        if c0 * (c0 + c_rate * length) <= 0.0:
            nearest = 0.0
        shift = min(math.sqrt(sy0_squared + nearest * nearest) / a, math.sqrt(plume[7]) / plume[3])
        furthest = d0 + d_rate * length + shift
        rung = LADDER * max(d0 + shift, 1e-9 * furthest)
        while rung < furthest:
            count = _add_edge(edges, count, (rung - shift - d0) / d_rate, length)
            rung *= LADDER
    edges[count] = length
    edges[: count + 1].sort()
    return count + 1


@compiled
def _refine(
    lo: float, hi: float, coarse: float, tolerance: float, line: Line, plume: Plume
) -> float:
    """Halve a panel until halving no longer changes its value."""
    stack = np.empty((STACK, 3))
    stack[0, 0], stack[0, 1], stack[0, 2] = lo, hi, coarse
    depth = 1
    total = 0.0
    while depth > 0:
        depth -= 1
        left, right, whole = stack[depth, 0], stack[depth, 1], stack[depth, 2]
        middle = 0.5 * (left + right)
        first = _panel(left, middle, line, plume)
        second = _panel(middle, right, line, plume)
        settled = abs(first + second - whole) <= tolerance
        if settled or depth + 2 > STACK or middle <= left or middle >= right:
            total += first + second
            continue
        stack[depth, 0], stack[depth, 1], stack[depth, 2] = left, middle, first
        stack[depth + 1, 0], stack[depth + 1, 1], stack[depth + 1, 2] = middle, right, second
        depth += 2
    return total


@compiled
def _integral(line: Line, plume: Plume, length: float, edges: FloatArray) -> float:
    """One receptor and one segment, whose upwind part has been cut away."""
    if _misses_plume(line, plume, length):
        return 0.0
    count = _breaks(edges, line, plume, length)
    coarse = np.empty(count - 1)
    for panel in range(count - 1):
        coarse[panel] = _panel(edges[panel], edges[panel + 1], line, plume)
    scale = 2.0 / math.sqrt(2.0 * math.pi * plume[7])
    tolerance = RELATIVE * coarse.sum() + ABSOLUTE * scale
    total = 0.0
    for panel in range(count - 1):
        total += _refine(edges[panel], edges[panel + 1], coarse[panel], tolerance, line, plume)
    return total


@compiled
def _integrals(
    receptors: FloatArray,
    segments: FloatArray,
    wind_from: float,
    curves: FloatArray,
    height: FloatArray,
    sigma_z0: FloatArray,
    sigma_y0: FloatArray,
    lid: float,
) -> FloatArray:
    """Every receptor and segment, at 1 m/s; the wind direction in radians."""
    down_x, down_y = -math.sin(wind_from), -math.cos(wind_from)
    table = np.zeros((len(receptors), len(segments)))
    edges = np.empty(MOST_EDGES)
    for index in range(len(segments)):
        h = height[index]
        plume = (
            curves[0], curves[1], curves[2], curves[3], curves[4], curves[5],
            sigma_y0[index] ** 2, sigma_z0[index] ** 2, h, lid,
        )  # fmt: skip
        x0, y0 = segments[index, 0, 0], segments[index, 0, 1]
        x1, y1 = segments[index, 1, 0], segments[index, 1, 1]
        length = math.hypot(x1 - x0, y1 - y0)
        if length == 0.0 or h > lid:
            continue
        d_rate = -((x1 - x0) * down_x + (y1 - y0) * down_y) / length
        c_rate = -((y1 - y0) * down_x - (x1 - x0) * down_y) / length
        if d_rate < 0.0:
            x0, y0 = x1, y1
            d_rate, c_rate = -d_rate, -c_rate
        for row in range(len(receptors)):
            x, y = receptors[row, 0] - x0, receptors[row, 1] - y0
            z = receptors[row, 2]
            d = x * down_x + y * down_y
            c = y * down_x - x * down_y
            onset = 0.0
            if d <= 0.0:
                if d + d_rate * length <= 0.0:
                    continue
                onset = -d / d_rate
                c += onset * c_rate
                d = 0.0
            if z <= lid and onset < length:
                line = (d, c, d_rate, c_rate, z)
                table[row, index] = _integral(line, plume, length - onset, edges)
    return table
