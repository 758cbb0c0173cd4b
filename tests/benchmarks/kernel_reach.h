/* Which part of each segment reaches each receptor: the first stages of kernel.c. */
#include "kernel_parts.h"

static int block_misses(const double circle[3], const double *ends, double down_x, double down_y,
                        double sy0, double a)
{
    double d0 = (circle[0] - ends[0]) * down_x + (circle[1] - ends[1]) * down_y + circle[2];
    double d1 = (circle[0] - ends[2]) * down_x + (circle[1] - ends[3]) * down_y + circle[2];
    if (d0 <= 0.0 && d1 <= 0.0)
        return 1;
    double c0 = (circle[1] - ends[1]) * down_x - (circle[0] - ends[0]) * down_y;
    double c1 = (circle[1] - ends[3]) * down_x - (circle[0] - ends[2]) * down_y;
    double reach0 = PRUNE * (sy0 + a * fmax(d0, 0.0)) + circle[2];
    double reach1 = PRUNE * (sy0 + a * fmax(d1, 0.0)) + circle[2];
    return (c0 > reach0 && c1 > reach1) || (c0 < -reach0 && c1 < -reach1);
}

/* Centre and radius of a block of receptors, and their lowest and highest. */
static void around(const double *x, const double *y, const float *z, int n, double circle[3],
                   float *low_z, float *high_z)
{
    double low_x = x[0], high_x = x[0], low_y = y[0], high_y = y[0];
    *low_z = *high_z = z[0];
    for (int j = 1; j < n; j++) {
        low_x = fmin(low_x, x[j]);
        high_x = fmax(high_x, x[j]);
        low_y = fmin(low_y, y[j]);
        high_y = fmax(high_y, y[j]);
        *low_z = least(*low_z, z[j]);
        *high_z = most(*high_z, z[j]);
    }
    circle[0] = 0.5 * (low_x + high_x);
    circle[1] = 0.5 * (low_y + high_y);
    circle[2] = 0.0;
    for (int j = 0; j < n; j++)
        circle[2] = fmax(circle[2], hypot(x[j] - circle[0], y[j] - circle[1]));
}

static void gather(scratch_t *s, const double *x, const double *y, const float *z, int n,
                   const double *ends, double length)
{
    double ax = (ends[2] - ends[0]) / length, ay = (ends[3] - ends[1]) / length;
#pragma omp simd
    for (int j = 0; j < n; j++) {
        double px = x[j] - ends[0], py = y[j] - ends[1];
        double foot = px * ax + py * ay;
        foot = foot < 0.0 ? 0.0 : foot;
        foot = foot > length ? length : foot;
        s->gap_x[j] = (float)(px - foot * ax);
        s->gap_y[j] = (float)(py - foot * ay);
        s->start[j] = (float)-foot;
        s->end[j] = (float)(length - foot);
        s->z[j] = z[j];
    }
}

/* Whether the line is not wholly on one side of the cone |c| = 6.3 (sy0 + a d). */
static inline int in_plume(float d, float c, float lo, float hi, float d_rate, float c_rate,
                           float sy0, float a)
{
    float d_lo = most(d + lo * d_rate, 0.0f), d_hi = d + hi * d_rate;
    float c_lo = c + lo * c_rate, c_hi = c + hi * c_rate;
    float reach_lo = PRUNE * (sy0 + a * d_lo), reach_hi = PRUNE * (sy0 + a * d_hi);
    int left = (c_lo > reach_lo) & (c_hi > reach_hi);
    int right = (c_lo < -reach_lo) & (c_hi < -reach_hi);
    return !(left | right);
}

/* For one wind direction: cut what is upwind, keep what the widest plume may reach. */
static int aim(scratch_t *s, int n, float down_x, float down_y, float flip, float a,
               const case_t *v)
{
    float d_rate = v->d_rate, c_rate = v->c_rate, sy0 = v->sy0;
    float per_rate = 1.0f / most(d_rate, TINY);
#pragma omp simd
    for (int j = 0; j < n; j++) {
        float d = s->gap_x[j] * down_x + s->gap_y[j] * down_y;
        float c = s->gap_y[j] * down_x - s->gap_x[j] * down_y;
        float lo = flip > 0.0f ? s->start[j] : -s->end[j];
        float hi = flip > 0.0f ? s->end[j] : -s->start[j];
        lo = most(lo, -d * per_rate);
        s->flag[j] = in_plume(d, c, lo, hi, d_rate, c_rate, sy0, a) & (lo < hi)
                     & (d + hi * d_rate > 0.0f);
        s->down[j] = d;
        s->cross[j] = c;
        s->first[j] = lo;
        s->last[j] = hi;
    }
    int m = 0;
    for (int j = 0; j < n; j++) {
        s->live[m] = j;
        m += s->flag[j];
    }
#pragma omp simd
    for (int k = 0; k < m; k++) {
        int j = s->live[k];
        s->l_down[k] = s->down[j];
        s->l_cross[k] = s->cross[j];
        s->l_first[k] = s->first[j];
        s->l_last[k] = s->last[j];
        s->l_z[k] = s->z[j];
    }
    return m;
}

/* Of the pairs that live in a wider plume, keep those that a narrower one may reach. */
static int narrow(scratch_t *s, int n, float a, const case_t *v)
{
    float d_rate = v->d_rate, c_rate = v->c_rate, sy0 = v->sy0;
#pragma omp simd
    for (int j = 0; j < n; j++)
        s->flag[j] = in_plume(s->l_down[j], s->l_cross[j], s->l_first[j], s->l_last[j], d_rate,
                              c_rate, sy0, a);
    int m = 0;
    for (int j = 0; j < n; j++) {
        s->l_down[m] = s->l_down[j];
        s->l_cross[m] = s->l_cross[j];
        s->l_first[m] = s->l_first[j];
        s->l_last[m] = s->l_last[j];
        s->l_z[m] = s->l_z[j];
        s->live[m] = s->live[j];
        m += s->flag[j];
    }
    return m;
}

/* Keep the stretch inside |c| = T sqrt(sy0^2 + a^2 d^2). */
static void cut(scratch_t *s, int n, const case_t *v)
{
    float d_rate = v->d_rate, c_rate = v->c_rate, sz0 = v->sz0, h = v->h;
    curve_t curve = v->curve;
    float a2 = curve.a * curve.a, sy02 = v->sy0 * v->sy0, per_sz02 = 1.0f / (sz0 * sz0);
#pragma omp simd
    for (int j = 0; j < n; j++) {
        float d = s->l_down[j], c = s->l_cross[j], lo = s->l_first[j], hi = s->l_last[j];
        float apart = s->l_z[j] - h;
        float d_lo = d + lo * d_rate, d_hi = d + hi * d_rate;
        float c_lo = c + lo * c_rate, c_hi = c + hi * c_rate;
        float t_lo = c_lo * c_lo / (sy02 + a2 * d_lo * d_lo + TINY);
        float t_hi = c_hi * c_hi / (sy02 + a2 * d_hi * d_hi + TINY);
        int crosses = c_lo * c_hi <= 0.0f;
        float change = c_lo - c_hi;
        change = change != 0.0f ? change : 1.0f;
        float nearest = crosses ? 0.0f : least(t_lo, t_hi);
        float middle = crosses ? lo + (hi - lo) * c_lo / change : (t_lo < t_hi ? lo : hi);
        float wide = nearest + 19.0f + apart * apart * per_sz02;
        wide = least(wide, most(nearest + 8.0f, 48.0f));

        float c_mid = crosses ? 0.0f : c + middle * c_rate, d_mid = d + middle * d_rate;
        float two = c_rate * c_rate - wide * a2 * d_rate * d_rate;
        float one = c_mid * c_rate - wide * a2 * d_mid * d_rate;
        float none = c_mid * c_mid - wide * (sy02 + a2 * d_mid * d_mid);
        float offset = c * d_rate - d * c_rate;
        float inside = wide * (a2 * offset * offset + sy02 * two);
        float root = sqrtf(most(inside, 0.0f));
        float summed = one >= 0.0f ? -(one + root) : root - one;
        summed = summed != 0.0f ? summed : TINY;
        float divisor = two != 0.0f ? two : TINY;
        float far = middle + summed / divisor, near = middle + none / summed;
        float open_lo = (near <= middle) & (far < lo) ? near : lo;
        float open_hi = (near > middle) & (far > hi) ? near : hi;
        float cut_lo = two > 0.0f ? least(near, far) : open_lo;
        float cut_hi = two > 0.0f ? most(near, far) : open_hi;
        cut_lo = (inside > 0.0f) & (cut_lo > lo) ? cut_lo : lo;
        cut_hi = (inside > 0.0f) & (cut_hi < hi) ? cut_hi : hi;
        s->in_first[j] = cut_lo;
        s->in_last[j] = cut_hi;
        s->middle[j] = middle;
        s->nearest[j] = nearest;
    }
}

/* Leave out what lies so near that height alone makes it vanish; nothing where
 * (z - h)^2 < 40 sz0^2, so that most blocks are spared it. */
static void lift(scratch_t *s, int n, const case_t *v)
{
    float d_rate = v->d_rate, c_rate = v->c_rate, sz0 = v->sz0;
    curve_t curve = v->curve;
    float a2 = curve.a * curve.a, sy02 = v->sy0 * v->sy0, per_az2 = 1.0f / curve.az2;
    float steepness = most(d_rate, TINY);
#pragma omp simd
    for (int j = 0; j < n; j++) {
        float d = s->l_down[j], c = s->l_cross[j], apart = s->l_z[j] - v->h;
        float lo = s->in_first[j], hi = s->in_last[j];
        float d_mid = d + s->middle[j] * d_rate;
        float d_end = d + hi * d_rate, c_end = c + hi * c_rate;
        float sz_mid = sigma_z_squared(d_mid, sz0, curve);
        float sz_end = sigma_z_squared(d_end, sz0, curve);
        float t_last = c_end * c_end / (sy02 + a2 * d_end * d_end + TINY);
        float best = least(apart * apart / sz_mid, apart * apart / sz_end + t_last - s->nearest[j]);
        float lifted = most(apart * apart / (best + 40.0f) - sz0 * sz0, 0.0f);
        float d_lift = sqrtf(lifted * per_az2);
        d_lift = d_lift / sqrtf(1.0f + curve.g * d_lift);
        float lift_lo = (d_lift - d) / steepness;
        int too_low = (lifted > 0.0f) & (lift_lo > lo) & (lift_lo < hi);
        s->in_first[j] = too_low ? lift_lo : lo;
    }
}

/* How many lines span too many scales of distance. */
static int spans(scratch_t *s, int n, const case_t *v)
{
    float d_rate = v->d_rate, c_rate = v->c_rate, per_a = 1.0f / v->curve.a, h = v->h;
    float rise = v->sz0 / sqrtf(v->curve.az2), sy02 = v->sy0 * v->sy0, sz0 = v->sz0;
    int count = 0;
#pragma omp simd reduction(+ : count)
    for (int j = 0; j < n; j++) {
        float lo = s->in_first[j], hi = s->in_last[j], d = s->l_down[j], c = s->l_cross[j];
        float span = fabsf(s->l_z[j] - h) > 1.5f * sz0 ? 6.0f : 30.0f;
        float d_lo = most(d + lo * d_rate, 0.0f), d_hi = d + hi * d_rate;
        float c_lo = c + lo * c_rate, c_hi = c + hi * c_rate;
        float c_least = c_lo * c_hi <= 0.0f ? 0.0f : least(fabsf(c_lo), fabsf(c_hi));
        float delta = most(least(sqrtf(sy02 + c_least * c_least) * per_a, rise), 1e-9f);
        count += d_hi + delta > span * (d_lo + delta);
    }
    return count;
}

/* Part a line that spans too many scales of distance. */
static int split(scratch_t *s, int n, const case_t *v)
{
    float d_rate = v->d_rate, c_rate = v->c_rate, a = v->curve.a;
    float rise = v->sz0 / sqrtf(v->curve.az2);
    for (int j = 0; j < n && n < ROOM;) {
        float lo = s->in_first[j], hi = s->in_last[j], d = s->l_down[j], c = s->l_cross[j];
        float span = fabsf(s->l_z[j] - v->h) > 1.5f * v->sz0 ? 6.0f : 30.0f;
        float d_lo = most(d + lo * d_rate, 0.0f), d_hi = d + hi * d_rate;
        if (d_hi > span * d_lo) {
            float c_lo = c + lo * c_rate, c_hi = c + hi * c_rate;
            float c_least = c_lo * c_hi <= 0.0f ? 0.0f : least(fabsf(c_lo), fabsf(c_hi));
            float delta = least(sqrtf(v->sy0 * v->sy0 + c_least * c_least) / a, rise);
            delta = most(delta, 1e-9f);
            if (d_hi + delta > span * (d_lo + delta)) {
                float d_cut = sqrtf((d_lo + delta) * (d_hi + delta)) - delta;
                float at = lo + (d_cut - d_lo) / d_rate;
                if (lo < at && at < hi) {
                    s->l_down[n] = d;
                    s->l_cross[n] = c;
                    s->in_first[n] = at;
                    s->in_last[n] = hi;
                    s->l_z[n] = s->l_z[j];
                    s->live[n] = s->live[j];
                    s->in_last[j] = at;
                    n++;
                    continue;
                }
            }
        }
        j++;
    }
    return n;
}
