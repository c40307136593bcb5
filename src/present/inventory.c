/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What a sample consists of, for JSON, tables and figures. */
#include <string.h>

#include "present_internal.h"

/* Sites of each orbital that are left. */
static sv_index count_orbital(const sv_sample *sample, int orbital)
{
    sv_index count = 0;
    for (sv_index r = 0; r < sample->n; r++)
        count += sample->flake->sites[sample->pristine[r]].orbital == orbital &&
                 (sample->adatom == NULL || sample->adatom[r] < 0);
    return count;
}

static json_t *make_orbitals(sv_json *json, const sv_sample *sample)
{
    json_t *object = json_object();
    const sv_model *model = sample->flake->model;
    for (int k = 0; k < model->n_orbitals; k++)
        sv_json_put_integer(json, object, model->orbitals[k].name, count_orbital(sample, k));
    return object;
}

/* What each entry of the sheet has put into this sample, by its name. */
static json_t *make_placed(sv_json *json, const sv_sample *sample)
{
    json_t *object = json_object();
    for (int k = 0; k < sample->n_disorder && k < SV_DISORDER_MOST; k++)
        sv_json_put_integer(json, object, sample->disorder[k].name, sample->inventory.placed[k]);
    return object;
}

json_t *sv_json_inventory(sv_json *json, const sv_sample *sample)
{
    const sv_inventory *inventory = &sample->inventory;
    json_t *object = json_object();
    sv_json_put_integer(json, object, "pristine_sites", inventory->pristine_sites);
    sv_json_put_integer(json, object, "sites", sample->n);
    sv_json_put(json, object, "orbitals", make_orbitals(json, sample));
    sv_json_put_integer(json, object, "imbalance", inventory->imbalance);
    sv_json_put_integer(json, object, "vacancies", inventory->vacancies);
    sv_json_put(json, object, "placed", make_placed(json, sample));
    sv_json_put_integer(json, object, "vacant_sites", inventory->vacant_sites);
    sv_json_put_integer(json, object, "adatoms", inventory->adatoms);
    sv_json_put_integer(json, object, "removed_sites", inventory->removed_sites);
    sv_json_put_integer(json, object, "pieces", inventory->pieces);
    sv_json_put_integer(json, object, "largest_piece", inventory->largest_piece);
    sv_json_put_integer(json, object, "isolated", inventory->isolated);
    sv_json_put_integer(json, object, "dangling", inventory->dangling);
    sv_json_put_integer(json, object, "marks_matched", inventory->marks_matched);
    sv_json_put_integer(json, object, "marks_unmatched", inventory->marks_unmatched);
    sv_json_put_integer(json, object, "marks_merged", inventory->marks_merged);
    return object;
}

const char *sv_empty_words(const sv_sample *sample, sv_index count)
{
    if (count != sample->inventory.vacancies)
        return count == 1 ? "empty position" : "empty positions";
    return count == 1 ? "vacancy" : "vacancies";
}

void sv_inventory_words(const sv_sample *sample, char *text, size_t size)
{
    const sv_inventory *i = &sample->inventory;
    char largest[64] = "", removed[64] = "";
    if (i->pieces > 1)
        snprintf(largest, sizeof largest, " (largest: %lld sites)", (long long)i->largest_piece);
    if (i->removed_sites > 0)
        snprintf(removed, sizeof removed, ", %lld sites of other pieces removed",
                 (long long)i->removed_sites);
    snprintf(text, size, "%lld piece%s%s%s, %lld dangling, %lld isolated, imbalance %lld",
             (long long)i->pieces, i->pieces == 1 ? "" : "s", largest, removed,
             (long long)i->dangling, (long long)i->isolated, (long long)i->imbalance);
}

sv_status sv_inventory_text(sv_context *context, const sv_sample *sample, char **ret_text)
{
    char words[300];
    sv_inventory_words(sample, words, sizeof words);
    return sv_take_text(context, words, ret_text);
}

sv_status sv_sample_json(sv_context *context, const sv_sample_result *result, char **ret_text)
{
    sv_json json = {.context = context};
    json_t *document = json_object();
    sv_json_put_integer(&json, document, "selvedge", 1);
    sv_json_put_text(&json, document, "command", "draw");
    sv_json_put_text(&json, document, "title", result->title);
    sv_json_put_integer(&json, document, "realisation", result->realisation);
    sv_json_put_integer(&json, document, "sites", result->sample->n);
    sv_json_put(&json, document, "inventory", sv_json_inventory(&json, result->sample));
    return sv_json_finish(&json, document, ret_text);
}
