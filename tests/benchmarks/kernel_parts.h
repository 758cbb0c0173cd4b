/* What the stages of kernel.c share: constants, columns of a block, small functions. */
#ifndef KERNEL_PARTS_H
#define KERNEL_PARTS_H

#include <math.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#ifndef BLOCK
#define BLOCK 1024
#endif
#define ROOM (2 * BLOCK + 208) /* no power of two: columns would share cache lines */
#define KINDS 12
#define MOST_NODES 36
#define TINY 1e-24f
#define PRUNE 6.3f
#define NO_LID 1e29f
#define PER_LN2 1.44269504f

static const int RULES[KINDS] = {1, 2, 3, 4, 5, 6, 8, 10, 13, 17, 24, 36};

typedef struct { float a, b, e1, e2, az2, g; } curve_t;

typedef float column_t[ROOM] __attribute__((aligned(64)));

typedef struct {
    /* pairs of a block with one segment, relative to its point nearest the receptor */
    column_t gap_x, gap_y, start, end, z;
    /* ... in one wind direction */
    column_t down, cross, first, last;
    int32_t flag[ROOM], live[ROOM], kind[ROOM], place[ROOM], begin[2 * KINDS + 1];
    /* pairs that live; then the stretch inside the plume of one state */
    column_t l_down, l_cross, l_first, l_last, l_z, in_first, in_last, middle, nearest;
    /* what the sum needs, in order of arrival, then by number of nodes */
    column_t field[9], by_kind[9], sum, wave;
} scratch_t;

enum { D_LO, D_SPAN, C_LO, C_SPAN, MEASURE, FALL, APART, MIRROR, HEIGHT };

typedef struct {
    float d_rate, c_rate, sy0, sz0, h, lid;
    curve_t curve;
} case_t;

static inline float least(float p, float q) { return p < q ? p : q; }
static inline float most(float p, float q) { return p > q ? p : q; }

static inline float sigma_z_squared(float d, float sz0, curve_t v)
{
    return sz0 * sz0 + v.az2 * d * d * (1.0f + v.g * d) / (1.0f + d * (v.e1 + v.e2 * d));
}

/* 2^y for y <= 0: a whole power times a polynomial in the rest (3e-6). */
static inline float power_of_two(float y)
{
    y = most(y, -120.0f);
    float whole = rintf(y), f = y - whole;
    float p = 0.00966636851541977f;
    p = p * f + 0.05592197584225692f;
    p = p * f + 0.24022349038020616f;
    p = p * f + 0.6931210452034275f;
    p = p * f + 1.0f;
    union { float f; int32_t i; } two = {p};
    two.i += (int32_t)whole << 23;
    return two.f;
}

/* ln x for x >= 1, to 0.01: for the number of nodes only. */
static inline float logarithm(float x)
{
    union { float f; int32_t i; } bits = {x};
    float power = (float)((bits.i >> 23) - 127);
    float part = (float)(bits.i & 0x7FFFFF) * 1.1920929e-7f;
    return (power + part + 0.346f * part * (1.0f - part)) * 0.69314718f;
}

#endif
