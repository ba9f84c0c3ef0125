/* Files that standardize and calibrate wrote, read back as notes for a run. */
#include "whichacid/bench_report.h"

#include "base/file.h"

#include <jansson.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>

#define FILE_LIMIT (1u << 20)

static bool is_file(const char *path)
{
    struct stat information;
    return stat(path, &information) == 0 && S_ISREG(information.st_mode);
}

static bool ends_in_json(const char *path)
{
    const size_t length = strlen(path);
    return length > 5 && strcmp(path + length - 5, ".json") == 0;
}

/* A pair of numbers, both finite and u not negative. */
static bool take(const json_t *object, const char *key, const char *key_u,
                 struct wa_quantity *quantity)
{
    const json_t *value = json_object_get(object, key), *u = json_object_get(object, key_u);
    if (!json_is_number(value) || !json_is_number(u)) {
        return false;
    }
    *quantity = (struct wa_quantity){json_number_value(value), json_number_value(u), true};
    return isfinite(quantity->value) && isfinite(quantity->u) && quantity->u >= 0.0;
}

static bool fill(const json_t *root, struct wa_bench_file *file)
{
    if (strcmp(file->kind, WA_TITRANT_FILE_KIND) == 0) {
        const json_t *titrant = json_object_get(root, "titrant");
        const char *name = json_string_value(json_object_get(titrant, "name"));
        snprintf(file->titrant, sizeof file->titrant, "%s", name != NULL ? name : "");
        return name != NULL &&
               take(titrant, "concentration_mol_L", "u_mol_L", &file->concentration) &&
               file->concentration.value > 0.0;
    }
    const json_t *electrode = json_object_get(root, "electrode");
    const json_t *correlation = json_object_get(electrode, "correlation");
    file->correlation = json_is_number(correlation) ? json_number_value(correlation) : 0.0;
    return take(electrode, "slope", "slope_u", &file->slope) &&
           take(electrode, "offset_pH", "offset_u_pH", &file->offset) && file->slope.value > 0.0 &&
           fabs(file->correlation) <= 1.0;
}

enum wa_status wa_bench_read(const char *path, const char *kind, struct wa_bench_file *file,
                             bool *ours, struct wa_error *error)
{
    char *bytes = NULL;
    size_t size = 0;
    *file = (struct wa_bench_file){.kind = ""};
    *ours = false;
    if (!is_file(path)) {
        return ends_in_json(path) ? wa_fail(error, WA_ERROR_FILE, path, 0, "There is no such file.")
                                  : WA_OK;
    }
    enum wa_status status = wa_file_read(path, FILE_LIMIT, &bytes, &size, error);
    if (status != WA_OK) {
        return status;
    }
    json_t *root = json_loadb(bytes, size, 0, NULL);
    free(bytes);
    const char *found = json_string_value(json_object_get(root, "kind"));
    *ours = found != NULL && strcmp(found, kind) == 0;
    snprintf(file->kind, sizeof file->kind, "%s", kind);
    if (*ours && !fill(root, file)) {
        status = wa_fail(error, WA_ERROR_INPUT, path, 0,
                         "The file lacks the figures of a %s; write it anew with --json --output.",
                         kind);
    } else if (!*ours && ends_in_json(path)) {
        status =
            wa_fail(error, WA_ERROR_INPUT, path, 0,
                    "The file does not hold a %s; 'whichacid %s' writes one with --json.", kind,
                    strcmp(kind, WA_TITRANT_FILE_KIND) == 0 ? "standardize" : "calibrate");
    }
    json_decref(root);
    return status;
}
