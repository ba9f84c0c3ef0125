/* Loading the reference table: what spreadsheet programs do to files, the user's rows laid over the
 * table's, parts and spectator ions, titrants by an analyst's words.
 * Kind of check: own contract, except where a comment says otherwise. */
#include "whichacid/reference.h"

#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <iconv.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include <cmocka.h>

#define FORM_HEADER "key,name,other names,formula,parts,CAS,molar mass,solubility\n"
#define ACID_HEADER "key,name,other names,formula,charge,group,modelled,note\n"
#define CONSTANT_HEADER "acid,step,pKa,u,temperature,ionic strength,kind,source\n"

static char file_name[64];

/* Write bytes into a file of its own. */
static const char *write_file(const char *bytes, size_t size)
{
    strcpy(file_name, "/tmp/whichacid-table-XXXXXX");
    int descriptor = mkstemp(file_name);
    assert_true(descriptor >= 0);
    assert_int_equal(write(descriptor, bytes, size), (ssize_t)size);
    close(descriptor);
    return file_name;
}

static void load_over(const char *bytes, size_t size, struct wa_table *table)
{
    struct wa_error error = {0};
    const char *also = write_file(bytes, size);
    enum wa_status status = wa_table_load(WHICHACID_REFERENCE_DIR, &also, 1, table, &error);
    unlink(also);
    if (status != WA_OK) {
        fail_msg("%s", error.message);
    }
}

static void load_text(const char *text, struct wa_table *table)
{
    load_over(text, strlen(text), table);
}

static const struct wa_form *form_of(const struct wa_table *table, const char *key)
{
    int form = wa_table_find_form(table, key);
    if (form < 0) {
        for (size_t i = 0; i < table->problem_count; i++) {
            print_message("%ld: %s\n", table->problems[i].line, table->problems[i].sentence);
        }
        fail_msg("there is no form '%s'", key);
    }
    return &table->forms[form];
}

static void shipped_table_loads_without_a_problem(void **state)
{
    (void)state;
    struct wa_table table;
    struct wa_error error = {0};
    assert_int_equal(wa_table_load(WHICHACID_REFERENCE_DIR, NULL, 0, &table, &error), WA_OK);
    for (size_t i = 0; i < table.problem_count; i++) {
        print_message("%s:%ld: %s: %s\n", table.problems[i].file, table.problems[i].line,
                      table.problems[i].column, table.problems[i].sentence);
    }
    assert_int_equal(table.problem_count, 0);
    assert_int_equal(table.overlaid_count, 0);
    assert_int_equal(strlen(table.version), 16);
    wa_table_free(&table);
    wa_table_free(&table);
    wa_table_free(NULL);
}

/* Turns red when an error of the whole table leaks, crashes or stays silent. */
static void a_table_that_is_not_there_is_refused(void **state)
{
    (void)state;
    struct wa_table table;
    struct wa_error error = {0};
    assert_int_equal(wa_table_load("/nowhere", NULL, 0, &table, &error), WA_ERROR_FILE);
    assert_true(strlen(error.message) > 10);
    const char *also = "/nowhere.csv";
    assert_int_equal(wa_table_load(WHICHACID_REFERENCE_DIR, &also, 1, &table, &error),
                     WA_ERROR_FILE);
    also = write_file("key\0name\n", 9);
    assert_int_equal(wa_table_load(WHICHACID_REFERENCE_DIR, &also, 1, &table, &error),
                     WA_ERROR_INPUT);
    assert_non_null(strstr(error.message, "zero bytes"));
    unlink(also);
}

/* What spreadsheet programs write: each must give the same form. */
static void spreadsheet_habits_do_no_harm(void **state)
{
    (void)state;
    static const char *const files[] = {
        "key,name,formula,parts,solubility\nx-form,x form,NaC2H3O2,acetic-acid lost 1,46.5\n",
        "\xEF\xBB\xBFkey,name,formula,parts,solubility\r\nx-form,x form,NaC2H3O2,acetic-acid lost "
        "1,46.5\r\n",
        "key;name;formula;parts;solubility\nx-form;x form;NaC2H3O2;\"acetic-acid lost 1\";46,5\n",
        "sep=;\r\nkey;name;formula;parts;solubility\r\nx-form;x form;NaC2H3O2;acetic-acid lost "
        "1;46,5\r\n",
        "key\tname\tformula\tparts\tsolubility\nx-form\tx form\tNaC2H3O2\tacetic-acid lost "
        "1\t46,5\n",
        "\"key\",\"name\",\"formula\",\"parts\",\"solubility\"\n\"x-form\",\"x "
        "form\",\"NaC2H3O2\",\"acetic-acid lost 1\",\"46,5\"\n",
        "key,name,formula,parts,solubility,,,\nx-form,x form,NaC2H3O2,acetic-acid lost 1,46.5,,,\n"
        ",,,,,,,\n\n,,,,,,,\n",
        "Solubility, Parts ,my own column,FORMULA,Name,Key\n46.5, acetic-acid  lost 1 "
        ",anything,NaC2H3O2,x form,x-form\n",
        "# made by hand\n\nkey,name,formula,parts,solubility\n# the salt\nx-form,x "
        "form,NaC2H3O2,acetic-acid lost 1,46.5",
        "key,name,formula,parts,solubility\rx-form,x form,NaC2H3O2,acetic-acid lost 1,46.5\r",
        "key,name,formula,parts,solubility\nx-form,\"x\nform\",NaC2H3O2,acetic-acid lost 1,46.5\n",
    };
    for (size_t i = 0; i < sizeof files / sizeof files[0]; i++) {
        struct wa_table table;
        load_text(files[i], &table);
        if (table.problem_count != 0) {
            fail_msg("file %zu: %s", i, table.problems[0].sentence);
        }
        const struct wa_form *form = form_of(&table, "x-form");
        assert_true(form->from_user);
        assert_int_equal(form->spectator_charge, 1);
        assert_true(fabs(form->solubility_mol_L - 465.0 / 82.034) < 0.01);
        wa_table_free(&table);
    }
}

/* UTF-16 and Windows-1252, in which the signs × and · are single other bytes. */
static void other_encodings_are_read(void **state)
{
    (void)state;
    const char *text = "key,name,formula,parts\nx-borax,x borax é,Na2B4O7·10H2O,boric-acid ×4 lost "
                       "2\n";
    const char *encodings[] = {"UTF-16", "UTF-16LE", "WINDOWS-1252"};
    for (size_t i = 0; i < sizeof encodings / sizeof encodings[0]; i++) {
        char bytes[1024] = {0};
        char *in = (char *)(uintptr_t)text;
        char *out = bytes;
        size_t in_left = strlen(text);
        size_t out_left = sizeof bytes;
        if (strcmp(encodings[i], "UTF-16LE") == 0) {
            memcpy(bytes, "\xFF\xFE", 2);
            out += 2;
            out_left -= 2;
        }
        iconv_t converter = iconv_open(encodings[i], "UTF-8");
        assert_true(converter != (iconv_t)-1);
        assert_true(iconv(converter, &in, &in_left, &out, &out_left) != (size_t)-1);
        iconv_close(converter);
        struct wa_table table;
        load_over(bytes, (size_t)(out - bytes), &table);
        assert_int_equal(table.problem_count, 0);
        assert_string_equal(form_of(&table, "x-borax")->name, "x borax é");
        assert_int_equal(form_of(&table, "x-borax")->parts[0].count, 4);
        wa_table_free(&table);
    }
}

/* Spectator charge from neutrality, sum of z^2 from the ions themselves. */
static void spectators_follow_from_formula_and_parts(void **state)
{
    (void)state;
    static const struct {
        const char *formula;
        const char *parts;
        int charge;
        double z2;
    } forms[] = {
        {"C2H4O2", "acetic-acid", 0, 0},
        {"NaC2H3O2·3H2O", "acetic-acid lost 1", 1, 1},
        {"Ca(C2H3O2)2·H2O", "acetic-acid x2 lost 2", 2, 4},
        {"Na2B4O7·10H2O", "boric-acid ×4 lost 2", 2, 2},
        {"Na2B4O7", "boric-acid × 4 lost 2", 2, 2},
        {"KH3(C2O4)2·2H2O", "oxalic-acid ×2 lost 1", 1, 1},
        {"C4H11NO3·HCl", "tris", -1, 1},
        {"(NH4)2C4H4O6", "ammonia ×2; tartaric-acid lost 2", 0, 0},
        {"NH4NO3", "ammonia", -1, 1},
        {"NH4ClO4", "ammonia", -1, 1},
        {"(NH4)2SO4", "ammonia ×2; sulfuric-acid lost 2", 0, 0},
        {"C4H11NO3·CH4O3S", "tris", -1, 1},
        {"NaOH", "water lost 1", 1, 1},
        {"Ba(OH)2·8H2O", "water ×2 lost 2", 2, 4},
        {"Mg(OH)Cl", "water lost 1", 1, 5},
        {"Na2CO3·10H2O", "carbonic-acid lost 2", 2, 2},
        {"C4H6O3", "acetic-acid ×2", 0, 0},
        {"C5H14NO·C2H3O2", "acetic-acid lost 1", 1, 1},
    };
    for (size_t i = 0; i < sizeof forms / sizeof forms[0]; i++) {
        char text[512];
        struct wa_table table;
        snprintf(text, sizeof text, "key,name,formula,parts\nx-form,x form,%s,%s\n",
                 forms[i].formula, forms[i].parts);
        load_text(text, &table);
        const struct wa_form *form = form_of(&table, "x-form");
        if (table.problem_count != 0 || form->spectator_charge != forms[i].charge ||
            fabs(form->spectator_z2 - forms[i].z2) > 1e-9) {
            fail_msg("%s: charge %d, z2 %g: %s", forms[i].formula, form->spectator_charge,
                     form->spectator_z2,
                     table.problem_count > 0 ? table.problems[0].sentence : "no problem");
        }
        wa_table_free(&table);
    }
}

/* The user's rows win: an acid and a step replace the table's, the rest of the table stays. */
static void rows_of_the_users_win(void **state)
{
    (void)state;
    struct wa_table table;
    struct wa_table plain;
    struct wa_error error;
    assert_int_equal(wa_table_load(WHICHACID_REFERENCE_DIR, NULL, 0, &plain, &error), WA_OK);
    load_text(CONSTANT_HEADER "citric-acid,2,4.60,0.03,25,0,,from memory\n", &table);
    int citric = wa_table_find_acid(&table, "citric acid");
    int before = wa_table_find_acid(&plain, "citric acid");
    assert_int_equal(table.overlaid_count, 1);
    assert_int_equal(table.acids[citric].step_count, 3);
    assert_true(fabs(table.acids[citric].steps[1].pKa - 4.60) < 1e-12);
    assert_int_equal(table.acids[citric].steps[1].row_count, 1);
    assert_true(fabs(table.acids[citric].steps[0].pKa - plain.acids[before].steps[0].pKa) < 1e-12);
    assert_string_not_equal(table.version, plain.version);
    wa_table_free(&table);

    load_text(FORM_HEADER "citric-acid,my citric acid,,C6H8O7·H2O,citric-acid,,,\n", &table);
    const struct wa_form *form = form_of(&table, "citric-acid");
    assert_true(form->from_user);
    assert_string_equal(form->name, "my citric acid");
    assert_int_equal(table.form_count, plain.form_count);
    wa_table_free(&table);

    load_text(ACID_HEADER "acetic-acid,my acetic acid,,C2H4O2,0,,yes,\n", &table);
    int acetic = wa_table_find_acid(&table, "my acetic acid");
    assert_true(acetic >= 0 && table.acids[acetic].from_user);
    assert_int_equal(table.acids[acetic].step_count, 1);
    wa_table_free(&table);
    wa_table_free(&plain);
}

/* A name is found in any case, with hyphens, spaces or underscores; accents count. */
static void names_are_found_as_people_write_them(void **state)
{
    (void)state;
    struct wa_table table;
    load_text(FORM_HEADER "x-form,Säure X,first other; ÄTHER-Y; third,NaC2H3O2,acetic-acid lost "
                          "1,,,\n",
              &table);
    int form = wa_table_find_form(&table, "x-form");
    assert_true(form >= 0);
    static const char *const names[] = {"X-Form",  "x form",        "x_form",
                                        "säure x", "SÄURE  X",      "äther-y",
                                        "Third",   " first other ", "First\tOther"};
    for (size_t i = 0; i < sizeof names / sizeof names[0]; i++) {
        if (wa_table_find_form(&table, names[i]) != form) {
            fail_msg("'%s' was not found", names[i]);
        }
    }
    assert_int_equal(wa_table_find_form(&table, "no such form"), -1);
    assert_int_equal(wa_table_find_form(&table, ""), -1);
    assert_int_equal(wa_table_find_acid(&table, "no such acid"), -1);
    assert_true(wa_table_find_acid(&table, "ethanoic acid") >= 0);
    assert_true(wa_table_find_indicator(&table, "phenolphthalein") >= 0);
    assert_int_equal(wa_table_find_source(&table, "from memory"), -1);
    wa_table_free(&table);
}

/* Words as laboratories write them in seven languages. */
static void titrants_are_found_by_an_analysts_words(void **state)
{
    (void)state;
    static const struct {
        const char *words;
        const char *key;
    } cases[] = {
        {"NaOH", "sodium-hydroxide"},
        {"0.1 M NaOH", "sodium-hydroxide"},
        {"NaOH 0,1 mol/L", "sodium-hydroxide"},
        {"sodium hydroxide solution", "sodium-hydroxide"},
        {"Natronlauge c = 0,1 mol/l", "sodium-hydroxide"},
        {"Natriumhydroxidlösung", "sodium-hydroxide"},
        {"soude caustique", "sodium-hydroxide"},
        {"hydroxyde de sodium 0,1 M", "sodium-hydroxide"},
        {"hidroxido de sodio", "sodium-hydroxide"},
        {"idrossido di sodio", "sodium-hydroxide"},
        {"KOH", "potassium-hydroxide"},
        {"Kalilauge", "potassium-hydroxide"},
        {"Ba(OH)2", "barium-hydroxide"},
        {"HCl", "hydrochloric-acid"},
        {"hcl 0.1N", "hydrochloric-acid"},
        {"Hydrochloric Acid", "hydrochloric-acid"},
        {"Salzsäure", "hydrochloric-acid"},
        {"Salzsaeure 0,1 mol/L", "hydrochloric-acid"},
        {"acide chlorhydrique", "hydrochloric-acid"},
        {"ácido clorhídrico", "hydrochloric-acid"},
        {"acido clorhidrico 0.1 M", "hydrochloric-acid"},
        {"zoutzuur", "hydrochloric-acid"},
        {"H₂SO₄", "sulfuric-acid"},
        {"Schwefelsäure", "sulfuric-acid"},
        {"sulphuric acid 0.05 M", "sulfuric-acid"},
        {"HClO4", "perchloric-acid"},
        {"Na2CO3", "sodium-carbonate"},
        {"NH3", "ammonia"},
        {"ammonium hydroxide", "ammonia"},
        {"acetic acid", "acetic-acid"},
    };
    struct wa_table table;
    struct wa_error error;
    assert_int_equal(wa_table_load(WHICHACID_REFERENCE_DIR, NULL, 0, &table, &error), WA_OK);
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        int found = wa_table_find_titrant(&table, cases[i].words);
        if (found < 0 || strcmp(table.titrants[found].key, cases[i].key) != 0) {
            fail_msg("'%s' was taken for %s", cases[i].words,
                     found < 0 ? "nothing" : table.titrants[found].key);
        }
    }
    assert_int_equal(wa_table_find_titrant(&table, "silver nitrate"), -1);
    assert_int_equal(wa_table_find_titrant(&table, ""), -1);
    assert_int_equal(wa_table_find_titrant(&table, NULL), -1);
    wa_table_free(&table);
}

/* What a mole of each titrant brings, and which are weak. */
static void titrants_know_their_protons(void **state)
{
    (void)state;
    static const struct {
        const char *key;
        bool base, weak;
        int protons, lost, count;
    } cases[] = {
        {"sodium-hydroxide", true, false, 1, 1, 1},
        {"barium-hydroxide", true, false, 2, 2, 2},
        {"hydrochloric-acid", false, false, 1, 0, 1},
        {"sulfuric-acid", false, false, 2, 0, 1},
        {"ammonia", true, true, 1, 1, 1},
        {"sodium-carbonate", true, true, 2, 2, 1},
        {"borax", true, true, 2, 2, 4},
        {"acetic-acid", false, true, 1, 0, 1},
        {"oxalic-acid", false, true, 2, 0, 1},
    };
    struct wa_table table;
    struct wa_error error;
    assert_int_equal(wa_table_load(WHICHACID_REFERENCE_DIR, NULL, 0, &table, &error), WA_OK);
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        int found = wa_table_find_titrant(&table, cases[i].key);
        assert_true(found >= 0);
        const struct wa_titrant *titrant = &table.titrants[found];
        assert_string_equal(titrant->key, cases[i].key);
        assert_int_equal(titrant->is_base, cases[i].base);
        assert_int_equal(titrant->is_weak, cases[i].weak);
        assert_int_equal(titrant->protons, cases[i].protons);
        assert_int_equal(titrant->lost, cases[i].lost);
        assert_int_equal(titrant->count, cases[i].count);
        bool needs_system = cases[i].weak || strcmp(cases[i].key, "sulfuric-acid") == 0;
        assert_int_equal(titrant->acid >= 0, needs_system);
    }
    wa_table_free(&table);
}

/* Asked for the constants of citric acid itself, the search must put it first; a molar mass picks
 * the hydrate. */
static void the_nearest_system_comes_first(void **state)
{
    (void)state;
    struct wa_table table;
    struct wa_error error;
    struct wa_near near[5];
    const double asked[] = {6.40, 3.13, 4.76};
    assert_int_equal(wa_table_load(WHICHACID_REFERENCE_DIR, NULL, 0, &table, &error), WA_OK);
    size_t found = wa_table_near(&table, asked, 3, 210.14, 0.2, near, 5);
    assert_true(found >= 1);
    assert_string_equal(table.acids[near[0].acid].key, "citric-acid");
    assert_string_equal(table.forms[near[0].form].key, "citric-acid-monohydrate");
    assert_int_equal(wa_table_near(&table, asked, 3, 21.0, 0.2, near, 5), 0);
    found = wa_table_near(&table, NULL, 0, 204.22, 0.2, near, 5);
    assert_true(found >= 1);
    assert_true(fabs(near[0].mass_off) < 0.01);
    wa_table_free(&table);
}

/* Append, then read back; the file keeps its own columns and separator. */
static void a_row_is_appended_in_the_files_own_manner(void **state)
{
    (void)state;
    struct wa_error error = {0};
    const struct wa_table_cell cells[] = {
        {"key", "y-form"},     {"name", "y; \"form\""},         {"formula", "KC2H3O2"},
        {"solubility", "2.5"}, {"parts", "acetic-acid lost 1"}, {"care", NULL},
    };
    const char *old = "name;key;formula;parts;solubility\r\nx;x-form;NaC2H3O2;acetic-acid lost "
                      "1;1,5";
    const char *path = write_file(old, strlen(old));
    assert_int_equal(wa_table_append(path, "forms.csv", cells, 6, &error), WA_OK);
    char text[512] = {0};
    FILE *stream = fopen(path, "r");
    assert_non_null(stream);
    assert_true(fread(text, 1, sizeof text - 1, stream) > 0);
    fclose(stream);
    assert_non_null(strstr(text, "1;1,5\n\"y; \"\"form\"\"\";y-form;KC2H3O2;acetic-acid lost "
                                 "1;2,5\r\n"));
    const struct wa_table_cell odd[] = {{"key", "z"}, {"colour", "red"}};
    assert_int_equal(wa_table_append(path, "forms.csv", odd, 2, &error), WA_ERROR_INPUT);
    assert_non_null(strstr(error.message, "colour"));
    unlink(path);
    assert_int_equal(wa_table_append(path, "sources.csv",
                                     (const struct wa_table_cell[]){{"key", "a"}}, 1, &error),
                     WA_OK);
    stream = fopen(path, "r");
    assert_non_null(stream);
    memset(text, 0, sizeof text);
    assert_true(fread(text, 1, sizeof text - 1, stream) > 0);
    fclose(stream);
    assert_string_equal(text, "key,reference,kind\na,,\n");
    unlink(path);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(shipped_table_loads_without_a_problem),
        cmocka_unit_test(a_table_that_is_not_there_is_refused),
        cmocka_unit_test(spreadsheet_habits_do_no_harm),
        cmocka_unit_test(other_encodings_are_read),
        cmocka_unit_test(spectators_follow_from_formula_and_parts),
        cmocka_unit_test(rows_of_the_users_win),
        cmocka_unit_test(names_are_found_as_people_write_them),
        cmocka_unit_test(titrants_are_found_by_an_analysts_words),
        cmocka_unit_test(titrants_know_their_protons),
        cmocka_unit_test(the_nearest_system_comes_first),
        cmocka_unit_test(a_row_is_appended_in_the_files_own_manner),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
