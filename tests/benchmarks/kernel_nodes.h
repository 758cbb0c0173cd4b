/* The sum along each segment: how many nodes, which, and their total (kernel.c). */
#include "kernel_parts.h"

#define ROOT_SCALE 0.849321800f /* sqrt(1 / (2 ln 2)): exponents are of 2 */

static inline float capped(float t) { return least(most(t, -40.0f), 40.0f); }

/* Nodes even in 1/(d + delta), and as many as the case asks for. */
static void stretch(scratch_t *s, int n, const case_t *v)
{
    float d_rate = v->d_rate, c_rate = v->c_rate, sz0 = v->sz0, h = v->h;
    curve_t curve = v->curve;
    float a2 = curve.a * curve.a, sy02 = v->sy0 * v->sy0, per_a = 1.0f / curve.a;
    float most_delta = 4.0f * sz0 / sqrtf(curve.az2);
#pragma omp simd
    for (int j = 0; j < n; j++) {
        float d = s->l_down[j], c = s->l_cross[j], z = s->l_z[j];
        float lo = s->in_first[j], hi = s->in_last[j];
        float apart = (z - h) * (z - h), length = most(hi - lo, 0.0f);
        float d_lo = most(d + lo * d_rate, 0.0f), d_hi = d_lo + length * d_rate;
        float c_lo = c + lo * c_rate, c_hi = c + hi * c_rate;
        float c_least = c_lo * c_hi <= 0.0f ? 0.0f : least(fabsf(c_lo), fabsf(c_hi));
        float delta = sqrtf(sy02 + c_least * c_least) * per_a;
        delta = most(least(delta, most_delta), 1e-9f);
        float keep = (d_lo + delta) / (d_hi + delta), half_way = keep / (1.0f + keep);
        float d_mid = d_lo + (d_hi - d_lo) * half_way, c_mid = c_lo + (c_hi - c_lo) * half_way;

        float t_lo = capped(c_lo / sqrtf(sy02 + a2 * d_lo * d_lo + TINY));
        float t_mid = capped(c_mid / sqrtf(sy02 + a2 * d_mid * d_mid + TINY));
        float t_hi = capped(c_hi / sqrtf(sy02 + a2 * d_hi * d_hi + TINY));
        float path = fabsf(t_mid - t_lo) + fabsf(t_hi - t_mid);
        float e_lo = 0.5f * t_lo * t_lo, e_mid = 0.5f * t_mid * t_mid, e_hi = 0.5f * t_hi * t_hi;
        float fall = most(most(e_lo, e_hi), e_mid) - least(least(e_lo, e_hi), e_mid);
        float sz_lo = sigma_z_squared(d_lo, sz0, curve), sz_hi = sigma_z_squared(d_hi, sz0, curve);
        float lift = sqrtf(apart) * fabsf(1.0f / sqrtf(sz_lo) - 1.0f / sqrtf(sz_hi));
        float w = logarithm(1.0f / keep);
        float need = 0.95f * path + 1.3f * w + 1.6f * sqrtf(w) + 0.85f * lift
                     + 0.35f * sqrtf(fall) + 0.2f * most(fall - 2.0f, 0.0f);

        s->field[D_LO][j] = d_lo;
        s->field[D_SPAN][j] = (d_hi - d_lo) * keep;
        s->field[C_LO][j] = ROOT_SCALE * c_lo;
        s->field[C_SPAN][j] = ROOT_SCALE * (c_hi - c_lo) * keep;
        s->field[MEASURE][j] = length * keep;
        s->field[FALL][j] = 1.0f - keep;
        s->field[APART][j] = 0.5f * PER_LN2 * apart;
        s->field[MIRROR][j] = 2.0f * PER_LN2 * z * h;
        s->field[HEIGHT][j] = z;
        float wanted = least(2.3f + need, 0.9f + 1.75f * need);
        s->kind[j] = (wanted > 1.0f) + (wanted > 2.0f) + (wanted > 3.0f) + (wanted > 4.0f)
                     + (wanted > 5.0f) + (wanted > 6.0f) + (wanted > 8.0f) + (wanted > 10.0f)
                     + (wanted > 13.0f) + (wanted > 17.0f) + (wanted > 24.0f);
    }
}

/* Pairs that feel the lid go to a rule for it, two steps finer; none above it gets anything. */
static void mark_lid(scratch_t *s, int n, const case_t *v)
{
    for (int j = 0; j < n; j++) {
        float d = s->field[D_LO][j] + s->field[D_SPAN][j] / (1.0f - s->field[FALL][j]);
        float gap = 2.0f * v->lid - s->l_z[j] - v->h;
        if (s->l_z[j] > v->lid)
            s->field[MEASURE][j] = 0.0f;
        else if (gap * gap < 4.5f * 4.5f * sigma_z_squared(d, v->sz0, v->curve))
            s->kind[j] = KINDS + (s->kind[j] + 2 < KINDS ? s->kind[j] + 2 : KINDS - 1);
    }
}

/* Bring pairs with the same number of nodes together; those that feel the lid come last. */
static void sort_by_nodes(scratch_t *s, int n, int fields)
{
    int next[2 * KINDS];
    memset(s->begin, 0, sizeof s->begin);
    for (int j = 0; j < n; j++)
        s->begin[s->kind[j] + 1]++;
    for (int k = 0; k < 2 * KINDS; k++) {
        s->begin[k + 1] += s->begin[k];
        next[k] = s->begin[k];
    }
    for (int j = 0; j < n; j++) {
        int p = next[s->kind[j]]++;
        s->place[j] = p;
        for (int f = 0; f < 8; f++)
            s->by_kind[f][p] = s->field[f][j];
        if (fields > 8)
            s->by_kind[8][p] = s->field[8][j];
    }
}

static void sum_free(scratch_t *s, int first, int last, int nodes, const float *xi,
                     const float *weight, const case_t *v)
{
    curve_t curve = v->curve;
    float sz02 = v->sz0 * v->sz0, sy02 = v->sy0 * v->sy0;
    float y0 = sy02 + TINY, y1 = sy02 * curve.b, y2 = curve.a * curve.a;
    float z1 = sz02 * curve.e1, z2 = sz02 * curve.e2 + curve.az2, z3 = curve.az2 * curve.g;
    for (int node = 0; node < nodes; node++) {
        float at = xi[node], share_of = weight[node];
#pragma omp simd
        for (int j = first; j < last; j++) {
            float grown = 1.0f / (1.0f - s->by_kind[FALL][j] * at), share = at * grown;
            float d = s->by_kind[D_LO][j] + s->by_kind[D_SPAN][j] * share;
            float c = s->by_kind[C_LO][j] + s->by_kind[C_SPAN][j] * share;
            float y_under = 1.0f + curve.b * d, y_over = y0 + d * (y1 + d * y2);
            float z_under = 1.0f + d * (curve.e1 + curve.e2 * d);
            float z_over = sz02 + d * (z1 + d * (z2 + d * z3));
            float per_both = 1.0f / (y_over * z_over);
            float per_y = y_under * z_over * per_both, per_z = z_under * y_over * per_both;
            float fall = c * c * per_y + s->by_kind[APART][j] * per_z;
            float mirror = power_of_two(-s->by_kind[MIRROR][j] * per_z);
            float plume = sqrtf(per_y * per_z) * power_of_two(-fall) * (1.0f + mirror);
            s->sum[j] += share_of * s->by_kind[MEASURE][j] * grown * grown * plume;
        }
    }
}

/* Plume, ground and lid near the source; per_z is 1 / (2 ln 2 sigma_z^2). */
static inline float images(float per_z, float z, float h, float lid)
{
    float apart = z - h, up = z + h, shift = 2.0f * lid;
    return power_of_two(-per_z * apart * apart) + power_of_two(-per_z * up * up)
         + power_of_two(-per_z * (apart - shift) * (apart - shift))
         + power_of_two(-per_z * (apart + shift) * (apart + shift))
         + power_of_two(-per_z * (up - shift) * (up - shift))
         + power_of_two(-per_z * (up + shift) * (up + shift))
         + power_of_two(-per_z * (up - 2.0f * shift) * (up - 2.0f * shift));
}

/* Images near the source, waves between ground and lid far from it. */
static void sum_under_lid(scratch_t *s, int first, int last, int nodes, const float *xi,
                          const float *weight, const case_t *v)
{
    curve_t curve = v->curve;
    float lid = v->lid, h = v->h, sz0 = v->sz0, a2 = curve.a * curve.a;
    float y0 = v->sy0 * v->sy0 + TINY, wave = 3.14159265f / lid;
    float source = cosf(wave * h), twice_source = 2.0f * source * source - 1.0f;
    float decay = -0.5f * PER_LN2 * wave * wave, spread = 2.50662827f / lid;
    for (int j = first; j < last; j++)
        s->wave[j] = cosf(wave * s->by_kind[HEIGHT][j]);
    for (int node = 0; node < nodes; node++) {
        float at = xi[node], share_of = weight[node];
#pragma omp simd
        for (int j = first; j < last; j++) {
            float grown = 1.0f / (1.0f - s->by_kind[FALL][j] * at), share = at * grown;
            float d = s->by_kind[D_LO][j] + s->by_kind[D_SPAN][j] * share;
            float c = s->by_kind[C_LO][j] + s->by_kind[C_SPAN][j] * share;
            float per_y = 1.0f / (y0 + a2 * d * d / (1.0f + curve.b * d));
            float variance = sigma_z_squared(d, sz0, curve), per_z = 1.0f / variance;
            float near = images(0.5f * PER_LN2 * per_z, s->by_kind[HEIGHT][j], h, lid);
            float cosine = s->wave[j];
            float once = power_of_two(decay * variance) * cosine * source;
            float twice = power_of_two(4.0f * decay * variance) * twice_source
                          * (2.0f * cosine * cosine - 1.0f);
            float far = 2.0f * spread * sqrtf(variance) * (0.5f + once + twice);
            float tall = variance < 0.25f * lid * lid ? near : far;
            float plume = sqrtf(per_y * per_z) * power_of_two(-c * c * per_y) * tall;
            s->sum[j] += share_of * s->by_kind[MEASURE][j] * grown * grown * plume;
        }
    }
}
