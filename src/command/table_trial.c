#include "command/table_trial.h"

#include "command/command.h"

#include "base/file.h"

#include <errno.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#define FILE_LIMIT ((size_t)32 << 20)

static const char *const own_files[] = {"acids.csv", "constants.csv", "forms.csv", "sources.csv"};
#define OWN_FILES (sizeof own_files / sizeof own_files[0])

bool trial_path(char path[TRIAL_PATH_MAX], const char *folder, const char *file)
{
    int length = snprintf(path, TRIAL_PATH_MAX, "%s/%s", folder, file);
    return length > 0 && length < TRIAL_PATH_MAX;
}

void trial_remove(const char *trial)
{
    for (size_t i = 0; i < OWN_FILES; i++) {
        char path[TRIAL_PATH_MAX];
        if (trial_path(path, trial, own_files[i])) {
            unlink(path);
        }
    }
    rmdir(trial);
}

static enum wa_status copy_file(const char *folder, const char *trial, const char *file,
                                struct wa_error *error)
{
    char from[TRIAL_PATH_MAX];
    char to[TRIAL_PATH_MAX];
    char *bytes = NULL;
    size_t size = 0;
    if (!trial_path(from, folder, file) || !trial_path(to, trial, file)) {
        return wa_fail(error, WA_ERROR_FILE, folder, 0, "The path is too long.");
    }
    if (access(from, F_OK) != 0) {
        return WA_OK;
    }
    enum wa_status status = wa_file_read(from, FILE_LIMIT, &bytes, &size, error);
    if (status == WA_OK) {
        status = wa_file_write(to, bytes, size, error);
    }
    free(bytes);
    return status;
}

enum wa_status trial_begin(const char *folder, char trial[TRIAL_PATH_MAX], struct wa_error *error)
{
    int length = snprintf(trial, TRIAL_PATH_MAX, "%s.XXXXXX", folder);
    if (length >= TRIAL_PATH_MAX || mkdtemp(trial) == NULL) {
        return wa_fail(error, WA_ERROR_FILE, folder, 0,
                       "Nothing can be written beside this folder: %s.", strerror(errno));
    }
    enum wa_status status = WA_OK;
    for (size_t i = 0; i < OWN_FILES && status == WA_OK; i++) {
        status = copy_file(folder, trial, own_files[i], error);
    }
    if (status != WA_OK) {
        trial_remove(trial);
    }
    return status;
}

enum wa_status trial_keep(const char *trial, const char *folder, struct wa_error *error)
{
    if (mkdir(folder, 0777) != 0 && errno != EEXIST) {
        return wa_fail(error, WA_ERROR_FILE, folder, 0, "The folder cannot be made: %s.",
                       strerror(errno));
    }
    for (size_t i = 0; i < OWN_FILES; i++) {
        char from[TRIAL_PATH_MAX];
        char to[TRIAL_PATH_MAX];
        if (!trial_path(from, trial, own_files[i]) || !trial_path(to, folder, own_files[i]) ||
            (access(from, F_OK) == 0 && rename(from, to) != 0)) {
            return wa_fail(error, WA_ERROR_FILE, folder, 0, "%s cannot be written there: %s.",
                           own_files[i], strerror(errno));
        }
    }
    return WA_OK;
}

int trial_check(const struct table_options *common, const char *trial)
{
    struct wa_table table;
    struct wa_error error;
    struct table_options options = *common;
    if (options.also_count == TABLE_ALSO_MAX) {
        options.also_count--;
    }
    options.also[options.also_count] = trial;
    const char *folder = options.folder != NULL ? options.folder : WHICHACID_REFERENCE_DIR;
    if (wa_table_load(folder, options.also, options.also_count + 1, &table, &error) != WA_OK) {
        command_report_error(&error);
        return -1;
    }
    if (wa_table_check(&table, &error) != WA_OK) {
        command_report_error(&error);
        wa_table_free(&table);
        return -1;
    }
    int count = 0;
    for (size_t i = 0; i < table.problem_count; i++) {
        const struct wa_table_problem *problem = &table.problems[i];
        if (strncmp(problem->file, trial, strlen(trial)) == 0) {
            fprintf(stderr, "whichacid: %s%s%s\n", problem->column,
                    problem->column[0] != '\0' ? ": " : "", problem->sentence);
            count++;
        }
    }
    wa_table_free(&table);
    return count;
}
