/* Finding acids, forms, indicators and sources by name. */
#include "reference/reference_internal.h"

#include <stdio.h>
#include <string.h>

/* One kind of row whose names are indexed. */
struct named {
    struct name_index *names;
    enum table_kind kind;
    int name_column;
    int other_column;
};

/* What is indexed of a row. */
struct name_owner {
    const char *key;
    const char *name;
    const char *other_names;
    const char *file;
    long line;
};

static struct name_owner owner_of(const struct wa_table *table, enum table_kind kind, int index)
{
    if (kind == TABLE_ACIDS) {
        const struct wa_acid *acid = &table->acids[index];
        return (struct name_owner){acid->key, acid->name, acid->other_names, acid->file,
                                   acid->line};
    }
    const struct wa_form *form = &table->forms[index];
    return (struct name_owner){form->key, form->name, form->other_names, form->file, form->line};
}

static bool from_user(const struct wa_table *table, enum table_kind kind, int index)
{
    return kind == TABLE_ACIDS ? table->acids[index].from_user : table->forms[index].from_user;
}

/* Enter one name; a name that another row holds is a problem, and the first row keeps it. */
static void enter(struct loader *loader, const struct named *named, int index, const char *name,
                  size_t length, int column)
{
    char folded[NAME_FOLD_MAX];
    name_fold(name, length, folded);
    if (folded[0] == '\0') {
        return;
    }
    const char *kept = storage_copy(loader->table.storage, folded, strlen(folded));
    int held = kept == NULL ? -2 : name_index_add(named->names, kept, index);
    if (held == -2) {
        loader->out_of_memory = true;
        return;
    }
    if (held < 0 || held == index) {
        return;
    }
    /* A name taken from the table by a user's row is the user's affair. */
    bool users = from_user(&loader->table, named->kind, held) &&
                 !from_user(&loader->table, named->kind, index);
    struct name_owner owner = owner_of(&loader->table, named->kind, users ? held : index);
    struct name_owner holder = owner_of(&loader->table, named->kind, users ? index : held);
    const struct table_file place = {.name = owner.file, .kind = named->kind};
    loader_problem(loader, &place, owner.line, column, false,
                   "The name '%.*s' of '%.60s' is already a name of '%.60s' (%s:%ld); each name "
                   "may stand once.",
                   (int)(length > 80 ? 80 : length), name, owner.key, holder.key, holder.file,
                   holder.line);
}

/* Keys before names before other names, the user's rows before the table's. */
static void index_names(struct loader *loader, const struct named *named, size_t count)
{
    for (int pass = 0; pass < 6 && !loader->out_of_memory; pass++) {
        for (size_t i = 0; i < count; i++) {
            if (from_user(&loader->table, named->kind, (int)i) != (pass % 2 == 0)) {
                continue;
            }
            struct name_owner owner = owner_of(&loader->table, named->kind, (int)i);
            if (pass < 2) {
                enter(loader, named, (int)i, owner.key, strlen(owner.key), 0);
            } else if (pass < 4) {
                enter(loader, named, (int)i, owner.name, strlen(owner.name), named->name_column);
            } else {
                const char *cursor = owner.other_names;
                const char *name;
                size_t length;
                while ((name = next_other_name(&cursor, &length)) != NULL) {
                    enter(loader, named, (int)i, name, length, named->other_column);
                }
            }
        }
    }
}

static bool index_plain(struct wa_table_storage *storage, struct name_index *names,
                        const char *name, int index)
{
    char folded[NAME_FOLD_MAX];
    name_fold(name, strlen(name), folded);
    const char *kept = storage_copy(storage, folded, strlen(folded));
    return kept != NULL && name_index_add(names, kept, index) != -2;
}

void settle_names(struct loader *loader)
{
    struct wa_table *table = &loader->table;
    struct wa_table_storage *storage = table->storage;
    const struct named acids = {&storage->acids, TABLE_ACIDS, ACID_NAME, ACID_OTHER};
    const struct named forms = {&storage->forms, TABLE_FORMS, FORM_NAME, FORM_OTHER};
    index_names(loader, &acids, table->acid_count);
    index_names(loader, &forms, table->form_count);
    for (size_t i = 0; i < table->indicator_count; i++) {
        if (!index_plain(storage, &storage->indicators, table->indicators[i].key, (int)i) ||
            !index_plain(storage, &storage->indicators, table->indicators[i].name, (int)i)) {
            loader->out_of_memory = true;
        }
    }
    for (size_t i = 0; i < table->source_count; i++) {
        if (!index_plain(storage, &storage->sources, table->sources[i].key, (int)i)) {
            loader->out_of_memory = true;
        }
    }
}

int wa_table_find_acid(const struct wa_table *table, const char *name)
{
    return name_index_find(&table->storage->acids, name);
}

int wa_table_find_form(const struct wa_table *table, const char *name)
{
    return name_index_find(&table->storage->forms, name);
}

int wa_table_find_indicator(const struct wa_table *table, const char *name)
{
    return name_index_find(&table->storage->indicators, name);
}

int wa_table_find_source(const struct wa_table *table, const char *key)
{
    return name_index_find(&table->storage->sources, key);
}
