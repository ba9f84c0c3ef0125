/* The faults in words: what is wrong, where, what to do. */
#include "fit/diagnosis_internal.h"

#include "base/text.h"

#include <math.h>
#include <stdlib.h>

static const double jump_half_width = 0.05; /* of the equivalence volume */

static void say_electrode(const struct wa_suspicion *s, struct wa_text *text)
{
    if (s->parameter == WA_PARAMETER_OFFSET) {
        wa_text_append(text,
                       "The electrode is out of calibration: the curve asks for readings that are "
                       "%.2f \u00b1 %.2f pH too %s at pH 7.",
                       fabs(s->value), s->u, s->value > 0.0 ? "high" : "low");
    } else {
        wa_text_append(text,
                       "The electrode is out of calibration: the curve asks for a slope of "
                       "%.1f \u00b1 %.1f %% of theory.",
                       100.0 * s->value, 100.0 * s->u);
    }
    wa_text_append(text, " Calibrate it with two buffers and repeat, or note its slope and offset; "
                         "the pKa of this run are off.");
}

static void say_carbonate(const struct wa_suspicion *s, struct wa_text *text)
{
    wa_text_append(text,
                   "The titrant holds carbonate: about %.1f %% of its alkalinity. Use freshly "
                   "made titrant kept from air, or note its carbonate; the last jump is blunted "
                   "and its volume depends on the end point.",
                   100.0 * exp(s->value));
}

static void say_uptake(const struct wa_inquiry *inquiry, const struct wa_suspicion *s,
                       struct wa_text *text)
{
    wa_text_append(text,
                   "The solution took up carbon dioxide from the air while it was alkaline: about "
                   "%.3g mmol by the end, judged by the %s. Cover the vessel or pass nitrogen, and "
                   "titrate without pauses.",
                   1e3 * exp(s->value), inquiry->timed ? "times noted" : "order of the points");
}

static void say_drift(const struct wa_inquiry *inquiry, const struct wa_suspicion *s,
                      struct wa_text *text)
{
    wa_text_append(text,
                   "The readings drift: by %+.2f \u00b1 %.2f pH from the first point to the last, "
                   "judged by the %s. Check the electrode in a buffer before and after the run, "
                   "and wait longer for each reading.",
                   s->value, s->u, inquiry->timed ? "times noted" : "order of the points");
}

static void say_precipitate(const struct wa_suspicion *s, struct wa_text *text)
{
    wa_text_append(text,
                   "Not everything was dissolved at the start: the first buffer region is as flat "
                   "as with a solid that dissolves to about %.2g mol/L. Repeat it more dilute, "
                   "warmer, or in a mixed solvent, until the solution is clear before the first "
                   "addition.",
                   exp(s->value));
}

static void say_few_points(const struct wa_inquiry *inquiry, const struct wa_suspicion *s,
                           struct wa_text *text)
{
    const struct wa_experiment *e = inquiry->experiment;
    wa_text_append(
        text,
        "There are too few points in the jump at %.2f mL: from line %ld to line %ld the "
        "volume goes from %.2f to %.2f mL and the reading from %.2f to %.2f. Add readings "
        "every %.2g mL there.",
        s->value, e->line[s->row - 1], e->line[s->row], e->volume_mL[s->row - 1],
        e->volume_mL[s->row], e->reading[s->row - 1], e->reading[s->row],
        0.2 * jump_half_width * s->value);
}

static void say_burette(const struct wa_inquiry *inquiry, const struct wa_suspicion *s,
                        struct wa_text *text)
{
    const struct wa_experiment *e = inquiry->experiment;
    const struct wa_run *run = inquiry->run;
    const char *much = s->value < 0.0 ? "more" : "less";
    if (s->which == WA_FAULT_SET_ASIDE) {
        wa_text_append(text,
                       "Line %ld, which was set aside, falls on the curve when its volume is taken "
                       "as 1 mL %s than written: the burette was misread there.",
                       run->set_aside[s->row].line, s->value < 0.0 ? "less" : "more");
    } else if (s->which == WA_FAULT_ONE_ROW) {
        wa_text_append(text,
                       "The burette was misread by 1 mL on line %ld: the curve expects its reading "
                       "where 1 mL %s is written. Correct that line and run again.",
                       e->line[s->row], s->value < 0.0 ? "less" : "more");
    } else {
        wa_text_append(
            text,
            "From line %ld on (%.2f mL) every volume is 1 mL %s than the curve allows: "
            "the burette was misread by 1 mL or refilled there. Check that line, correct "
            "the rest and run again.",
            e->line[s->row], e->volume_mL[s->row], much);
    }
}

static void say_missed(const struct wa_inquiry *inquiry, const struct wa_suspicion *s,
                       struct wa_text *text)
{
    const struct wa_experiment *e = inquiry->experiment;
    if (s->which == WA_FAULT_IN_SERIES) {
        wa_text_append(
            text,
            "A row is missing before line %ld: the volumes rise by %.3g mL all along, "
            "and by twice as much there. If the addition was made and only not read, "
            "nothing else is wrong; check that the later readings belong to their lines.",
            e->line[s->row], s->value);
    } else {
        wa_text_append(text,
                       "An addition of about %.2f \u00b1 %.2f mL is missing before line %ld: all "
                       "later volumes are too small by it. Look it up and put the row in.",
                       s->value, s->u, e->line[s->row]);
    }
}

static void say_runs(const struct wa_inquiry *inquiry, const struct wa_suspicion *s,
                     struct wa_text *text)
{
    const struct wa_fit *fit = &inquiry->bases[0]->fit;
    const struct wa_runs_test test =
        wa_runs_test(fit->residual, fit->outlier, inquiry->experiment->count);
    wa_text_append(text,
                   "The points wander about the best curve instead of scattering: their residuals "
                   "change sign in %zu runs where about %.0f are expected (a chance of %.1g, runs "
                   "test). Something in this run is not in the model; plot the residuals.",
                   test.runs,
                   1.0 + 2.0 * (double)test.positive * (double)test.negative /
                             (double)(test.positive + test.negative),
                   exp(-s->statistic));
}

char *wa_fault_sentence(const struct wa_inquiry *inquiry, const struct wa_suspicion *suspicion)
{
    struct wa_text text = {.bytes = NULL};
    switch (suspicion->kind) {
    case WA_FAULT_ELECTRODE:
        say_electrode(suspicion, &text);
        break;
    case WA_FAULT_CARBONATE:
        say_carbonate(suspicion, &text);
        break;
    case WA_FAULT_UPTAKE:
        say_uptake(inquiry, suspicion, &text);
        break;
    case WA_FAULT_DRIFT:
        say_drift(inquiry, suspicion, &text);
        break;
    case WA_FAULT_PRECIPITATE:
        say_precipitate(suspicion, &text);
        break;
    case WA_FAULT_FEW_POINTS:
        say_few_points(inquiry, suspicion, &text);
        break;
    case WA_FAULT_BURETTE:
        say_burette(inquiry, suspicion, &text);
        break;
    case WA_FAULT_MISSED_ROW:
        say_missed(inquiry, suspicion, &text);
        break;
    case WA_FAULT_RUNS:
    case WA_FAULT_KINDS:
        say_runs(inquiry, suspicion, &text);
        break;
    }
    if (text.failed) {
        wa_text_free(&text);
        return NULL;
    }
    return text.bytes;
}
