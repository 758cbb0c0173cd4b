"""The fast line integral, compiled: float32, many pairs at once, nodes as needed.

A *pair* is one receptor and one segment. Receptors come in blocks of neighbours;
for a block, a segment and a weather state the stages follow one another:

    gather   geometry of the pairs, relative to the segment's point nearest the receptor
    select   leave out what is upwind, drop pairs the plume misses
    cut      keep the stretch of line inside the plume
    split    part a line that spans too many scales of distance
    stretch  map it so that few nodes do, and choose how many
    sort     bring pairs with the same number of nodes together
    sum      Gauss-Legendre, all pairs of a node at once

and the sum, times line strength, goes into the groups.
"""

from __future__ import annotations

import numpy as np
from numba import prange

from roaddisp.dispersion.columns import (
    BLOCK,
    COLUMNS,
    KINDS,
    PER_CIRCLE,
    PRUNE,
    ROOM,
    SUM,
    ZERO,
    Curve,
    f32,
    u64,
)
from roaddisp.dispersion.compiling import fast_compiled, parallel_compiled
from roaddisp.dispersion.nodes import sort, stretch, sum_free, sum_under_lid
from roaddisp.dispersion.reach import cut, distance_from, gather, select, split
from roaddisp.model import Float32Array, FloatArray, IntArray


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
    return bool((c0 > reach0 and c1 > reach1) or (c0 < -reach0 and c1 < -reach1))


@fast_compiled
def _outside_window(circle: FloatArray, piece: FloatArray, near: float, far: float) -> bool:
    """Whether no receptor of a block is in a segment's window."""
    away = distance_from(circle[0], circle[1], piece)
    return bool(away + circle[2] < near or away - circle[2] >= far)


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
    n = select(
        scratch, live, pairs, f32(down_x), f32(down_y), d32, c32, f32(flip), sy0, curve[0], lid
    )
    if n == 0:
        return 0
    cut(scratch, n, d32, c32, sy0, sz0, h, curve)
    n = split(scratch, live, n, d32, c32, sy0, sz0, h, curve)
    stretch(scratch, n, d32, c32, sy0, sz0, h, curve)
    sort(scratch, live, kind, begin, sorted_, n, h, sz0, lid, curve)
    for j in range(u64(n)):
        scratch[SUM + j] = ZERO
    for rule in range(KINDS):
        count = begin[rule + 1] - begin[rule]
        if count > 0:
            sum_free(scratch[begin[rule] :], count, rule, sy0, sz0, curve)
        under = KINDS + rule
        if begin[under + 1] > begin[under]:
            sum_under_lid(
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
    across_only: bool,
) -> None:  # fmt: skip
    """Add every segment to ``table`` (W, K, G, R); blocks of ``size`` receptors in parallel.

    With ``across_only`` a segment's sigma_y0 is what the wind sees of it: its
    component across the wind.

    A receptor's sum always runs over the segments in their order, so the bytes do
    not depend on the number of threads.
    """
    blocks = (len(order) + size - 1) // size
    for number in prange(blocks):
        first, last = number * size, min(number * size + size, len(order))
        scratch = np.empty(COLUMNS * ROOM, dtype=np.float32)
        owner, live = np.empty(BLOCK, dtype=np.int64), np.empty(ROOM, dtype=np.int64)
        kind, sorted_ = np.empty(ROOM, dtype=np.int64), np.empty(ROOM, dtype=np.int64)
        begin = np.empty(2 * KINDS + 1, dtype=np.int64)
        circle = _block_circle(points, order, first, last)
        for s in range(len(ends)):
            x0, y0, x1, y1 = ends[s, 0, 0], ends[s, 0, 1], ends[s, 1, 0], ends[s, 1, 1]
            length = np.hypot(x1 - x0, y1 - y0)
            if length == 0.0 or _outside_window(circle, piece[s], near[s], far[s]):
                continue
            pairs = gather(
                scratch, owner, points, order, first, last, ends[s], piece[s], near[s], far[s]
            )
            if pairs == 0:
                continue
            along_x, along_y = (x1 - x0) / length, (y1 - y0) / length
            sz0, h = f32(sigma_z0[s]), f32(height[s])
            for w in range(len(wind_from)):
                down_x, down_y = -np.sin(wind_from[w]), -np.cos(wind_from[w])
                spread = sigma_y0[s]
                if across_only:
                    spread *= abs(along_x * down_x + along_y * down_y)
                sy0 = f32(spread)
                c = curves[code[w]]
                if height[s] > lid[w] or _block_misses(
                    circle, x0, y0, x1, y1, down_x, down_y, spread, c[0]
                ):
                    continue
                n = _one_state(
                    scratch, live, kind, begin, sorted_, owner, points, pairs,
                    along_x, along_y, down_x, down_y, sy0, sz0, h, f32(lid[w]),
                    (c[0], c[1], c[2], c[3], c[4], c[5]),
                )  # fmt: skip
                for k in range(len(strength)):
                    share = strength[k, s] * PER_CIRCLE
                    for j in range(u64(n)):
                        table[w, k, group[s], owner[sorted_[j]]] += share * scratch[SUM + j]
