"""The scratch array of the fast path, the Gauss-Legendre rules, and its constants.

One scratch array holds everything about a block of receptors and one segment:
columns of `ROOM` numbers, ``COLUMN + j`` being pair j's place in a column. A stage
works on columns from 0 to n, so that the compiler can use vector instructions.
Every number is float32: a float64 constant would widen the arithmetic.
"""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np
import numpy.typing as npt

from roaddisp.model import Float32Array

f32 = np.float32

BLOCK: Final = 1024
"""Most receptors in a block: the scratch columns then stay in a near cache."""
LANES: Final = 8
"""Numbers in a vector register; loops run over whole registers, the last one part filled."""
ROOM: Final = 2 * BLOCK + 208
"""Length of a column: long lines are split, and each part takes a place. Not a power of
two, which would have all columns share a few lines of the cache."""

# Columns are unsigned, and so are indices into them: no vector loop can be made of an
# index that might count from the end.
u64 = np.uint64

# A block's pairs with one segment
GAP_X, GAP_Y, START, END, Z = (u64(ROOM * column) for column in range(5))
# ... in one wind direction: offsets at the nearest point, the stretch of line upwind
DOWN, CROSS, FIRST, LAST = (u64(ROOM * column) for column in range(5, 9))
# Pairs that live: the same, taken over
L_DOWN, L_CROSS, L_FIRST, L_LAST, L_Z = (u64(ROOM * column) for column in range(9, 14))
# ... in one state: the stretch inside the plume, its point of least c/sigma_y and that squared
IN_FIRST, IN_LAST, MIDDLE, LEAST = (u64(ROOM * column) for column in range(14, 18))
# What the sum needs, in order of arrival (C_), then by number of nodes
FIELDS: Final = 8
C_D_LO, C_D_SPAN, C_C_LO, C_C_SPAN, C_MEASURE, C_FALL, C_APART, C_MIRROR = (
    u64(ROOM * column) for column in range(18, 18 + FIELDS)
)
D_LO, D_SPAN, C_LO, C_SPAN, MEASURE, FALL, APART, MIRROR = (
    u64(ROOM * column) for column in range(18 + FIELDS, 18 + 2 * FIELDS)
)
SUM: Final = u64(ROOM * (18 + 2 * FIELDS))
# ... and under a lid: height, cos(pi z / lid); at a node, plume without its vertical part,
# vertical variance, vertical part
S_Z, WAVE, PLUME, VARIANCE, TALL = (
    u64(ROOM * column) for column in range(19 + 2 * FIELDS, 24 + 2 * FIELDS)
)
COLUMNS: Final = 24 + 2 * FIELDS

RULES: Final = (1, 2, 3, 4, 5, 6, 8, 10, 13, 17, 24, 36)
KINDS: Final = len(RULES)
MOST_NODES: Final = RULES[-1]


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
LEAST_DELTA: Final = f32(1e-9)
FARTHEST: Final = f32(40.0)
"""Cap of c/sigma_y in the count of nodes."""
PI: Final = f32(np.pi)
PER_CIRCLE: Final = f32(0.5 / np.pi)

# 2^y = 2^k 2^f, k the whole number nearest to y, which y + MAGIC has in its last bits
LOWEST_POWER: Final = f32(-120.0)
MAGIC: Final = f32(1.5 * 2.0**23)
P4, P3, P2, P1, P0 = (
    f32(0.00966636851541977),
    f32(0.05592197584225692),
    f32(0.24022349038020616),
    f32(0.6931210452034275),
    f32(0.9999999999999982),
)
"""2^f for |f| <= 1/2 to 3e-6, interpolated at Chebyshev's points."""
PER_LN2: Final = f32(1.4426950408889634)
HALF_PER_LN2: Final = f32(0.5 * 1.4426950408889634)
ROOT_HALF_PER_LN2: Final = f32(np.sqrt(0.5 * 1.4426950408889634))
BIAS: Final = np.int32(127)
MANTISSA: Final = np.int32(23)
FRACTION: Final = np.int32(0x7FFFFF)
ULP: Final = f32(2.0**-23)

# Nodes wanted, fitted to cases of every kind
BY_PATH, BY_STRETCH, BY_ROOT, BY_HEIGHT = f32(0.95), f32(1.3), f32(1.6), f32(0.85)
BY_FALL, BY_STEEP = f32(0.35), f32(0.2)
STEEP_FROM: Final = f32(2.0)
BASE, BASE_SHORT, SLOPE_SHORT = f32(2.3), f32(0.9), f32(1.75)

# Clip of the line at t = c/sigma_y
CUT: Final = f32(19.0)
CUT_MOST: Final = f32(48.0)
CUT_LEAST_MORE: Final = f32(8.0)
NOTHING: Final = f32(40.0)
"""Twice the exponent that makes a part of a line count for nothing (e^-20)."""
SPAN: Final = f32(30.0)
SPAN_LIFTED: Final = f32(6.0)
"""Most scales of distance, (d_hi + delta)/(d_lo + delta), that one rule serves."""
LIFTED: Final = f32(1.5)
"""|z - h|/sigma_z0 from which height shapes the integrand."""
RISES: Final = f32(4.0)
"""sigma_z0/a of sigma_z, times this: most that delta may be."""

CountArray = npt.NDArray[np.int32]
"""Flags, places in a block, rules: whole numbers as wide as float32."""


class Work(NamedTuple):
    """What one thread works in: a block's columns and lists of whole numbers."""

    scratch: Float32Array
    owner: CountArray
    """Place in the table of each pair's receptor."""
    live: CountArray
    """For each pair that lives, which of the block's pairs it is."""
    flag: CountArray
    kind: CountArray
    """Rule of each line; from `KINDS` on, under a lid."""
    place: CountArray
    """Where `sort` has put each line."""
    begin: CountArray
    """Where each kind begins."""


class Line(NamedTuple):
    """A segment in one wind direction: d' and c' along it, initial spreads, source height."""

    d_rate: f32
    c_rate: f32
    sy0: f32
    sz0: f32
    h: f32


Curve = tuple[f32, f32, f32, f32, f32, f32]
"""a and b of the crosswind curve, then e1, e2, a^2 and g of the vertical one:
sigma_y^2 = a^2 d^2 / (1 + b d); sigma_z^2 = a^2 d^2 (1 + g d) / (1 + e1 d + e2 d^2)."""
