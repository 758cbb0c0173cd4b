"""Which part of each segment reaches each receptor: the first stages of the fast path."""

from __future__ import annotations

import numpy as np

from roaddisp.dispersion.columns import (
    CROSS,
    CUT,
    CUT_LEAST_MORE,
    CUT_MOST,
    DOWN,
    END,
    FIRST,
    GAP_X,
    GAP_Y,
    L_CROSS,
    L_DOWN,
    L_FIRST,
    L_LAST,
    L_Z,
    LEAST_DELTA,
    LIFTED,
    LIVE,
    NOTHING,
    ONE,
    PRUNE,
    ROOM,
    SPAN,
    SPAN_LIFTED,
    START,
    TINY,
    ZERO,
    Curve,
    Z,
    f32,
    u64,
)
from roaddisp.dispersion.compiling import fast_compiled
from roaddisp.model import Float32Array, FloatArray, IntArray


@fast_compiled
def distance_from(x: float, y: float, piece: FloatArray) -> float:
    """Plan distance of a point from a stretch of line, or from a point."""
    px, py = piece[0, 0], piece[0, 1]
    run, rise = piece[1, 0] - px, piece[1, 1] - py
    squared = run * run + rise * rise
    share = ((x - px) * run + (y - py) * rise) / squared if squared > 0.0 else 0.0
    share = min(max(share, 0.0), 1.0)
    return float(np.hypot(x - px - share * run, y - py - share * rise))


@fast_compiled
def gather(
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
    windowed = near > 0.0 or far < np.inf
    n = 0
    for place in range(first, last):
        x, y = points[order[place], 0], points[order[place], 1]
        if windowed:
            distance = distance_from(x, y, piece)
            if distance < near or distance >= far:
                continue
        foot = min(max((x - x0) * along_x + (y - y0) * along_y, 0.0), length)
        scratch[GAP_X + u64(n)] = x - x0 - foot * along_x
        scratch[GAP_Y + u64(n)] = y - y0 - foot * along_y
        scratch[START + u64(n)] = -foot
        scratch[END + u64(n)] = length - foot
        scratch[Z + u64(n)] = points[order[place], 2]
        owner[n] = order[place]
        n += 1
    return n


@fast_compiled
def select(
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
    for j in range(u64(n)):
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
    for j in range(u64(n)):
        live[m] = j
        m += scratch[LIVE + j] > ZERO
    for k in range(u64(m)):
        pair = u64(live[k])
        scratch[L_DOWN + k] = scratch[DOWN + pair]
        scratch[L_CROSS + k] = scratch[CROSS + pair]
        scratch[L_FIRST + k] = scratch[FIRST + pair]
        scratch[L_LAST + k] = scratch[END + pair] if flip > ZERO else -scratch[START + pair]
        scratch[L_Z + k] = scratch[Z + pair]
    return m


@fast_compiled
def cut(
    scratch: Float32Array, n: int, d_rate: f32, c_rate: f32, sy0: f32, sz0: f32, h: f32,
    curve: Curve,
) -> None:  # fmt: skip
    """Cut each line to the stretch inside |c| = T sqrt(sigma_y0^2 + a^2 d^2).

    T follows from the line's least t = c/sigma_y; ((z - h)/sigma_z0)^2 widens it: far
    above or below the source the tails decide. The roots are taken from the point of
    least t, where the quadratic is not positive. Then cut what is so near that height
    alone makes it vanish beside the best of three points.
    """
    a, _, e1, e2, az_squared, g = curve
    a_squared, sy0_squared, sz0_squared = a * a, sy0 * sy0, sz0 * sz0
    per_sz0_squared, per_az_squared = ONE / sz0_squared, ONE / az_squared
    steepness = d_rate if d_rate > TINY else TINY
    for j in range(u64(n)):
        d, c = scratch[L_DOWN + j], scratch[L_CROSS + j]
        lo, hi = scratch[L_FIRST + j], scratch[L_LAST + j]
        apart = scratch[L_Z + j] - h
        d_lo, d_hi = d + lo * d_rate, d + hi * d_rate
        c_lo, c_hi = c + lo * c_rate, c + hi * c_rate
        t_lo = c_lo * c_lo / (sy0_squared + a_squared * d_lo * d_lo + TINY)
        t_hi = c_hi * c_hi / (sy0_squared + a_squared * d_hi * d_hi + TINY)
        crosses = c_lo * c_hi <= ZERO
        change = c_lo - c_hi
        change = change if change != ZERO else ONE
        t_end = t_lo if t_lo < t_hi else t_hi
        end = lo if t_lo < t_hi else hi
        least = ZERO if crosses else t_end
        middle = lo + (hi - lo) * c_lo / change if crosses else end
        wide = least + CUT + apart * apart * per_sz0_squared
        most = least + CUT_LEAST_MORE
        most = most if most > CUT_MOST else CUT_MOST
        wide = wide if wide < most else most

        c_mid = ZERO if crosses else c + middle * c_rate
        d_mid = d + middle * d_rate
        two = c_rate * c_rate - wide * a_squared * d_rate * d_rate
        one = c_mid * c_rate - wide * a_squared * d_mid * d_rate
        none = c_mid * c_mid - wide * (sy0_squared + a_squared * d_mid * d_mid)
        # one^2 - two none, without its cancellation
        offset = c * d_rate - d * c_rate
        inside = wide * (a_squared * offset * offset + sy0_squared * two)
        root = np.sqrt(inside if inside > ZERO else ZERO)
        summed = -(one + root) if one >= ZERO else root - one
        summed = summed if summed != ZERO else TINY
        divisor = two if two != ZERO else TINY
        far, near = middle + summed / divisor, middle + none / summed
        # two > 0: the line leaves the plume on both sides of its middle
        closed_lo = near if near < far else far
        closed_hi = far if near < far else near
        # two < 0: it leaves once and comes back; cut only an end that lies outside
        open_lo = near if (near <= middle) & (far < lo) else lo
        open_hi = near if (near > middle) & (far > hi) else hi
        cut_lo = closed_lo if two > ZERO else open_lo
        cut_hi = closed_hi if two > ZERO else open_hi
        cut_lo = cut_lo if (inside > ZERO) & (cut_lo > lo) else lo
        cut_hi = cut_hi if (inside > ZERO) & (cut_hi < hi) else hi

        d_end = d + cut_hi * d_rate
        sz_mid = sz0_squared + az_squared * d_mid * d_mid * (ONE + g * d_mid) / (
            ONE + d_mid * (e1 + e2 * d_mid)
        )
        sz_end = sz0_squared + az_squared * d_end * d_end * (ONE + g * d_end) / (
            ONE + d_end * (e1 + e2 * d_end)
        )
        c_end = c + cut_hi * c_rate
        t_last = c_end * c_end / (sy0_squared + a_squared * d_end * d_end + TINY)
        at_mid = apart * apart / sz_mid
        at_end = apart * apart / sz_end + t_last - least
        best = at_mid if at_mid < at_end else at_end
        lifted = apart * apart / (best + NOTHING) - sz0_squared
        lifted = lifted if lifted > ZERO else ZERO
        d_lift = np.sqrt(lifted * per_az_squared)
        d_lift = d_lift / np.sqrt(ONE + g * d_lift)
        lift_lo = (d_lift - d) / steepness
        too_low = (lifted > ZERO) & (lift_lo > cut_lo) & (lift_lo < cut_hi)
        scratch[L_FIRST + j] = lift_lo if too_low else cut_lo
        scratch[L_LAST + j] = cut_hi


@fast_compiled
def split(
    scratch: Float32Array, live: IntArray, n: int, d_rate: f32, c_rate: f32, sy0: f32, sz0: f32,
    h: f32, curve: Curve,
) -> int:  # fmt: skip
    """Part a line that spans too many scales of distance; return how many parts there are."""
    a = curve[0]
    rise = sz0 / np.sqrt(curve[4])
    k = 0
    while k < n and n < ROOM:
        j = u64(k)
        lo, hi = scratch[L_FIRST + j], scratch[L_LAST + j]
        d, c = scratch[L_DOWN + j], scratch[L_CROSS + j]
        span = SPAN_LIFTED if abs(scratch[L_Z + j] - h) > LIFTED * sz0 else SPAN
        d_lo, d_hi = max(d + lo * d_rate, ZERO), d + hi * d_rate
        if d_hi > span * d_lo:
            c_lo, c_hi = c + lo * c_rate, c + hi * c_rate
            c_least = ZERO if c_lo * c_hi <= ZERO else min(abs(c_lo), abs(c_hi))
            delta = max(min(np.sqrt(sy0 * sy0 + c_least * c_least) / a, rise), LEAST_DELTA)
            if d_hi + delta > span * (d_lo + delta):
                d_cut = np.sqrt((d_lo + delta) * (d_hi + delta)) - delta
                cut = lo + (d_cut - d_lo) / d_rate
                if lo < cut and cut < hi:
                    new = u64(n)
                    scratch[L_DOWN + new], scratch[L_CROSS + new] = d, c
                    scratch[L_FIRST + new], scratch[L_LAST + new] = cut, hi
                    scratch[L_Z + new] = scratch[L_Z + j]
                    live[n] = live[k]
                    scratch[L_LAST + j] = cut
                    n += 1
                    continue
        k += 1
    return n
