/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What fixes the numbers of a run, as sorted lines `path = value`: all values in the model's
 * units, files by the digest of their content, and nothing that only says how long to go on. */
#include "sheet_internal.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* These change no number of a realisation: a run may be continued with other values. What a preset
 * gives counts by its values. */
static const char EXEMPT_KEYS[] =
    "ensemble.realisations ensemble.threads model.preset question.most";
static const char EXEMPT_BLOCKS[] = "ensemble.stop finite_size";

static bool is_exempt(const sv_section *section, const char *key)
{
    char path[SV_PATH_SIZE];
    const char *dot = section->path[0] != '\0' ? "." : "";
    snprintf(path, sizeof path, "%s%s%s", section->path, dot, key);
    return sv_words_hold(EXEMPT_BLOCKS, section->path) || sv_words_hold(EXEMPT_KEYS, path);
}

/* Lines are collected with their offsets, since the text moves while it grows. */
typedef struct writer {
    sv_reader *reader;
    sv_text line;
    const char **lines;
    sv_index n_lines, capacity;
} writer;

static void end_line(writer *w)
{
    sv_reader *reader = w->reader;
    if (w->line.status == SV_OK)
        w->line.status =
            sv_reserve(reader->context, &w->lines, &w->capacity, w->n_lines + 1, sizeof *w->lines);
    if (w->line.status != SV_OK)
        return;
    w->line.status = sv_arena_text(reader->context, reader->arena, w->line.data,
                                   (size_t)w->line.length, &w->lines[w->n_lines]);
    w->n_lines += w->line.status == SV_OK;
    w->line.length = 0;
}

static void add_real(writer *w, double value)
{
    char number[32];
    sv_format_real(value + 0.0, number, sizeof number); /* −0 becomes 0 */
    sv_text_add(&w->line, "%s", number);
}

static void add_pair(writer *w, const double value[2])
{
    sv_text_add(&w->line, "[");
    add_real(w, value[0]);
    sv_text_add(&w->line, ", ");
    add_real(w, value[1]);
    sv_text_add(&w->line, "]");
}

static void add_list(writer *w, const double *values, sv_index n)
{
    for (sv_index i = 0; i < n; i++) {
        sv_text_add(&w->line, i > 0 ? ", " : "[");
        add_real(w, values[i]);
    }
    sv_text_add(&w->line, "]");
}

static void add_value(writer *w, const sv_key *key, const sv_value *value)
{
    char word[64];
    switch (key->type) {
    case SV_KEY_REAL:
    case SV_KEY_AUTO_OR_REAL:
        if (value->has_auto)
            sv_text_add(&w->line, "auto");
        else
            add_real(w, value->real[0]);
        break;
    case SV_KEY_REAL_PAIR:
    case SV_KEY_PLACE:
        if (value->has_auto)
            sv_text_add(&w->line, "centre");
        else
            add_pair(w, value->real);
        break;
    case SV_KEY_INTEGER:
    case SV_KEY_FLAG:
        sv_text_add(&w->line, "%lld", (long long)value->integer[0]);
        break;
    case SV_KEY_INTEGER_PAIR:
    case SV_KEY_INTEGER_OR_PAIR:
        sv_text_add(&w->line, "[%lld, %lld]", (long long)value->integer[0],
                    (long long)value->integer[1]);
        break;
    case SV_KEY_CHOICE_PAIR:
        for (int i = 0; i < 2; i++) {
            sv_choice_word(key->choices, (int)value->integer[i], word, sizeof word);
            sv_text_add(&w->line, "%s%s", i > 0 ? " " : "", word);
        }
        break;
    case SV_KEY_FILE:
        sv_text_add(&w->line, "sha256 %s", value->digest);
        break;
    case SV_KEY_REAL_LIST:
    case SV_KEY_POINTS:
    case SV_KEY_LOOPS:
        add_list(w, value->list, value->count);
        break;
    case SV_KEY_TEXT:
    case SV_KEY_CHOICE:
        sv_emit_scalar(&w->line, value->text);
        break;
    case SV_KEY_TREE:
        break;
    }
}

/* Entries of lists by number, so that order and name both count. */
static void begin_line(writer *w, const sv_section *section, const char *key)
{
    if (section->entry >= 0)
        sv_text_add(&w->line, "%s.%02d", section->block->name, section->entry);
    else
        sv_text_add(&w->line, "%s", section->path);
    sv_text_add(&w->line, "%s%s = ", section->path[0] != '\0' ? "." : "", key);
}

static void add_section(writer *w, const sv_section *section)
{
    for (int i = 0; i < section->n_fields; i++) {
        const sv_key *key = section->fields[i].key;
        bool scale = sv_schema_is_scale(key) && key->dimension == SV_DIM_ENERGY;
        if (!section->values[i].present || key->type == SV_KEY_TREE || scale ||
            is_exempt(section, key->name))
            continue;
        begin_line(w, section, key->name);
        add_value(w, key, &section->values[i]);
        end_line(w);
    }
}

static void add_axis(writer *w, const sv_sweep_axis *axis, int number)
{
    sv_text_add(&w->line, "sweep.%02d = %s ", number, axis->path);
    add_list(w, axis->values, axis->count);
    if (axis->second != NULL) {
        sv_text_add(&w->line, " x ");
        add_list(w, axis->second, axis->count);
    }
    end_line(w);
}

/* The model as built says what the trees of a custom one say; a table of hops counts by its digest.
 */
static void add_custom(writer *w, const sv_model *model)
{
    for (int i = 0; i < 2; i++) {
        sv_text_add(&w->line, "model.vectors.%d = ", i);
        add_pair(w, model->vectors[i]);
        end_line(w);
    }
    for (int i = 0; i < model->n_orbitals; i++) {
        const sv_orbital *orbital = &model->orbitals[i];
        sv_text_add(&w->line, "model.orbitals.%04d = ", i);
        sv_emit_scalar(&w->line, orbital->name);
        sv_text_add(&w->line, " ");
        add_pair(w, orbital->at);
        sv_text_add(&w->line, " ");
        add_real(w, orbital->onsite);
        if (orbital->spin != 0)
            sv_text_add(&w->line, orbital->spin > 0 ? " up" : " down");
        end_line(w);
    }
    for (int i = 0; i < w->reader->listed_hops; i++) {
        const sv_hop *hop = &model->hops[i];
        double parts[2] = {creal(hop->amplitude), cimag(hop->amplitude)};
        sv_text_add(&w->line, "model.hops.%05d = %d %d [%d, %d] ", i, hop->from, hop->to,
                    hop->shift[0], hop->shift[1]);
        add_pair(w, parts);
        end_line(w);
    }
}

static void add_rules(writer *w, const sv_model *model)
{
    for (int i = 0; i < model->n_orbitals; i++) {
        sv_text_add(&w->line, "model.species.%04d = ", i);
        sv_emit_scalar(&w->line, model->orbitals[i].name);
        sv_text_add(&w->line, " ");
        add_real(w, model->orbitals[i].onsite);
        end_line(w);
    }
    for (int i = 0; i < model->n_rules; i++) {
        const sv_distance_rule *r = &model->rules[i];
        const double numbers[] = {r->distance,         r->tolerance,        r->decay, r->cutoff,
                                  creal(r->amplitude), cimag(r->amplitude), r->phase};
        sv_text_add(&w->line, "model.hops.%05d = %d %d ", i, r->from, r->to);
        add_list(w, numbers, (sv_index)(sizeof numbers / sizeof numbers[0]));
        end_line(w);
    }
}

/* The trees of a question say what is asked; how many realisations it may cost does not count. */
static void add_question(writer *w, const sv_sheet_question *q)
{
    sv_text_add(&w->line, "question.range = ");
    add_list(w, q->axis.values, q->axis.count);
    end_line(w);
    for (int i = 0; i < q->n_sizes; i++) {
        sv_text_add(&w->line, "question.sizes.%d = [%lld, %lld]", i, (long long)q->sizes[i][0],
                    (long long)q->sizes[i][1]);
        end_line(w);
    }
    if (q->budget.count > 0) {
        sv_text_add(&w->line, "question.budget.values = ");
        add_list(w, q->budget.values, q->budget.count);
        end_line(w);
    }
}

static int compare_lines(const void *a, const void *b)
{
    const char *const *x = a, *const *y = b;
    return strcmp(*x, *y);
}

static sv_status join(writer *w, char **ret_text)
{
    sv_text text = {.context = w->reader->context};
    if (w->line.status != SV_OK)
        return w->line.status;
    qsort(w->lines, (size_t)w->n_lines, sizeof *w->lines, compare_lines);
    for (sv_index i = 0; i < w->n_lines; i++) {
        sv_text_add_bytes(&text, w->lines[i], strlen(w->lines[i]));
        sv_text_add_bytes(&text, "\n", 1);
    }
    if (text.status != SV_OK)
        sv_give(w->reader->context, text.data);
    else
        *ret_text = text.data;
    return text.status;
}

sv_status sv_identity_write(sv_reader *reader, const sv_setup *setup, char **ret_text)
{
    writer w = {.reader = reader, .line = {.context = reader->context}};
    for (const sv_section *s = reader->sections; s != NULL; s = s->next)
        if (strcmp(s->block->name, "sweep") != 0)
            add_section(&w, s);
    /* A marker without keys leaves no line of its own above. */
    for (const sv_section *s = reader->sections; s != NULL; s = s->next)
        if (strcmp(s->block->name, "markers") == 0 && s->kind != NULL) {
            sv_text_add(&w.line, "%s = asked for", s->path);
            end_line(&w);
        }
    sv_text_add(&w.line, "model.energy_unit = ");
    add_real(&w, setup->energy_unit);
    end_line(&w);
    if (strcmp(setup->model.name, "custom") == 0)
        add_custom(&w, &setup->model);
    if (setup->model.n_rules > 0)
        add_rules(&w, &setup->model);
    for (int i = 0; i < setup->n_axes; i++)
        add_axis(&w, &setup->axes[i], i);
    for (int i = 0; setup->has_plateau && i < setup->plateau.n_temperatures; i++) {
        sv_text_add(&w.line, "plateau.temperatures.%02d = ", i);
        add_real(&w, setup->plateau.kelvin[i]);
        end_line(&w);
    }
    if (setup->has_question)
        add_question(&w, &setup->question);
    sv_status status = join(&w, ret_text);
    sv_give(reader->context, w.lines);
    sv_give(reader->context, w.line.data);
    return status;
}
