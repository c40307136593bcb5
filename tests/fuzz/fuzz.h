/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the fuzz targets share. A target is one file with LLVMFuzzerTestOneInput(): it hands the
 * bytes to the code under test and ends the process when that code breaks its word. It runs under
 * libFuzzer (-Dfuzz=libfuzzer) and under driver.c (everywhere else). */
#ifndef SELVEDGE_FUZZ_H
#define SELVEDGE_FUZZ_H

#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include "selvedge/base.h"

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size);
/* Of libFuzzer or of driver.c: changes data in place, returns the new size. */
size_t LLVMFuzzerMutate(uint8_t *data, size_t size, size_t most);
/* A target may have one, to keep check sums right. */
size_t LLVMFuzzerCustomMutator(uint8_t *data, size_t size, size_t most, unsigned seed);

/* A context for one input: counts blocks and refuses more than 256 MB at a time. */
sv_context *fuzz_begin(void);
/* Ends the process when a block was not given back. */
void fuzz_end(void);
/* Ends the process with a message unless the condition holds. */
void fuzz_require(bool condition, const char *format, ...) SV_PRINTF(2, 3);
/* Allowed outcomes of reading something foreign: read, refused in words, or too large. */
void fuzz_require_answer(sv_status status);
/* A folder of this process alone, in memory where there is such a place; removed at the end. */
const char *fuzz_folder(void);
void fuzz_write(const char *path, const void *data, size_t size);

#endif
