#include "command/table_page.h"

#include "base/text.h"

#include "whichacid/quantity.h"

#include <math.h>
#include <string.h>

#define HAZARD_CODES_MAX 64

static void print_heading(FILE *stream, const char *heading)
{
    fprintf(stream, "\n%s\n", heading);
}

static void print_title(FILE *stream, const struct wa_acid *acid)
{
    fprintf(stream, "%s (%s), %s", acid->name, acid->key, acid->formula);
    if (acid->charge != 0) {
        fprintf(stream, " with charge %+d", acid->charge);
    }
    fprintf(stream, "%s\n", acid->from_user ? ", from your own file" : "");
    if (acid->other_names[0] != '\0') {
        fputs("  also: ", stream);
        print_wrapped(stream, 8, 8, acid->other_names);
    }
    if (acid->note[0] != '\0') {
        fputs("  ", stream);
        print_wrapped(stream, 2, 2, acid->note);
    }
    if (!acid->modelled) {
        fputs("  ", stream);
        print_wrapped(stream, 2, 2,
                      "Its curve is not computed: the ion hydrolyses and precipitates.");
    }
}

static void print_step(FILE *stream, const struct acid_page *page, int number)
{
    const struct wa_acid *acid = &page->table->acids[page->acid];
    const struct wa_step *step = &acid->steps[number - 1];
    char value[48];
    wa_quantity_format(value, sizeof value, step->pKa, step->u);
    int charge = charge_before(acid, number);
    fprintf(stream, charge == 0 ? "  %4d  %6d  " : "  %4d  %+6d  ", number, charge);
    print_padded(stream, value, 16);
    if (step->enthalpy_known) {
        fprintf(stream, "  %8.1f", step->enthalpy);
    } else {
        fprintf(stream, "  %8s", "-");
    }
    fprintf(stream, "  %s%s%s%s\n", step->from_memory ? "from memory" : "sourced",
            step->row_count > 1 ? ", combined" : "", step->converted ? ", converted" : "",
            step->birge_ratio > 2.0 ? ", sources disagree" : "");
}

/* The constants at the temperature and ionic strength that were asked for. */
static void print_elsewhere(FILE *stream, const struct acid_page *page)
{
    const struct wa_acid *acid = &page->table->acids[page->acid];
    fprintf(stream, "\n  at %g °C and I = %g mol/L:\n", page->temperature_C, page->ionic_strength);
    fputs("  step  thermodynamic     concentration constant  half-way on a pH meter\n", stream);
    bool guessed = false;
    for (int i = 0; i < acid->step_count; i++) {
        char value[48];
        double u;
        double pKa = wa_step_pKa_at(&acid->steps[i], page->temperature_C, &u);
        wa_quantity_format(value, sizeof value, pKa, u);
        fprintf(stream, "  %4d  ", i + 1);
        print_padded(stream, value, 16);
        fprintf(stream, "  %22.2f  %22.2f\n", pKa_concentration(page, i + 1),
                pKa_as_read(page, i + 1));
        guessed = guessed || !acid->steps[i].enthalpy_known;
    }
    if (guessed && fabs(page->temperature_C - 25.0) > 0.5) {
        fputs("  ", stream);
        print_wrapped(stream, 2, 2,
                      "Where no enthalpy is known, the usual one of that kind of proton stands in, "
                      "with its uncertainty.");
    }
}

static const char *constant_words(enum wa_constant_kind kind)
{
    return kind == WA_CONSTANT_CONCENTRATION ? " (concentration constant)"
           : kind == WA_CONSTANT_MIXED       ? " (mixed constant)"
                                             : "";
}

static void print_rows(FILE *stream, const struct acid_page *page)
{
    const struct wa_acid *acid = &page->table->acids[page->acid];
    fputs("\n  as published:\n", stream);
    for (size_t i = 0; i < acid->constant_count; i++) {
        const struct wa_constant_row *row = &page->table->constants[acid->constant_first + i];
        char value[48];
        char text[512];
        wa_quantity_format(value, sizeof value, row->pKa, row->u);
        int used = snprintf(text, sizeof text, "%s at %g °C, I = %g%s, %s%s", value,
                            row->temperature_C, row->ionic_strength, constant_words(row->kind),
                            row->source, row->from_user ? " (yours)" : "");
        if (row->used && fabs(row->pKa_standard - row->pKa) > 0.0005 && used > 0 &&
            (size_t)used < sizeof text) {
            used += snprintf(text + used, sizeof text - (size_t)used, "; brought to %.3f ± %.3f",
                             row->pKa_standard, row->u_standard);
        }
        if (!row->used && used > 0 && (size_t)used < sizeof text) {
            used += snprintf(text + used, sizeof text - (size_t)used,
                             "; not used: another temperature, and no enthalpy to convert with");
        }
        if (row->note[0] != '\0' && used > 0 && (size_t)used < sizeof text) {
            snprintf(text + used, sizeof text - (size_t)used, "; %s", row->note);
        }
        fprintf(stream, "  %4d  ", row->step);
        print_wrapped(stream, 8, 10, text);
    }
}

static bool any_combined(const struct wa_acid *acid)
{
    for (int i = 0; i < acid->step_count; i++) {
        if (acid->steps[i].row_count > 1 || acid->steps[i].converted) {
            return true;
        }
    }
    return false;
}

static void print_constants(FILE *stream, const struct acid_page *page)
{
    const struct wa_acid *acid = &page->table->acids[page->acid];
    print_heading(stream, "Constants (thermodynamic, 25 °C, zero ionic strength)");
    fputs("  step  charge  pKa               ΔH/(kJ/mol)\n", stream);
    for (int i = 0; i < acid->step_count; i++) {
        print_step(stream, page, i + 1);
    }
    if (any_combined(acid)) {
        fputs("  ", stream);
        print_wrapped(stream, 2, 2,
                      "Combined: mean weighted by 1/u², u enlarged by the Birge ratio (1932) where "
                      "the sources disagree. Converted: brought to I = 0 by the Davies equation.");
    }
    if (fabs(page->temperature_C - 25.0) > 1e-9 || page->ionic_strength > 0.0) {
        print_elsewhere(stream, page);
    }
    print_rows(stream, page);
}

static bool brings(const struct wa_form *form, int acid)
{
    for (int i = 0; i < form->part_count; i++) {
        if (form->parts[i].acid == acid) {
            return true;
        }
    }
    return false;
}

/* Does the form bring this system and nothing else but hydroxide or spectator ions? */
static bool brings_only(const struct wa_form *form, int acid)
{
    return form->part_count == 1 && form->parts[0].acid == acid;
}

static void print_form(FILE *stream, const struct wa_form *form)
{
    char mass[48];
    char text[512];
    wa_quantity_format(mass, sizeof mass, form->molar_mass, form->molar_mass_u);
    int used = snprintf(text, sizeof text, "%s, %s g/mol", form->formula, mass);
    if (form->cas[0] != '\0') {
        used += snprintf(text + used, sizeof text - (size_t)used, ", CAS %.20s", form->cas);
    }
    if (isfinite(form->solubility_mol_L)) {
        used += snprintf(text + used, sizeof text - (size_t)used, ", dissolves to %.2g mol/L",
                         form->solubility_mol_L);
    }
    if (isfinite(form->melting_point_C)) {
        snprintf(text + used, sizeof text - (size_t)used, ", melts at %g °C%s",
                 form->melting_point_C,
                 strchr(form->melting_point, 'd') != NULL ? " and decomposes" : "");
    }
    char title[512];
    snprintf(title, sizeof title, "%s (%s)%s", form->name, form->key,
             form->from_user ? " (yours)" : "");
    fputs("  ", stream);
    print_wrapped(stream, 2, 4, title);
    fputs("    ", stream);
    print_wrapped(stream, 4, 4, text);
    if (form->care[0] != '\0') {
        fputs("    care: ", stream);
        print_wrapped(stream, 10, 4, form->care);
    }
}

static void print_forms(FILE *stream, const struct acid_page *page)
{
    print_heading(stream, "Forms that are weighed");
    size_t mixed = 0;
    for (size_t i = 0; i < page->table->form_count; i++) {
        if (brings_only(&page->table->forms[i], page->acid)) {
            print_form(stream, &page->table->forms[i]);
        } else if (brings(&page->table->forms[i], page->acid)) {
            mixed++;
        }
    }
    if (mixed == 0) {
        return;
    }
    print_heading(stream, "Forms that bring another acid or base besides");
    for (size_t i = 0; i < page->table->form_count; i++) {
        const struct wa_form *form = &page->table->forms[i];
        if (brings(form, page->acid) && !brings_only(form, page->acid)) {
            print_form(stream, form);
        }
    }
}

static void print_end(FILE *stream, const struct acid_page *page, const struct landmarks *landmarks,
                      int point)
{
    char text[640];
    size_t used = 0;
    double jump = landmarks->jump_high[point] - landmarks->jump_low[point];
    int written = snprintf(text, sizeof text, "half-way %.2f, end %.2f, ",
                           landmarks->half_pH[point], landmarks->equivalence_pH[point]);
    used += written > 0 ? (size_t)written : 0;
    if (jump < VISIBLE_JUMP) {
        snprintf(text + used, sizeof text - used, "no visible jump");
    } else {
        written = snprintf(text + used, sizeof text - used, "jump %.1f;", jump);
        used += written > 0 ? (size_t)written : 0;
        bool any = false;
        for (size_t i = 0; i < page->table->indicator_count && used < sizeof text; i++) {
            const struct wa_indicator *indicator = &page->table->indicators[i];
            if (indicator_suits(indicator, landmarks, point)) {
                written = snprintf(text + used, sizeof text - used, "%s %s", any ? "," : "",
                                   indicator->name);
                used += written > 0 ? (size_t)written : 0;
                any = true;
            }
        }
        if (!any && used < sizeof text) {
            snprintf(text + used, sizeof text - used, " no indicator of the table turns there");
        }
    }
    fprintf(stream, "    proton %d: ", point + 1);
    print_wrapped(stream, 14, 14, text);
}

static bool any_jump(const struct landmarks *landmarks)
{
    for (int i = 0; i < landmarks->count; i++) {
        if (landmarks->jump_high[i] - landmarks->jump_low[i] >= VISIBLE_JUMP) {
            return true;
        }
    }
    return false;
}

static void print_landmarks_of(FILE *stream, const struct acid_page *page,
                               const struct wa_form *form, bool with_base)
{
    struct landmarks landmarks;
    const char *titrant = with_base ? "sodium hydroxide" : "hydrochloric acid";
    if (!landmarks_compute(page->table, form, with_base, PAGE_CONCENTRATION, page->temperature_C,
                           &landmarks)) {
        return;
    }
    bool visible = any_jump(&landmarks);
    char text[512];
    snprintf(text, sizeof text, "%s with %s: start %.2f%s", form->name, titrant, landmarks.start_pH,
             visible ? "" : ", no visible jump");
    fputs("  ", stream);
    print_wrapped(stream, 2, 4, text);
    if (!visible) {
        return;
    }
    for (int i = 0; i < landmarks.count; i++) {
        print_end(stream, page, &landmarks, i);
    }
}

static void print_landmarks(FILE *stream, const struct acid_page *page)
{
    int forms[LANDMARKS_MAX];
    int count = landmark_forms(page->table, page->acid, forms);
    if (count == 0) {
        return;
    }
    print_heading(stream, "Titration of 0.1 mol/L with 0.1 mol/L: pH at the landmarks, jump within "
                          "±0.5 %\nof the titrant, and the indicators that turn within it");
    for (int i = 0; i < count; i++) {
        print_landmarks_of(stream, page, &page->table->forms[forms[i]], true);
        print_landmarks_of(stream, page, &page->table->forms[forms[i]], false);
    }
}

static void print_near_ones(FILE *stream, const struct acid_page *page)
{
    struct wa_near near[PAGE_NEAR_MAX];
    size_t count = page_near(page, near);
    if (count == 0) {
        return;
    }
    print_heading(stream, "Easily taken for (pKa alike; the molar mass or another test decides)");
    for (size_t i = 0; i < count; i++) {
        const struct wa_acid *acid = &page->table->acids[near[i].acid];
        double mass = NAN;
        struct wa_error error;
        if (wa_table_molar_mass(page->table, acid->formula, &mass, NULL, &error) != WA_OK) {
            mass = NAN;
        }
        fputs("  ", stream);
        print_padded(stream, acid->name, 34);
        fprintf(stream, " %.2f apart, %s, %.2f g/mol\n", near[i].distance, acid->formula, mass);
    }
}

/* Every code once, with its sentence. */
static void print_hazards(FILE *stream, const struct acid_page *page)
{
    char seen[HAZARD_CODES_MAX][12];
    size_t count = 0;
    for (size_t i = 0; i < page->table->form_count; i++) {
        const struct wa_form *form = &page->table->forms[i];
        const char *at = brings_only(form, page->acid) ? form->hazards : "";
        while (*at != '\0' && count < HAZARD_CODES_MAX) {
            size_t length = strcspn(at, " ");
            snprintf(seen[count], sizeof seen[0], "%.*s", (int)(length < 11 ? length : 11), at);
            bool known = false;
            for (size_t j = 0; j < count; j++) {
                known = known || strcmp(seen[j], seen[count]) == 0;
            }
            at += length;
            at += strspn(at, " ");
            if (known || seen[count][0] == '\0') {
                continue;
            }
            if (count == 0) {
                print_heading(stream, "Hazards named for one or other of the forms (GHS)");
            }
            const char *sentence = wa_table_hazard_sentence(page->table, seen[count]);
            fprintf(stream, "  %-7s", seen[count]);
            print_wrapped(stream, 9, 9, sentence != NULL ? sentence : "(no sentence known)");
            count++;
        }
    }
}

static void print_sources(FILE *stream, const struct acid_page *page)
{
    const struct wa_acid *acid = &page->table->acids[page->acid];
    const struct wa_constant_row *rows = page->table->constants + acid->constant_first;
    bool any = false;
    for (size_t i = 0; i < acid->constant_count; i++) {
        bool listed = false;
        for (size_t j = 0; j < i; j++) {
            listed = listed || strcmp(rows[j].source, rows[i].source) == 0;
        }
        int source = wa_table_find_source(page->table, rows[i].source);
        if (listed || source < 0) {
            continue;
        }
        if (!any) {
            print_heading(stream, "Sources");
        }
        any = true;
        fprintf(stream, "  %s: ", rows[i].source);
        print_wrapped(stream, (int)strlen(rows[i].source) + 4, 4,
                      page->table->sources[source].reference);
    }
}

void print_acid_page(FILE *stream, const struct acid_page *page)
{
    print_title(stream, &page->table->acids[page->acid]);
    print_constants(stream, page);
    print_species_plot(stream, page);
    print_landmarks(stream, page);
    print_forms(stream, page);
    print_near_ones(stream, page);
    print_hazards(stream, page);
    print_sources(stream, page);
}
