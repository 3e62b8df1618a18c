/* The measurement of orbits in hand-vectorised C, to compare the package's speed and results with.

   The same job as the two baselines in Python, by the method of lanes: LANES orbits at a time, each chord from the
   cross product over its trivial root, g(h) = Re sum_j B_j v^(2 j - 1), by steps of fourth order from the chord of the
   first-harmonic ellipse.  Sums over the harmonics stay in registers.  Compile for the machine it runs on. */

#include <math.h>
#include <stdlib.h>
#include <string.h>

#ifdef __AVX512F__
#define WIDTH 8
#else
#define WIDTH 4
#endif
#define GROUP 2
#define LANES (WIDTH * GROUP)
#define BUFFER 16
#define MOST_HARMONICS 512
#define MOST_CORRECTIONS 6
#define EACH for (int g = 0; g < GROUP; g++)

typedef double vec __attribute__((vector_size(8 * WIDTH)));
typedef long long mask __attribute__((vector_size(8 * WIDTH)));

static inline vec select_vec(mask which, vec yes, vec no) { return (vec)((which & (mask)yes) | (~which & (mask)no)); }
static inline vec abs_vec(vec x) { return (vec)((mask)x & 0x7fffffffffffffffLL); }
static inline vec with_sign(vec x, vec sign) { return (vec)(((mask)x & 0x7fffffffffffffffLL) | ((mask)sign & (1LL << 63))); }
static inline vec sqrt_vec(vec x)
{
    double values[WIDTH] __attribute__((aligned(64)));
    memcpy(values, &x, sizeof x);
    for (int i = 0; i < WIDTH; i++) values[i] = __builtin_sqrt(values[i]);
    memcpy(&x, values, sizeof x);
    return x;
}
static inline int any(mask which)
{
    long long found = 0;
    for (int i = 0; i < WIDTH; i++) found |= which[i];
    return found != 0;
}

/* Angle of (x, y) in turns for y > 0: a Chebyshev fit of the arctangent below tan(1/16 turn). */
static inline vec upper_angle(vec y, vec x)
{
    vec along = abs_vec(x);
    mask steep = y > along;
    vec low = select_vec(steep, along, y), high = select_vec(steep, y, along);
    mask wide = low > 0.41421356237309503 * high;
    vec slope = select_vec(wide, low - high, low) / select_vec(wide, low + high, high);
    vec square = slope * slope;
    vec tail = -0.008093077387038777 + square * (0.006241985651407801 + square * -0.0030497379878334507);
    tail = 0.012242488736289614 + square * (-0.010606884708709996 + square * (0.009323405996267038 + square * tail));
    tail = 0.017683882412101896 + square * (-0.014468623962907377 + square * tail);
    tail = -0.05305164769729844 + square * (0.03183098861837187 + square * (-0.022736420440018033 + square * tail));
    vec angle = slope * 0.15915494309189535 + slope * square * tail;
    vec eighth = (vec){0} + 0.125, offset = select_vec(wide, eighth, (vec){0});
    angle = select_vec(steep, -angle, angle);
    offset = select_vec(steep, 0.25 - offset, offset);
    return select_vec(x < 0.0, 0.5 - offset, offset) + select_vec(x < 0.0, -angle, angle);
}

typedef struct { vec x[GROUP], y[GROUP]; } pairs;

/* What is known of LANES orbits at their last bounce. */
typedef struct {
    const double *xc, *xs, *yc, *ys;
    int highest;
    pairs power[MOST_HARMONICS + 1], quotient[MOST_HARMONICS + 2];
    pairs point, tangent, ray, half;
    vec p[GROUP], c[GROUP], curvature[GROUP];
} block;

typedef struct { vec advance[GROUP], p[GROUP], chord[GROUP], ss[GROUP], sp[GROUP], ps[GROUP], pp[GROUP]; } bounce;

static inline void boundary(block *b, pairs *w, pairs *w1, pairs *w2)
{
    pairs z = b->power[1], at = z;
    EACH {
        w2->x[g] = -(b->xc[1] * z.x[g] + b->xs[1] * z.y[g]);
        w2->y[g] = -(b->yc[1] * z.x[g] + b->ys[1] * z.y[g]);
        w1->x[g] = b->xs[1] * z.x[g] - b->xc[1] * z.y[g];
        w1->y[g] = b->ys[1] * z.x[g] - b->yc[1] * z.y[g];
        w->x[g] = b->xc[0] - w2->x[g];
        w->y[g] = b->yc[0] - w2->y[g];
    }
    for (int k = 2; k <= b->highest; k++) {
        double xc = b->xc[k], xs = b->xs[k], yc = b->yc[k], ys = b->ys[k], order = k, square = order * order;
        EACH {
            vec re = at.x[g] * z.x[g] - at.y[g] * z.y[g], im = at.x[g] * z.y[g] + at.y[g] * z.x[g];
            b->power[k].x[g] = at.x[g] = re;
            b->power[k].y[g] = at.y[g] = im;
            vec x = xc * re + xs * im, y = yc * re + ys * im;
            w->x[g] += x;
            w->y[g] += y;
            w1->x[g] += order * (xs * re - xc * im);
            w1->y[g] += order * (ys * re - yc * im);
            w2->x[g] -= square * x;
            w2->y[g] -= square * y;
        }
    }
}

static inline void start(block *b, const double *turns, const double *p)
{
    for (int j = 0; j < LANES; j++) {
        b->power[1].x[j / WIDTH][j % WIDTH] = cos(2.0 * M_PI * turns[j]);
        b->power[1].y[j / WIDTH][j % WIDTH] = sin(2.0 * M_PI * turns[j]);
        b->p[j / WIDTH][j % WIDTH] = p[j];
    }
    pairs w1, w2;
    boundary(b, &b->point, &w1, &w2);
    EACH {
        vec over = 1.0 / sqrt_vec(w1.x[g] * w1.x[g] + w1.y[g] * w1.y[g]);
        b->c[g] = sqrt_vec((1.0 - b->p[g]) * (1.0 + b->p[g]));
        b->tangent.x[g] = w1.x[g] * over;
        b->tangent.y[g] = w1.y[g] * over;
        b->curvature[g] = (w1.x[g] * w2.y[g] - w1.y[g] * w2.x[g]) * over * over * over;
    }
}

static inline void guess(block *b)
{
    double xc = b->xc[1], xs = b->xs[1], yc = b->yc[1], ys = b->ys[1];
    EACH {
        vec re = b->power[1].x[g], im = b->power[1].y[g], p = b->p[g], c = b->c[g];
        vec tx = xs * re - xc * im, ty = ys * re - yc * im;
        vec rx = tx * p - ty * c, ry = tx * c + ty * p;
        vec even = rx * yc - ry * xc, odd = rx * ys - ry * xs;
        vec along = even * re + odd * im, across = odd * re - even * im;
        vec scale = with_sign(1.0 / sqrt_vec(along * along + across * across), across);
        b->half.x[g] = along * scale;
        b->half.y[g] = across * scale;
    }
}

static inline void divide_out_start(block *b)
{
    pairs sum = {0};
    for (int k = b->highest; k > 0; k--)
        EACH {
            vec even = b->ray.x[g] * b->yc[k] - b->ray.y[g] * b->xc[k];
            vec odd = b->ray.x[g] * b->ys[k] - b->ray.y[g] * b->xs[k];
            sum.x[g] += odd * b->power[k].x[g] - even * b->power[k].y[g];
            sum.y[g] += even * b->power[k].x[g] + odd * b->power[k].y[g];
            b->quotient[k].x[g] = sum.x[g];
            b->quotient[k].y[g] = sum.y[g];
        }
}

/* One step of fourth order for the lanes that still move; returns whether any does. */
static inline int correct(block *b, mask settled[GROUP])
{
    pairs at = b->half, u;
    vec g0[GROUP], g1[GROUP], g2[GROUP], g3[GROUP];
    EACH {
        vec re = b->quotient[1].x[g] * at.x[g] - b->quotient[1].y[g] * at.y[g];
        vec im = b->quotient[1].x[g] * at.y[g] + b->quotient[1].y[g] * at.x[g];
        g0[g] = re, g1[g] = -im, g2[g] = -re, g3[g] = im;
        u.x[g] = at.x[g] * at.x[g] - at.y[g] * at.y[g];
        u.y[g] = 2.0 * at.x[g] * at.y[g];
    }
    for (int k = 2; k <= b->highest; k++) {
        double order = 2 * k - 1, square = order * order, cube = square * order;
        EACH {
            vec vr = at.x[g] * u.x[g] - at.y[g] * u.y[g], vi = at.x[g] * u.y[g] + at.y[g] * u.x[g];
            at.x[g] = vr;
            at.y[g] = vi;
            vec re = b->quotient[k].x[g] * vr - b->quotient[k].y[g] * vi;
            vec im = b->quotient[k].x[g] * vi + b->quotient[k].y[g] * vr;
            g0[g] += re;
            g1[g] -= order * im;
            g2[g] -= square * re;
            g3[g] += cube * im;
        }
    }
    int moving = 0;
    EACH {
        vec top = -g0[g] * (6.0 * g1[g] * g1[g] - 3.0 * g0[g] * g2[g]);
        vec step = top / (6.0 * g1[g] * (g1[g] * g1[g] - g0[g] * g2[g]) + g0[g] * g0[g] * g3[g]);
        step = select_vec(settled[g], (vec){0}, step);
        settled[g] = abs_vec(step) < 5e-6 * b->half.y[g] + 1e-14;
        moving |= any(~settled[g]);
        vec half = 0.5 * step, tangent = half * (1.0 + half * half * (1.0 / 3.0));
        vec scale = 1.0 / (1.0 + tangent * tangent);
        vec cr = (1.0 - tangent * tangent) * scale, ci = 2.0 * tangent * scale, vr = b->half.x[g], vi = b->half.y[g];
        b->half.x[g] = vr * cr - vi * ci;
        b->half.y[g] = vr * ci + vi * cr;
    }
    return moving;
}

/* Halve the bracket 0 < h < pi of one lane until it is rounding. */
static void bisect(block *b, int group, int lane)
{
    double low = 0.0, high = M_PI, h = 0.0;
    for (int step = 0; step < 60; step++) {
        double value = 0.0;
        h = 0.5 * (low + high);
        for (int k = 1; k <= b->highest; k++)
            value += b->quotient[k].x[group][lane] * cos((2 * k - 1) * h) - b->quotient[k].y[group][lane] * sin((2 * k - 1) * h);
        if (value < 0.0) low = h; else high = h;
    }
    b->half.x[group][lane] = cos(h);
    b->half.y[group][lane] = sin(h);
}

static inline void find_chord(block *b)
{
    guess(b);
    if (b->highest == 1) return;
    divide_out_start(b);
    mask settled[GROUP] = {{0}};
    int moving = 1;
    for (int count = 0; moving && count < MOST_CORRECTIONS; count++) moving = correct(b, settled);
    if (moving)
        for (int j = 0; j < LANES; j++)
            if (!settled[j / WIDTH][j % WIDTH]) bisect(b, j / WIDTH, j % WIDTH);
}

static inline void bounce_once(block *b, bounce *seen)
{
    EACH {
        b->ray.x[g] = b->tangent.x[g] * b->p[g] - b->tangent.y[g] * b->c[g];
        b->ray.y[g] = b->tangent.x[g] * b->c[g] + b->tangent.y[g] * b->p[g];
    }
    find_chord(b);
    EACH {
        vec vr = b->half.x[g], vi = b->half.y[g], unit = 1.5 - 0.5 * (vr * vr + vi * vi);
        vr *= unit;
        vi *= unit;
        seen->advance[g] = 2.0 * upper_angle(vi, vr);
        vec ur = vr * vr - vi * vi, ui = 2.0 * vr * vi, zr = b->power[1].x[g], zi = b->power[1].y[g];
        vec re = zr * ur - zi * ui, im = zr * ui + zi * ur;
        unit = 1.5 - 0.5 * (re * re + im * im);
        b->power[1].x[g] = re * unit;
        b->power[1].y[g] = im * unit;
    }
    pairs w, w1, w2;
    boundary(b, &w, &w1, &w2);
    EACH {
        vec over = 1.0 / sqrt_vec(w1.x[g] * w1.x[g] + w1.y[g] * w1.y[g]);
        vec tx = w1.x[g] * over, ty = w1.y[g] * over, rx = b->ray.x[g], ry = b->ray.y[g];
        vec k1 = (w1.x[g] * w2.y[g] - w1.y[g] * w2.x[g]) * over * over * over, k0 = b->curvature[g], c0 = b->c[g];
        vec length = (w.x[g] - b->point.x[g]) * rx + (w.y[g] - b->point.y[g]) * ry;
        vec p = tx * rx + ty * ry, c1 = ty * rx - tx * ry, unit = 1.5 - 0.5 * (p * p + c1 * c1);
        p *= unit;
        c1 *= unit;
        vec both = 1.0 / (c0 * c1);
        seen->p[g] = p;
        seen->chord[g] = length;
        /* Berry, Eur. J. Phys. 2:91, 1981. */
        seen->ss[g] = (k0 * length - c0) * (c0 * both);
        seen->sp[g] = -length * both;
        seen->ps[g] = k0 * c1 + k1 * c0 - k0 * k1 * length;
        seen->pp[g] = (k1 * length - c1) * (c1 * both);
        b->p[g] = p;
        b->c[g] = c1;
        b->tangent.x[g] = tx;
        b->tangent.y[g] = ty;
        b->curvature[g] = k1;
    }
    b->point = w;
}

/* Arrays as ``lay_out_windows`` gives them; averages [windows][3][orbits], growth [marks][orbits], path [orbits].
   ``orbits`` is a multiple of what ``lanes`` returns. */
long lanes(void) { return LANES; }

int measure(const double *harmonics, long highest, long orbits, const double *turns, const double *p, long windows,
            const long *spans, const double *weights, long longest, long count_marks, const long *marks,
            double *averages, double *growth, double *path)
{
    block *b = aligned_alloc(64, sizeof *b);
    vec(*sums)[3][GROUP] = aligned_alloc(64, windows * sizeof *sums);
    if (!b || !sums || highest > MOST_HARMONICS) return 1;
    *b = (block){.xc = harmonics, .xs = harmonics + highest + 1, .yc = harmonics + 2 * (highest + 1),
                 .ys = harmonics + 3 * (highest + 1), .highest = (int)highest};
    for (long orbit = 0; orbit < orbits; orbit += LANES) {
        bounce seen[BUFFER];
        vec s[GROUP], q[GROUP], travelled[GROUP], grown[GROUP];
        EACH s[g] = q[g] = (vec){0} + 0.5, travelled[g] = grown[g] = (vec){0};
        memset(sums, 0, windows * sizeof *sums);
        start(b, turns + orbit, p + orbit);
        long first = 0;
        for (long mark = 0; mark < count_marks; mark++) {
            while (first < marks[mark]) {
                long count = marks[mark] - first < BUFFER ? marks[mark] - first : BUFFER;
                for (long i = 0; i < count; i++) {
                    bounce_once(b, &seen[i]);
                    EACH {
                        vec next = seen[i].ss[g] * s[g] + seen[i].sp[g] * q[g];
                        q[g] = seen[i].ps[g] * s[g] + seen[i].pp[g] * q[g];
                        s[g] = next;
                        travelled[g] += seen[i].chord[g];
                    }
                }
                for (long w = 0; w < windows; w++) {
                    const double *weight = weights + spans[3 * w + 2] * longest - spans[3 * w];
                    long low = spans[3 * w] > first ? spans[3 * w] : first, end = spans[3 * w] + spans[3 * w + 1];
                    long high = end < first + count ? end : first + count;
                    for (long i = low; i < high; i++)
                        EACH {
                            sums[w][0][g] += weight[i] * seen[i - first].advance[g];
                            sums[w][1][g] += weight[i] * seen[i - first].p[g];
                            sums[w][2][g] += weight[i] * seen[i - first].chord[g];
                        }
                }
                EACH {
                    vec size = abs_vec(s[g]) + abs_vec(q[g]);
                    for (int i = 0; i < WIDTH; i++) grown[g][i] += log(size[i]);
                    s[g] /= size;
                    q[g] /= size;
                }
                first += count;
            }
            memcpy(growth + mark * orbits + orbit, grown, sizeof grown);
        }
        memcpy(path + orbit, travelled, sizeof travelled);
        for (long w = 0; w < windows; w++)
            for (int kind = 0; kind < 3; kind++)
                memcpy(averages + (w * 3 + kind) * orbits + orbit, sums[w][kind], sizeof sums[w][kind]);
    }
    free(sums);
    free(b);
    return 0;
}
