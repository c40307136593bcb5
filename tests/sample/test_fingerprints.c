/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The same seed gives the same sample for ever: one stored number per kind of disorder. A change of
 * one of them breaks every published seed and needs a new version of the sheet. */
#include "fixtures.h"

/* FNV-1a over what is left and the matrix, elements rounded to 1e-7 so that the last bits of a
 * mathematical library do not matter. */
static uint64_t mix(uint64_t hash, int64_t value)
{
    for (int byte = 0; byte < 8; byte++)
        hash = (hash ^ (uint64_t)((value >> (8 * byte)) & 0xff)) * 1099511628211u;
    return hash;
}

static uint64_t fingerprint(const char *model_name, const double *numbers, const sv_disorder *d,
                            int n)
{
    sv_model model = fixture_model(model_name, numbers);
    sv_flake_spec spec = fixture_cells(&model, 16, 14, false);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_sample s = {0};
    uint64_t hash = 14695981039346656037u;
    CHECK_OK(sv_sample_draw(test_context(), &flake, d, n, 2026, 3, &s));
    const sv_sparse *h = &s.hamiltonian;
    for (sv_index r = 0; r < s.n; r++) {
        hash = mix(hash, s.pristine[r]);
        for (sv_index k = h->row_start[r]; k < h->row_start[r + 1]; k++) {
            hash = mix(hash, h->column[k]);
            hash = mix(hash, llround(creal(h->value[k]) * 1e7));
            hash = mix(hash, llround(cimag(h->value[k]) * 1e7));
        }
    }
    sv_sample_free(test_context(), &s);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
    return hash;
}

static const double haldane[] = {1.0, 0.2, 1.1, 0.1}, square[] = {-1.0};

static void check(const char *what, const double *numbers, const sv_disorder *d, int n,
                  uint64_t wanted)
{
    uint64_t found = fingerprint(numbers == haldane ? "haldane" : "qi_wu_zhang", numbers, d, n);
    test_check(found == wanted, __FILE__, __LINE__, "%s: 0x%016llx, stored 0x%016llx", what,
               (unsigned long long)found, (unsigned long long)wanted);
}

#define VACANCIES .name = "vac", .type = SV_DISORDER_VACANCIES, .on = -1
#define ONSITE    .name = "pot", .type = SV_DISORDER_ONSITE, .on = -1

SV_TEST(vacancies_keep_their_numbers)
{
    check("share", haldane, &(sv_disorder){VACANCIES, .has_share = true, .share = 0.1}, 1,
          0x2a06e2bd2e64d606);
    check("count", haldane, &(sv_disorder){VACANCIES, .has_count = true, .count = 21}, 1,
          0x45453f5ea4c686e2);
    check("clusters", haldane,
          &(sv_disorder){VACANCIES, .has_share = true, .share = 0.1, .cluster_size = 4,
                         .cluster_radius = 1.3},
          1, 0xe115fca72a1d3cc4);
    check("distance", haldane,
          &(sv_disorder){VACANCIES, .has_share = true, .share = 0.05, .distance = 1.1}, 1,
          0xc96503e3b426d445);
}

SV_TEST(energies_keep_their_numbers)
{
    for (int law = SV_BOX; law <= SV_BINARY; law++) {
        static const uint64_t wanted[] = {0x8873ee26c577043a, 0x676775eef0d27ade,
                                          0xb4537465e161e53a};
        check("onsite", haldane,
              &(sv_disorder){ONSITE, .width = 1.5, .distribution = (sv_distribution)law}, 1,
              wanted[law]);
    }
    for (int law = 0; law < 2; law++) {
        static const uint64_t wanted[] = {0x2a7b3a228918ba2d, 0xe66bb3fc85851160};
        check("correlated", square,
              &(sv_disorder){ONSITE, .width = 0.4, .distribution = SV_CORRELATED, .length = 2.5,
                             .covariance = (sv_covariance)law},
              1, wanted[law]);
    }
    check("puddles", square,
          &(sv_disorder){ONSITE, .distribution = SV_PUDDLES, .density = 0.1, .strength = 0.5,
                         .depth = 1.0, .screening = 2.0},
          1, 0x868ed0ebbe557886);
    check("mass", haldane,
          &(sv_disorder){.name = "m", .type = SV_DISORDER_MASS, .on = -1, .width = 0.3}, 1,
          0x7e2594513475b3e1);
    check("point defects", square,
          &(sv_disorder){
              .name = "m", .type = SV_DISORDER_MASS, .on = -1, .strength = 0.3, .density = 0.7},
          1, 0xe96acd40e33b202d);
}

SV_TEST(hops_and_regions_keep_their_numbers)
{
    const sv_disorder rows[] = {
        {.name = "hop", .type = SV_DISORDER_HOPPING, .on = -1, .width = 0.3, .phase = 0.4},
        {.name = "flux", .type = SV_DISORDER_FLUX, .on = -1, .width = 0.3},
        {.name = "flux", .type = SV_DISORDER_FLUX, .on = -1, .width = 0.3, .independent = true},
        {.name = "ad",
         .type = SV_DISORDER_ADATOMS,
         .on = -1,
         .has_share = true,
         .share = 0.1,
         .energy = 0.2,
         .coupling = 1.1},
        {.name = "crack",
         .type = SV_DISORDER_CRACKS,
         .on = -1,
         .density = 0.02,
         .length = 4,
         .exponential = true},
        {.name = "dom",
         .type = SV_DISORDER_DOMAINS,
         .on = -1,
         .share = 0.5,
         .length = 5,
         .jump = 1,
         .wall = 1},
        {.name = "rim", .type = SV_DISORDER_ROUGHNESS, .on = -1, .amplitude = 3, .length = 2},
        {.name = "step",
         .type = SV_DISORDER_STEPS,
         .on = -1,
         .from = {5, 5},
         .angle = 0.3,
         .jump = 0.4,
         .spacing = 3,
         .amplitude = 1,
         .length = 2},
    };
    static const uint64_t wanted[] = {0xef802b13b0513fce, 0x04f677aa1fd1f4f6, 0x8663fc5d59268843,
                                      0xe84def2bde048715, 0x32822f2651701999, 0xf402b8cf20706400,
                                      0x1e4127340a694987, 0xaf5763fde1c2de5e};
    for (int k = 0; k < 8; k++)
        check(rows[k].name, haldane, &rows[k], 1, wanted[k]);
}
