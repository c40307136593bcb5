/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Complex products by three real ones, compiled once per precision and instruction set (see
 * meson.build): PRODUCT is the name of this copy, PRODUCT_BYTES the size of a register. Fused
 * multiply–adds are allowed.
 *
 * Parts of the factors are packed in three copies, real, imaginary and their sum, in the order in
 * which the inner loop reads them; the three real sums of a tile meet in registers, so that the
 * result passes through memory once per TERMS terms. Every sum is taken in the order of its terms,
 * in chunks that depend on the shape alone. */
#include "../product_kernel.h"

enum { LANES = PRODUCT_BYTES / sizeof(real), TILE = 2 * LANES };
/* Columns computed together: two sums each, as many as the registers hold. */
enum { TOGETHER = PRODUCT_BYTES == 64 ? 12 : PRODUCT_BYTES == 32 ? 6 : 4 };
enum { TERMS = SV_PRODUCT_TERMS, ROWS = SV_PRODUCT_ROWS, COLUMNS = SV_PRODUCT_COLUMNS };
_Static_assert(ROWS % TILE == 0 && COLUMNS % TOGETHER == 0, "blocks of whole tiles");

typedef real lane __attribute__((vector_size(PRODUCT_BYTES), aligned(PRODUCT_BYTES)));

/* ------------------------------------------------------------------ packing */

typedef struct source {
    const real *re, *im;
    sv_index along, across; /* strides: within a group (rows of a, columns of b), between terms */
    real sign;              /* of the imaginary part */
    const real *turn_re, *turn_im; /* one phase per term, or NULL */
} source;

/* A group of `width` (at most `group`) rows or columns: for each term `group` numbers, zeros after
 * the width; all real parts first, then all imaginary ones, then the sums. `along` is given apart
 * so that the compiler may know it. */
static inline __attribute__((always_inline)) void pack_group(const source *s, sv_index along,
                                                             sv_index group, sv_index width,
                                                             sv_index terms, real *to)
{
    real *re = to, *im = to + group * terms, *sum = im + group * terms;
    for (sv_index k = 0; k < terms; k++) {
        const real *from_re = s->re + k * s->across, *from_im = s->im + k * s->across;
        for (sv_index g = 0; g < width; g++) {
            re[k * group + g] = from_re[g * along];
            im[k * group + g] = s->sign * from_im[g * along];
        }
        for (sv_index g = width; g < group; g++)
            re[k * group + g] = im[k * group + g] = 0;
    }
    if (s->turn_re != NULL)
        for (sv_index k = 0; k < terms; k++)
            for (sv_index g = 0; g < group; g++) {
                real x = re[k * group + g], y = im[k * group + g];
                re[k * group + g] = s->turn_re[k] * x - s->turn_im[k] * y;
                im[k * group + g] = s->turn_re[k] * y + s->turn_im[k] * x;
            }
    for (sv_index e = 0; e < group * terms; e++)
        sum[e] = re[e] + im[e];
}

/* The same where terms, not members of a group, lie side by side. */
static void pack_across(const source *s, sv_index group, sv_index width, sv_index terms, real *to)
{
    enum { CHUNK = 16 };
    for (sv_index k = 0; k < terms; k += CHUNK) {
        sv_index count = terms - k < CHUNK ? terms - k : CHUNK;
        for (sv_index g = 0; g < width; g++) {
            const real *from_re = s->re + g * s->along + k * s->across;
            const real *from_im = s->im + g * s->along + k * s->across;
            for (sv_index j = 0; j < count; j++) {
                to[(k + j) * group + g] = from_re[j * s->across];
                to[(terms + k + j) * group + g] = from_im[j * s->across];
            }
        }
    }
    source packed = {to, to + group * terms, 1, group, s->sign, s->turn_re, s->turn_im};
    pack_group(&packed, 1, group, width, terms, to);
}

static void pack(const source *s, sv_index group, sv_index count, sv_index terms, real *to)
{
    for (sv_index first = 0; first < count; first += group, to += 3 * group * terms) {
        sv_index width = count - first < group ? count - first : group;
        source part = *s;
        part.re += first * s->along;
        part.im += first * s->along;
        if (s->along == 1)
            pack_group(&part, 1, group, width, terms, to);
        else if (s->along == 2)
            pack_group(&part, 2, group, width, terms, to);
        else
            pack_across(&part, group, width, terms, to);
    }
}

/* ------------------------------------------------------------------ tiles */

/* The real sums of one tile, columns one after the other. */
static inline void sums(const real *a, const real *b, sv_index terms, lane (*ret)[2])
{
    lane low[TOGETHER] = {{0}}, high[TOGETHER] = {{0}};
    for (sv_index k = 0; k < terms; k++, a += TILE, b += TOGETHER) {
        lane a0 = ((const lane *)a)[0], a1 = ((const lane *)a)[1];
#pragma GCC unroll 12
        for (int c = 0; c < TOGETHER; c++) {
            low[c] += a0 * b[c];
            high[c] += a1 * b[c];
        }
    }
#pragma GCC unroll 12
    for (int c = 0; c < TOGETHER; c++) {
        ret[c][0] = low[c];
        ret[c][1] = high[c];
    }
}

static inline __attribute__((always_inline)) void put_column(const real *re, const real *im,
                                                             sv_index rows, sv_index along,
                                                             real weight, bool fresh, real *to_re,
                                                             real *to_im)
{
    if (fresh)
        for (sv_index r = 0; r < rows; r++) {
            to_re[r * along] = weight * re[r];
            to_im[r * along] = weight * im[r];
        }
    else
        for (sv_index r = 0; r < rows; r++) {
            to_re[r * along] += weight * re[r];
            to_im[r * along] += weight * im[r];
        }
}

/* One tile: three real sums become a complex one. `length`: terms packed, of which `terms` count.
 */
static void tile(const real *a, const real *b, sv_index length, sv_index terms, sv_index rows,
                 sv_index columns, const PRODUCT_JOB *job, bool fresh, real *re, real *im)
{
    lane first[TOGETHER][2], second[TOGETHER][2], third[TOGETHER][2];
    sums(a, b, terms, first);
    sums(a + TILE * length, b + TOGETHER * length, terms, second);
    sums(a + 2 * TILE * length, b + 2 * TOGETHER * length, terms, third);
    for (int c = 0; c < TOGETHER; c++)
        for (int h = 0; h < 2; h++) {
            third[c][h] -= first[c][h] + second[c][h];
            first[c][h] -= second[c][h];
        }
    for (sv_index c = 0; c < columns; c++, re += job->c_column, im += job->c_column) {
        const real *from_re = (const real *)first[c], *from_im = (const real *)third[c];
        if (job->c_row == 1)
            put_column(from_re, from_im, rows, 1, job->weight, fresh, re, im);
        else
            put_column(from_re, from_im, rows, job->c_row, job->weight, fresh, re, im);
    }
}

static sv_index least(sv_index a, sv_index b)
{
    return a < b ? a : b;
}

/* Terms of this chunk that the tile at (row, column) needs. */
static sv_index terms_of(const PRODUCT_JOB *job, sv_index row, sv_index column, sv_index from,
                         sv_index count)
{
    if (job->depth == NULL)
        return count;
    sv_index depth = job->depth[row > column ? row : column] - from;
    return depth < 0 ? 0 : least(depth, count);
}

/* All tiles of a block of rows and one of columns, `count` terms from `from` on. */
static void block(const PRODUCT_JOB *job, sv_index row, sv_index rows, sv_index column,
                  sv_index columns, sv_index from, sv_index count, const real *a, const real *b)
{
    for (sv_index c = 0; c < columns; c += TOGETHER)
        for (sv_index r = 0; r < rows; r += TILE) {
            sv_index height = least(rows - r, TILE), width = least(columns - c, TOGETHER);
            sv_index terms = terms_of(job, row + r, column + c, from, count);
            sv_index at = (row + r) * job->c_row + (column + c) * job->c_column;
            bool fresh = job->fresh && from == 0;
            if ((job->lower && row + r + height <= column + c) || (terms == 0 && !fresh))
                continue;
            tile(a + 3 * r * count, b + 3 * c * count, count, terms, height, width, job, fresh,
                 job->c_re + at, job->c_im + at);
        }
}

void PRODUCT(const PRODUCT_JOB *job, real *work)
{
    const PRODUCT_FACTOR *fa = &job->a, *fb = &job->b;
    real *packed_a = work, *packed_b = work + 3 * ROWS * TERMS;
    for (sv_index c = 0; c < job->columns; c += COLUMNS)
        for (sv_index k = 0; k < job->terms; k += TERMS) {
            sv_index columns = least(job->columns - c, COLUMNS),
                     terms = least(job->terms - k, TERMS);
            sv_index at_b = c * fb->column + k * fb->row;
            source b = {fb->re + at_b,
                        fb->im + at_b,
                        fb->column,
                        fb->row,
                        fb->sign,
                        job->turn_re == NULL ? NULL : job->turn_re + k,
                        job->turn_im == NULL ? NULL : job->turn_im + k};
            if (k > 0 && terms_of(job, 0, c, k, terms) == 0)
                continue;
            pack(&b, TOGETHER, columns, terms, packed_b);
            for (sv_index r = job->lower ? c / ROWS * ROWS : 0; r < job->rows; r += ROWS) {
                sv_index rows = least(job->rows - r, ROWS);
                sv_index at_a = r * fa->row + k * fa->column;
                source a = {fa->re + at_a, fa->im + at_a, fa->row, fa->column,
                            fa->sign,      NULL,          NULL};
                if (k > 0 && terms_of(job, r, c, k, terms) == 0)
                    continue;
                pack(&a, TILE, rows, terms, packed_a);
                block(job, r, rows, c, columns, k, terms, packed_a, packed_b);
            }
        }
}
