/* Memory of a table: one arena for strings, and the list of problems. */
#include "base/grow.h"
#include "reference/reference_internal.h"

#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#define CHUNK_SIZE ((size_t)65536)

struct arena_chunk {
    struct arena_chunk *next;
    size_t size;
    size_t used;
    char *bytes; /* behind this header, or a block that was taken over */
};

char *storage_reserve(struct wa_table_storage *storage, size_t size)
{
    struct arena_chunk *chunk = storage->chunks;
    if (chunk == NULL || chunk->size - chunk->used < size) {
        size_t chunk_size = size > CHUNK_SIZE ? size : CHUNK_SIZE;
        chunk = malloc(sizeof *chunk + chunk_size);
        if (chunk == NULL) {
            return NULL;
        }
        chunk->bytes = (char *)(chunk + 1);
        chunk->size = chunk_size;
        chunk->used = 0;
        /* A large piece goes behind the current chunk, whose room is still wanted. */
        if (size > CHUNK_SIZE && storage->chunks != NULL) {
            chunk->next = storage->chunks->next;
            storage->chunks->next = chunk;
        } else {
            chunk->next = storage->chunks;
            storage->chunks = chunk;
        }
        storage->bytes += sizeof *chunk + chunk_size;
    }
    char *place = chunk->bytes + chunk->used;
    chunk->used += size;
    return place;
}

bool storage_adopt(struct wa_table_storage *storage, char *bytes, size_t size)
{
    struct arena_chunk *chunk = malloc(sizeof *chunk);
    if (chunk == NULL) {
        return false;
    }
    *chunk = (struct arena_chunk){.size = size, .used = size, .bytes = bytes};
    /* A full chunk goes behind the current one, whose room is still wanted. */
    struct arena_chunk **place =
        storage->chunks != NULL ? &storage->chunks->next : &storage->chunks;
    chunk->next = *place;
    *place = chunk;
    storage->bytes += size;
    return true;
}

const char *storage_copy(struct wa_table_storage *storage, const char *text, size_t length)
{
    char *copy = storage_reserve(storage, length + 1);
    if (copy != NULL) {
        memcpy(copy, text, length);
        copy[length] = '\0';
    }
    return copy;
}

void storage_free(struct wa_table_storage *storage)
{
    if (storage == NULL) {
        return;
    }
    struct arena_chunk *chunk = storage->chunks;
    while (chunk != NULL) {
        struct arena_chunk *next = chunk->next;
        if (chunk->bytes != (char *)(chunk + 1)) {
            free(chunk->bytes);
        }
        free(chunk);
        chunk = next;
    }
    name_index_free(&storage->acids);
    name_index_free(&storage->forms);
    name_index_free(&storage->indicators);
    name_index_free(&storage->sources);
    free(storage->hazards);
    free(storage);
}

static bool add_problem(struct wa_table *table, size_t *capacity, const char *file, long line,
                        const char *column, bool fatal, const char *sentence)
{
    struct wa_table_problem problem = {
        .file = file,
        .line = line,
        .column = column,
        .sentence = storage_copy(table->storage, sentence, strlen(sentence)),
        .fatal = fatal,
    };
    if (problem.sentence == NULL ||
        !wa_grow(&table->problems, capacity, table->problem_count + 1, sizeof *table->problems)) {
        return false;
    }
    table->problems[table->problem_count] = problem;
    table->problem_count++;
    return true;
}

void loader_problem(struct loader *loader, const struct table_file *file, long line, int column,
                    bool fatal, const char *format, ...)
{
    char sentence[512];
    va_list arguments;
    va_start(arguments, format);
    vsnprintf(sentence, sizeof sentence, format, arguments);
    va_end(arguments);
    const char *word = column < 0 ? "" : table_column_word(file->kind, column);
    if (!add_problem(&loader->table, &loader->problem_capacity, file->name, line, word, fatal,
                     sentence)) {
        loader->out_of_memory = true;
    }
}

enum wa_status table_problem(struct wa_table *table, const char *file, long line,
                             const char *column, bool fatal, struct wa_error *error,
                             const char *format, ...)
{
    char sentence[512];
    va_list arguments;
    va_start(arguments, format);
    vsnprintf(sentence, sizeof sentence, format, arguments);
    va_end(arguments);
    /* The capacity is not kept once the table is loaded; growth by one is rare enough. */
    size_t capacity = table->problem_count;
    return add_problem(table, &capacity, file, line, column, fatal, sentence)
               ? WA_OK
               : wa_fail_memory(error);
}
