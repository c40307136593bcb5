/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Complex products of all copies of the kernel beside sums written down naively. */
#include "selvedge/base.h"
#include "selvedge/linalg.h"
#include "testing.h"

#include <float.h>
#include <math.h>
#include <string.h>

/* How a matrix lies in memory. */
typedef enum layout { APART, APART_TURNED, MIXED, MIXED_TURNED, LAYOUTS } layout;

typedef struct product_case {
    sv_index rows, columns, terms;
    layout a, b, c;
    int sign_a, sign_b;
    bool turned, deep, fresh, lower;
    double weight;
} product_case;

/* Values and strides of a matrix: re, im, row, column. */
typedef struct matrix {
    double *values; /* 2·rows·columns + a number that must not change */
    sv_index count, im, row, column;
} matrix;

static matrix matrix_make(sv_index rows, sv_index columns, layout l, uint64_t seed)
{
    sv_index count = rows * columns;
    sv_index one = l == MIXED || l == MIXED_TURNED ? 2 : 1;
    bool turned = l == APART_TURNED || l == MIXED_TURNED;
    matrix m = {NULL, 2 * count, one == 2 ? 1 : count, turned ? one * columns : one,
                turned ? one : one * rows};
    sv_stream stream = sv_stream_make(seed, "product test", 0);
    CHECK_OK(sv_take(test_context(), 2 * count + 1, sizeof *m.values, &m.values));
    for (sv_index e = 0; e <= 2 * count; e++) /* exact in single precision as well */
        m.values[e] = (double)(float)(sv_stream_uniform(&stream, (int32_t)e, 0, 0) - 0.5);
    return m;
}

/* Zeros where the terms of an index are over: as `depth` promises. */
static void cut(matrix *m, bool rows, sv_index indices, sv_index terms, const sv_index *depth)
{
    for (sv_index r = 0; r < indices; r++)
        for (sv_index k = depth[r]; k < terms; k++) {
            sv_index at = rows ? r * m->row + k * m->column : k * m->row + r * m->column;
            m->values[at] = m->values[at + m->im] = 0.0;
        }
}

typedef struct product_data {
    product_case is;
    matrix a, b, c;
    double *turn; /* terms real parts, terms imaginary parts */
    sv_index *depth;
} product_data;

static product_data data_make(product_case is)
{
    product_data d = {.is = is};
    d.a = matrix_make(is.rows, is.terms, is.a, 1);
    d.b = matrix_make(is.terms, is.columns, is.b, 2);
    d.c = matrix_make(is.rows, is.columns, is.c, 3);
    sv_index most = is.rows > is.columns ? is.rows : is.columns;
    CHECK_OK(sv_take(test_context(), 2 * is.terms, sizeof *d.turn, &d.turn));
    CHECK_OK(sv_take(test_context(), most, sizeof *d.depth, &d.depth));
    for (sv_index k = 0; k < is.terms; k++) {
        d.turn[k] = (double)(float)cos((double)k);
        d.turn[is.terms + k] = (double)(float)sin((double)k);
    }
    for (sv_index r = 0; r < most; r++)
        d.depth[r] = is.terms * (most - r) / most;
    if (is.deep) {
        cut(&d.a, true, is.rows, is.terms, d.depth);
        cut(&d.b, false, is.columns, is.terms, d.depth);
    }
    return d;
}

static void data_free(product_data *d)
{
    sv_give(test_context(), d->a.values);
    sv_give(test_context(), d->b.values);
    sv_give(test_context(), d->c.values);
    sv_give(test_context(), d->turn);
    sv_give(test_context(), d->depth);
}

static sv_complex element(const matrix *m, sv_index r, sv_index c, int sign)
{
    const double *at = m->values + r * m->row + c * m->column;
    return CMPLX(at[0], sign * at[m->im]);
}

/* The result in double precision, or in single converted to double. */
static void run_double(sv_panel_kernel kernel, const product_data *d, double *out)
{
    const product_case *is = &d->is;
    sv_product_job job = {
        .rows = is->rows,
        .columns = is->columns,
        .terms = is->terms,
        .a = {d->a.values, d->a.values + d->a.im, d->a.row, d->a.column, is->sign_a},
        .b = {d->b.values, d->b.values + d->b.im, d->b.row, d->b.column, is->sign_b},
        .turn_re = is->turned ? d->turn : NULL,
        .turn_im = is->turned ? d->turn + is->terms : NULL,
        .depth = is->deep ? d->depth : NULL,
        .fresh = is->fresh,
        .lower = is->lower,
        .weight = is->weight,
        .c_re = out,
        .c_im = out + d->c.im,
        .c_row = d->c.row,
        .c_column = d->c.column};
    memcpy(out, d->c.values, (size_t)(d->c.count + 1) * sizeof *out);
    CHECK_OK(sv_product(test_context(), kernel, &job));
}

static float *to_single(const double *x, sv_index count)
{
    float *y = NULL;
    CHECK_OK(sv_take(test_context(), count, sizeof *y, &y));
    for (sv_index e = 0; e < count; e++)
        y[e] = (float)x[e];
    return y;
}

static void run_single(sv_panel_kernel kernel, const product_data *d, double *out)
{
    const product_case *is = &d->is;
    float *a = to_single(d->a.values, d->a.count), *b = to_single(d->b.values, d->b.count);
    float *c = to_single(d->c.values, d->c.count + 1), *turn = to_single(d->turn, 2 * is->terms);
    sv_product_single_job job = {.rows = is->rows,
                                 .columns = is->columns,
                                 .terms = is->terms,
                                 .a = {a, a + d->a.im, d->a.row, d->a.column, (float)is->sign_a},
                                 .b = {b, b + d->b.im, d->b.row, d->b.column, (float)is->sign_b},
                                 .turn_re = is->turned ? turn : NULL,
                                 .turn_im = is->turned ? turn + is->terms : NULL,
                                 .depth = is->deep ? d->depth : NULL,
                                 .fresh = is->fresh,
                                 .lower = is->lower,
                                 .weight = (float)is->weight,
                                 .c_re = c,
                                 .c_im = c + d->c.im,
                                 .c_row = d->c.row,
                                 .c_column = d->c.column};
    CHECK_OK(sv_product_single(test_context(), kernel, &job));
    for (sv_index e = 0; e <= d->c.count; e++)
        out[e] = (double)c[e];
    sv_give(test_context(), a);
    sv_give(test_context(), b);
    sv_give(test_context(), c);
    sv_give(test_context(), turn);
}

/* What the result should be, and how large the errors of its elements may be in roundings. */
typedef struct reference {
    sv_complex *value;
    double *scale; /* |c| + |weight| Σ|a||b|, sizes the sums of those of the parts */
} reference;

static double size_of(sv_complex x)
{
    return fabs(creal(x)) + fabs(cimag(x));
}

static reference reference_make(const product_data *d)
{
    const product_case *is = &d->is;
    reference ref;
    CHECK_OK(sv_take(test_context(), is->rows * is->columns, sizeof *ref.value, &ref.value));
    CHECK_OK(sv_take(test_context(), is->rows * is->columns, sizeof *ref.scale, &ref.scale));
    for (sv_index c = 0; c < is->columns; c++)
        for (sv_index r = 0; r < is->rows; r++) {
            long double re = 0.0L, im = 0.0L;
            double size = 0.0;
            for (sv_index k = 0; k < is->terms; k++) {
                sv_complex x = element(&d->a, r, k, is->sign_a);
                sv_complex y = element(&d->b, k, c, is->sign_b);
                if (is->turned)
                    y *= CMPLX(d->turn[k], d->turn[is->terms + k]);
                re += (long double)creal(x) * creal(y) - (long double)cimag(x) * cimag(y);
                im += (long double)creal(x) * cimag(y) + (long double)cimag(x) * creal(y);
                size += size_of(x) * size_of(y);
            }
            sv_complex before = is->fresh ? 0.0 : element(&d->c, r, c, 1);
            ref.value[r + c * is->rows] = CMPLX((double)(creal(before) + is->weight * re),
                                                (double)(cimag(before) + is->weight * im));
            ref.scale[r + c * is->rows] = size_of(before) + fabs(is->weight) * size;
        }
    return ref;
}

/* Largest error of an element that is wanted, in roundings of its scale. */
static double worst_error(const product_data *d, const reference *ref, const double *out,
                          double roundoff)
{
    const product_case *is = &d->is;
    double worst = 0.0;
    for (sv_index c = 0; c < is->columns; c++)
        for (sv_index r = is->lower ? c : 0; r < is->rows; r++) {
            const double *at = out + r * d->c.row + c * d->c.column;
            double error = size_of(CMPLX(at[0], at[d->c.im]) - ref->value[r + c * is->rows]);
            double scale = roundoff * ref->scale[r + c * is->rows];
            if (!(error <= worst * scale))
                worst = scale > 0.0 ? error / scale : (double)INFINITY;
        }
    /* The number after the matrix is whole. */
    CHECK(out[d->c.count] == d->c.values[d->c.count]);
    return worst;
}

static double check_case(product_case is)
{
    product_data d = data_make(is);
    reference ref = reference_make(&d);
    double *out = NULL, worst = 0.0;
    CHECK_OK(sv_take(test_context(), d.c.count + 1, sizeof *out, &out));
    for (sv_panel_kernel kernel = SV_PANEL_PLAIN; kernel <= sv_panel_best_kernel(); kernel++) {
        run_double(kernel, &d, out);
        worst = fmax(worst, worst_error(&d, &ref, out, DBL_EPSILON));
        run_single(kernel, &d, out);
        worst = fmax(worst, worst_error(&d, &ref, out, (double)FLT_EPSILON));
    }
    sv_give(test_context(), out);
    sv_give(test_context(), ref.value);
    sv_give(test_context(), ref.scale);
    data_free(&d);
    return worst;
}

SV_TEST(products_of_all_shapes_and_layouts)
{
    /* One, below, at and above the tiles (32, 16 × 12, 6, 4) and blocks (192, 96 rows, 960, 480
     * columns, 256 terms) of the kernels. */
    const sv_index shapes[][3] = {{1, 1, 1},    {3, 2, 5},     {16, 12, 16},  {17, 13, 33},
                                  {32, 24, 64}, {97, 31, 257}, {193, 50, 40}, {40, 965, 7}};
    double worst = 0.0;
    for (size_t s = 0; s < sizeof shapes / sizeof *shapes; s++)
        for (int k = 0; k < 2 * LAYOUTS; k++)
            worst = fmax(worst, check_case((product_case){.rows = shapes[s][0],
                                                          .columns = shapes[s][1],
                                                          .terms = shapes[s][2],
                                                          .a = (layout)(k % LAYOUTS),
                                                          .b = (layout)((k + s) % LAYOUTS),
                                                          .c = (layout)((k + 2 * s + 1) % LAYOUTS),
                                                          .sign_a = k % 2 ? -1 : 1,
                                                          .sign_b = k % 3 ? -1 : 1,
                                                          .turned = k % 4 == 3,
                                                          .fresh = k % 2 == 0,
                                                          .weight = k % 5 ? 1.0 : -0.75}));
    printf("# largest error %.2f roundings\n", worst);
    CHECK(worst < 4.0);
}

SV_TEST(products_that_end_early_and_halves_of_products)
{
    const sv_index shapes[][3] = {{45, 45, 300}, {210, 200, 270}, {200, 230, 20}, {490, 485, 3}};
    double worst = 0.0;
    for (size_t s = 0; s < sizeof shapes / sizeof *shapes; s++)
        for (int k = 0; k < 4; k++)
            worst = fmax(worst, check_case((product_case){.rows = shapes[s][0],
                                                          .columns = shapes[s][1],
                                                          .terms = shapes[s][2],
                                                          .a = k % 2 ? APART : MIXED_TURNED,
                                                          .b = k / 2 ? APART_TURNED : MIXED,
                                                          .c = k % 2 ? MIXED : APART,
                                                          .sign_a = -1,
                                                          .sign_b = 1,
                                                          .turned = k == 1,
                                                          .deep = k != 3,
                                                          .lower = k >= 2,
                                                          .fresh = k % 2 == 0,
                                                          .weight = -1.0}));
    printf("# largest error %.2f roundings\n", worst);
    CHECK(worst < 4.0);
}
