/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A structure while it is made. */
#ifndef SELVEDGE_STRUCTURE_INTERNAL_H
#define SELVEDGE_STRUCTURE_INTERNAL_H

#include "sample_internal.h"

/* Fills the fault and the message. `column` from 1. */
sv_status sv_structure_fail(sv_context *context, sv_table_fault *fault, int line, int column,
                            const char *hint, const char *format, ...) SV_PRINTF(6, 7);
/* structure_read.c: sites, species, lines, z. */
sv_status sv_structure_read(sv_context *context, const sv_model *model, const char *text,
                            size_t size, double unit, sv_structure *s, sv_table_fault *fault);
/* structure_bonds.c: all rules; needs the sites. */
sv_status sv_structure_join(sv_context *context, const sv_model *model, sv_structure *s,
                            sv_table_fault *fault);

#endif
