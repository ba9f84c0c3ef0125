#include "command/command.h"
#include "command/table_page.h"

#include "whichacid/quantity.h"

#include <math.h>
#include <string.h>

#define NEAR_APART 0.35

struct show_call {
    struct table_options common;
    char name[256];
    double temperature_C;
    double ionic_strength;
};

enum { OPTION_TEMPERATURE = 0x200, OPTION_IONIC_STRENGTH };

static const struct argp_option options[] = {
    {"temperature", OPTION_TEMPERATURE, "T", 0, "degrees Celsius (25)", 0},
    {"ionic-strength", OPTION_IONIC_STRENGTH, "I", 0, "mol/L (0)", 0},
    {0},
};

static const char documentation[] =
    "A page about one acid or base, found by the key, name or other name of the system or of a "
    "form: constants with their sources, species against pH, landmarks of its titration, "
    "indicators, what it may be taken for, hazards."
    "\vExample: whichacid table show citric acid --temperature 37 \\\n"
    "  --ionic-strength 0.1";

static double value_of(const char *text, enum wa_dimension dimension, double low, double high,
                       struct argp_state *state)
{
    struct wa_quantity quantity;
    struct wa_error error;
    if (wa_quantity_parse(text, dimension, &quantity, &error) != WA_OK) {
        argp_error(state, "%s", error.message);
    }
    if (quantity.value < low || quantity.value > high) {
        argp_error(state, "'%s' is outside %g to %g, where the equations hold.", text, low, high);
    }
    return quantity.value;
}

static error_t parse(int key, char *argument, struct argp_state *state)
{
    struct show_call *call = state->input;
    switch (key) {
    case ARGP_KEY_INIT:
        state->child_inputs[0] = &call->common;
        return 0;
    case OPTION_TEMPERATURE:
        call->temperature_C = value_of(argument, WA_DIMENSION_TEMPERATURE, 0.0, 100.0, state);
        return 0;
    case OPTION_IONIC_STRENGTH:
        call->ionic_strength = value_of(argument, WA_DIMENSION_CONCENTRATION, 0.0, 2.0, state);
        return 0;
    case ARGP_KEY_ARGS:
        join_words(call->name, sizeof call->name, state->argv + state->next,
                   state->argc - state->next);
        return 0;
    case ARGP_KEY_NO_ARGS:
        argp_error(state, "name an acid, such as citric acid.");
        return 0;
    default:
        return ARGP_ERR_UNKNOWN;
    }
}

/* ---- what the page and the JSON both need ------------------------------------------------------
 */

int charge_before(const struct wa_acid *acid, int step)
{
    return acid->charge - (step - 1);
}

static double log10_gamma(const struct acid_page *page)
{
    struct wa_medium medium = wa_medium_at(page->temperature_C);
    return wa_davies_log10_gamma(page->ionic_strength, medium.debye_huckel_A,
                                 WA_DAVIES_COEFFICIENT);
}

double pKa_as_read(const struct acid_page *page, int step)
{
    const struct wa_acid *acid = &page->table->acids[page->acid];
    double pKa = wa_step_pKa_at(&acid->steps[step - 1], page->temperature_C, NULL);
    return pKa + (1 - 2 * charge_before(acid, step)) * log10_gamma(page);
}

double pKa_concentration(const struct acid_page *page, int step)
{
    const struct wa_acid *acid = &page->table->acids[page->acid];
    double pKa = wa_step_pKa_at(&acid->steps[step - 1], page->temperature_C, NULL);
    return pKa + 2 * (1 - charge_before(acid, step)) * log10_gamma(page);
}

size_t page_near(const struct acid_page *page, struct wa_near near[PAGE_NEAR_MAX])
{
    const struct wa_acid *acid = &page->table->acids[page->acid];
    struct wa_near found[PAGE_NEAR_MAX + 1];
    double values[WA_PROTONS_MAX];
    size_t count = 0;
    for (int i = 0; i < acid->step_count; i++) {
        if (acid->steps[i].pKa > 2.0 && acid->steps[i].pKa < 12.0) {
            values[count] = acid->steps[i].pKa;
            count++;
        }
    }
    if (count == 0) {
        return 0;
    }
    size_t all =
        wa_table_near(page->table, values, count, NAN, NEAR_APART, found, PAGE_NEAR_MAX + 1);
    size_t kept = 0;
    for (size_t i = 0; i < all && kept < PAGE_NEAR_MAX; i++) {
        if (found[i].acid != page->acid && found[i].unmatched == 0) {
            near[kept] = found[i];
            kept++;
        }
    }
    return kept;
}

/* The middle of the transition must lie within the jump, and the jump must be one. */
bool indicator_suits(const struct wa_indicator *indicator, const struct landmarks *landmarks,
                     int point)
{
    double middle = 0.5 * (indicator->low_pH + indicator->high_pH);
    double low = landmarks->jump_low[point];
    double high = landmarks->jump_high[point];
    return high - low >= VISIBLE_JUMP && middle >= low && middle <= high;
}

/* ---- JSON --------------------------------------------------------------------------------------
 */

static json_t *steps_json(const struct acid_page *page)
{
    const struct wa_acid *acid = &page->table->acids[page->acid];
    json_t *steps = json_array();
    for (int i = 0; i < acid->step_count; i++) {
        const struct wa_step *step = &acid->steps[i];
        double u;
        double pKa = wa_step_pKa_at(step, page->temperature_C, &u);
        json_array_append_new(
            steps, json_pack("{s:i,s:f,s:f,s:f,s:f,s:f,s:f,s:o,s:b,s:i,s:f}", "step", i + 1, "pKa",
                             step->pKa, "u", step->u, "pKa_at_temperature", pKa, "u_at_temperature",
                             u, "pKa_concentration", pKa_concentration(page, i + 1), "pKa_as_read",
                             pKa_as_read(page, i + 1), "enthalpy_kJ_mol",
                             step->enthalpy_known ? json_real(step->enthalpy) : json_null(),
                             "from_memory", (int)step->from_memory, "rows", step->row_count,
                             "birge_ratio", step->birge_ratio));
    }
    return steps;
}

static const char *constant_kind_word(enum wa_constant_kind kind)
{
    return kind == WA_CONSTANT_CONCENTRATION ? "concentration"
           : kind == WA_CONSTANT_MIXED       ? "mixed"
                                             : "thermodynamic";
}

static json_t *constants_json(const struct acid_page *page)
{
    const struct wa_acid *acid = &page->table->acids[page->acid];
    json_t *rows = json_array();
    for (size_t i = 0; i < acid->constant_count; i++) {
        const struct wa_constant_row *row = &page->table->constants[acid->constant_first + i];
        int source = wa_table_find_source(page->table, row->source);
        json_array_append_new(
            rows, json_pack("{s:i,s:f,s:f,s:f,s:f,s:s,s:b,s:f,s:s,s:s}", "step", row->step, "pKa",
                            row->pKa, "u", row->u, "temperature_C", row->temperature_C,
                            "ionic_strength", row->ionic_strength, "kind",
                            constant_kind_word(row->kind), "used", (int)row->used, "pKa_standard",
                            row->pKa_standard, "source", row->source, "reference",
                            source >= 0 ? page->table->sources[source].reference : row->source));
    }
    return rows;
}

static json_t *landmarks_json(const struct acid_page *page, const struct wa_form *form,
                              const struct landmarks *landmarks)
{
    json_t *points = json_array();
    for (int i = 0; i < landmarks->count; i++) {
        json_t *indicators = json_array();
        for (size_t j = 0; j < page->table->indicator_count; j++) {
            if (indicator_suits(&page->table->indicators[j], landmarks, i)) {
                json_array_append_new(indicators, json_string(page->table->indicators[j].key));
            }
        }
        json_array_append_new(points,
                              json_pack("{s:f,s:f,s:f,s:o}", "half_way_pH", landmarks->half_pH[i],
                                        "equivalence_pH", landmarks->equivalence_pH[i], "jump",
                                        landmarks->jump_high[i] - landmarks->jump_low[i],
                                        "indicators", indicators));
    }
    return json_pack("{s:s,s:s,s:f,s:f,s:o}", "form", form->key, "titrant",
                     landmarks->with_base ? "sodium-hydroxide" : "hydrochloric-acid",
                     "concentration", PAGE_CONCENTRATION, "start_pH", landmarks->start_pH, "points",
                     points);
}

static json_t *all_landmarks_json(const struct acid_page *page)
{
    int forms[LANDMARKS_MAX];
    int count = landmark_forms(page->table, page->acid, forms);
    json_t *all = json_array();
    for (int i = 0; i < count; i++) {
        for (int base = 1; base >= 0; base--) {
            struct landmarks landmarks;
            const struct wa_form *form = &page->table->forms[forms[i]];
            if (landmarks_compute(page->table, form, base == 1, PAGE_CONCENTRATION,
                                  page->temperature_C, &landmarks)) {
                json_array_append_new(all, landmarks_json(page, form, &landmarks));
            }
        }
    }
    return all;
}

static json_t *forms_json(const struct acid_page *page)
{
    json_t *forms = json_array();
    for (size_t i = 0; i < page->table->form_count; i++) {
        const struct wa_form *form = &page->table->forms[i];
        for (int j = 0; j < form->part_count; j++) {
            if (form->parts[j].acid == page->acid) {
                json_array_append_new(
                    forms,
                    json_pack("{s:s,s:s,s:s,s:f,s:f,s:s,s:s,s:s,s:o}", "key", form->key, "name",
                              form->name, "formula", form->formula, "molar_mass", form->molar_mass,
                              "molar_mass_u", form->molar_mass_u, "cas", form->cas, "hazards",
                              form->hazards, "care", form->care, "solubility_mol_L",
                              json_number_or_null(form->solubility_mol_L)));
                break;
            }
        }
    }
    return forms;
}

static json_t *page_json(const struct acid_page *page)
{
    const struct wa_acid *acid = &page->table->acids[page->acid];
    struct wa_near near[PAGE_NEAR_MAX];
    size_t count = page_near(page, near);
    json_t *confused = json_array();
    for (size_t i = 0; i < count; i++) {
        json_array_append_new(confused,
                              json_pack("{s:s,s:f}", "key", page->table->acids[near[i].acid].key,
                                        "distance", near[i].distance));
    }
    return json_pack("{s:s,s:s,s:s,s:s,s:i,s:b,s:b,s:f,s:f,s:o,s:o,s:o,s:o,s:o}", "key", acid->key,
                     "name", acid->name, "other_names", acid->other_names, "formula", acid->formula,
                     "charge", acid->charge, "modelled", (int)acid->modelled, "yours",
                     (int)acid->from_user, "temperature_C", page->temperature_C, "ionic_strength",
                     page->ionic_strength, "steps", steps_json(page), "constants",
                     constants_json(page), "forms", forms_json(page), "landmarks",
                     all_landmarks_json(page), "confused_with", confused);
}

/* ---- the word ----------------------------------------------------------------------------------
 */

/* The acid of that name, or the first system of the form of that name; -1 with a sentence. */
static int find_subject(const struct wa_table *table, const char *name)
{
    int acid = wa_table_find_acid(table, name);
    if (acid >= 0) {
        return acid;
    }
    int form = wa_table_find_form(table, name);
    for (int i = 0; form >= 0 && i < table->forms[form].part_count; i++) {
        if (table->forms[form].parts[i].acid >= 0) {
            return table->forms[form].parts[i].acid;
        }
    }
    fprintf(stderr,
            "whichacid: the table has no acid or form '%s'; 'whichacid table list' lists them, "
            "with a word of the name those that hold it.\n",
            name);
    return -1;
}

int table_show(int argument_count, char **arguments)
{
    const struct argp argp = {.options = options,
                              .parser = parse,
                              .args_doc = "NAME",
                              .doc = documentation,
                              .children = table_common_children};
    struct show_call call = {.temperature_C = 25.0};
    struct wa_table table;
    argp_parse(&argp, argument_count, arguments, 0, NULL, &call);
    int status = table_open(&call.common, &table);
    if (status != 0) {
        return status;
    }
    struct acid_page subject = {&table, find_subject(&table, call.name), call.temperature_C,
                                call.ionic_strength};
    struct page page;
    if (subject.acid < 0) {
        status = 1;
    } else if (call.common.json) {
        status = table_write_json(page_json(&subject), &call.common);
    } else {
        status = page_open(&page);
        if (status == 0) {
            print_acid_page(page.stream, &subject);
            status = page_close(&page, &call.common);
        }
    }
    wa_table_free(&table);
    return status;
}
