/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The colours of the maps, by numbers: no picture needed. */
#include "selvedge/present.h"
#include "testing.h"

static double decode(double channel)
{
    const double c = channel / 255;
    return c <= 0.04045 ? c / 12.92 : pow((c + 0.055) / 1.055, 2.4);
}

static void linear_at(double position, double rgb[3])
{
    uint8_t bytes[3];
    sv_palette_colour(position, bytes);
    for (int i = 0; i < 3; i++)
        rgb[i] = decode(bytes[i]);
}

/* CIE lightness of linear sRGB (IEC 61966-2-1 luminance weights). */
static double lightness(const double rgb[3])
{
    const double y = 0.2126 * rgb[0] + 0.7152 * rgb[1] + 0.0722 * rgb[2];
    return y > 0.008856 ? 116 * cbrt(y) - 16 : 903.3 * y;
}

/* Machado, Oliveira, Fernandes, IEEE Trans. Vis. Comput. Graph. 15, 1291 (2009), severity 1;
   the values of the matrices are recalled from memory, their rows must sum to one. */
static const double vision[3][3][3] = {{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}},
                                       {{0.152286, 1.052583, -0.204868},
                                        {0.114503, 0.786281, 0.099216},
                                        {-0.003882, -0.048116, 1.051998}},
                                       {{0.367322, 0.860646, -0.227968},
                                        {0.280085, 0.672501, 0.047413},
                                        {-0.011820, 0.042940, 0.968881}}};

static double seen_lightness(double position, int eye)
{
    double rgb[3], seen[3] = {0};
    linear_at(position, rgb);
    for (int i = 0; i < 3; i++)
        for (int k = 0; k < 3; k++)
            seen[i] += vision[eye][i][k] * rgb[k];
    return lightness(seen);
}

SV_TEST(lightness_falls_on_both_sides_for_every_eye)
{
    for (int eye = 0; eye < 3; eye++) {
        for (int i = 0; i < 3; i++)
            CHECK_CLOSE(vision[eye][i][0] + vision[eye][i][1] + vision[eye][i][2], 1, 3e-6);
        for (int side = -1; side <= 1; side += 2)
            for (int k = 1; k <= 32; k++)
                CHECK(seen_lightness(side * k / 32.0, eye) <
                      seen_lightness(side * (k - 1) / 32.0, eye));
        CHECK(seen_lightness(1, eye) < 45 && seen_lightness(-1, eye) < 45);
    }
}

SV_TEST(the_centre_is_neutral_and_light)
{
    uint8_t rgb[3];
    sv_palette_colour(0, rgb);
    CHECK(rgb[0] > 235 && rgb[0] - rgb[1] < 4 && rgb[0] - rgb[2] < 4);
    CHECK(rgb[1] - rgb[0] < 4 && rgb[2] - rgb[0] < 4);
}

SV_TEST(the_sides_match_and_differ)
{
    for (int k = 1; k <= 16; k++) {
        double below[3], above[3];
        linear_at(-k / 16.0, below);
        linear_at(k / 16.0, above);
        CHECK(fabs(lightness(below) - lightness(above)) < 6); /* neither sign looks stronger */
        CHECK(below[2] > below[0] && above[0] > above[2]);    /* blue below, red-brown above */
    }
    uint8_t end[3], beyond[3];
    sv_palette_colour(1, end);
    sv_palette_colour(7, beyond);
    CHECK(memcmp(end, beyond, 3) == 0);
}

/* Steps of equal size in Oklab (B. Ottosson 2020; matrices of the inverse way from memory). */
static void oklab(const double rgb[3], double lab[3])
{
    const double l = cbrt(0.4122214708 * rgb[0] + 0.5363325363 * rgb[1] + 0.0514459929 * rgb[2]);
    const double m = cbrt(0.2119034982 * rgb[0] + 0.6806995451 * rgb[1] + 0.1073969566 * rgb[2]);
    const double s = cbrt(0.0883024619 * rgb[0] + 0.2817188376 * rgb[1] + 0.6299787005 * rgb[2]);
    lab[0] = 0.2104542553 * l + 0.7936177850 * m - 0.0040720468 * s;
    lab[1] = 1.9779984951 * l - 2.4285922050 * m + 0.4505937099 * s;
    lab[2] = 0.0259040371 * l + 0.7827717662 * m - 0.8086757660 * s;
}

SV_TEST(steps_look_even)
{
    for (int side = -1; side <= 1; side += 2) {
        double least = INFINITY, most = 0, last[3], rgb[3], lab[3];
        linear_at(0, rgb);
        oklab(rgb, last);
        for (int k = 1; k <= 16; k++) {
            linear_at(side * k / 16.0, rgb);
            oklab(rgb, lab);
            const double step = hypot(hypot(lab[0] - last[0], lab[1] - last[1]), lab[2] - last[2]);
            least = fmin(least, step);
            most = fmax(most, step);
            memcpy(last, lab, sizeof last);
        }
        CHECK(most / least < 1.3);
    }
}

/* A deviation has no sign: darker is more, and no colour is one of the marker maps' sides. */
SV_TEST(amounts_darken_from_the_same_centre)
{
    uint8_t before[3], rgb[3], end[3];
    sv_palette_colour(0, before);
    sv_palette_amount(-1, rgb);
    CHECK(memcmp(before, rgb, 3) == 0);
    for (int k = 1; k <= 32; k++) {
        sv_palette_amount(k / 32.0, rgb);
        /* Luma as in ITU-R BT.601, value recalled from memory. */
        CHECK(0.299 * rgb[0] + 0.587 * rgb[1] + 0.114 * rgb[2] <
              0.299 * before[0] + 0.587 * before[1] + 0.114 * before[2] - 1);
        CHECK(k < 8 || (rgb[1] > rgb[0] && rgb[1] > rgb[2] - 12));
        memcpy(before, rgb, 3);
    }
    sv_palette_amount(9, end);
    CHECK(memcmp(end, rgb, 3) == 0);
}
