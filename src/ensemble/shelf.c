/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The packed records of an ensemble: numbers in blocks of slots, every text once. */
#include "ensemble_internal.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

enum { BLOCK_SLOTS = 512, CHUNK_BYTES = 1 << 16 };

/* Slots that follow each other: heads, and n_markers outcomes for each. */
typedef struct block {
    sv_kept_head *heads;
    sv_kept_outcome *outcomes;
} block;

/* Texts by number, found again by hash. Number 0 is the empty text. Chunks never move. */
typedef struct words {
    char **chunks;
    sv_index n_chunks, chunks_room;
    size_t used; /* bytes of the last chunk */
    const char **texts;
    sv_index n_texts, texts_room;
    int32_t *table;      /* numbers, 0: free */
    sv_index table_size; /* a power of two, at least twice n_texts */
} words;

typedef struct sv_shelf {
    block *blocks;
    sv_index n_blocks, n_slots;
    words words;
} sv_shelf;

/* FNV-1a, 64 bits: texts are short and there is nothing to defend. */
static uint64_t hash_of(const char *text)
{
    uint64_t hash = UINT64_C(14695981039346656037);
    for (; *text != '\0'; text++)
        hash = (hash ^ (unsigned char)*text) * UINT64_C(1099511628211);
    return hash;
}

/* Where the number of a text stands or would stand. */
static sv_index place_of(const words *w, const char *text)
{
    sv_index mask = w->table_size - 1, place = (sv_index)(hash_of(text) & (uint64_t)mask);
    while (w->table[place] != 0 && strcmp(w->texts[w->table[place]], text) != 0)
        place = (place + 1) & mask;
    return place;
}

static sv_status widen(sv_context *context, words *w)
{
    words wider = *w;
    if (2 * (w->n_texts + 1) <= w->table_size)
        return SV_OK;
    wider.table_size = w->table_size == 0 ? 64 : 2 * w->table_size;
    sv_status status = sv_take(context, wider.table_size, sizeof *wider.table, &wider.table);
    if (status != SV_OK)
        return status;
    for (int32_t number = 1; number < w->n_texts; number++)
        wider.table[place_of(&wider, w->texts[number])] = number;
    sv_give(context, w->table);
    w->table = wider.table;
    w->table_size = wider.table_size;
    return SV_OK;
}

/* Copies a text behind the last one. */
static sv_status keep_text(sv_context *context, words *w, const char *text, const char **ret_copy)
{
    size_t size = strlen(text) + 1;
    if (w->n_chunks == 0 || w->used + size > CHUNK_BYTES) {
        char *chunk = NULL;
        sv_status status =
            sv_reserve(context, &w->chunks, &w->chunks_room, w->n_chunks + 1, sizeof *w->chunks);
        if (status == SV_OK)
            status = sv_take_raw(context, CHUNK_BYTES, 1, &chunk);
        if (status != SV_OK)
            return status;
        w->chunks[w->n_chunks++] = chunk;
        w->used = 0;
    }
    char *copy = w->chunks[w->n_chunks - 1] + w->used;
    memcpy(copy, text, size);
    w->used += size;
    *ret_copy = copy;
    return SV_OK;
}

static sv_status number_of(sv_context *context, words *w, const char *text, int32_t *ret_number)
{
    *ret_number = 0;
    if (text[0] == '\0')
        return SV_OK;
    sv_status status = widen(context, w);
    if (status != SV_OK)
        return status;
    sv_index place = place_of(w, text), first = w->n_texts == 0;
    if (w->table[place] != 0) {
        *ret_number = w->table[place];
        return SV_OK;
    }
    if (w->n_texts == INT32_MAX)
        return SV_FAIL(context, SV_NO_MEMORY, "more than %ld different texts", (long)INT32_MAX);
    status =
        sv_reserve(context, &w->texts, &w->texts_room, w->n_texts + first + 1, sizeof *w->texts);
    if (status != SV_OK)
        return status;
    if (first)
        w->texts[w->n_texts++] = "";
    const char *copy = NULL;
    status = keep_text(context, w, text, &copy);
    if (status != SV_OK)
        return status;
    w->texts[w->n_texts] = copy;
    w->table[place] = *ret_number = (int32_t)w->n_texts++;
    return SV_OK;
}

sv_status sv_ensemble_init(sv_context *context, int32_t n_points, int64_t realisations,
                           int32_t n_markers, sv_ensemble *ret_ensemble)
{
    sv_ensemble ensemble = {
        .n_points = n_points, .realisations = realisations, .n_markers = n_markers};
    sv_index count;
    if (n_points < 1 || realisations < 1 || n_markers < 0 || n_markers > SV_MAX_MARKERS ||
        __builtin_mul_overflow((sv_index)n_points, realisations, &count))
        return SV_FAIL(context, SV_INVALID_INPUT, "%ld points of %lld realisations, %ld markers",
                       (long)n_points, (long long)realisations, (long)n_markers);
    sv_status status = sv_take(context, count, sizeof *ensemble.done, &ensemble.done);
    if (status == SV_OK)
        status = sv_take(context, 1, sizeof *ensemble.shelf, &ensemble.shelf);
    if (status == SV_OK) {
        ensemble.shelf->n_slots = count;
        ensemble.shelf->n_blocks = (count - 1) / BLOCK_SLOTS + 1;
        status = sv_take(context, ensemble.shelf->n_blocks, sizeof *ensemble.shelf->blocks,
                         &ensemble.shelf->blocks);
    }
    if (status != SV_OK) {
        sv_ensemble_free(context, &ensemble);
        return status;
    }
    *ret_ensemble = ensemble;
    return SV_OK;
}

void sv_ensemble_free(sv_context *context, sv_ensemble *ensemble)
{
    sv_shelf *shelf = ensemble->shelf;
    if (shelf != NULL) {
        for (sv_index b = 0; shelf->blocks != NULL && b < shelf->n_blocks; b++) {
            sv_give(context, shelf->blocks[b].heads);
            sv_give(context, shelf->blocks[b].outcomes);
        }
        for (sv_index k = 0; k < shelf->words.n_chunks; k++)
            sv_give(context, shelf->words.chunks[k]);
        sv_give(context, shelf->words.chunks);
        sv_give(context, shelf->words.texts);
        sv_give(context, shelf->words.table);
        sv_give(context, shelf->blocks);
        sv_give(context, shelf);
    }
    sv_give(context, ensemble->done);
    *ensemble = (sv_ensemble){0};
}

static sv_status open_block(sv_context *context, const sv_ensemble *ensemble, sv_index number)
{
    block *b = &ensemble->shelf->blocks[number], fresh = {0};
    sv_index slots = ensemble->shelf->n_slots - number * BLOCK_SLOTS;
    if (b->heads != NULL)
        return SV_OK;
    if (slots > BLOCK_SLOTS)
        slots = BLOCK_SLOTS;
    sv_status status = sv_take(context, slots, sizeof *fresh.heads, &fresh.heads);
    if (status == SV_OK)
        status =
            sv_take(context, slots * ensemble->n_markers, sizeof *fresh.outcomes, &fresh.outcomes);
    if (status != SV_OK) {
        sv_give(context, fresh.heads);
        return status;
    }
    *b = fresh;
    return SV_OK;
}

static sv_status pack(sv_context *context, words *w, const sv_outcome *o, sv_kept_outcome *ret)
{
    sv_kept_outcome kept = {.value = o->value,
                            .index = o->index,
                            .numerical_error = o->numerical_error,
                            .estimator_error = o->estimator_error,
                            .margin = o->margin,
                            .weakest = o->weakest,
                            .sum_over_sites = o->sum_over_sites,
                            .kappa = o->kappa,
                            .highest_occupied = o->highest_occupied,
                            .lowest_empty = o->lowest_empty,
                            .window_cells = o->window_cells,
                            .electrons = o->electrons,
                            .degree = o->degree,
                            .verdict = o->verdict};
    sv_status status = number_of(context, w, o->reason, &kept.reason);
    if (status == SV_OK)
        status = number_of(context, w, o->engine, &kept.engine);
    if (status == SV_OK)
        *ret = kept;
    return status;
}

sv_status sv_ensemble_put(sv_context *context, sv_ensemble *ensemble, const sv_record *record)
{
    sv_kept_outcome kept[SV_MAX_MARKERS];
    if (record->point < 0 || record->point >= ensemble->n_points || record->realisation < 0 ||
        record->realisation >= ensemble->realisations || record->n_outcomes < 0 ||
        record->n_outcomes > ensemble->n_markers)
        return SV_FAIL(context, SV_INVALID_INPUT,
                       "realisation %lld of point %ld with %ld outcomes has no place among %lld of "
                       "%ld with %ld",
                       (long long)record->realisation, (long)record->point,
                       (long)record->n_outcomes, (long long)ensemble->realisations,
                       (long)ensemble->n_points, (long)ensemble->n_markers);
    sv_index slot = record->point * ensemble->realisations + record->realisation;
    sv_index number = slot / BLOCK_SLOTS, place = slot % BLOCK_SLOTS;
    sv_status status = open_block(context, ensemble, number);
    for (int k = 0; k < record->n_outcomes && status == SV_OK; k++)
        status = pack(context, &ensemble->shelf->words, &record->outcomes[k], &kept[k]);
    if (status != SV_OK)
        return status;
    block *b = &ensemble->shelf->blocks[number];
    b->heads[place] = (sv_kept_head){.sites = record->sites,
                                     .vacancies = record->vacancies,
                                     .seconds = record->seconds,
                                     .status = record->status,
                                     .n_outcomes = record->n_outcomes};
    if (record->n_outcomes > 0)
        memcpy(&b->outcomes[place * ensemble->n_markers], kept,
               (size_t)record->n_outcomes * sizeof *kept);
    ensemble->done[slot] = true;
    return SV_OK;
}

const sv_kept_head *sv_ensemble_head(const sv_ensemble *ensemble, int32_t point,
                                     int64_t realisation)
{
    sv_index slot = point * ensemble->realisations + realisation;
    const block *b = &ensemble->shelf->blocks[slot / BLOCK_SLOTS];
    return ensemble->done[slot] && b->heads != NULL ? &b->heads[slot % BLOCK_SLOTS] : NULL;
}

const sv_kept_outcome *sv_ensemble_outcome(const sv_ensemble *ensemble, int32_t point,
                                           int64_t realisation, int marker)
{
    const sv_kept_head *head = sv_ensemble_head(ensemble, point, realisation);
    if (head == NULL || marker < 0 || marker >= head->n_outcomes)
        return NULL;
    sv_index slot = point * ensemble->realisations + realisation;
    return &ensemble->shelf->blocks[slot / BLOCK_SLOTS]
                .outcomes[slot % BLOCK_SLOTS * ensemble->n_markers + marker];
}

const char *sv_ensemble_text(const sv_ensemble *ensemble, int32_t number)
{
    const words *w = &ensemble->shelf->words;
    return number > 0 && number < w->n_texts ? w->texts[number] : "";
}

bool sv_ensemble_get(const sv_ensemble *ensemble, int32_t point, int64_t realisation,
                     sv_record *ret_record)
{
    const sv_kept_head *head = sv_ensemble_head(ensemble, point, realisation);
    if (head == NULL)
        return false;
    sv_record record = {.point = point,
                        .realisation = realisation,
                        .status = head->status,
                        .sites = head->sites,
                        .vacancies = head->vacancies,
                        .seconds = head->seconds,
                        .n_outcomes = head->n_outcomes};
    for (int k = 0; k < head->n_outcomes; k++) {
        const sv_kept_outcome *o = sv_ensemble_outcome(ensemble, point, realisation, k);
        sv_outcome *out = &record.outcomes[k];
        *out = (sv_outcome){.verdict = o->verdict,
                            .value = o->value,
                            .index = o->index,
                            .numerical_error = o->numerical_error,
                            .estimator_error = o->estimator_error,
                            .margin = o->margin,
                            .weakest = o->weakest,
                            .unresolved_within = (double)NAN,
                            .nearest_level = (double)NAN,
                            .sum_over_sites = o->sum_over_sites,
                            .window_cells = o->window_cells,
                            .kappa = o->kappa,
                            .highest_occupied = o->highest_occupied,
                            .lowest_empty = o->lowest_empty,
                            .electrons = o->electrons,
                            .degree = o->degree};
        snprintf(out->reason, sizeof out->reason, "%s", sv_ensemble_text(ensemble, o->reason));
        snprintf(out->engine, sizeof out->engine, "%s", sv_ensemble_text(ensemble, o->engine));
    }
    *ret_record = record;
    return true;
}
