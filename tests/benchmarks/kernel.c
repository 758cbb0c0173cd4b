/* The scheme of roaddisp's fast line integral, written by hand in C: a yardstick.
 *
 * Same stages, same clipping, mapping, rule for the number of nodes and blocks as
 * roaddisp/dispersion; float32. What differs is the language: static arrays, and a
 * compiler that may reorder sums (-ffast-math). A pair is one receptor and one
 * segment; a block is BLOCK neighbouring receptors.
 *
 * Curves, per class: a, b of sigma_y^2 = a^2 d^2 / (1 + b d), then e1, e2, az^2, g of
 * sigma_z^2 = az^2 d^2 (1 + g d) / (1 + e1 d + e2 d^2).
 *
 * No lid is a large number (1e30), since -ffast-math knows no infinity.
 */
#include "kernel_nodes.h"
#include "kernel_reach.h"

/* The pairs that live in one state, from cut to sum; the number of lines they became. */
static int one_state(scratch_t *s, int m, float most_apart, const case_t *v, const float *nodes,
                     const float *weights, int64_t *evaluated)
{
    int under_lid = v->lid < NO_LID;
    cut(s, m, v);
    if (most_apart * most_apart > 36.0f * v->sz0 * v->sz0)
        lift(s, m, v);
    if (spans(s, m, v) > 0)
        m = split(s, m, v);
    stretch(s, m, v);
    if (under_lid)
        mark_lid(s, m, v);
    sort_by_nodes(s, m, under_lid ? 9 : 8);
    memset(s->sum, 0, (size_t)m * sizeof(float));
    for (int k = 0; k < KINDS; k++) {
        const float *xi = nodes + k * MOST_NODES, *weight = weights + k * MOST_NODES;
        const int32_t *free_of = s->begin + k, *under = s->begin + KINDS + k;
        if (free_of[1] > free_of[0])
            sum_free(s, free_of[0], free_of[1], RULES[k], xi, weight, v);
        if (under[1] > under[0])
            sum_under_lid(s, under[0], under[1], RULES[k], xi, weight, v);
        *evaluated += (int64_t)RULES[k] * (free_of[1] - free_of[0] + under[1] - under[0]);
    }
    return m;
}

/* table (W, G, R), zeroed, takes the sum of each group's segments at 1 m/s. Receptors x, y, z
 * and the table's columns stand along a space-filling curve, so that a block adds to a row in
 * one place; segments come sorted by group, so that few rows are at work; states by direction,
 * in each the widest plume first, with turns (one more than there are directions) saying where
 * a direction begins. counted takes the number of live pairs and of nodes. Returns 0, or 1
 * where there is no memory. */
int fill_table(float *table, const double *x, const double *y, const float *z, int receptors,
               const double *ends, int segments, const float *strength, const int32_t *group,
               int groups, const float *height, const float *sigma_z0, const float *sigma_y0,
               const double *wind_from, const int32_t *code, const float *lid,
               const int32_t *turns, int directions, const float *curves, const float *nodes,
               const float *weights, int threads, int64_t *counted)
{
    int blocks = (receptors + BLOCK - 1) / BLOCK, failed = 0;
    int64_t pairs = 0, evaluated = 0;
#pragma omp parallel num_threads(threads) reduction(+ : pairs, evaluated) reduction(| : failed)
    {
        scratch_t *s = aligned_alloc(64, (sizeof *s + 63) / 64 * 64);
        failed = s == NULL;
#pragma omp for schedule(dynamic, 1)
        for (int b = 0; b < blocks; b++) {
            if (s == NULL)
                continue;
            int first = b * BLOCK, n = receptors - first < BLOCK ? receptors - first : BLOCK;
            double circle[3];
            float low_z, high_z;
            around(x + first, y + first, z + first, n, circle, &low_z, &high_z);
            for (int i = 0; i < segments; i++) {
                const double *end = ends + 4 * i;
                double length = hypot(end[2] - end[0], end[3] - end[1]);
                if (length == 0.0)
                    continue;
                gather(s, x + first, y + first, z + first, n, end, length);
                double ax = (end[2] - end[0]) / length, ay = (end[3] - end[1]) / length;
                float most_apart = most(fabsf(low_z - height[i]), fabsf(high_z - height[i]));
                for (int turn = 0; turn < directions; turn++) {
                    int w = turns[turn];
                    double down_x = -sin(wind_from[w]), down_y = -cos(wind_from[w]);
                    float widest = ((const curve_t *)curves)[code[w]].a;
                    if (block_misses(circle, end, down_x, down_y, sigma_y0[i], widest))
                        continue;
                    double d_rate = -(ax * down_x + ay * down_y);
                    double c_rate = -(ay * down_x - ax * down_y), flip = d_rate < 0.0 ? -1.0 : 1.0;
                    case_t v = {(float)(flip * d_rate), (float)(flip * c_rate), sigma_y0[i],
                                sigma_z0[i], height[i], 0.0f, ((const curve_t *)curves)[code[w]]};
                    int m = aim(s, n, (float)down_x, (float)down_y, (float)flip, widest, &v);
                    for (; w < turns[turn + 1] && m > 0; w++) {
                        v.curve = ((const curve_t *)curves)[code[w]];
                        v.lid = lid[w];
                        if (v.curve.a < widest) {
                            widest = v.curve.a;
                            m = narrow(s, m, widest, &v);
                        }
                        if (m == 0 || height[i] > lid[w])
                            continue;
                        pairs += m;
                        int count = one_state(s, m, most_apart, &v, nodes, weights, &evaluated);
                        float share = strength[i] * 0.15915494f;
                        float *row = table + ((size_t)w * groups + group[i]) * receptors + first;
                        for (int j = 0; j < count; j++)
                            row[s->live[j]] += share * s->sum[s->place[j]];
                    }
                }
            }
        }
        free(s);
    }
    counted[0] = pairs;
    counted[1] = evaluated;
    return failed;
}
