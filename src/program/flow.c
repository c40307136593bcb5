/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The levels of the spectral flow: what the map command does with them. */
#include "program_internal.h"

static const sv_marker_request *flow_request(const sv_case *problem)
{
    const int flow = sv_marker_find("spectral_flow");
    for (int k = 0; k < problem->n_markers; k++)
        if (problem->markers[k].marker == flow)
            return &problem->markers[k];
    return NULL;
}

bool flow_wanted(const options *o, const sv_case *problem)
{
    return flow_request(problem) != NULL && (o->flow != NULL || o->output != NULL);
}

sv_status flow_check(sv_context *context, const options *o, const sv_case *problem)
{
    if (o->flow != NULL && flow_request(problem) == NULL)
        return SV_FAIL(context, SV_USAGE,
                       "--flow: the sheet asks for no spectral flow (markers.spectral_flow)");
    return may_write(context, o, o->flow);
}

sv_status flow_compute(session *s, const sv_case *problem, const sv_sample *sample,
                       sv_flow_trace *ret_trace)
{
    sv_outcome outcome; /* the record holds it already */
    const sv_marker_input input = {.sample = sample,
                                   .occupation = &problem->occupation,
                                   .values = flow_request(problem)->values,
                                   .threads = s->threads};
    return sv_spectral_flow_trace(s->context, &input, &outcome, ret_trace);
}

sv_status flow_write_csv(session *s, const sv_flow_trace *trace, const char *path)
{
    char *text = NULL;
    sv_status status = sv_flow_csv(s->context, trace, &text);
    if (status == SV_OK)
        status = write_csv_text(s->context, path, text);
    sv_give(s->context, text);
    return status;
}
