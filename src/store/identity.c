/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What makes two runs the same, and words for what makes them differ. */
#include <stdio.h>
#include <string.h>

#include "store_internal.h"

/* SHA-256 over the canonical text, the version and the kernel, each with its length before it. */
void sv_identity_digest(sv_context *context, const sv_run_identity *identity, char digest[65])
{
    (void)context;
    char parts[3][65], joined[3 * 65];
    sv_digest(identity->identity, strlen(identity->identity), parts[0]);
    sv_digest(identity->program_version, strlen(identity->program_version), parts[1]);
    sv_digest(identity->kernel, strlen(identity->kernel), parts[2]);
    snprintf(joined, sizeof joined, "%s %s %s", parts[0], parts[1], parts[2]);
    sv_digest(joined, strlen(joined), digest);
}

/* Copies one line, without its indent; long ones are cut. */
static void copy_line(const char *line, char *text, size_t size)
{
    size_t indent = strspn(line, " ");
    size_t length = strcspn(line + indent, "\n");
    if (length == 0)
        snprintf(text, size, "(nothing)");
    else
        snprintf(text, size, "\"%.*s%s\"", (int)(length > 100 ? 100 : length), line + indent,
                 length > 100 ? "..." : "");
}

/* The first lines that differ; false when the texts agree. */
static bool first_difference(const char *was, const char *is, char *text, size_t size)
{
    int line = 1;
    while (*was != '\0' || *is != '\0') {
        size_t n = strcspn(was, "\n"), m = strcspn(is, "\n");
        if (n != m || memcmp(was, is, n) != 0) {
            char old_line[128], new_line[128];
            copy_line(was, old_line, sizeof old_line);
            copy_line(is, new_line, sizeof new_line);
            snprintf(text, size, "the run has %s where this sheet has %s (line %d of the identity)",
                     old_line, new_line, line);
            return true;
        }
        was += n + (was[n] == '\n');
        is += m + (is[m] == '\n');
        line++;
    }
    return false;
}

void sv_identity_difference(const sv_run *run, const sv_run_identity *identity, char *text,
                            size_t size)
{
    const char *was = sv_run_meta(run, "identity");
    const char *version = sv_run_meta(run, "program_version");
    const char *kernel = sv_run_meta(run, "kernel");
    if (was == NULL || version == NULL || kernel == NULL)
        snprintf(text, size, "the ledger does not say what the run is");
    else if (first_difference(was, identity->identity, text, size))
        return;
    else if (strcmp(version, identity->program_version) != 0)
        snprintf(text, size, "the run was made by version %.60s, this is version %.60s", version,
                 identity->program_version);
    else if (strcmp(kernel, identity->kernel) != 0)
        snprintf(text, size,
                 "the run was made with the arithmetic kernel \"%.100s\", this is \"%.100s\"",
                 kernel, identity->kernel);
    else
        snprintf(text, size, "the texts differ in white space only");
}
