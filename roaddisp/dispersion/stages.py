"""The fast line integral, compiled: float32, many pairs at once, nodes as needed.

A *pair* is one receptor and one segment. Receptors come in blocks of neighbours;
for a block, a segment and a weather state the stages below follow one another:

    gather   geometry of the pairs, relative to the segment's point nearest the receptor
    select   cut what is upwind, drop pairs the plume misses
    clip     cut each segment to the plume, choose how many nodes it needs
    sort     bring pairs with the same number of nodes together
    sum      Gauss-Legendre on a stretched line, all pairs of a node at once
    scatter  times line strength, into the groups

Within a stage the columns of one scratch array are worked on from 0 to n, so that
the compiler can use vector instructions; ``COLUMN + j`` is pair j's place in a
column. Every number is float32: a float64 constant would widen the arithmetic.

All compiled code of the fast path is in this module, because a kept compilation
does not notice a change in another file.
"""

from __future__ import annotations

from typing import Final

import numpy as np
from numba import prange

from roaddisp.dispersion.compiling import fast_compiled, parallel_compiled
from roaddisp.model import Float32Array, FloatArray, IntArray

f32 = np.float32

BLOCK: Final = 2048
"""Most receptors in a block: the scratch columns then stay in the nearest cache."""

# Columns that hold a block's pairs with one segment
GAP_X, GAP_Y, START, END, Z = (BLOCK * column for column in range(5))
# ... and one state: offsets at the nearest point, then the stretch of line upwind
DOWN, CROSS, FIRST, LIVE = (BLOCK * column for column in range(5, 9))
# Pairs that live: as taken over from above
L_DOWN, L_CROSS, L_FIRST, L_LAST, L_Z, WANTED = (BLOCK * column for column in range(9, 15))
# What the sum needs, in order of arrival, then in order of nodes
FIELDS: Final = 8
CLIPPED: Final = BLOCK * 15
SORTED: Final = BLOCK * (15 + FIELDS)
D_LO, D_SPAN, C_LO, C_SPAN, MEASURE, KEEP, APART, MIRROR = (BLOCK * f for f in range(FIELDS))
SUM: Final = BLOCK * (15 + 2 * FIELDS)
COLUMNS: Final = 15 + 2 * FIELDS + 1

RULES: Final = (1, 2, 3, 4, 5, 6, 8, 10, 13, 17, 24, 36)
KINDS: Final = len(RULES)
MOST_NODES: Final = RULES[-1]
KIND_OF: Final = np.array(
    [next(kind for kind, rule in enumerate(RULES) if rule >= n) for n in range(MOST_NODES + 1)]
)
"""For a wanted number of nodes, which rule has at least as many."""


def _unit_rules() -> tuple[Float32Array, Float32Array]:
    """Gauss-Legendre nodes and weights on (0, 1), one rule a row."""
    nodes = np.zeros((KINDS, MOST_NODES), dtype=f32)
    weights = np.zeros((KINDS, MOST_NODES), dtype=f32)
    for kind, rule in enumerate(RULES):
        x, w = np.polynomial.legendre.leggauss(rule)
        nodes[kind, :rule] = 0.5 * (x + 1.0)
        weights[kind, :rule] = 0.5 * w
    return nodes, weights


NODES, WEIGHTS = _unit_rules()
RULE_SIZE: Final = np.array(RULES)

ZERO, HALF, ONE, TWO = f32(0.0), f32(0.5), f32(1.0), f32(2.0)
TINY: Final = f32(1e-24)
PRUNE: Final = f32(6.3)
"""Standard deviations crosswind beyond which a pair is dropped."""
LID_REACH: Final = f32(4.5)
"""Vertical standard deviations at which the first image in the lid is felt."""
FARTHEST: Final = f32(40.0)
"""Cap of c/sigma_y in the count of nodes."""
PI: Final = f32(np.pi)
PER_CIRCLE: Final = f32(0.5 / np.pi)

# exp(x) = 2^k exp(r), r = x - k ln 2 with ln 2 in two parts (Cody and Waite)
LOWEST_EXPONENT: Final = f32(-80.0)
PER_LN2: Final = f32(1.4426950408889634)
LN2_HIGH: Final = f32(0.693359375)
LN2_LOW: Final = f32(-2.12194440e-4)
E6, E5, E4, E3 = f32(1.0 / 720.0), f32(1.0 / 120.0), f32(1.0 / 24.0), f32(1.0 / 6.0)
BIAS: Final = np.int32(127)
MANTISSA: Final = np.int32(23)
FRACTION: Final = np.int32(0x7FFFFF)
ULP: Final = f32(2.0**-23)

# Nodes wanted, fitted to cases of every kind
BY_PATH, BY_STRETCH, BY_ROOT, BY_HEIGHT = f32(0.95), f32(1.3), f32(1.6), f32(0.85)
BY_FALL, BY_STEEP = f32(0.35), f32(0.2)
STEEP_FROM: Final = f32(2.0)
BASE, BASE_SHORT, SLOPE_SHORT = f32(2.1), f32(0.79), f32(1.7)

# Clip of the line at t = c/sigma_y
CUT: Final = f32(16.0)
CUT_MOST: Final = f32(48.0)
CUT_LEAST_MORE: Final = f32(8.0)

Curve = tuple[f32, f32, f32, f32, f32, f32]
"""a and b of the crosswind curve, then e1, e2, a^2 and g of the vertical one:
sigma_y^2 = a^2 d^2 / (1 + b d); sigma_z^2 = a^2 d^2 (1 + g d) / (1 + e1 d + e2 d^2)."""


@fast_compiled
def _exponential(x: f32) -> f32:
    """e^x for x <= 0 in vector instructions, to 3e-7; nothing is lost below -80."""
    x = x if x > LOWEST_EXPONENT else LOWEST_EXPONENT
    power = np.int32(x * PER_LN2 - HALF)
    whole = f32(power)
    r = x - whole * LN2_HIGH - whole * LN2_LOW
    series = ((((E6 * r + E5) * r + E4) * r + E3) * r + HALF) * r + ONE
    return (series * r + ONE) * np.int32((power + BIAS) << MANTISSA).view(np.float32)


@fast_compiled
def _logarithm(x: f32) -> f32:
    """Natural logarithm of x >= 1, to 0.01: for the count of nodes only."""
    bits = np.float32(x).view(np.int32)
    power = f32(np.int32((bits >> MANTISSA) - BIAS))
    part = f32(np.int32(bits & FRACTION)) * ULP
    return (power + part + f32(0.346) * part * (ONE - part)) / PER_LN2


@fast_compiled
def _gather(
    scratch: Float32Array,
    owner: IntArray,
    points: FloatArray,
    order: IntArray,
    first: int,
    last: int,
    ends: FloatArray,
    piece: FloatArray,
    near: float,
    far: float,
) -> int:
    """Pairs of a block with one segment whose receptor is in the segment's window.

    Positions are taken from the segment's point nearest the receptor, in float64:
    what is left are short distances, for which float32 is enough.
    """
    x0, y0 = ends[0, 0], ends[0, 1]
    length = np.hypot(ends[1, 0] - x0, ends[1, 1] - y0)
    along_x, along_y = (ends[1, 0] - x0) / length, (ends[1, 1] - y0) / length
    px, py = piece[0, 0], piece[0, 1]
    reach = np.hypot(piece[1, 0] - px, piece[1, 1] - py)
    piece_x, piece_y = (piece[1, 0] - px) / reach, (piece[1, 1] - py) / reach
    windowed = near > 0.0 or far < np.inf
    n = 0
    for place in range(first, last):
        x, y = points[order[place], 0], points[order[place], 1]
        if windowed:
            foot = min(max((x - px) * piece_x + (y - py) * piece_y, 0.0), reach)
            distance = np.hypot(x - px - foot * piece_x, y - py - foot * piece_y)
            if distance < near or distance >= far:
                continue
        foot = min(max((x - x0) * along_x + (y - y0) * along_y, 0.0), length)
        scratch[GAP_X + n] = x - x0 - foot * along_x
        scratch[GAP_Y + n] = y - y0 - foot * along_y
        scratch[START + n] = -foot
        scratch[END + n] = length - foot
        scratch[Z + n] = points[order[place], 2]
        owner[n] = order[place]
        n += 1
    return n


@fast_compiled
def _select(
    scratch: Float32Array,
    live: IntArray,
    n: int,
    down_x: f32,
    down_y: f32,
    d_rate: f32,
    c_rate: f32,
    flip: f32,
    sy0: f32,
    a: f32,
    lid: f32,
) -> int:
    """Cut what is upwind; keep pairs that the widest plume may reach.

    ``flip`` is -1 where the line is run backwards, so that d grows along it.
    """
    steepness = d_rate if d_rate > TINY else TINY
    for j in range(n):
        gx, gy = scratch[GAP_X + j], scratch[GAP_Y + j]
        d = gx * down_x + gy * down_y
        c = gy * down_x - gx * down_y
        start, end = scratch[START + j], scratch[END + j]
        lo = start if flip > ZERO else -end
        hi = end if flip > ZERO else -start
        onset = -d / steepness
        lo = lo if lo > onset else onset
        d_lo, d_hi = d + lo * d_rate, d + hi * d_rate
        d_lo = d_lo if d_lo > ZERO else ZERO
        c_lo, c_hi = c + lo * c_rate, c + hi * c_rate
        reach_lo, reach_hi = PRUNE * (sy0 + a * d_lo), PRUNE * (sy0 + a * d_hi)
        left = (c_lo > reach_lo) & (c_hi > reach_hi)
        right = (c_lo < -reach_lo) & (c_hi < -reach_hi)
        alive = (lo < hi) & (d_hi > ZERO) & (not (left | right)) & (scratch[Z + j] <= lid)
        scratch[DOWN + j] = d
        scratch[CROSS + j] = c
        scratch[FIRST + j] = lo
        scratch[LIVE + j] = ONE if alive else ZERO
    m = 0
    for j in range(n):
        live[m] = j
        m += scratch[LIVE + j] > ZERO
    for k in range(m):
        j = live[k]
        scratch[L_DOWN + k] = scratch[DOWN + j]
        scratch[L_CROSS + k] = scratch[CROSS + j]
        scratch[L_FIRST + k] = scratch[FIRST + j]
        scratch[L_LAST + k] = scratch[END + j] if flip > ZERO else -scratch[START + j]
        scratch[L_Z + k] = scratch[Z + j]
    return m


@fast_compiled
def _plume_ends(
    lo: f32, hi: f32, d: f32, c: f32, d_rate: f32, c_rate: f32,
    sy0_squared: f32, a_squared: f32, lift: f32,
) -> tuple[f32, f32]:  # fmt: skip
    """The stretch of line inside |c| = T sqrt(sigma_y0^2 + a^2 d^2).

    T follows from the line's least t = c/sigma_y; ``lift`` is ((z - h)/sigma_z0)^2,
    which widens it: far above or below the source the tails decide. The roots are
    taken from the point of least t, where the quadratic is not positive.
    """
    d_lo, d_hi = d + lo * d_rate, d + hi * d_rate
    c_lo, c_hi = c + lo * c_rate, c + hi * c_rate
    t_lo = c_lo * c_lo / (sy0_squared + a_squared * d_lo * d_lo + TINY)
    t_hi = c_hi * c_hi / (sy0_squared + a_squared * d_hi * d_hi + TINY)
    crosses = c_lo * c_hi <= ZERO
    change = c_lo - c_hi
    inner = lo + (hi - lo) * c_lo / (change if change != ZERO else ONE)
    outer = lo if t_lo < t_hi else hi
    least = ZERO if crosses else (t_lo if t_lo < t_hi else t_hi)
    middle = inner if crosses else outer
    wide = least + CUT + lift
    most = least + CUT_LEAST_MORE
    most = most if most > CUT_MOST else CUT_MOST
    wide = wide if wide < most else most

    c_mid = ZERO if crosses else c + middle * c_rate
    d_mid = d + middle * d_rate
    two = c_rate * c_rate - wide * a_squared * d_rate * d_rate
    one = c_mid * c_rate - wide * a_squared * d_mid * d_rate
    none = c_mid * c_mid - wide * (sy0_squared + a_squared * d_mid * d_mid)
    inside = one * one - two * none
    root = np.sqrt(inside if inside > ZERO else ZERO)
    sum_ = -(one + root) if one >= ZERO else root - one
    sum_ = sum_ if sum_ != ZERO else TINY
    far = middle + sum_ / (two if two != ZERO else TINY)
    near = middle + none / sum_
    # two > 0: the line leaves the plume on both sides of its middle
    closed_lo = near if near < far else far
    closed_hi = far if near < far else near
    # two < 0: it leaves once and comes back; cut only an end that lies outside
    ahead = near > middle
    open_lo = lo if ahead | (far >= lo) else near
    open_hi = near if ahead & (far > hi) else hi
    cut_lo = closed_lo if two > ZERO else open_lo
    cut_hi = closed_hi if two > ZERO else open_hi
    cut_lo = cut_lo if inside > ZERO else lo
    cut_hi = cut_hi if inside > ZERO else hi
    return (cut_lo if cut_lo > lo else lo), (cut_hi if cut_hi < hi else hi)


@fast_compiled
def _capped(t: f32) -> f32:
    t = t if t < FARTHEST else FARTHEST
    return t if t > -FARTHEST else -FARTHEST


@fast_compiled
def _clip(
    scratch: Float32Array, n: int, d_rate: f32, c_rate: f32, sy0: f32, sz0: f32, h: f32,
    curve: Curve,
) -> None:  # fmt: skip
    """Cut each line to the plume, stretch it, and say how many nodes it wants.

    With delta the distance at which the plume's growth begins to count, nodes are
    even in 1/(d + delta): one rule from crosswind to parallel wind.
    """
    a, _, e1, e2, az_squared, g = curve
    a_squared, sy0_squared, sz0_squared = a * a, sy0 * sy0, sz0 * sz0
    for j in range(n):
        d, c, z = scratch[L_DOWN + j], scratch[L_CROSS + j], scratch[L_Z + j]
        apart = (z - h) * (z - h)
        lo, hi = _plume_ends(
            scratch[L_FIRST + j], scratch[L_LAST + j], d, c, d_rate, c_rate,
            sy0_squared, a_squared, apart / sz0_squared,
        )  # fmt: skip
        length = hi - lo if hi > lo else ZERO
        d_lo = d + lo * d_rate
        d_lo = d_lo if d_lo > ZERO else ZERO
        d_hi = d_lo + length * d_rate
        c_lo, c_hi = c + lo * c_rate, c + hi * c_rate
        c_least = abs(c_lo) if abs(c_lo) < abs(c_hi) else abs(c_hi)
        c_least = ZERO if c_lo * c_hi <= ZERO else c_least
        delta = np.sqrt(sy0_squared + c_least * c_least) / a
        delta = delta if delta > f32(1e-9) else f32(1e-9)
        keep = (d_lo + delta) / (d_hi + delta)
        half_way = keep / (ONE + keep)
        d_mid = d_lo + (d_hi - d_lo) * half_way
        c_mid = c_lo + (c_hi - c_lo) * half_way

        t_lo = _capped(c_lo / np.sqrt(sy0_squared + a_squared * d_lo * d_lo + TINY))
        t_mid = _capped(c_mid / np.sqrt(sy0_squared + a_squared * d_mid * d_mid + TINY))
        t_hi = _capped(c_hi / np.sqrt(sy0_squared + a_squared * d_hi * d_hi + TINY))
        path = abs(t_mid - t_lo) + abs(t_hi - t_mid)
        e_lo, e_mid, e_hi = HALF * t_lo * t_lo, HALF * t_mid * t_mid, HALF * t_hi * t_hi
        e_most = e_lo if e_lo > e_hi else e_hi
        e_most = e_most if e_most > e_mid else e_mid
        e_least = e_lo if e_lo < e_hi else e_hi
        e_least = e_least if e_least < e_mid else e_mid
        fall = e_most - e_least
        steep = fall - STEEP_FROM if fall > STEEP_FROM else ZERO
        sz_lo = sz0_squared + az_squared * d_lo * d_lo * (ONE + g * d_lo) / (
            ONE + d_lo * (e1 + e2 * d_lo)
        )
        sz_hi = sz0_squared + az_squared * d_hi * d_hi * (ONE + g * d_hi) / (
            ONE + d_hi * (e1 + e2 * d_hi)
        )
        lift = np.sqrt(apart) * abs(ONE / np.sqrt(sz_lo) - ONE / np.sqrt(sz_hi))
        stretch = _logarithm(ONE / keep)
        need = (
            BY_PATH * path + BY_STRETCH * stretch + BY_ROOT * np.sqrt(stretch)
            + BY_HEIGHT * lift + BY_FALL * np.sqrt(fall) + BY_STEEP * steep
        )  # fmt: skip
        long, short = BASE + need, BASE_SHORT + SLOPE_SHORT * need

        scratch[CLIPPED + D_LO + j] = d_lo
        scratch[CLIPPED + D_SPAN + j] = d_hi - d_lo
        scratch[CLIPPED + C_LO + j] = c_lo
        scratch[CLIPPED + C_SPAN + j] = c_hi - c_lo
        scratch[CLIPPED + MEASURE + j] = length * keep
        scratch[CLIPPED + KEEP + j] = keep
        scratch[CLIPPED + APART + j] = HALF * apart
        scratch[CLIPPED + MIRROR + j] = TWO * z * h
        scratch[WANTED + j] = long if long < short else short


@fast_compiled
def _feels_lid(scratch: Float32Array, j: int, h: f32, sz0: f32, lid: f32, curve: Curve) -> bool:
    """Whether the first image in the lid reaches the receptor from the line's far end."""
    d = scratch[CLIPPED + D_LO + j] + scratch[CLIPPED + D_SPAN + j]
    _, _, e1, e2, az_squared, g = curve
    sz_squared = sz0 * sz0 + az_squared * d * d * (ONE + g * d) / (ONE + d * (e1 + e2 * d))
    return TWO * lid - scratch[L_Z + j] - h < LID_REACH * np.sqrt(sz_squared)


@fast_compiled
def _sort(
    scratch: Float32Array, live: IntArray, kind: IntArray, begin: IntArray, sorted_: IntArray,
    n: int, h: f32, sz0: f32, lid: f32, curve: Curve,
) -> None:  # fmt: skip
    """Bring pairs of one rule together; those the lid touches come last, a rule finer."""
    begin[:] = 0
    for j in range(n):
        wanted = min(int(np.ceil(scratch[WANTED + j])), MOST_NODES)
        kind[j] = KIND_OF[max(wanted, 1)]
        if lid < np.inf and _feels_lid(scratch, j, h, sz0, lid, curve):
            kind[j] = KINDS + min(kind[j] + 2, KINDS - 1)
        begin[kind[j] + 1] += 1
    for k in range(2 * KINDS):
        begin[k + 1] += begin[k]
    for j in range(n):
        place = begin[kind[j]]
        begin[kind[j]] += 1
        sorted_[place] = live[j]
        for field in range(FIELDS):
            scratch[SORTED + BLOCK * field + place] = scratch[CLIPPED + BLOCK * field + j]
    for k in range(2 * KINDS, 0, -1):
        begin[k] = begin[k - 1]
    begin[0] = 0


@fast_compiled
def _lid_sum(z: f32, h: f32, variance: f32, lid: f32) -> f32:
    """Plume, ground and lid, as images near the source, as waves far from it."""
    if variance < f32(0.25) * lid * lid:
        per = HALF / variance
        apart, up = z - h, z + h
        shift = TWO * lid
        return (
            np.exp(-per * apart * apart) + np.exp(-per * up * up)
            + np.exp(-per * (apart - shift) ** 2) + np.exp(-per * (apart + shift) ** 2)
            + np.exp(-per * (up - shift) ** 2) + np.exp(-per * (up + shift) ** 2)
            + np.exp(-per * (up - shift - shift) ** 2)
        )  # fmt: skip
    total = HALF
    for order in range(1, 4):
        wave = f32(order) * PI / lid
        total += np.exp(-HALF * wave * wave * variance) * np.cos(wave * z) * np.cos(wave * h)
    return TWO * total * np.sqrt(TWO * PI * variance) / lid


@fast_compiled
def _sum_free(
    scratch: Float32Array, n: int, kind: int, sy0: f32, sz0: f32, curve: Curve
) -> None:
    """Add up one rule's nodes for its ``n`` pairs, the first in ``scratch``; no lid is felt."""
    a, b, e1, e2, az_squared, g = curve
    a_squared, sy0_squared, sz0_squared = a * a, sy0 * sy0, sz0 * sz0
    for node in range(RULE_SIZE[kind]):
        xi, weight = NODES[kind, node], WEIGHTS[kind, node]
        for j in range(n):
            keep = scratch[SORTED + KEEP + j]
            stretch = ONE / (ONE - (ONE - keep) * xi)
            share = xi * keep * stretch
            d = scratch[SORTED + D_LO + j] + scratch[SORTED + D_SPAN + j] * share
            c = scratch[SORTED + C_LO + j] + scratch[SORTED + C_SPAN + j] * share
            # variances as fractions, so that one division serves both and their root
            y_under = ONE + b * d
            y_over = sy0_squared * y_under + a_squared * d * d + TINY
            z_under = ONE + d * (e1 + e2 * d)
            z_over = sz0_squared * z_under + az_squared * d * d * (ONE + g * d)
            per_both = ONE / (y_over * z_over)
            per_y = y_under * z_over * per_both
            per_z = z_under * y_over * per_both
            exponent = HALF * c * c * per_y + scratch[SORTED + APART + j] * per_z
            mirror = _exponential(-scratch[SORTED + MIRROR + j] * per_z)
            plume = np.sqrt(per_y * per_z) * _exponential(-exponent) * (ONE + mirror)
            scratch[SUM + j] += (
                weight * scratch[SORTED + MEASURE + j] * stretch * stretch * plume
            )


@fast_compiled
def _sum_under_lid(
    scratch: Float32Array, owner: IntArray, points: FloatArray, sorted_: IntArray,
    begin: int, end: int, kind: int, sy0: f32, sz0: f32, h: f32, lid: f32, curve: Curve,
) -> None:  # fmt: skip
    """The same for pairs the lid touches, one at a time."""
    a, b, e1, e2, az_squared, g = curve
    for j in range(begin, end):
        z = f32(points[owner[sorted_[j]], 2])
        keep = scratch[SORTED + KEEP + j]
        for node in range(RULE_SIZE[kind]):
            xi, weight = NODES[kind, node], WEIGHTS[kind, node]
            stretch = ONE / (ONE - (ONE - keep) * xi)
            share = xi * keep * stretch
            d = scratch[SORTED + D_LO + j] + scratch[SORTED + D_SPAN + j] * share
            c = scratch[SORTED + C_LO + j] + scratch[SORTED + C_SPAN + j] * share
            sy_squared = sy0 * sy0 + a * a * d * d / (ONE + b * d) + TINY
            sz_squared = sz0 * sz0 + az_squared * d * d * (ONE + g * d) / (
                ONE + d * (e1 + e2 * d)
            )
            plume = np.exp(-HALF * c * c / sy_squared) / np.sqrt(sy_squared * sz_squared)
            scratch[SUM + j] += (
                weight * scratch[SORTED + MEASURE + j] * stretch * stretch
                * plume * _lid_sum(z, h, sz_squared, lid)
            )  # fmt: skip


@fast_compiled
def _block_misses(
    block: FloatArray, x: float, y: float, end_x: float, end_y: float,
    down_x: float, down_y: float, sy0: float, a: float,
) -> bool:  # fmt: skip
    """Whether no receptor of a block (centre x, y, radius) can be reached by a segment."""
    d0 = (block[0] - x) * down_x + (block[1] - y) * down_y + block[2]
    d1 = (block[0] - end_x) * down_x + (block[1] - end_y) * down_y + block[2]
    if d0 <= 0.0 and d1 <= 0.0:
        return True
    c0 = (block[1] - y) * down_x - (block[0] - x) * down_y
    c1 = (block[1] - end_y) * down_x - (block[0] - end_x) * down_y
    reach0 = PRUNE * (sy0 + a * max(d0, 0.0)) + block[2]
    reach1 = PRUNE * (sy0 + a * max(d1, 0.0)) + block[2]
    return (c0 > reach0 and c1 > reach1) or (c0 < -reach0 and c1 < -reach1)


@fast_compiled
def _block_circle(points: FloatArray, order: IntArray, first: int, last: int) -> FloatArray:
    """Centre and radius of a block of receptors."""
    x, y = points[order[first:last], 0], points[order[first:last], 1]
    circle = np.empty(3)
    circle[0] = 0.5 * (x.min() + x.max())
    circle[1] = 0.5 * (y.min() + y.max())
    circle[2] = np.sqrt(((x - circle[0]) ** 2 + (y - circle[1]) ** 2).max())
    return circle


@fast_compiled
def _one_state(
    scratch: Float32Array, live: IntArray, kind: IntArray, begin: IntArray, sorted_: IntArray,
    owner: IntArray, points: FloatArray, pairs: int, along_x: float, along_y: float,
    down_x: float, down_y: float, sy0: f32, sz0: f32, h: f32, lid: f32, curve: Curve,
) -> int:  # fmt: skip
    """All pairs of a block with one segment in one state; return how many live."""
    d_rate = -(along_x * down_x + along_y * down_y)
    c_rate = -(along_y * down_x - along_x * down_y)
    flip = 1.0 if d_rate >= 0.0 else -1.0
    d32, c32 = f32(flip * d_rate), f32(flip * c_rate)
    n = _select(
        scratch, live, pairs, f32(down_x), f32(down_y), d32, c32, f32(flip), sy0, curve[0], lid
    )
    if n == 0:
        return 0
    _clip(scratch, n, d32, c32, sy0, sz0, h, curve)
    _sort(scratch, live, kind, begin, sorted_, n, h, sz0, lid, curve)
    for j in range(n):
        scratch[SUM + j] = ZERO
    for rule in range(KINDS):
        count = begin[rule + 1] - begin[rule]
        if count > 0:
            _sum_free(scratch[begin[rule] :], count, rule, sy0, sz0, curve)
        under = KINDS + rule
        if begin[under + 1] > begin[under]:
            _sum_under_lid(
                scratch, owner, points, sorted_, begin[under], begin[under + 1], rule,
                sy0, sz0, h, lid, curve,
            )  # fmt: skip
    return n


@parallel_compiled
def fill_table(
    table: Float32Array, points: FloatArray, order: IntArray, size: int, ends: FloatArray,
    piece: FloatArray, near: FloatArray, far: FloatArray, wind_from: FloatArray,
    code: IntArray, lid: FloatArray, curves: Float32Array, strength: Float32Array,
    group: IntArray, height: FloatArray, sigma_z0: FloatArray, sigma_y0: FloatArray,
) -> None:  # fmt: skip
    """Add every segment to ``table`` (W, K, G, R); blocks of ``size`` receptors in parallel.

    A receptor's sum always runs over the segments in their order, so the bytes do
    not depend on the number of threads.
    """
    blocks = (len(order) + size - 1) // size
    for number in prange(blocks):
        first, last = number * size, min(number * size + size, len(order))
        scratch = np.empty(COLUMNS * BLOCK, dtype=np.float32)
        owner, live = np.empty(BLOCK, dtype=np.int64), np.empty(BLOCK + 1, dtype=np.int64)
        kind, sorted_ = np.empty(BLOCK, dtype=np.int64), np.empty(BLOCK, dtype=np.int64)
        begin = np.empty(2 * KINDS + 1, dtype=np.int64)
        circle = _block_circle(points, order, first, last)
        for s in range(len(ends)):
            x0, y0, x1, y1 = ends[s, 0, 0], ends[s, 0, 1], ends[s, 1, 0], ends[s, 1, 1]
            length = np.hypot(x1 - x0, y1 - y0)
            if length == 0.0:
                continue
            pairs = _gather(
                scratch, owner, points, order, first, last, ends[s], piece[s], near[s], far[s]
            )
            if pairs == 0:
                continue
            along_x, along_y = (x1 - x0) / length, (y1 - y0) / length
            sy0, sz0, h = f32(sigma_y0[s]), f32(sigma_z0[s]), f32(height[s])
            for w in range(len(wind_from)):
                down_x, down_y = -np.sin(wind_from[w]), -np.cos(wind_from[w])
                c = curves[code[w]]
                if height[s] > lid[w] or _block_misses(
                    circle, x0, y0, x1, y1, down_x, down_y, sigma_y0[s], c[0]
                ):
                    continue
                n = _one_state(
                    scratch, live, kind, begin, sorted_, owner, points, pairs,
                    along_x, along_y, down_x, down_y, sy0, sz0, h, f32(lid[w]),
                    (c[0], c[1], c[2], c[3], c[4], c[5]),
                )  # fmt: skip
                for k in range(len(strength)):
                    share = strength[k, s] * PER_CIRCLE
                    for j in range(n):
                        table[w, k, group[s], owner[sorted_[j]]] += share * scratch[SUM + j]
