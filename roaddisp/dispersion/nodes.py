"""The sum along each segment: how many nodes, which, and their total."""

from __future__ import annotations

import numpy as np

from roaddisp.dispersion.columns import (
    APART,
    BASE,
    BASE_SHORT,
    BIAS,
    BY_FALL,
    BY_HEIGHT,
    BY_PATH,
    BY_ROOT,
    BY_STEEP,
    BY_STRETCH,
    C_APART,
    C_C_LO,
    C_C_SPAN,
    C_D_LO,
    C_D_SPAN,
    C_KEEP,
    C_LO,
    C_MEASURE,
    C_MIRROR,
    C_SPAN,
    D_LO,
    D_SPAN,
    E3,
    E4,
    E5,
    E6,
    FARTHEST,
    FIELDS,
    FRACTION,
    HALF,
    KEEP,
    KIND_OF,
    KINDS,
    L_CROSS,
    L_DOWN,
    L_FIRST,
    L_LAST,
    L_Z,
    LEAST_DELTA,
    LID_REACH,
    LN2_HIGH,
    LN2_LOW,
    LOWEST_EXPONENT,
    MANTISSA,
    MEASURE,
    MIRROR,
    MOST_NODES,
    NODES,
    ONE,
    PER_LN2,
    PI,
    RISES,
    ROOM,
    RULE_SIZE,
    SLOPE_SHORT,
    STEEP_FROM,
    SUM,
    TINY,
    TWO,
    ULP,
    WANTED,
    WEIGHTS,
    ZERO,
    Curve,
    f32,
    u64,
)
from roaddisp.dispersion.compiling import fast_compiled
from roaddisp.model import Float32Array, FloatArray, IntArray


@fast_compiled
def exponential(x: f32) -> f32:
    """e^x for x <= 0 in vector instructions, to 3e-7; nothing is lost below -80."""
    x = x if x > LOWEST_EXPONENT else LOWEST_EXPONENT
    power = np.int32(x * PER_LN2 - HALF)
    whole = f32(power)
    r = x - whole * LN2_HIGH - whole * LN2_LOW
    series = ((((E6 * r + E5) * r + E4) * r + E3) * r + HALF) * r + ONE
    return (series * r + ONE) * np.int32((power + BIAS) << MANTISSA).view(np.float32)


@fast_compiled
def logarithm(x: f32) -> f32:
    """Natural logarithm of x >= 1, to 0.01: for the count of nodes only."""
    bits = np.float32(x).view(np.int32)
    power = f32(np.int32((bits >> MANTISSA) - BIAS))
    part = f32(np.int32(bits & FRACTION)) * ULP
    return (power + part + f32(0.346) * part * (ONE - part)) / PER_LN2


@fast_compiled
def _capped(t: f32) -> f32:
    low = t if t > -FARTHEST else -FARTHEST
    capped = low if low < FARTHEST else FARTHEST
    return capped  # noqa: RET504 - a conditional return would keep the loop from vectors


@fast_compiled
def stretch(
    scratch: Float32Array, n: int, d_rate: f32, c_rate: f32, sy0: f32, sz0: f32, h: f32,
    curve: Curve,
) -> None:  # fmt: skip
    """Map each line onto (0, 1) and say how many nodes it wants.

    With delta the distance at which the plume's growth begins to count, nodes are
    even in 1/(d + delta): one rule from crosswind to parallel wind.
    """
    a, _, e1, e2, az_squared, g = curve
    a_squared, sy0_squared, sz0_squared = a * a, sy0 * sy0, sz0 * sz0
    per_a, most_delta = ONE / a, RISES * sz0 / np.sqrt(az_squared)
    for j in range(u64(n)):
        d, c, z = scratch[L_DOWN + j], scratch[L_CROSS + j], scratch[L_Z + j]
        lo, hi = scratch[L_FIRST + j], scratch[L_LAST + j]
        apart = (z - h) * (z - h)
        length = hi - lo if hi > lo else ZERO
        d_lo = d + lo * d_rate
        d_lo = d_lo if d_lo > ZERO else ZERO
        d_hi = d_lo + length * d_rate
        c_lo, c_hi = c + lo * c_rate, c + hi * c_rate
        side_lo, side_hi = abs(c_lo), abs(c_hi)
        c_least = side_lo if side_lo < side_hi else side_hi
        c_least = ZERO if c_lo * c_hi <= ZERO else c_least
        delta = np.sqrt(sy0_squared + c_least * c_least) * per_a
        delta = delta if delta < most_delta else most_delta
        delta = delta if delta > LEAST_DELTA else LEAST_DELTA
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
        stretch = logarithm(ONE / keep)
        need = (
            BY_PATH * path + BY_STRETCH * stretch + BY_ROOT * np.sqrt(stretch)
            + BY_HEIGHT * lift + BY_FALL * np.sqrt(fall) + BY_STEEP * steep
        )  # fmt: skip
        long, short = BASE + need, BASE_SHORT + SLOPE_SHORT * need

        scratch[C_D_LO + j] = d_lo
        scratch[C_D_SPAN + j] = d_hi - d_lo
        scratch[C_C_LO + j] = c_lo
        scratch[C_C_SPAN + j] = c_hi - c_lo
        scratch[C_MEASURE + j] = length * keep
        scratch[C_KEEP + j] = keep
        scratch[C_APART + j] = HALF * apart
        scratch[C_MIRROR + j] = TWO * z * h
        scratch[WANTED + j] = long if long < short else short


@fast_compiled
def _feels_lid(scratch: Float32Array, j: int, h: f32, sz0: f32, lid: f32, curve: Curve) -> bool:
    """Whether the first image in the lid reaches the receptor from the line's far end."""
    d = scratch[C_D_LO + j] + scratch[C_D_SPAN + j]
    _, _, e1, e2, az_squared, g = curve
    sz_squared = sz0 * sz0 + az_squared * d * d * (ONE + g * d) / (ONE + d * (e1 + e2 * d))
    return bool(TWO * lid - scratch[L_Z + j] - h < LID_REACH * np.sqrt(sz_squared))


@fast_compiled
def sort(
    scratch: Float32Array, live: IntArray, kind: IntArray, begin: IntArray, sorted_: IntArray,
    n: int, h: f32, sz0: f32, lid: f32, curve: Curve,
) -> None:  # fmt: skip
    """Bring pairs of one rule together; those the lid touches come last, a rule finer."""
    begin[:] = 0
    for j in range(u64(n)):
        wanted = min(int(np.ceil(scratch[WANTED + j])), MOST_NODES)
        kind[j] = KIND_OF[max(wanted, 1)]
        if lid < np.inf and _feels_lid(scratch, j, h, sz0, lid, curve):
            kind[j] = KINDS + min(kind[j] + 2, KINDS - 1)
        begin[kind[j] + 1] += 1
    for k in range(2 * KINDS):
        begin[k + 1] += begin[k]
    for j in range(u64(n)):
        place = begin[kind[j]]
        begin[kind[j]] += 1
        sorted_[place] = live[j]
        for field in range(FIELDS):
            scratch[D_LO + u64(ROOM * field + place)] = scratch[C_D_LO + u64(ROOM * field) + j]
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
        return f32(
            np.exp(-per * apart * apart) + np.exp(-per * up * up)
            + np.exp(-per * (apart - shift) ** 2) + np.exp(-per * (apart + shift) ** 2)
            + np.exp(-per * (up - shift) ** 2) + np.exp(-per * (up + shift) ** 2)
            + np.exp(-per * (up - shift - shift) ** 2)
        )  # fmt: skip
    total = HALF
    for order in range(1, 4):
        wave = f32(order) * PI / lid
        total += np.exp(-HALF * wave * wave * variance) * np.cos(wave * z) * np.cos(wave * h)
    return f32(TWO * total * np.sqrt(TWO * PI * variance) / lid)


@fast_compiled
def sum_free(scratch: Float32Array, n: int, kind: int, sy0: f32, sz0: f32, curve: Curve) -> None:
    """Add up one rule's nodes for its ``n`` pairs, the first in ``scratch``; no lid is felt."""
    a, b, e1, e2, az_squared, g = curve
    a_squared, sy0_squared, sz0_squared = a * a, sy0 * sy0, sz0 * sz0
    for node in range(RULE_SIZE[kind]):
        xi, weight = NODES[kind, node], WEIGHTS[kind, node]
        for j in range(u64(n)):
            keep = scratch[KEEP + j]
            stretch = ONE / (ONE - (ONE - keep) * xi)
            share = xi * keep * stretch
            d = scratch[D_LO + j] + scratch[D_SPAN + j] * share
            c = scratch[C_LO + j] + scratch[C_SPAN + j] * share
            # variances as fractions, so that one division serves both and their root
            y_under = ONE + b * d
            y_over = sy0_squared * y_under + a_squared * d * d + TINY
            z_under = ONE + d * (e1 + e2 * d)
            z_over = sz0_squared * z_under + az_squared * d * d * (ONE + g * d)
            per_both = ONE / (y_over * z_over)
            per_y = y_under * z_over * per_both
            per_z = z_under * y_over * per_both
            exponent = HALF * c * c * per_y + scratch[APART + j] * per_z
            mirror = exponential(-scratch[MIRROR + j] * per_z)
            plume = np.sqrt(per_y * per_z) * exponential(-exponent) * (ONE + mirror)
            scratch[SUM + j] += weight * scratch[MEASURE + j] * stretch * stretch * plume


@fast_compiled
def sum_under_lid(
    scratch: Float32Array, owner: IntArray, points: FloatArray, sorted_: IntArray,
    begin: int, end: int, kind: int, sy0: f32, sz0: f32, h: f32, lid: f32, curve: Curve,
) -> None:  # fmt: skip
    """Add up the nodes of pairs the lid touches, one at a time."""
    a, b, e1, e2, az_squared, g = curve
    for j in range(u64(begin), u64(end)):
        z = f32(points[owner[sorted_[j]], 2])
        keep = scratch[KEEP + j]
        for node in range(RULE_SIZE[kind]):
            xi, weight = NODES[kind, node], WEIGHTS[kind, node]
            stretch = ONE / (ONE - (ONE - keep) * xi)
            share = xi * keep * stretch
            d = scratch[D_LO + j] + scratch[D_SPAN + j] * share
            c = scratch[C_LO + j] + scratch[C_SPAN + j] * share
            sy_squared = sy0 * sy0 + a * a * d * d / (ONE + b * d) + TINY
            sz_squared = sz0 * sz0 + az_squared * d * d * (ONE + g * d) / (ONE + d * (e1 + e2 * d))
            plume = np.exp(-HALF * c * c / sy_squared) / np.sqrt(sy_squared * sz_squared)
            scratch[SUM + j] += (
                weight * scratch[MEASURE + j] * stretch * stretch
                * plume * _lid_sum(z, h, sz_squared, lid)
            )  # fmt: skip
