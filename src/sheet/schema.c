/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The one table of what a sheet may say. A block is a row of `blocks`; its keys are sv_key rows,
 * those of kinds (models, shapes, disorder) come from the layers that own them. Validation,
 * defaults, the list of keys, the resolved sheet and the identity all walk these rows. */
#include "sheet_internal.h"

#include <float.h>
#include <string.h>

static const sv_key root_keys[] = {
    {.name = "selvedge",
     .type = SV_KEY_INTEGER,
     .low = 1,
     .high = 1,
     .required = true,
     .doc = "version of the sheet: 1"},
    {.name = "title", .type = SV_KEY_TEXT, .fallback = "", .doc = "one line about the sheet"},
};

static const sv_key model_keys[] = {
    {.name = "name", .type = SV_KEY_TEXT, .required = true, .doc = "which model"},
    {.name = "lattice_constant",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_LENGTH,
     .low = 0,
     .low_open = true,
     .high = DBL_MAX,
     .doc = "with a unit; gives lengths, areas and densities a meaning"},
    {.name = "energy_unit",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_ENERGY,
     .low = 0,
     .low_open = true,
     .high = DBL_MAX,
     .doc = "with a unit: what a bare 1 is worth (1 eV once any energy carries a unit)"},
    {.name = "preset",
     .type = SV_KEY_TEXT,
     .doc = "a material that gives the keys not written here: selvedge help presets"},
};

static const sv_key flake_keys[] = {
    {.name = "shape", .type = SV_KEY_TEXT, .required = true, .doc = "which shape"},
    {.name = "boundary",
     .type = SV_KEY_CHOICE_PAIR,
     .choices = "open periodic",
     .fallback = "open",
     .doc = "of both directions, or [along the first, along the second]"},
    {.name = "keep",
     .type = SV_KEY_CHOICE,
     .choices = "all largest",
     .fallback = "all",
     .doc = "all connected pieces, or only the largest of each sample"},
};

static const sv_key disorder_keys[] = {
    {.name = "name",
     .type = SV_KEY_TEXT,
     .doc = "what a sweep points at, and the name of its random numbers (default: the kind)"},
    {.name = "kind", .type = SV_KEY_TEXT, .required = true, .doc = "which kind of disorder"},
};

static const sv_key occupation_keys[] = {
    {.name = "fermi_energy",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_ENERGY,
     .low = -1e12,
     .high = 1e12,
     .fallback = "0",
     .doc = "states below it are occupied"},
    {.name = "filling",
     .type = SV_KEY_REAL,
     .low = 0,
     .high = 1,
     .doc = "share of the states present"},
    {.name = "electrons",
     .type = SV_KEY_INTEGER,
     .low = 0,
     .high = 1e12,
     .doc = "number of occupied states"},
};

static const sv_key ensemble_keys[] = {
    {.name = "realisations",
     .type = SV_KEY_INTEGER,
     .low = 1,
     .high = 1e9,
     .fallback = "1",
     .doc = "samples per point of the sweep"},
    {.name = "seed",
     .type = SV_KEY_INTEGER,
     .low = 0,
     .high = 4294967295.0,
     .fallback = "1",
     .doc = "of all random numbers"},
    {.name = "site_maps",
     .type = SV_KEY_FLAG,
     .fallback = "false",
     .doc = "mean and deviation of the local Chern marker of every site; every site is computed"},
};

static const sv_key stop_keys[] = {
    {.name = "standard_error",
     .type = SV_KEY_REAL,
     .low = 0,
     .low_open = true,
     .high = 1e6,
     .doc = "stop once the mean is known this well (skewed values count as wider)"},
    {.name = "share_width",
     .type = SV_KEY_REAL,
     .low = 0,
     .low_open = true,
     .high = 1,
     .doc = "stop once Wilson's 95 % interval of the most frequent index is this narrow"},
    {.name = "time",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_TIME,
     .low = 0,
     .low_open = true,
     .high = 1e12,
     .doc = "stop once the realisations have taken this much computing (of one thread, all points "
            "together); what counts then depends on the machine"},
    {.name = "of",
     .type = SV_KEY_TEXT,
     .doc = "which marker (may be left out when there is only one)"},
    {.name = "at_least",
     .type = SV_KEY_INTEGER,
     .low = 2,
     .high = 1e9,
     .fallback = "50",
     .doc = "realisations before the rule may hold"},
};

static const sv_key sweep_keys[] = {
    {.name = "parameter",
     .type = SV_KEY_TEXT,
     .required = true,
     .doc = "dotted path of a number, or of a pair such as flake.cells"},
    {.name = "from", .type = SV_KEY_TREE, .doc = "first value"},
    {.name = "to", .type = SV_KEY_TREE, .doc = "last value"},
    {.name = "steps",
     .type = SV_KEY_INTEGER,
     .low = 2,
     .high = 100000,
     .doc = "number of points, both ends included"},
    {.name = "values",
     .type = SV_KEY_TREE,
     .doc = "[v1, v2, …] instead of from, to, steps; a size n stands for [n, n]"},
};

static const sv_key question_keys[] = {
    {.name = "parameter", .type = SV_KEY_TEXT, .required = true, .doc = "dotted path of a number"},
    {.name = "range",
     .type = SV_KEY_TREE,
     .required = true,
     .doc = "[lowest, highest] value to look at; the criterion should hold at the lowest"},
    {.name = "precision",
     .type = SV_KEY_TREE,
     .required = true,
     .doc = "half width of the interval wanted"},
    {.name = "confidence",
     .type = SV_KEY_REAL,
     .low = 0.5,
     .high = 0.999,
     .fallback = "0.95",
     .doc = "of the interval"},
    {.name = "sizes",
     .type = SV_KEY_TREE,
     .doc = "[[n1, n2], …] cells of the flakes to ask; left out: the flake of the sheet"},
    {.name = "most",
     .type = SV_KEY_INTEGER,
     .low = 100,
     .high = 1e8,
     .fallback = "20000",
     .doc = "realisations at most for one threshold"},
};

static const sv_key criterion_keys[] = {
    {.name = "quantity",
     .type = SV_KEY_TEXT,
     .required = true,
     .doc = "a marker (judged by its samples) or MARKER.mean"},
    {.name = "within",
     .type = SV_KEY_REAL,
     .low = 0,
     .low_open = true,
     .high = 1e6,
     .doc = "half width of the band about the clean value"},
    {.name = "share",
     .type = SV_KEY_REAL,
     .low = 0,
     .low_open = true,
     .high = 1,
     .doc = "of the samples in the band, or with the clean index"},
};

static const sv_key budget_keys[] = {
    {.name = "parameter", .type = SV_KEY_TEXT, .required = true, .doc = "dotted path of a number"},
    {.name = "values", .type = SV_KEY_TREE, .required = true, .doc = "[v1, v2, …] in any order"},
};

static const sv_key plateau_keys[] = {
    {.name = "energies",
     .type = SV_KEY_REAL_PAIR,
     .dimension = SV_DIM_ENERGY,
     .low = -1e12,
     .high = 1e12,
     .required = true,
     .doc = "[lowest, highest] Fermi energy"},
    {.name = "points",
     .type = SV_KEY_INTEGER,
     .low = 3,
     .high = 10001,
     .fallback = "101",
     .doc = "number of energies, both ends included"},
    {.name = "of",
     .type = SV_KEY_TEXT,
     .doc = "which marker (may be left out when there is only one)"},
    {.name = "within",
     .type = SV_KEY_REAL,
     .low = 0,
     .low_open = true,
     .high = 10,
     .fallback = "0.05",
     .doc = "half width of the band about the clean value"},
    {.name = "temperatures", .type = SV_KEY_TREE, .doc = "[0 K, 4 K, …]; left out: 0 K alone"},
};

static const sv_key finite_size_keys[] = {
    {.name = "of",
     .type = SV_KEY_TEXT,
     .doc = "which marker (may be left out when there is only one)"},
    {.name = "range",
     .type = SV_KEY_TREE,
     .doc = "[lowest, highest] value of the other axis that counts (default: chosen by the fit)"},
    {.name = "order",
     .type = SV_KEY_INTEGER,
     .low = 1,
     .high = 9,
     .doc = "of the polynomial for the scaling function (default: chosen by the fit)"},
    {.name = "correction",
     .type = SV_KEY_CHOICE,
     .choices = "none fixed free",
     .fallback = "none",
     .doc = "term L^-y for small sizes: none, with y given by exponent, or y fitted"},
    {.name = "exponent",
     .type = SV_KEY_REAL,
     .low = 0,
     .low_open = true,
     .high = 20,
     .doc = "y of a fixed correction"},
    {.name = "resamples",
     .type = SV_KEY_INTEGER,
     .low = 50,
     .high = 100000,
     .fallback = "400",
     .doc = "of the bootstrap that gives the errors"},
    {.name = "confidence",
     .type = SV_KEY_REAL,
     .low = 0.5,
     .low_open = true,
     .high = 0.999,
     .fallback = "0.95",
     .doc = "of the intervals"},
};

static const sv_key solve_keys[] = {
    {.name = "engine",
     .type = SV_KEY_CHOICE,
     .choices = "auto dense chebyshev rational",
     .fallback = "auto",
     .doc = "how occupied states are projected on"},
    {.name = "accuracy",
     .type = SV_KEY_REAL,
     .low = 1e-14,
     .high = 0.1,
     .fallback = "1e-6",
     .doc = "numerical error allowed per value, units of the marker"},
    {.name = "sampling_error",
     .type = SV_KEY_REAL,
     .low = 0,
     .low_open = true,
     .high = 1,
     .fallback = "0.005",
     .doc = "error allowed of a window mean that is sampled"},
    {.name = "estimator",
     .type = SV_KEY_CHOICE,
     .choices = "auto cells random_phase",
     .fallback = "auto",
     .doc = "window mean: auto (every site, of large windows sampled cells), cells, or vectors of "
            "random phases"},
};

#define KEYS(rows) .keys = rows, .n_keys = (int)(sizeof rows / sizeof rows[0])

/* Parents stand before their children, and `model` first of all: it fixes the units. */
static const sv_block blocks[] = {
    {.name = "", .doc = "the sheet", .required = true, KEYS(root_keys)},
    {.parent = "",
     .name = "model",
     .doc = "the clean lattice model",
     .required = true,
     KEYS(model_keys),
     .kind_key = "name",
     .kinds = sv_model_kinds},
    {.parent = "",
     .name = "flake",
     .doc = "shape, size and boundary",
     .required = true,
     KEYS(flake_keys),
     .kind_key = "shape",
     .kinds = sv_shape_kinds},
    {.parent = "",
     .name = "disorder",
     .doc = "list of defects and potentials, applied in order",
     .form = SV_BLOCK_LIST,
     .max_entries = 64,
     KEYS(disorder_keys),
     .kind_key = "kind",
     .kinds = sv_disorder_kinds},
    {.parent = "",
     .name = "occupation",
     .doc = "which states are occupied; one of its keys",
     .exclusive = "fermi_energy filling electrons",
     KEYS(occupation_keys)},
    {.parent = "",
     .name = "markers",
     .doc = "what is computed",
     .form = SV_BLOCK_NAMED,
     .fallback = "local_chern"},
    {.parent = "", .name = "ensemble", .doc = "how many realisations", KEYS(ensemble_keys)},
    {.parent = "ensemble",
     .name = "stop",
     .doc = "when fewer realisations are enough",
     .optional_section = true,
     KEYS(stop_keys)},
    {.parent = "",
     .name = "sweep",
     .doc = "list of one or two axes",
     .form = SV_BLOCK_LIST,
     .max_entries = 2,
     KEYS(sweep_keys)},
    {.parent = "",
     .name = "question",
     .doc = "for the command tolerance: how much of one parameter is tolerable",
     .optional_section = true,
     KEYS(question_keys)},
    {.parent = "question",
     .name = "criterion",
     .doc = "what must hold",
     .required = true,
     KEYS(criterion_keys)},
    {.parent = "question",
     .name = "budget",
     .doc = "the same question at several values of a second parameter",
     .optional_section = true,
     KEYS(budget_keys)},
    {.parent = "",
     .name = "plateau",
     .doc = "for the command plateau: the marker against the Fermi energy",
     .optional_section = true,
     KEYS(plateau_keys)},
    {.parent = "",
     .name = "finite_size",
     .doc = "for a sweep over the size of the flake and another parameter: where the curves cross",
     .optional_section = true,
     KEYS(finite_size_keys)},
    {.parent = "", .name = "solve", .doc = "engine and accuracy", KEYS(solve_keys)},
};
enum { N_BLOCKS = sizeof blocks / sizeof blocks[0] };

const sv_block *sv_schema_blocks(int *ret_count)
{
    *ret_count = N_BLOCKS;
    return blocks;
}

const sv_block *sv_schema_find(const char *name)
{
    for (int i = 0; i < N_BLOCKS; i++)
        if (strcmp(blocks[i].name, name) == 0)
            return &blocks[i];
    return NULL;
}

const sv_block *sv_schema_child(const sv_block *parent, const sv_block *previous)
{
    int first = previous == NULL ? 0 : (int)(previous - blocks) + 1;
    for (int i = first; i < N_BLOCKS; i++)
        if (blocks[i].parent != NULL && strcmp(blocks[i].parent, parent->name) == 0)
            return &blocks[i];
    return NULL;
}

bool sv_schema_is_scale(const sv_key *key)
{
    return key == &model_keys[1] || key == &model_keys[2] || sv_schema_is_grid(key);
}

bool sv_schema_is_grid(const sv_key *key)
{
    return key->dimension == SV_DIM_LENGTH && strcmp(key->name, "grid") == 0;
}
