/* Loading a table: every file is read and split first, then taken in by kind, so that the order of
 * the files does not matter. */
#include "base/grow.h"
#include "reference/reference_internal.h"

#include <dirent.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#define PATH_TEXT_MAX 4096

/* The files read so far. */
struct file_list {
    struct table_file *files;
    bool *from_user;
    size_t count;
    size_t capacity;
    size_t user_capacity;
};

static const struct {
    enum table_kind kind;
    void (*take)(struct loader *loader, const struct table_file *file);
} stages[] = {
    {TABLE_ATOMIC_WEIGHTS, take_atomic_weights},
    {TABLE_SOURCES, take_sources},
    {TABLE_HAZARDS, take_hazards},
    {TABLE_ACIDS, take_acids},
    {TABLE_CONSTANTS, take_constants},
    {TABLE_FORMS, take_forms},
    {TABLE_TITRANTS, take_titrants},
    {TABLE_INDICATORS, take_indicators},
    {TABLE_BUFFERS, take_buffers},
    {TABLE_STANDARDS, take_standards},
};

static enum wa_status add_file(struct loader *loader, struct file_list *list, const char *path,
                               enum table_kind wanted, bool user, struct wa_error *error)
{
    if (!wa_grow(&list->files, &list->capacity, list->count + 1, sizeof *list->files) ||
        !wa_grow(&list->from_user, &list->user_capacity, list->count + 1,
                 sizeof *list->from_user)) {
        return wa_fail_memory(error);
    }
    enum wa_status status = table_file_read(loader, path, wanted, &list->files[list->count], error);
    if (status == WA_OK) {
        list->from_user[list->count] = user;
        list->count++;
    }
    return status;
}

/* The table's own folder: the files that matter must be there, the others may be missing. */
static enum wa_status add_folder(struct loader *loader, struct file_list *list, const char *folder,
                                 struct wa_error *error)
{
    for (enum table_kind kind = 0; kind < TABLE_KINDS; kind++) {
        char path[PATH_TEXT_MAX];
        snprintf(path, sizeof path, "%s/%s", folder, table_kind_file(kind));
        bool needed = kind == TABLE_ACIDS || kind == TABLE_CONSTANTS || kind == TABLE_FORMS ||
                      kind == TABLE_ATOMIC_WEIGHTS;
        if (access(path, R_OK) != 0 && !needed) {
            continue;
        }
        if (access(path, R_OK) != 0) {
            return wa_fail(error, WA_ERROR_FILE, path, 0,
                           "The table's folder needs this file; check the folder's name.");
        }
        enum wa_status status = add_file(loader, list, path, kind, false, error);
        if (status != WA_OK) {
            return status;
        }
    }
    return WA_OK;
}

static int is_csv(const struct dirent *entry)
{
    size_t length = strlen(entry->d_name);
    return length > 4 && strcasecmp(entry->d_name + length - 4, ".csv") == 0;
}

/* A user's file, or every CSV file of a user's folder in the order of their names. */
static enum wa_status add_also(struct loader *loader, struct file_list *list, const char *path,
                               struct wa_error *error)
{
    struct stat about;
    if (stat(path, &about) != 0 || !S_ISDIR(about.st_mode)) {
        return add_file(loader, list, path, TABLE_KINDS, true, error);
    }
    struct dirent **entries = NULL;
    int count = scandir(path, &entries, is_csv, alphasort);
    enum wa_status status = WA_OK;
    if (count <= 0) {
        status = wa_fail(error, WA_ERROR_FILE, path, 0,
                         "The folder holds no CSV file to lay over the table.");
    }
    for (int i = 0; i < count; i++) {
        char file[PATH_TEXT_MAX];
        snprintf(file, sizeof file, "%s/%s", path, entries[i]->d_name);
        if (status == WA_OK) {
            status = add_file(loader, list, file, TABLE_KINDS, true, error);
        }
        free(entries[i]);
    }
    free(entries);
    return status;
}

static void take_files(struct loader *loader, const struct file_list *list)
{
    for (size_t stage = 0; stage < sizeof stages / sizeof stages[0]; stage++) {
        /* The table's own rows first, so that the user's are laid over them. */
        for (int user = 0; user < 2; user++) {
            loader->user = user == 1;
            for (size_t i = 0; i < list->count && !loader->out_of_memory; i++) {
                if (list->files[i].kind == stages[stage].kind &&
                    list->from_user[i] == loader->user) {
                    stages[stage].take(loader, &list->files[i]);
                }
            }
        }
        if (stages[stage].kind == TABLE_ATOMIC_WEIGHTS) {
            settle_ions(loader->table.storage);
        }
        if (stages[stage].kind == TABLE_CONSTANTS && !loader->out_of_memory) {
            settle_acids(loader);
        }
    }
    if (!loader->out_of_memory) {
        settle_names(loader);
    }
}

static int compare_problems(const void *left, const void *right)
{
    const struct wa_table_problem *first = left;
    const struct wa_table_problem *second = right;
    int order = strcmp(first->file, second->file);
    return order != 0 ? order : (first->line > second->line) - (first->line < second->line);
}

static enum wa_status finish(struct loader *loader, const char *folder, struct wa_error *error)
{
    struct wa_table *table = &loader->table;
    if (loader->out_of_memory) {
        return wa_fail_memory(error);
    }
    if (table->storage->element_count == 0) {
        return wa_fail(error, WA_ERROR_INPUT, folder, 0,
                       "atomic-weights.csv holds no element that can be used.");
    }
    if (table->acid_count == 0) {
        return wa_fail(error, WA_ERROR_INPUT, folder, 0,
                       "acids.csv and constants.csv hold no acid that can be used%s%s",
                       table->problem_count > 0 ? "; the first problem: " : ".",
                       table->problem_count > 0 ? table->problems[0].sentence : "");
    }
    if (table->problem_count > 1) {
        qsort(table->problems, table->problem_count, sizeof *table->problems, compare_problems);
    }
    snprintf(table->version, sizeof table->version, "%016llx", (unsigned long long)loader->hash);
    return WA_OK;
}

enum wa_status wa_table_load(const char *folder, const char *const *also, size_t also_count,
                             struct wa_table *table, struct wa_error *error)
{
    struct loader loader = {.hash = UINT64_C(14695981039346656037)};
    struct file_list list = {0};
    loader.table.storage = calloc(1, sizeof *loader.table.storage);
    if (loader.table.storage == NULL) {
        return wa_fail_memory(error);
    }
    enum wa_status status = add_folder(&loader, &list, folder, error);
    for (size_t i = 0; i < also_count && status == WA_OK; i++) {
        status = add_also(&loader, &list, also[i], error);
    }
    if (status == WA_OK) {
        take_files(&loader, &list);
        status = finish(&loader, folder, error);
    }
    for (size_t i = 0; i < list.count; i++) {
        table_file_free(&list.files[i]);
    }
    free(list.files);
    free(list.from_user);
    for (size_t i = 0; i < TABLE_KINDS; i++) {
        name_index_free(&loader.keys[i]);
    }
    if (status != WA_OK) {
        wa_table_free(&loader.table);
        return status;
    }
    *table = loader.table;
    return WA_OK;
}

void wa_table_free(struct wa_table *table)
{
    if (table == NULL) {
        return;
    }
    free(table->acids);
    free(table->constants);
    free(table->forms);
    free(table->titrants);
    free(table->indicators);
    free(table->buffers);
    free(table->standards);
    free(table->sources);
    free(table->problems);
    storage_free(table->storage);
    *table = (struct wa_table){0};
}
