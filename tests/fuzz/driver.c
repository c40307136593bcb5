/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * Runs a fuzz target without libFuzzer: every kept input, then inputs made from them by damage
 * that a fixed seed decides. Speaks TAP. An input that breaks the target is left as a file.
 *
 * usage: fuzz-TARGET [-n INPUTS] [-s SEED] [-w WORDS] [-o FOLDER] FILE|FOLDER…
 */
#include "fuzz.h"

#include <dirent.h>
#include <fcntl.h>
#include <signal.h>
#include <stdio.h>
#include <sys/stat.h>
#include <sys/time.h>
#include <time.h>
#include <unistd.h>

enum { MOST_INPUTS = 5000, MOST_WORDS = 500, MOST_BYTES = 1 << 16, SECONDS_AN_INPUT = 20 };

#pragma weak LLVMFuzzerCustomMutator

typedef struct piece {
    uint8_t *data;
    size_t size;
} piece;

static piece inputs[MOST_INPUTS], words[MOST_WORDS];
static int n_inputs, n_words;
static uint64_t state;
/* The input being run, for the signal handler. */
static const uint8_t *volatile current;
static volatile size_t current_size;
static char left_over[300] = "broken-input";

/* SplitMix64 (Steele, Lea, Flood, OOPSLA 2014; constants recalled from memory). */
static uint64_t next_random(void)
{
    uint64_t z = state += UINT64_C(0x9e3779b97f4a7c15);
    z = (z ^ z >> 30) * UINT64_C(0xbf58476d1ce4e5b9);
    z = (z ^ z >> 27) * UINT64_C(0x94d049bb133111eb);
    return z ^ z >> 31;
}

static size_t below(size_t n)
{
    return n == 0 ? 0 : (size_t)(next_random() % n);
}

/* Puts `n` bytes in place of `gone` bytes at `at`; what does not fit is cut off. */
static size_t replace(uint8_t *data, size_t size, size_t most, size_t at, size_t gone,
                      const uint8_t *with, size_t n)
{
    if (gone > size - at)
        gone = size - at;
    if (size - gone + n > most)
        return size;
    memmove(data + at + n, data + at + gone, size - at - gone);
    memcpy(data + at, with, n);
    return size - gone + n;
}

size_t LLVMFuzzerMutate(uint8_t *data, size_t size, size_t most)
{
    static const int64_t edges[] = {0,   1,     -1,    127,       128,      255,
                                    256, 32767, 65535, INT32_MAX, INT32_MIN};
    uint8_t chunk[64];
    const size_t at = below(size + 1);
    const piece *other = &inputs[below((size_t)n_inputs)], *word = &words[below((size_t)n_words)];
    switch (below(8)) {
    case 0: /* one bit */
        if (at < size)
            data[at] ^= (uint8_t)(1U << below(8));
        return size;
    case 1: /* one byte */
        chunk[0] = (uint8_t)next_random();
        return replace(data, size, most, at, below(2), chunk, 1);
    case 2: /* less */
        return replace(data, size, most, at, 1 + below(below(4) == 0 ? 200 : 8), chunk, 0);
    case 3: { /* a piece of itself again, elsewhere */
        const size_t from = below(size + 1), left = size - from;
        const size_t n = below((left < sizeof chunk ? left : sizeof chunk) + 1);
        memcpy(chunk, data + from, n);
        return replace(data, size, most, at, below(2) == 0 ? n : 0, chunk, n);
    }
    case 4: { /* a binary number at an edge */
        const int64_t number = edges[below(sizeof edges / sizeof *edges)];
        const size_t n = (size_t)1 << below(4);
        memcpy(chunk, &number, 8);
        return replace(data, size, most, at, n, chunk, n);
    }
    case 5: { /* the end of another input */
        const size_t from = below(other->size + 1);
        return replace(data, size, most, at, size, other->data + from, other->size - from);
    }
    default: /* a word of the trade */
        return n_words == 0 ? size
                            : replace(data, size, most, at, below(2) == 0 ? word->size : 0,
                                      word->data, word->size);
    }
}

static void on_signal(int number)
{
    static const char said[] = "not ok - an input broke the target; it is kept as ";
    const int fd = open(left_over, O_WRONLY | O_CREAT | O_TRUNC | O_CLOEXEC, 0644);
    if (fd >= 0 && write(fd, (const void *)current, current_size) == (ssize_t)current_size &&
        write(STDOUT_FILENO, said, sizeof said - 1) > 0 &&
        write(STDOUT_FILENO, left_over, strlen(left_over)) > 0 && write(STDOUT_FILENO, "\n", 1) > 0)
        close(fd);
    signal(number, SIG_DFL);
    raise(number);
}

/* The bytes lie in a block of their own, so that a checker sees a step beyond the end. */
static void run(const uint8_t *data, size_t size)
{
    uint8_t *copy = malloc(size + (size == 0));
    fuzz_require(copy != NULL, "no memory for an input");
    memcpy(copy, data, size);
    current = copy;
    current_size = size;
    /* Processor time: a machine with much else to do is no fault of the input. */
    const struct itimerval patience = {.it_value = {.tv_sec = SECONDS_AN_INPUT}};
    setitimer(ITIMER_PROF, &patience, NULL);
    LLVMFuzzerTestOneInput(copy, size);
    free(copy);
}

static bool load(const char *path)
{
    FILE *stream = fopen(path, "rb");
    uint8_t *data = malloc(MOST_BYTES);
    if (stream == NULL || data == NULL || n_inputs == MOST_INPUTS)
        return false;
    inputs[n_inputs++] = (piece){data, fread(data, 1, MOST_BYTES, stream)};
    fclose(stream);
    return true;
}

static int visible(const struct dirent *entry)
{
    return entry->d_name[0] != '.';
}

/* A file, or the files of a folder by name. */
static bool load_all(const char *path)
{
    struct dirent **entries = NULL;
    struct stat info;
    char name[1000];
    if (stat(path, &info) != 0)
        return false;
    if (!S_ISDIR(info.st_mode))
        return load(path);
    const int n = scandir(path, &entries, visible, alphasort);
    bool good = n > 0;
    for (int i = 0; i < n; i++) {
        snprintf(name, sizeof name, "%s/%s", path, entries[i]->d_name);
        good = load(name) && good;
        free(entries[i]);
    }
    free(entries);
    return good;
}

/* Lines "word" with \xHH, \\ and \" (the format of libFuzzer's dictionaries, without names). */
static bool load_words(const char *path)
{
    FILE *stream = fopen(path, "r");
    char line[300];
    if (stream == NULL)
        return false;
    while (n_words < MOST_WORDS && fgets(line, sizeof line, stream) != NULL) {
        uint8_t *word = line[0] == '"' ? malloc(sizeof line) : NULL;
        size_t n = 0;
        unsigned byte;
        for (const char *at = line + 1; word != NULL && *at != '"' && *at != '\0'; at++)
            if (*at == '\\' && sscanf(at + 1, "x%2x", &byte) == 1) {
                word[n++] = (uint8_t)byte;
                at += 3;
            } else {
                at += *at == '\\';
                word[n++] = (uint8_t)*at;
            }
        if (word != NULL)
            words[n_words++] = (piece){word, n};
    }
    fclose(stream);
    return true;
}

static void run_damaged(long count, uint64_t seed)
{
    static uint8_t data[MOST_BYTES];
    for (long k = 0; k < count; k++) {
        state = seed * UINT64_C(1000000007) + (uint64_t)k;
        const piece *from = &inputs[below((size_t)n_inputs)];
        size_t size = from->size;
        memcpy(data, from->data, size);
        for (size_t step = 1 + below(4); step > 0; step--)
            size = LLVMFuzzerCustomMutator != NULL
                       ? LLVMFuzzerCustomMutator(data, size, MOST_BYTES, (unsigned)next_random())
                       : LLVMFuzzerMutate(data, size, MOST_BYTES);
        run(data, size);
    }
}

int main(int argc, char **argv)
{
    static const int caught[] = {SIGSEGV, SIGABRT, SIGBUS, SIGFPE, SIGILL, SIGPROF};
    long count = 0;
    uint64_t seed = 1;
    bool good = true;
    for (int option; (option = getopt(argc, argv, "n:s:w:o:")) != -1;) {
        count = option == 'n' ? atol(optarg) : count;
        seed = option == 's' ? strtoull(optarg, NULL, 10) : seed;
        good = (option != 'w' || load_words(optarg)) && option != '?' && good;
        if (option == 'o')
            snprintf(left_over, sizeof left_over, "%s/broken-%s", optarg,
                     strrchr(argv[0], '/') != NULL ? strrchr(argv[0], '/') + 1 : argv[0]);
    }
    for (int i = optind; i < argc; i++)
        good = load_all(argv[i]) && good;
    if (!good || n_inputs == 0) {
        fprintf(stderr, "usage: %s [-n INPUTS] [-s SEED] [-w WORDS] [-o FOLDER] FILE|FOLDER...\n",
                argv[0]);
        return 2;
    }
    for (size_t i = 0; i < sizeof caught / sizeof *caught; i++)
        signal(caught[i], on_signal);
    setvbuf(stdout, NULL, _IOLBF, 0);
    printf("1..2\n");
    for (int i = 0; i < n_inputs; i++)
        run(inputs[i].data, inputs[i].size);
    printf("ok 1 - %d kept inputs\n", n_inputs);
    const clock_t start = clock();
    run_damaged(count, seed);
    const double seconds = (double)(clock() - start) / CLOCKS_PER_SEC;
    printf("ok 2 - %ld damaged inputs from seed %llu\n", count, (unsigned long long)seed);
    printf("# %.0f inputs per second of processor time\n", (double)count / (seconds + 1e-9));
    for (int i = 0; i < n_inputs; i++)
        free(inputs[i].data);
    for (int i = 0; i < n_words; i++)
        free(words[i].data);
    return 0;
}
