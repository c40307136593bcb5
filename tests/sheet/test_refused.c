/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Every file of tests/sheet/refused is refused at the place, with the message and the hint that
 * its first two lines announce: `# expect: LINE:COLUMN: message`, `# hint: part of the hint`. */
#include "sheet_testing.h"

#include <dirent.h>

/* The rest of line `number` (from 0) after its label; the text is the caller's. */
static void header_line(const char *text, int number, const char *label, char *rest, size_t size)
{
    rest[0] = '\0';
    for (int i = 0; i < number; i++)
        text = strchr(text, '\n') + 1;
    if (strncmp(text, label, strlen(label)) == 0)
        snprintf(rest, size, "%.*s", (int)(strcspn(text, "\n") - strlen(label)),
                 text + strlen(label));
}

static void check_file(const char *name)
{
    char path[1200], expect[400], hint[400];
    sv_diagnostics said = {0};
    sv_sheet *sheet = NULL;
    char *text = NULL;
    size_t size = 0;
    int line = 0, column = 0, used = 0;
    sv_sheet_options options = reading_options(NULL, 0);
    snprintf(path, sizeof path, "%s/%s", test_data("sheet/refused"), name);
    CHECK_OK(sv_read_file(test_context(), path, 1 << 20, &text, &size));
    header_line(text, 0, "# expect: ", expect, sizeof expect);
    header_line(text, 1, "# hint: ", hint, sizeof hint);
    test_check(sscanf(expect, "%d:%d: %n", &line, &column, &used) == 2, __FILE__, __LINE__,
               "%s announces no place", name);
    sv_status status = sv_sheet_read(test_context(), path, &options, &said, &sheet);
    test_check(status == SV_INVALID_INPUT, __FILE__, __LINE__, "%s gave %d", name, status);
    const sv_diagnostic *item = find_said(&said, line, column, expect + used);
    bool found =
        item != NULL && item->severity == SV_SEVERITY_ERROR && strcmp(item->file, path) == 0;
    bool hinted =
        found && (hint[0] == '\0' || (item->hint != NULL && strstr(item->hint, hint) != NULL));
    test_check(found && hinted, __FILE__, __LINE__, "%s: expected %s (%s)", name, expect, hint);
    if (!found || !hinted)
        show_said(&said);
    test_check(said.errors == 1 || strcmp(name, "custom_orbital_key.yaml") == 0, __FILE__, __LINE__,
               "%s gives %d errors", name, said.errors);
    sv_sheet_free(test_context(), sheet);
    sv_diagnostics_free(test_context(), &said);
    sv_give(test_context(), text);
}

SV_TEST(corpus_is_refused)
{
    int n = 0;
    DIR *folder = opendir(test_data("sheet/refused"));
    if (!CHECK(folder != NULL))
        return;
    for (struct dirent *entry; (entry = readdir(folder)) != NULL;) {
        if (strstr(entry->d_name, ".yaml") == NULL)
            continue;
        check_file(entry->d_name);
        n++;
    }
    closedir(folder);
    test_check(n >= 90, __FILE__, __LINE__, "only %d files", n);
}
