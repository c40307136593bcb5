/* SPDX-License-Identifier: GPL-3.0-or-later */
/* TIFF 6.0 through libtiff: one page, grey, 8 or 16 bits, in strips or tiles. */
#include "image_internal.h"

#include <stdarg.h>
#include <stdio.h>
#include <string.h>

#include <tiffio.h>

enum { MOST_BYTES_AT_ONCE = 1 << 28 };

typedef struct loader {
    sv_context *context;
    sv_image_source *source;
    sv_table_fault *fault;
    TIFF *file;
    uint32_t width, height;
    int bytes; /* per sample */
    bool inverted;
    char message[120];
} loader;

static tmsize_t on_read(thandle_t user, void *to, tmsize_t size)
{
    sv_image_source *s = ((loader *)user)->source;
    const size_t left = s->at < s->size ? s->size - s->at : 0;
    const size_t n = (size_t)size < left ? (size_t)size : left;
    memcpy(to, s->data + (left > 0 ? s->at : 0), n);
    s->at += n;
    return (tmsize_t)n;
}

static tmsize_t on_write(thandle_t user, void *from, tmsize_t size)
{
    (void)user, (void)from, (void)size;
    return 0;
}

static toff_t on_seek(thandle_t user, toff_t offset, int whence)
{
    sv_image_source *s = ((loader *)user)->source;
    s->at = whence == SEEK_SET ? offset : whence == SEEK_CUR ? s->at + offset : s->size + offset;
    return s->at;
}

static int on_close(thandle_t user)
{
    (void)user;
    return 0;
}

static toff_t on_size(thandle_t user)
{
    return ((loader *)user)->source->size;
}

/* The first message says most; the later ones follow from it. */
static int SV_PRINTF(4, 0)
    on_error(TIFF *file, void *user, const char *module, const char *format, va_list args)
{
    loader *l = user;
    (void)file, (void)module;
    if (l->message[0] == '\0')
        vsnprintf(l->message, sizeof l->message, format, args);
    return 1;
}

static int SV_PRINTF(4, 0)
    on_warning(TIFF *file, void *user, const char *module, const char *format, va_list args)
{
    (void)file, (void)user, (void)module, (void)format, (void)args;
    return 1;
}

static sv_status damaged(loader *l)
{
    const size_t at = l->source->at < l->source->size ? l->source->at : l->source->size;
    return sv_image_fail(l->context, l->fault, (long long)at,
                         "the file is damaged or cut off; export it anew", "TIFF: %s",
                         l->message[0] ? l->message : "it cannot be read");
}

static bool open_file(loader *l)
{
    TIFFOpenOptions *options = TIFFOpenOptionsAlloc();
    if (options == NULL)
        return false;
    TIFFOpenOptionsSetErrorHandlerExtR(options, on_error, l);
    TIFFOpenOptionsSetWarningHandlerExtR(options, on_warning, l);
    TIFFOpenOptionsSetMaxSingleMemAlloc(options, MOST_BYTES_AT_ONCE);
    /* m: no mapping of memory; the bytes are there already */
    l->file = TIFFClientOpenExt("image", "rm", l, on_read, on_write, on_seek, on_close, on_size,
                                NULL, NULL, options);
    TIFFOpenOptionsFree(options);
    return l->file != NULL;
}

static sv_status refuse(loader *l, const char *what, long long value)
{
    return sv_image_fail(
        l->context, l->fault, -1,
        "save it as grey-scale with 8 or 16 bits, without compression or with LZW, "
        "Deflate or PackBits",
        "TIFF: %s (%lld)", what, value);
}

/* The kinds of TIFF that hold measured greys; everything else is refused by name. */
static sv_status check_kind(loader *l)
{
    uint16_t bits = 1, samples = 1, format = SAMPLEFORMAT_UINT, photometric = 0;
    uint16_t compression = COMPRESSION_NONE, planes = 1;
    TIFFGetFieldDefaulted(l->file, TIFFTAG_BITSPERSAMPLE, &bits);
    TIFFGetFieldDefaulted(l->file, TIFFTAG_SAMPLESPERPIXEL, &samples);
    TIFFGetFieldDefaulted(l->file, TIFFTAG_SAMPLEFORMAT, &format);
    TIFFGetFieldDefaulted(l->file, TIFFTAG_COMPRESSION, &compression);
    TIFFGetFieldDefaulted(l->file, TIFFTAG_PLANARCONFIG, &planes);
    if (!TIFFGetField(l->file, TIFFTAG_PHOTOMETRIC, &photometric))
        return refuse(l, "it does not say how grey values are meant", 0);
    if (photometric != PHOTOMETRIC_MINISBLACK && photometric != PHOTOMETRIC_MINISWHITE)
        return refuse(l, "it is no grey-scale image: photometric interpretation", photometric);
    if (samples != 1)
        return refuse(l, "it has several samples per pixel", samples);
    if (bits != 8 && bits != 16)
        return refuse(l, "bits per sample", bits);
    if (format != SAMPLEFORMAT_UINT && format != SAMPLEFORMAT_VOID)
        return refuse(l, "samples are no unsigned integers: format", format);
    if (compression != COMPRESSION_NONE && compression != COMPRESSION_LZW &&
        compression != COMPRESSION_ADOBE_DEFLATE && compression != COMPRESSION_DEFLATE &&
        compression != COMPRESSION_PACKBITS)
        return refuse(l, "compression", compression);
    l->bytes = bits / 8;
    l->inverted = photometric == PHOTOMETRIC_MINISWHITE;
    return SV_OK;
}

/* `row` counts downwards as in the file; ours upwards. */
static void put_row(const loader *l, const void *from, uint32_t row, uint32_t x0, uint32_t count,
                    sv_grey *grey)
{
    float *to = grey->value + (sv_index)(l->height - 1 - row) * l->width + x0;
    for (uint32_t x = 0; x < count; x++) {
        const float v = l->bytes == 1 ? (float)((const uint8_t *)from)[x] / 255.0F
                                      : (float)((const uint16_t *)from)[x] / 65535.0F;
        to[x] = l->inverted ? 1.0F - v : v;
    }
}

static sv_status read_rows(loader *l, sv_grey *grey)
{
    void *buffer = NULL;
    const tmsize_t size = TIFFScanlineSize(l->file);
    if (size < (tmsize_t)l->width * l->bytes || size > MOST_BYTES_AT_ONCE)
        return damaged(l);
    sv_status status = sv_take(l->context, size, 1, &buffer);
    for (uint32_t row = 0; row < l->height && status == SV_OK; row++) {
        if (TIFFReadScanline(l->file, buffer, row, 0) < 0)
            status = damaged(l);
        else
            put_row(l, buffer, row, 0, l->width, grey);
    }
    sv_give(l->context, buffer);
    return status;
}

static void put_tile(const loader *l, const char *buffer, const uint32_t corner[2],
                     const uint32_t tile[2], sv_grey *grey)
{
    const uint32_t left = l->width - corner[0];
    const uint32_t count = left < tile[0] ? left : tile[0];
    for (uint32_t y = 0; y < tile[1] && corner[1] + y < l->height; y++)
        put_row(l, buffer + (size_t)y * tile[0] * (size_t)l->bytes, corner[1] + y, corner[0], count,
                grey);
}

static sv_status read_tiles(loader *l, sv_grey *grey)
{
    uint32_t tile[2] = {0, 0};
    void *buffer = NULL;
    TIFFGetField(l->file, TIFFTAG_TILEWIDTH, &tile[0]);
    TIFFGetField(l->file, TIFFTAG_TILELENGTH, &tile[1]);
    const tmsize_t size = TIFFTileSize(l->file);
    if (tile[0] == 0 || tile[1] == 0 || size > MOST_BYTES_AT_ONCE ||
        (double)size < (double)tile[0] * tile[1] * l->bytes)
        return damaged(l);
    sv_status status = sv_take(l->context, size, 1, &buffer);
    for (uint32_t y = 0; y < l->height && status == SV_OK; y += tile[1])
        for (uint32_t x = 0; x < l->width && status == SV_OK; x += tile[0]) {
            const uint32_t corner[2] = {x, y};
            if (TIFFReadTile(l->file, buffer, x, y, 0, 0) < 0)
                status = damaged(l);
            else
                put_tile(l, buffer, corner, tile, grey);
        }
    sv_give(l->context, buffer);
    return status;
}

static sv_status read_page(loader *l, sv_grey *grey)
{
    sv_status status;
    if (!open_file(l) || !TIFFGetField(l->file, TIFFTAG_IMAGEWIDTH, &l->width) ||
        !TIFFGetField(l->file, TIFFTAG_IMAGELENGTH, &l->height))
        return damaged(l);
    if ((status = sv_image_check_size(l->context, l->fault, l->width, l->height)) != SV_OK ||
        (status = check_kind(l)) != SV_OK)
        return status;
    if (!TIFFLastDirectory(l->file))
        return sv_image_fail(l->context, l->fault, -1,
                             "save the page you mean as a file of its own",
                             "TIFF: the file has several pages");
    grey->width = (int)l->width;
    grey->height = (int)l->height;
    status = sv_take(l->context, (sv_index)l->width * l->height, sizeof *grey->value, &grey->value);
    if (status != SV_OK)
        return status;
    return TIFFIsTiled(l->file) ? read_tiles(l, grey) : read_rows(l, grey);
}

sv_status sv_image_read_tiff(sv_context *context, sv_image_source *source, sv_grey *ret_grey,
                             sv_table_fault *ret_fault)
{
    loader l = {.context = context, .source = source, .fault = ret_fault};
    sv_grey grey = {0};
    sv_status status = read_page(&l, &grey);
    if (l.file != NULL)
        TIFFClose(l.file);
    if (status == SV_OK)
        *ret_grey = grey;
    else
        sv_grey_free(context, &grey);
    return status;
}
