/* A plan as text and as a sheet for the bench. */
#include "bench/bench_internal.h"
#include "whichacid/bench_report.h"

#include <math.h>
#include <stdio.h>

static const char *name_of(const struct wa_plan *plan)
{
    return plan->form != NULL ? plan->form->name : "the unknown";
}

/* The table writes the names of titrants with a capital. */
struct in_sentence {
    char text[96];
};

static struct in_sentence small(const char *name)
{
    struct in_sentence words;
    snprintf(words.text, sizeof words.text, "%s", name);
    if (words.text[0] >= 'A' && words.text[0] <= 'Z' && words.text[1] >= 'a') {
        words.text[0] = (char)(words.text[0] - 'A' + 'a');
    }
    return words;
}

static void say(struct wa_text *out, size_t indent, const char *format, ...) WA_PRINTF(3, 4);

static void say(struct wa_text *out, size_t indent, const char *format, ...)
{
    char sentence[768];
    va_list arguments;
    va_start(arguments, format);
    vsnprintf(sentence, sizeof sentence, format, arguments);
    va_end(arguments);
    bench_paragraph(out, sentence, indent);
}

/* The hardest proton that was asked for says why it cannot work. */
static void say_why_not(struct wa_text *out, const struct wa_plan *plan)
{
    const struct wa_plan_step *best = NULL;
    for (int i = 0; i < plan->step_count; i++) {
        best = best == NULL || plan->steps[i].wide_jump > best->wide_jump ? &plan->steps[i] : best;
    }
    if (best == NULL) {
        say(out, 0, "It cannot work: %s has nothing that %s takes or gives in water.",
            name_of(plan), small(plan->titrant->name).text);
        return;
    }
    say(out, 0,
        "%s: the reaction of %s with %s has an equilibrium constant of %.2g%s about %.0e is "
        "needed. With equal amounts %.3g %% would be left unreacted, and the pH moves by %.2f only "
        "while the volume goes from 1 %% short to 1 %% over.",
        best->complete ? "There is no end point" : "It cannot work", name_of(plan),
        small(plan->titrant->name).text, best->K,
        best->complete ? "; in strong solutions" : ", and", WA_COMPLETE_K,
        100.0 * best->unconverted, best->wide_jump);
    if (best->complete) {
        say(out, 0,
            "A fit of the whole curve can still tell constant and amount, less exactly; a stronger "
            "solution helps.");
        return;
    }
    say(out, 0, "%s",
        plan->titrant->is_weak
            ? "A weak acid and a weak base do not use each other up: take a strong titrant."
            : "Take a stronger solution, or another method: precipitation, a solvent that makes "
              "the acid stronger, or titration of a derivative.");
}

static void verdict(struct wa_text *out, const struct wa_plan *plan)
{
    wa_text_append(out, "%s with %s, %.4g mol/L\n\n", name_of(plan),
                   small(plan->titrant->name).text, plan->concentration);
    if (plan->chosen < 0) {
        say_why_not(out, plan);
        return;
    }
    const struct wa_plan_step *step = &plan->steps[plan->chosen];
    say(out, 0,
        "It will work%s: titrate to %.2f mL, pH %.2f. The reaction constant is %.2g (at least "
        "%.0e is needed), %.2g %% is left unreacted, and the pH moves by %.2f from 0.1 %% short to "
        "0.1 %% over.",
        plan->form == NULL && plan->chosen == 0 ? " for the easier end of the range only" : "",
        step->volume_mL, step->pH, step->K, WA_COMPLETE_K, 100.0 * step->unconverted, step->jump);
    for (int i = plan->chosen + 1; i < plan->step_count; i++) {
        say(out, 0, "The proton of pKa %.2f gives no end point of its own (K = %.2g).",
            plan->steps[i].pKa, plan->steps[i].K);
    }
}

static void steps(struct wa_text *out, const struct wa_plan *plan)
{
    wa_text_append(out, "\n  pKa    mL      K        left     pH     jump   jump   dpH/dV\n"
                        "                          over     there  0.1 %%  1 %%    per mL\n");
    for (int i = 0; i < plan->step_count; i++) {
        const struct wa_plan_step *s = &plan->steps[i];
        wa_text_append(out, "  %-6.2f %-7.2f %-8.2g %-7.2g%% %-6.2f %-6.2f %-6.2f %-7.2g %s\n",
                       s->pKa, s->volume_mL, s->K, 100.0 * s->unconverted, s->pH, s->jump,
                       s->wide_jump, s->steepness,
                       s->visible    ? "end point"
                       : s->complete ? "no own jump"
                                     : "incomplete");
    }
}

static void weigh(struct wa_text *out, const struct wa_plan *plan,
                  const struct wa_plan_options *options)
{
    wa_text_append(out, "\nWeigh %.4f g, make it up to %.4g mL.\n", plan->mass_g,
                   options->solution_mL);
    if (plan->form == NULL) {
        say(out, 0,
            "For %.4g to %.4g g/mol the end point then lies between %.1f and %.1f mL: have enough "
            "titrant, and take a second portion once the first has told the volume.",
            options->mass_low, options->mass_high, plan->volume_low, plan->volume_high);
    }
}

static void indicators(struct wa_text *out, const struct wa_plan *plan)
{
    const bool base = plan->titrant->is_base;
    if (plan->chosen < 0) {
        return;
    }
    wa_text_append(out, "\nIndicators (error against the equivalence volume; the colour turns)\n");
    for (int i = 0; i < plan->indicator_count; i++) {
        const struct wa_plan_indicator *found = &plan->indicators[i];
        const struct wa_indicator *indicator = found->indicator;
        wa_text_append(out, "  ");
        bench_cell(out, indicator->name, 38);
        wa_text_append(out, "%+.3f mL ± %.3f  %s\n", found->error_mL, found->spread_mL,
                       found->within ? "suits" : "too early or late");
        wa_text_append(out, "      at pH %.1f, from %s to %s\n", found->pH,
                       base ? indicator->colour_acid : indicator->colour_base,
                       base ? indicator->colour_base : indicator->colour_acid);
    }
}

static void precision(struct wa_text *out, const struct wa_plan *plan,
                      const struct wa_plan_options *options)
{
    const struct wa_plan_precision *d = &plan->design, *e = &plan->even;
    const bool tried = options->trials > 0;
    wa_text_append(out, "\nExpected standard uncertainty with %d readings\n", plan->addition_count);
    wa_text_append(out, "                 placed as below       evenly spaced%s\n",
                   tried ? "         gain" : "");
    for (int i = 0; i < plan->free_pKa_count; i++) {
        wa_text_append(out, "  pKa %-6.2f     %.4f", plan->free_pKa[i], d->pKa_u[i]);
        if (tried) {
            wa_text_append(out, " (found %.4f)  %.4f (found %.4f)  x %.2f\n", d->pKa_error[i],
                           e->pKa_u[i], e->pKa_error[i], e->pKa_u[i] / d->pKa_u[i]);
        } else {
            wa_text_append(out, "                %.4f\n", e->pKa_u[i]);
        }
    }
    wa_text_append(out, "  amount         %.3f %%", 100.0 * d->amount_u);
    if (tried) {
        wa_text_append(out, " (found %.3f)   %.3f %% (found %.3f)  x %.2f\n",
                       100.0 * d->amount_error, 100.0 * e->amount_u, 100.0 * e->amount_error,
                       e->amount_u / d->amount_u);
        wa_text_append(out, "  (found: over %d and %d simulated runs, by their median error)\n",
                       d->converged, e->converged);
    } else {
        wa_text_append(out, "               %.3f %%\n", 100.0 * e->amount_u);
    }
    wa_text_append(out, "  molar mass     %.3g g/mol by one run, pure sample, weighed to %.2g mg\n",
                   plan->molar_mass_u, 1e3 * options->mass_u);
}

static void rival(struct wa_text *out, const struct wa_plan *plan)
{
    if (plan->rival == NULL) {
        return;
    }
    wa_text_append(out, "\n");
    say(out, 0,
        "Against %s (%.2f g/mol), evenly spaced readings of one run, told with at least "
        "95 %% probability:",
        plan->rival->name, plan->rival->molar_mass);
    for (int i = 0; i < plan->power_count; i++) {
        wa_text_append(out, "  %3d readings: in %3.0f %% of simulated runs ",
                       plan->power[i].readings, 100.0 * plan->power[i].share);
        bench_bar(out, plan->power[i].share, 20);
        wa_text_append(out, "\n");
    }
    say(out, 0, "%s",
        plan->rival_told
            ? "They can be told apart."
            : "They cannot be relied on to be told apart by this titration: weigh more exactly, "
              "calibrate the electrode, titrate replicates, or use another test.");
}

static enum wa_status done(struct wa_text *out, char **text, struct wa_error *error)
{
    if (out->failed) {
        wa_text_free(out);
        return wa_fail_memory(error);
    }
    *text = out->bytes;
    return WA_OK;
}

static void sheet(struct wa_text *out, const struct wa_plan *plan,
                  const struct wa_plan_options *options)
{
    wa_text_append(out, "BENCH SHEET   %s with %s\n\n", name_of(plan),
                   small(plan->titrant->name).text);
    wa_text_append(out, "  Date ______________  Analyst ______________  Sample ______________\n");
    wa_text_append(out, "  Weigh about %.4f g:        weighed ______________ g\n", plan->mass_g);
    wa_text_append(out, "  Make up to %.4g mL with water, stir, wait for a steady reading.\n",
                   options->solution_mL);
    wa_text_append(out, "  Titrant %.4g mol/L:        found ______________ mol/L\n",
                   plan->concentration);
    wa_text_append(out, "  Temperature ________ °C    Electrode slope ________ %%\n\n");
    if (plan->chosen >= 0 && plan->indicator_count > 0 && plan->indicators[0].within) {
        const struct wa_indicator *indicator = plan->indicators[0].indicator;
        const bool base = plan->titrant->is_base;
        wa_text_append(out, "  Indicator: %s, from %s to %s near %.2f mL\n\n", indicator->name,
                       base ? indicator->colour_acid : indicator->colour_base,
                       base ? indicator->colour_base : indicator->colour_acid,
                       plan->steps[plan->chosen].volume_mL + plan->indicators[0].error_mL);
    }
    wa_text_append(out, "   n   add/mL   burette/mL   pH about   pH read    remark\n");
    for (int i = 0; i < plan->addition_count; i++) {
        const double before = i > 0 ? plan->additions_mL[i - 1] : 0.0;
        wa_text_append(out, "  %2d   %6.2f   %10.2f   %8.1f   ________   ____________\n", i + 1,
                       plan->additions_mL[i] - before, plan->additions_mL[i], plan->expected_pH[i]);
    }
    wa_text_append(out, "\n");
    say(out, 2,
        "The burette is read from 0. Volumes missed by a few hundredths do no harm: write down "
        "what was added. The pH expected holds for the sample as planned.");
    if (plan->form == NULL) {
        say(out, 2,
            "This is an unknown: if the jump does not come, go on in steps of 1 mL until the pH "
            "stays %s; in the jump take steps of 0.1 mL.",
            plan->titrant->is_base ? "above 11.5" : "below 2.5");
    }
}

enum wa_status wa_plan_sheet(const struct wa_plan *plan, const struct wa_plan_options *options,
                             char **text, struct wa_error *error)
{
    struct wa_text out = {.bytes = NULL};
    sheet(&out, plan, options);
    return done(&out, text, error);
}

enum wa_status wa_plan_text(const struct wa_plan *plan, const struct wa_plan_options *options,
                            char **text, struct wa_error *error)
{
    struct wa_text out = {.bytes = NULL};
    verdict(&out, plan);
    if (plan->step_count > 0) {
        steps(&out, plan);
    }
    if (plan->chosen >= 0) {
        weigh(&out, plan, options);
        indicators(&out, plan);
        precision(&out, plan, options);
    }
    rival(&out, plan);
    if (plan->chosen >= 0) {
        wa_text_append(&out, "\n");
        sheet(&out, plan, options);
    }
    return done(&out, text, error);
}
