/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * The colours of the marker maps: indigo below zero, rust above, a near-white neutral at zero.
 * Each side is a curve in the Oklab space (B. Ottosson, "A perceptual color space for image
 * processing", 2020), walked at equal steps; both sides have the same lightness at the same
 * distance from zero, so that order survives grey printing and colour-vision deficiency.
 */
#include <math.h>

#include "selvedge/present.h"

static const double light_centre = 0.965, light_end = 0.42;

/* Hue angle (radian) and largest chroma of the two sides; the hue turns a little to the dark. */
typedef struct side {
    double hue_light, hue_dark, chroma;
} side;
static const side below = {4.15, 4.78, 0.135}; /* sky to indigo */
static const side above = {1.25, 0.62, 0.135}; /* sand to rust */

static const side amount = {1.95, 3.55, 0.115}; /* straw to teal */

/* A point of the curve, 0 ≤ s ≤ 1: lightness falls, chroma rises and falls back somewhat. */
static void curve_at(const side *arm, double s, double lab[3])
{
    const double chroma = arm->chroma * sin(s * 2.15) / sin(2.15 * 0.73);
    const double hue = arm->hue_light + s * (arm->hue_dark - arm->hue_light);
    lab[0] = light_centre + s * (light_end - light_centre);
    lab[1] = chroma * cos(hue);
    lab[2] = chroma * sin(hue);
}

static double encode_srgb(double linear)
{
    if (linear <= 0)
        return 0;
    if (linear >= 1)
        return 1;
    return linear <= 0.0031308 ? 12.92 * linear : 1.055 * pow(linear, 1 / 2.4) - 0.055;
}

/* Matrices of the reference above. */
static void to_rgb(const double lab[3], uint8_t rgb[3])
{
    const double l = pow(lab[0] + 0.3963377774 * lab[1] + 0.2158037573 * lab[2], 3);
    const double m = pow(lab[0] - 0.1055613458 * lab[1] - 0.0638541728 * lab[2], 3);
    const double s = pow(lab[0] - 0.0894841775 * lab[1] - 1.2914855480 * lab[2], 3);
    const double linear[3] = {4.0767416621 * l - 3.3077115913 * m + 0.2309699292 * s,
                              -1.2684380046 * l + 2.6097574011 * m - 0.3413193965 * s,
                              -0.0041960863 * l - 0.7034186147 * m + 1.7076147010 * s};
    for (int i = 0; i < 3; i++)
        rgb[i] = (uint8_t)lrint(255 * encode_srgb(linear[i]));
}

void sv_palette_colour(double position, uint8_t ret_rgb[3])
{
    const side *arm = position < 0 ? &below : &above;
    double lab[3];
    curve_at(arm, fmin(fabs(position), 1.0), lab);
    to_rgb(lab, ret_rgb);
}

void sv_palette_amount(double position, uint8_t ret_rgb[3])
{
    double lab[3];
    curve_at(&amount, fmin(fmax(position, 0.0), 1.0), lab);
    to_rgb(lab, ret_rgb);
}
