/* SPDX-License-Identifier: GPL-3.0-or-later */
/* `--set path=value`: the value is YAML, the path as in a sweep. Nodes made here carry places in
 * the text of the override, so that later messages point into it. */
#include "sheet_internal.h"

#include <string.h>

static const char HOW[] = "write it as in --set disorder.vac.share=0.02";

/* The text as a source of its own, kept with the sheet. */
static sv_source *keep_text(sv_reader *reader, const char *text)
{
    sv_source *source = sv_reader_take(reader, 1, sizeof *source);
    const char *copy = sv_reader_text(reader, "%s", text);
    if (source == NULL || copy == NULL)
        return NULL;
    *source = (sv_source){"--set", copy, strlen(copy)};
    return source;
}

static bool read_value(sv_reader *reader, const sv_source *source, size_t skip,
                       const sv_node **ret_value)
{
    sv_tree_input input = {source, skip, "value"};
    sv_node *value = NULL;
    sv_status status =
        sv_tree_read(reader->context, reader->arena, &input, reader->diagnostics, &value);
    if (status == SV_INVALID_INPUT)
        reader->errors++;
    else if (status != SV_OK)
        reader->status = status;
    else
        *ret_value = value;
    return status == SV_OK;
}

bool sv_override_apply(sv_reader *reader, const char *text, const sv_node **root)
{
    sv_source *source = keep_text(reader, text);
    if (source == NULL)
        return false;
    const char *equals = strchr(source->text, '=');
    sv_place place = {source, 1, 1, (int)strlen(source->text)};
    if (equals == NULL || equals == source->text)
        return sv_report_at(reader, &place, HOW, "expected path=value");
    size_t length = (size_t)(equals - source->text);
    while (length > 0 && source->text[length - 1] == ' ')
        length--;
    const char *path_text = sv_reader_text(reader, "%.*s", (int)length, source->text);
    const sv_node *value = NULL;
    sv_path path;
    place.length = (int)length;
    return path_text != NULL && sv_path_split(reader, path_text, &place, &path) &&
           read_value(reader, source, (size_t)(equals - source->text) + 1, &value) &&
           sv_path_set(reader, *root, &path, value, root);
}
