"""The fast line integral, compiled: float32, many pairs at once, nodes as needed.

A *pair* is one receptor and one segment. Receptors come in blocks of neighbours. For
a block and a segment, and then for each wind direction,

    gather   geometry of the pairs, relative to the segment's point nearest the receptor
    aim      leave out what is upwind, drop pairs the widest plume of all states misses

and for each state of that direction, the widest plume first,

    narrow   drop pairs that this state's plume misses
    cut      keep the stretch of line inside the plume
    lift     leave out what height makes vanish
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
    L_Z,
    NOTHING,
    PER_CIRCLE,
    PRUNE,
    ROOM,
    S_Z,
    SUM,
    Curve,
    Line,
    Work,
    f32,
    u64,
)
from roaddisp.dispersion.compiling import fast_compiled, parallel_compiled
from roaddisp.dispersion.nodes import (
    mark_lid,
    mark_touched,
    sort,
    stretch,
    sum_free,
    sum_under_lid,
)
from roaddisp.dispersion.reach import (
    aim,
    cut,
    distance_from,
    feels_lid,
    gather,
    lift,
    narrow,
    spans,
    split,
    touched,
)
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
def _curve(row: Float32Array) -> Curve:
    return (row[0], row[1], row[2], row[3], row[4], row[5])


@fast_compiled
def _block_circle(points: FloatArray, first: int, last: int) -> FloatArray:
    """Centre and radius of a block of receptors, and their lowest and highest."""
    x, y, z = points[first:last, 0], points[first:last, 1], points[first:last, 2]
    circle = np.empty(5)
    circle[0] = 0.5 * (x.min() + x.max())
    circle[1] = 0.5 * (y.min() + y.max())
    circle[2] = np.sqrt(((x - circle[0]) ** 2 + (y - circle[1]) ** 2).max())
    circle[3], circle[4] = z.min(), z.max()
    return circle


@fast_compiled
def _block_feels_lid(
    block: FloatArray, x: float, y: float, end_x: float, end_y: float,
    down_x: float, down_y: float, sz0: f32, h: f32, lid: f32, curve: Curve,
) -> bool:  # fmt: skip
    """Whether any receptor of a block may feel the lid, or stands above it."""
    d0 = (block[0] - x) * down_x + (block[1] - y) * down_y
    d1 = (block[0] - end_x) * down_x + (block[1] - end_y) * down_y
    farthest = f32(max(max(d0, d1) + block[2], 0.0) * 1.001)
    highest = f32(block[4])
    return bool(feels_lid(farthest, highest, h, sz0, lid, curve) or highest > lid or h > lid)


@fast_compiled
def room() -> Work:
    """Room for one block."""
    return Work(
        np.zeros(COLUMNS * ROOM, dtype=np.float32),
        np.zeros(BLOCK, dtype=np.int32),
        np.zeros(ROOM, dtype=np.int32),
        np.zeros(ROOM, dtype=np.int32),
        np.zeros(ROOM, dtype=np.int32),
        np.zeros(ROOM, dtype=np.int32),
        np.zeros(2 * KINDS + 1, dtype=np.int32),
    )


@fast_compiled
def prepare(work: Work, n: int, most_apart: f32, line: Line, curve: Curve) -> int:
    """From live pairs to lines with a rule each; return how many lines there are."""
    cut(work.scratch, n, line, curve[0])
    if most_apart * most_apart > f32(0.9) * NOTHING * line.sz0 * line.sz0:
        lift(work.scratch, n, line, curve)
    if spans(work, n, line, curve) > 0:
        n = split(work, n, line, curve)
    stretch(work, n, line, curve)
    return n


@fast_compiled
def _sum(work: Work, n: int, line: Line, lid: f32, curve: Curve) -> None:
    """Sum every line by its rule."""
    scratch, place, begin = work.scratch, work.place, work.begin
    sort(work, n)
    for rule in range(KINDS):
        if begin[rule + 1] > begin[rule]:
            sum_free(scratch, begin[rule], begin[rule + 1], rule, line, curve)
    if begin[2 * KINDS] > begin[KINDS]:
        for j in range(u64(n)):
            scratch[S_Z + u64(place[j])] = scratch[L_Z + j]
        for rule in range(KINDS):
            first, last = begin[KINDS + rule], begin[KINDS + rule + 1]
            if last > first:
                sum_under_lid(scratch, first, last, rule, line, lid, curve)


@fast_compiled
def _add(row: Float32Array, work: Work, n: int, share: f32) -> None:
    """Give each line's sum to its receptor."""
    scratch, owner, live, place = work.scratch, work.owner, work.live, work.place
    for j in range(u64(n)):
        row[u64(owner[u64(live[j])])] += share * scratch[SUM + u64(place[j])]


@fast_compiled
def _one_state(
    rows: Float32Array, work: Work, m: int, most_apart: f32, line: Line, lid: f32,
    curve: Curve, strength: Float32Array, touched_only: bool,
) -> None:  # fmt: skip
    """Add the live pairs of a state to its group's rows (K, R), or the change its lid makes."""
    n = prepare(work, m, most_apart, line, curve)
    # of the change, the free sum comes off first
    for under in range(0 if touched_only else 1, 1 if line.h > lid else 2):
        if under == 0:
            mark_touched(work, n, line, lid, curve)
        elif lid < np.inf:
            mark_lid(work, n, line, lid, curve)
        _sum(work, n, line, lid, curve)
        per = PER_CIRCLE if under == 1 else -PER_CIRCLE
        for k in range(len(strength)):
            _add(rows[k], work, n, strength[k] * per)


@fast_compiled
def _fill_block(
    table: Float32Array, points: FloatArray, first: int, last: int,
    first_segment: int, last_segment: int, ends: FloatArray, piece: FloatArray,
    near: FloatArray, far: FloatArray, states: IntArray, turns: IntArray,
    wind_from: FloatArray, code: IntArray, lid: FloatArray, curves: Float32Array,
    strength: Float32Array, group: IntArray, height: FloatArray, sigma_z0: FloatArray,
    sigma_y0: FloatArray, across_only: bool, touched_only: bool,
) -> None:  # fmt: skip
    """Add some segments to one block of receptors."""
    work = room()
    circle = _block_circle(points, first, last)
    for s in range(first_segment, last_segment):
        x0, y0, x1, y1 = ends[s, 0, 0], ends[s, 0, 1], ends[s, 1, 0], ends[s, 1, 1]
        length = np.hypot(x1 - x0, y1 - y0)
        if length == 0.0 or _outside_window(circle, piece[s], near[s], far[s]):
            continue
        pairs = gather(work, points, first, last, ends[s], piece[s], near[s], far[s])
        if pairs == 0:
            continue
        along_x, along_y = (x1 - x0) / length, (y1 - y0) / length
        sz0, h = f32(sigma_z0[s]), f32(height[s])
        most_apart = f32(max(abs(circle[3] - height[s]), abs(circle[4] - height[s])))
        for turn in range(len(turns) - 1):
            w = states[turns[turn]]
            down_x, down_y = -np.sin(wind_from[w]), -np.cos(wind_from[w])
            d_rate = -(along_x * down_x + along_y * down_y)
            c_rate = -(along_y * down_x - along_x * down_y)
            spread = sigma_y0[s] * (abs(d_rate) if across_only else 1.0)
            a = curves[code[w], 0]
            if _block_misses(circle, x0, y0, x1, y1, down_x, down_y, spread, a):
                continue
            if touched_only and not _block_feels_lid(
                circle,
                x0,
                y0,
                x1,
                y1,
                down_x,
                down_y,
                sz0,
                h,
                f32(lid[w]),
                _curve(curves[code[w]]),
            ):
                continue
            flip = 1.0 if d_rate >= 0.0 else -1.0
            line = Line(f32(flip * d_rate), f32(flip * c_rate), f32(spread), sz0, h)
            m = aim(work, pairs, f32(down_x), f32(down_y), f32(flip), line, a)
            if touched_only:
                m = touched(work, m, line, f32(lid[w]), _curve(curves[code[w]]))
            for index in range(turns[turn], turns[turn + 1]):
                w = states[index]
                if curves[code[w], 0] < a:
                    a = curves[code[w], 0]
                    m = narrow(work, m, line, a)
                if m == 0:
                    break
                if touched_only or height[s] <= lid[w]:
                    _one_state(
                        table[w, :, group[s]], work, m, most_apart, line, f32(lid[w]),
                        _curve(curves[code[w]]), strength[:, s], touched_only,
                    )  # fmt: skip


@parallel_compiled
def fill_table(
    table: Float32Array, points: FloatArray, size: int, first_block: int, last_block: int,
    first_segment: int, last_segment: int, ends: FloatArray, piece: FloatArray,
    near: FloatArray, far: FloatArray, states: IntArray, turns: IntArray,
    wind_from: FloatArray, code: IntArray, lid: FloatArray, curves: Float32Array,
    strength: Float32Array, group: IntArray, height: FloatArray, sigma_z0: FloatArray,
    sigma_y0: FloatArray, across_only: bool, touched_only: bool,
) -> None:  # fmt: skip
    """Add some segments to some blocks of ``table`` (W, K, G, R), in parallel.

    Block b holds the receptors from ``b size`` on, in the order of ``points``. ``states``
    lists the states by direction, within one the widest plume first; ``turns`` says where
    a direction begins. With ``across_only`` a segment's sigma_y0 is what the wind sees of
    it: its component across the wind. With ``touched_only`` the change that the lid makes
    is added, and every state is a direction by itself.

    A receptor's sum always runs over the segments in their order, so the bytes depend
    neither on the number of threads nor on how the work is parted into calls.
    """
    for number in prange(first_block, last_block):
        first, last = number * size, min(number * size + size, len(points))
        _fill_block(
            table, points, first, last, first_segment, last_segment, ends, piece, near, far,
            states, turns, wind_from, code, lid, curves, strength, group, height, sigma_z0,
            sigma_y0, across_only, touched_only,
        )  # fmt: skip
