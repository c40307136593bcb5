/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "selvedge/base.h"

#include <string.h>

int sv_kind_find_key(const sv_kind *kind, const char *name)
{
    for (int i = 0; i < kind->n_keys; i++)
        if (strcmp(kind->keys[i].name, name) == 0)
            return i;
    return -1;
}

static int smallest(int a, int b, int c)
{
    int least = a < b ? a : b;
    return least < c ? least : c;
}

int sv_edit_distance(const char *a, const char *b)
{
    enum { LONGEST = 64 };
    size_t length_a = strlen(a), length_b = strlen(b);
    if (length_a > LONGEST || length_b > LONGEST)
        return LONGEST;
    int before[LONGEST + 1], previous[LONGEST + 1], row[LONGEST + 1];
    for (size_t j = 0; j <= length_b; j++)
        previous[j] = before[j] = (int)j;
    for (size_t i = 1; i <= length_a; i++) {
        row[0] = (int)i;
        for (size_t j = 1; j <= length_b; j++) {
            int differs = a[i - 1] != b[j - 1];
            row[j] = smallest(row[j - 1] + 1, previous[j] + 1, previous[j - 1] + differs);
            bool swapped = i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1];
            if (swapped && before[j - 2] + 1 < row[j])
                row[j] = before[j - 2] + 1;
        }
        memcpy(before, previous, sizeof before);
        memcpy(previous, row, sizeof previous);
    }
    return previous[length_b];
}
