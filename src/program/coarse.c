/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The coarse map of the local Chern marker: what the map and report commands do with it. */
#include "program_internal.h"

#include <unistd.h>

static const sv_marker_request *coarse_request(const sv_case *problem)
{
    const int chern = sv_marker_find("local_chern");
    for (int k = 0; k < problem->n_markers; k++)
        if (problem->markers[k].marker == chern &&
            sv_local_chern_wants_blocks(problem->markers[k].values))
            return &problem->markers[k];
    return NULL;
}

bool coarse_wanted(const sv_case *problem)
{
    return coarse_request(problem) != NULL;
}

sv_status coarse_compute(session *s, const sv_case *problem, const sv_sample *sample,
                         sv_index realisation, sv_coarse *ret)
{
    sv_context *context = s->context;
    sv_marker_input input = {.sample = sample,
                             .occupation = &problem->occupation,
                             .values = coarse_request(problem)->values,
                             .threads = s->threads,
                             .seed = problem->seed,
                             .realisation = realisation};
    sv_progress_bar bar;
    sv_status status =
        sv_projector_make(context, sample, &problem->occupation, &problem->solve, &input.projector);
    if (status != SV_OK)
        return status;
    sv_progress_bar_init(&bar, stderr, isatty(fileno(stderr)));
    if (wants_progress(s->options)) {
        context->progress = sv_progress_bar_show;
        context->progress_user = &bar;
    }
    status = sv_local_chern_blocks(context, &input, ret);
    context->progress = NULL;
    sv_progress_bar_end(&bar);
    sv_projector_free(context, input.projector);
    return status;
}

sv_status write_csv_text(sv_context *context, const char *path, const char *text)
{
    sv_output file;
    sv_status status = sv_output_begin(context, path, &file);
    if (status != SV_OK)
        return status;
    fputs(text, file.stream);
    return sv_output_commit(context, &file);
}

sv_status coarse_write_csv(session *s, const sv_coarse *map, const char *path)
{
    char *text = NULL;
    sv_status status = sv_coarse_csv(s->context, map, &text);
    if (status == SV_OK)
        status = write_csv_text(s->context, path, text);
    sv_give(s->context, text);
    return status;
}
