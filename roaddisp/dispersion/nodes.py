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
    C_FALL,
    C_LO,
    C_MEASURE,
    C_MIRROR,
    C_SPAN,
    D_LO,
    D_SPAN,
    FALL,
    FARTHEST,
    FRACTION,
    HALF,
    HALF_PER_LN2,
    IN_FIRST,
    IN_LAST,
    KINDS,
    L_CROSS,
    L_DOWN,
    L_Z,
    LOWEST_POWER,
    MAGIC,
    MANTISSA,
    MEASURE,
    MIRROR,
    NODES,
    ONE,
    P0,
    P1,
    P2,
    P3,
    P4,
    PER_LN2,
    PI,
    PLUME,
    RISES,
    ROOT_HALF_PER_LN2,
    RULE_SIZE,
    RULES,
    S_Z,
    SLOPE_SHORT,
    STEEP_FROM,
    SUM,
    TALL,
    TINY,
    TWO,
    ULP,
    VARIANCE,
    WAVE,
    WEIGHTS,
    ZERO,
    Curve,
    Line,
    Work,
    f32,
    u64,
)
from roaddisp.dispersion.compiling import fast_compiled
from roaddisp.dispersion.reach import feels_lid, scale, whole
from roaddisp.model import Float32Array


@fast_compiled
def power_of_two(y: f32) -> f32:
    """2^y for y <= 0 in vector instructions, to 4e-6; nothing is lost below -120."""
    y = y if y > LOWEST_POWER else LOWEST_POWER
    shifted = y + MAGIC
    f = y - (shifted - MAGIC)
    series = (((P4 * f + P3) * f + P2) * f + P1) * f + P0
    power = np.int32(np.float32(shifted).view(np.int32) << MANTISSA)
    return np.int32(np.float32(series).view(np.int32) + power).view(np.float32)


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
    return low if low < FARTHEST else FARTHEST


@fast_compiled
def _rule(wanted: f32) -> np.int32:
    """First rule with at least so many nodes: the number of those that have fewer."""
    return np.int32(
        np.int32(wanted > f32(RULES[0])) + np.int32(wanted > f32(RULES[1]))
        + np.int32(wanted > f32(RULES[2])) + np.int32(wanted > f32(RULES[3]))
        + np.int32(wanted > f32(RULES[4])) + np.int32(wanted > f32(RULES[5]))
        + np.int32(wanted > f32(RULES[6])) + np.int32(wanted > f32(RULES[7]))
        + np.int32(wanted > f32(RULES[8])) + np.int32(wanted > f32(RULES[9]))
        + np.int32(wanted > f32(RULES[10]))
    )  # fmt: skip


@fast_compiled
def stretch(work: Work, n: int, line: Line, curve: Curve) -> None:
    """Map each line onto (0, 1) and choose its rule.

    Exponents are of 2 from here on, so offsets are scaled by sqrt(1 / (2 ln 2)).
    With delta the distance at which the plume's growth begins to count, nodes are
    even in 1/(d + delta): one rule from crosswind to parallel wind.
    """
    scratch, kind = work.scratch, work.kind
    d_rate, c_rate, sy0, sz0, h = line
    a, _, e1, e2, az_squared, g = curve
    a_squared, sy0_squared, sz0_squared = a * a, sy0 * sy0, sz0 * sz0
    per_a, most_delta = ONE / a, RISES * sz0 / np.sqrt(az_squared)
    for j in range(u64(whole(n))):
        d, c, z = scratch[L_DOWN + j], scratch[L_CROSS + j], scratch[L_Z + j]
        lo, hi = scratch[IN_FIRST + j], scratch[IN_LAST + j]
        apart = (z - h) * (z - h)
        length = hi - lo if hi > lo else ZERO
        d_lo = d + lo * d_rate
        d_lo = d_lo if d_lo > ZERO else ZERO
        d_hi = d_lo + length * d_rate
        c_lo, c_hi = c + lo * c_rate, c + hi * c_rate
        delta = scale(c_lo, c_hi, sy0_squared, per_a, most_delta)
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
        scratch[C_D_SPAN + j] = (d_hi - d_lo) * keep
        scratch[C_C_LO + j] = ROOT_HALF_PER_LN2 * c_lo
        scratch[C_C_SPAN + j] = ROOT_HALF_PER_LN2 * (c_hi - c_lo) * keep
        scratch[C_MEASURE + j] = length * keep
        scratch[C_FALL + j] = ONE - keep
        scratch[C_APART + j] = HALF_PER_LN2 * apart
        scratch[C_MIRROR + j] = PER_LN2 * TWO * z * h
        kind[j] = _rule(long if long < short else short)


@fast_compiled
def mark_lid(work: Work, n: int, line: Line, lid: f32, curve: Curve) -> None:
    """Send pairs whose lid is felt at the line's far end to a rule for it, two steps finer.

    A receptor above the lid gets nothing.
    """
    scratch, kind, sz0, h = work.scratch, work.kind, line.sz0, line.h
    for j in range(u64(n)):
        z = scratch[L_Z + j]
        if z > lid:
            scratch[C_MEASURE + j] = ZERO
        elif feels_lid(_far_end(scratch, j), z, h, sz0, lid, curve):
            kind[j] = np.int32(KINDS + min(kind[j] + 2, KINDS - 1))


@fast_compiled
def mark_touched(work: Work, n: int, line: Line, lid: f32, curve: Curve) -> None:
    """Let only those pairs count that feel the lid or have an end above it."""
    scratch, sz0, h = work.scratch, line.sz0, line.h
    for j in range(u64(n)):
        z = scratch[L_Z + j]
        felt = feels_lid(_far_end(scratch, j), z, h, sz0, lid, curve)
        if not (felt or z > lid or h > lid):
            scratch[C_MEASURE + j] = ZERO


@fast_compiled
def _far_end(scratch: Float32Array, j: int) -> f32:
    return f32(scratch[C_D_LO + j] + scratch[C_D_SPAN + j] / (ONE - scratch[C_FALL + j]))


@fast_compiled
def sort(work: Work, n: int) -> None:
    """Bring pairs of one rule together, each rule from a new vector register on."""
    scratch, kind, place, begin = work.scratch, work.kind, work.place, work.begin
    begin[:] = 0
    for j in range(u64(n)):
        begin[u64(kind[j] + 1)] += 1
    for k in range(2 * KINDS):
        begin[k + 1] = begin[k] + whole(begin[k + 1])
    for j in range(u64(n)):
        rule = u64(kind[j])
        p = begin[rule]
        begin[rule] = p + 1
        place[j] = p
        to = u64(p)
        scratch[D_LO + to] = scratch[C_D_LO + j]
        scratch[D_SPAN + to] = scratch[C_D_SPAN + j]
        scratch[C_LO + to] = scratch[C_C_LO + j]
        scratch[C_SPAN + to] = scratch[C_C_SPAN + j]
        scratch[MEASURE + to] = scratch[C_MEASURE + j]
        scratch[FALL + to] = scratch[C_FALL + j]
        scratch[APART + to] = scratch[C_APART + j]
        scratch[MIRROR + to] = scratch[C_MIRROR + j]
    for k in range(2 * KINDS, 0, -1):
        begin[k] = whole(begin[k - 1])
    begin[0] = 0
    for j in range(u64(begin[2 * KINDS])):
        scratch[SUM + j] = ZERO


@fast_compiled
def sum_free(
    scratch: Float32Array, first: int, last: int, kind: int, line: Line, curve: Curve
) -> None:
    """Add up one rule's nodes for the pairs in places ``first`` to ``last``; no lid is felt.

    Variances are fractions, so that one division serves both and their root.
    """
    a, b, e1, e2, az_squared, g = curve
    sy0_squared, sz0_squared = line.sy0 * line.sy0, line.sz0 * line.sz0
    y0, y1, y2 = sy0_squared + TINY, sy0_squared * b, a * a
    z1, z2, z3 = sz0_squared * e1, sz0_squared * e2 + az_squared, az_squared * g
    for node in range(RULE_SIZE[kind]):
        xi, weight = NODES[kind, node], WEIGHTS[kind, node]
        for j in range(u64(first), u64(last)):
            grow = ONE / (ONE - scratch[FALL + j] * xi)
            share = xi * grow
            d = scratch[D_LO + j] + scratch[D_SPAN + j] * share
            c = scratch[C_LO + j] + scratch[C_SPAN + j] * share
            y_under = ONE + b * d
            y_over = y0 + d * (y1 + d * y2)
            z_under = ONE + d * (e1 + e2 * d)
            z_over = sz0_squared + d * (z1 + d * (z2 + d * z3))
            per_both = ONE / (y_over * z_over)
            per_y = y_under * z_over * per_both
            per_z = z_under * y_over * per_both
            fall = c * c * per_y + scratch[APART + j] * per_z
            mirror = power_of_two(-scratch[MIRROR + j] * per_z)
            plume = np.sqrt(per_y * per_z) * power_of_two(-fall) * (ONE + mirror)
            scratch[SUM + j] += weight * scratch[MEASURE + j] * grow * grow * plume


@fast_compiled
def sum_under_lid(
    scratch: Float32Array, first: int, last: int, kind: int, line: Line, lid: f32, curve: Curve
) -> None:  # fmt: skip
    """Add up the nodes of pairs the lid touches: images near the source, waves far from it."""
    for j in range(u64(first), u64(last)):
        scratch[WAVE + j] = np.cos(PI / lid * scratch[S_Z + j])
    for node in range(RULE_SIZE[kind]):
        _at_node(scratch, first, last, NODES[kind, node], WEIGHTS[kind, node], line, curve)
        for order in range(-1, 3):
            _add_image(scratch, first, last, f32(2 * order) * lid - line.h)
            if order < 2:
                _add_image(scratch, first, last, f32(2 * order) * lid + line.h)
        _add_waves(scratch, first, last, line.h, lid)


@fast_compiled
def _at_node(
    scratch: Float32Array, first: int, last: int, xi: f32, weight: f32, line: Line, curve: Curve
) -> None:
    """Weighted plume without its vertical part, and vertical variance, at one node."""
    a, b, e1, e2, az_squared, g = curve
    y0, sz0_squared = line.sy0 * line.sy0 + TINY, line.sz0 * line.sz0
    for j in range(u64(first), u64(last)):
        grow = ONE / (ONE - scratch[FALL + j] * xi)
        share = xi * grow
        d = scratch[D_LO + j] + scratch[D_SPAN + j] * share
        c = scratch[C_LO + j] + scratch[C_SPAN + j] * share
        per_y = ONE / (y0 + a * a * d * d / (ONE + b * d))
        variance = sz0_squared + az_squared * d * d * (ONE + g * d) / (ONE + d * (e1 + e2 * d))
        plume = np.sqrt(per_y / variance) * power_of_two(-c * c * per_y)
        scratch[PLUME + j] = weight * scratch[MEASURE + j] * grow * grow * plume
        scratch[VARIANCE + j] = variance
        scratch[TALL + j] = ZERO


@fast_compiled
def _add_image(scratch: Float32Array, first: int, last: int, at: f32) -> None:
    """Add the image of the source at height ``at``."""
    for j in range(u64(first), u64(last)):
        apart = scratch[S_Z + j] - at
        scratch[TALL + j] += power_of_two(-HALF_PER_LN2 * apart * apart / scratch[VARIANCE + j])


@fast_compiled
def _add_waves(scratch: Float32Array, first: int, last: int, h: f32, lid: f32) -> None:
    """Take waves instead of images where the plume fills half the air; add to the sum."""
    wave, far_from = PI / lid, f32(0.25) * lid * lid
    at_source = np.cos(wave * h)
    twice_at_source = TWO * at_source * at_source - ONE
    decay, spread = -HALF_PER_LN2 * wave * wave, TWO * np.sqrt(TWO * PI) / lid
    for j in range(u64(first), u64(last)):
        variance, at = scratch[VARIANCE + j], scratch[WAVE + j]
        damped = power_of_two(decay * variance)
        twice = damped * damped * damped * damped * twice_at_source * (TWO * at * at - ONE)
        far = spread * np.sqrt(variance) * (HALF + damped * at * at_source + twice)
        near = scratch[TALL + j]
        scratch[SUM + j] += scratch[PLUME + j] * (near if variance < far_from else far)
