/* SPDX-License-Identifier: GPL-3.0-or-later */
/* PNG (ISO/IEC 15948) through libpng. */
#include "image_internal.h"

#include <setjmp.h>
#include <string.h>

#include <png.h>

/* All that must survive a long jump lives here, not in registers. */
typedef struct loader {
    sv_context *context;
    sv_image_source *source;
    sv_table_fault *fault;
    png_structp png;
    png_infop info;
    unsigned char *pixels; /* all rows */
    size_t row_bytes;
    int width, height, channels, bytes; /* bytes per sample */
    char message[120];
} loader;

static void on_error(png_structp png, png_const_charp message)
{
    loader *l = png_get_error_ptr(png);
    snprintf(l->message, sizeof l->message, "%s", message);
    longjmp(png_jmpbuf(png), 1);
}

static void on_warning(png_structp png, png_const_charp message)
{
    (void)png;
    (void)message;
}

static void on_read(png_structp png, png_bytep to, size_t size)
{
    sv_image_source *s = ((loader *)png_get_io_ptr(png))->source;
    if (size > s->size - s->at) {
        s->at = s->size;
        png_error(png, "the file ends here");
    }
    memcpy(to, s->data + s->at, size);
    s->at += size;
}

static sv_status damaged(loader *l)
{
    return sv_image_fail(l->context, l->fault, (long long)l->source->at,
                         "the file is damaged or cut off; export it anew", "PNG: %s", l->message);
}

/* Header and the choice of a plain layout: whole bytes, palettes as colours, transparency as a
 * channel. */
static sv_status read_header(loader *l)
{
    if (setjmp(png_jmpbuf(l->png)))
        return damaged(l);
    png_read_info(l->png, l->info);
    sv_status status =
        sv_image_check_size(l->context, l->fault, (double)png_get_image_width(l->png, l->info),
                            (double)png_get_image_height(l->png, l->info));
    if (status != SV_OK)
        return status;
    png_set_expand(l->png);
    png_set_interlace_handling(l->png);
    png_read_update_info(l->png, l->info);
    l->width = (int)png_get_image_width(l->png, l->info);
    l->height = (int)png_get_image_height(l->png, l->info);
    l->channels = png_get_channels(l->png, l->info);
    l->bytes = png_get_bit_depth(l->png, l->info) / 8;
    l->row_bytes = png_get_rowbytes(l->png, l->info);
    return SV_OK;
}

static sv_status read_rows(loader *l)
{
    /* Passes of interlaced files fill the same rows one after the other. */
    const int passes = png_get_interlace_type(l->png, l->info) == PNG_INTERLACE_ADAM7 ? 7 : 1;
    if (setjmp(png_jmpbuf(l->png)))
        return damaged(l);
    for (int pass = 0; pass < passes; pass++)
        for (int y = 0; y < l->height; y++)
            png_read_row(l->png, l->pixels + (size_t)y * l->row_bytes, NULL);
    png_read_end(l->png, NULL);
    return SV_OK;
}

static unsigned sample_at(const loader *l, const unsigned char *pixel, int channel)
{
    const unsigned char *s = pixel + channel * l->bytes;
    return l->bytes == 1 ? s[0] : (unsigned)s[0] << 8 | s[1];
}

/* Colours must be greys, and nothing may shine through. */
static sv_status to_grey(loader *l, sv_grey *grey)
{
    const unsigned full = l->bytes == 1 ? 255 : 65535;
    const bool colour = l->channels >= 3, alpha = l->channels == 2 || l->channels == 4;
    for (int y = 0; y < l->height; y++)
        for (int x = 0; x < l->width; x++) {
            const unsigned char *pixel =
                l->pixels + (size_t)y * l->row_bytes + (size_t)(x * l->channels * l->bytes);
            const unsigned first = sample_at(l, pixel, 0);
            if (colour && (sample_at(l, pixel, 1) != first || sample_at(l, pixel, 2) != first))
                return sv_image_fail(l->context, l->fault, -1, "convert it to grey-scale",
                                     "the pixel in column %d, row %d has a colour", x + 1, y + 1);
            if (alpha && sample_at(l, pixel, l->channels - 1) != full)
                return sv_image_fail(l->context, l->fault, -1, "remove the transparency",
                                     "the pixel in column %d, row %d is transparent", x + 1, y + 1);
            /* Rows of a file run downwards, ours upwards. */
            grey->value[(sv_index)(l->height - 1 - y) * l->width + x] = (float)first / (float)full;
        }
    return SV_OK;
}

sv_status sv_image_read_png(sv_context *context, sv_image_source *source, sv_grey *ret_grey,
                            sv_table_fault *ret_fault)
{
    loader l = {.context = context, .source = source, .fault = ret_fault};
    sv_grey grey = {0};
    sv_status status = SV_NO_MEMORY;
    l.png = png_create_read_struct(PNG_LIBPNG_VER_STRING, &l, on_error, on_warning);
    l.info = l.png == NULL ? NULL : png_create_info_struct(l.png);
    if (l.info == NULL) {
        status = SV_FAIL(context, SV_NO_MEMORY, "no memory for a PNG image");
        goto out;
    }
    png_set_read_fn(l.png, &l, on_read);
    if ((status = read_header(&l)) != SV_OK ||
        (status = sv_take(context, l.height, l.row_bytes, &l.pixels)) != SV_OK ||
        (status = read_rows(&l)) != SV_OK)
        goto out;
    grey.width = l.width;
    grey.height = l.height;
    status = sv_take_raw(context, (sv_index)l.width * l.height, sizeof *grey.value, &grey.value);
    if (status == SV_OK)
        status = to_grey(&l, &grey);
    if (status == SV_OK) {
        *ret_grey = grey;
        grey = (sv_grey){0};
    }
out:
    png_destroy_read_struct(&l.png, &l.info, NULL);
    sv_give(context, l.pixels);
    sv_grey_free(context, &grey);
    return status;
}
