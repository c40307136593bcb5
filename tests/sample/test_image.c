/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Images and rasters through the library: values, edges, refusals. The files of the command-line
 * tests are written by another program; here the smallest ones by hand. */
#include "fixtures.h"

/* TIFF 6.0, little endian, 3×2 pixels of 8 bits in one strip; `width` as the header says it. */
static size_t make_tiff(uint8_t file[200], uint32_t width)
{
    const uint8_t pixels[8] = {0, 51, 102, 153, 204, 255, 0, 0};
    const uint32_t entries[][3] = {/* tag, type, value */
                                   {256, 4, width}, {257, 4, 2}, {258, 3, 8},
                                   {259, 3, 1},     {262, 3, 1}, {273, 4, 8},
                                   {277, 3, 1},     {278, 4, 2}, {279, 4, 6}};
    size_t at = 0;
    memcpy(file, "II*\0", 4);
    const uint32_t directory = 16;
    memcpy(file + 4, &directory, 4);
    memcpy(file + 8, pixels, 8);
    at = directory;
    file[at++] = 9;
    file[at++] = 0;
    for (int k = 0; k < 9; k++) {
        const uint16_t words[2] = {(uint16_t)entries[k][0], (uint16_t)entries[k][1]};
        const uint32_t one = 1;
        memcpy(file + at, words, 4);
        memcpy(file + at + 4, &one, 4);
        memcpy(file + at + 8, &entries[k][2], 4);
        at += 12;
    }
    memset(file + at, 0, 4);
    return at + 4;
}

SV_TEST(rows_are_counted_from_below)
{
    uint8_t file[200];
    sv_grey grey = {0};
    sv_table_fault fault = {0};
    size_t size = make_tiff(file, 3);
    CHECK(sv_image_is(file, size));
    CHECK(!sv_image_is("x,y\n1,2\n", 8));
    CHECK_OK(sv_image_read(test_context(), file, size, &grey, &fault));
    CHECK_INT(grey.width, 3);
    CHECK_INT(grey.height, 2);
    const double wanted[] = {0.6, 0.8, 1.0, 0.0, 0.2, 0.4};
    for (int k = 0; k < 6; k++)
        CHECK_CLOSE((double)grey.value[k], wanted[k], 1e-7);
    sv_grid grid = sv_grid_of_grey(&grey, 2.0, -10.0, 10.0);
    double value = 0.0;
    CHECK(sv_grid_at(&grid, (const double[]){1.0, 1.0}, &value));
    CHECK_CLOSE(value, 2.0, 1e-5);
    CHECK(sv_grid_at(&grid, (const double[]){2.0, 2.0}, &value)); /* the corner of four pixels */
    CHECK_CLOSE(value, -10.0 + 20.0 * (0.6 + 0.8 + 0.0 + 0.2) / 4, 1e-5);
    CHECK(sv_grid_at(&grid, (const double[]){0.0, 0.0}, &value)); /* constant over the rim */
    CHECK_CLOSE(value, 2.0, 1e-5);
    CHECK(!sv_grid_at(&grid, (const double[]){6.1, 1.0}, &value));
    CHECK(!sv_grid_at(&grid, (const double[]){(double)NAN, 1.0}, &value));
    sv_grid_free(test_context(), &grid);
    sv_grey_free(test_context(), &grey);
    sv_grey_free(test_context(), &grey);
}

/* Every cut of the file and every changed byte gives an answer or a fault, never a crash. */
SV_TEST(damaged_files_are_refused_or_read)
{
    uint8_t file[200], copy[200];
    size_t size = make_tiff(file, 3);
    int refused = 0;
    for (size_t cut = 0; cut < size; cut++) {
        sv_grey grey = {0};
        sv_table_fault fault = {0};
        sv_status status = sv_image_read(test_context(), file, cut, &grey, &fault);
        CHECK(status == SV_OK || (status == SV_INVALID_INPUT && fault.message[0] != '\0'));
        refused += status == SV_INVALID_INPUT;
        sv_grey_free(test_context(), &grey);
    }
    CHECK(refused > 100);
    for (size_t at = 0; at < size; at++)
        for (int bit = 0; bit < 8; bit += 3) {
            sv_grey grey = {0};
            sv_table_fault fault = {0};
            memcpy(copy, file, size);
            copy[at] ^= (uint8_t)(1 << bit);
            sv_status status = sv_image_read(test_context(), copy, size, &grey, &fault);
            CHECK(status == SV_OK || status == SV_INVALID_INPUT);
            sv_grey_free(test_context(), &grey);
        }
}

SV_TEST(a_huge_header_is_refused_before_memory_is_taken)
{
    uint8_t file[200];
    sv_grey grey = {0};
    sv_table_fault fault = {0};
    size_t size = make_tiff(file, 400000000);
    CHECK_STATUS(SV_INVALID_INPUT, sv_image_read(test_context(), file, size, &grey, &fault));
    CHECK(strstr(fault.message, "400000000 x 2 pixels") != NULL);
    CHECK(grey.value == NULL);
}

SV_TEST(rows_make_a_raster_in_any_order)
{
    sv_mark marks[6];
    sv_grid grid = {0};
    sv_table_fault fault = {0};
    for (int k = 0; k < 6; k++) {
        const int node = (5 * k + 2) % 6;
        marks[k] = (sv_mark){.at = {0.5 * (node % 3) - 1, 0.25 * (node / 3) + 2},
                             .energy = node * node,
                             .line = k + 2};
    }
    CHECK_OK(sv_grid_from_marks(test_context(), marks, 6, &grid, &fault));
    double value;
    CHECK(sv_grid_at(&grid, (const double[]){-0.5, 2.0}, &value));
    CHECK_CLOSE(value, 1.0, 1e-12);
    CHECK(sv_grid_at(&grid, (const double[]){-0.25, 2.125}, &value));
    CHECK_CLOSE(value, (1.0 + 4.0 + 16.0 + 25.0) / 4, 1e-12);
    sv_grid_free(test_context(), &grid);
    marks[4].at[0] += 0.1;
    CHECK_STATUS(SV_INVALID_INPUT, sv_grid_from_marks(test_context(), marks, 6, &grid, &fault));
    CHECK(strstr(fault.message, "no regular raster") != NULL);
}

/* Rows: the numbers of those outside; maps: the sites outside. */
SV_TEST(what_has_no_partner_is_found_in_order)
{
    sv_model model = fixture_qi_wu_zhang(-1);
    sv_flake_spec spec = fixture_cells(&model, 4, 4, false);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_mark marks[3] = {{.at = {9, 9}, .orbital = -1},
                        {.at = {1.1, 2}, .orbital = -1},
                        {.at = {-5, 0}, .orbital = -1}};
    sv_disorder rows = {
        .on = -1, .has_marks = true, .marks = marks, .n_marks = 3, .tolerance = 0.5};
    CHECK_INT(sv_measured_unmatched(&flake, &rows, 0), 0);
    CHECK_INT(sv_measured_unmatched(&flake, &rows, 1), 2);
    CHECK_INT(sv_measured_unmatched(&flake, &rows, 3), -1);
    float pixels[4] = {0};
    const sv_grey grey = {.width = 2, .height = 2, .value = pixels};
    sv_disorder map = {.on = -1, .has_grid = true, .grid = sv_grid_of_grey(&grey, 1.6, 0, 1)};
    for (sv_index s = -1; (s = sv_measured_unmatched(&flake, &map, s + 1)) >= 0;)
        CHECK_INT(flake.sites[s].at[0] > 3.2 || flake.sites[s].at[1] > 3.2, 1);
    map.grid = sv_grid_of_grey(&grey, 1.4, 0, 1); /* now reaches to 2.8: cells 3 are outside */
    int outside = 0;
    for (sv_index s = -1; (s = sv_measured_unmatched(&flake, &map, s + 1)) >= 0; outside++)
        ;
    CHECK_INT(outside, 2 * 7);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}
