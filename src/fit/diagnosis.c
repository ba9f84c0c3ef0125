#include "fit/diagnosis_internal.h"

#include <math.h>
#include <stdlib.h>

/* Beyond these a fault is said. Set on simulated clean runs so that all together are said of fewer
 * than 2 in 100. */
static const struct {
    const char *code;
    double threshold;
} kinds[WA_FAULT_KINDS] = {
    [WA_FAULT_ELECTRODE] = {"electrode-calibration", 2.0},
    [WA_FAULT_CARBONATE] = {"titrant-carbonate", 2.0},
    [WA_FAULT_UPTAKE] = {"carbon-dioxide-uptake", 2.0},
    [WA_FAULT_DRIFT] = {"drift", 2.0},
    [WA_FAULT_PRECIPITATE] = {"precipitate", 2.0},
    [WA_FAULT_FEW_POINTS] = {"few-points-in-jump", 1.0},
    [WA_FAULT_BURETTE] = {"burette-misread", 2.0},
    [WA_FAULT_MISSED_ROW] = {"missed-row", 2.0},
    [WA_FAULT_RUNS] = {"residual-runs", 7.6},
};

static const double alkaline_limit = 7.3; /* pH beyond which carbon dioxide is taken up */

/* Two faults whose evidences differ by less, in ln, are both named. */
static const double rival_within = 3.0;

/* The best generic acid, and for few protons the best whose every proton takes part: what a fault
 * does to a curve, further protons can imitate. */
static void choose_bases(struct wa_inquiry *inquiry)
{
    const struct wa_proton_study *study = inquiry->study;
    const bool base = inquiry->experiment->titrant_is_base;
    inquiry->bases[inquiry->base_count++] = &study->generic[0];
    for (int n = 1; n < WA_BASES_MAX; n++) {
        bool chosen = false, neutral = false;
        for (int i = 0; i < study->count; i++) {
            const struct wa_generic *generic = &study->generic[i];
            if (generic->step_count != n || generic->lost != (base ? 0 : n)) {
                continue;
            }
            if (!chosen && i > 0) {
                inquiry->bases[inquiry->base_count++] = generic;
            }
            if (!neutral && generic->charge == generic->lost) {
                inquiry->neutral[inquiry->neutral_count++] = generic;
                neutral = true;
            }
            chosen = true;
        }
    }
    inquiry->log_evidence = fmax(inquiry->log_evidence,
                                 study->generic[0].fit.log_evidence + study->generic[0].log_prior);
}

/* Time since the first reading, at a point of the experiment. */
static double time_at(const struct wa_inquiry *inquiry, size_t point)
{
    const struct wa_experiment *e = inquiry->experiment;
    const size_t grouping = e->grouping > 0 ? e->grouping : 1;
    return inquiry->run->points[point * grouping].time_s - inquiry->run->points[0].time_s;
}

/* How much of the run has passed at each point, and of its alkaline part: by time where every
 * point has one, else by the order of the points. */
static void set_course(struct wa_inquiry *inquiry)
{
    const struct wa_experiment *e = inquiry->experiment;
    const size_t last = e->count - 1;
    inquiry->timed = time_at(inquiry, last) > 0.0;
    for (size_t p = 1; p < e->count; p++) {
        inquiry->timed = inquiry->timed && time_at(inquiry, p) >= time_at(inquiry, p - 1);
    }
    double alkaline = 0.0;
    for (size_t p = 0; p < e->count; p++) {
        const double now = inquiry->timed ? time_at(inquiry, p) : (double)p;
        const double before = p == 0           ? 0.0
                              : inquiry->timed ? time_at(inquiry, p - 1)
                                               : (double)p - 1.0;
        const bool open = e->reading[p] > alkaline_limit;
        alkaline += open ? now - before : 0.0;
        inquiry->alkaline += open ? 1 : 0;
        inquiry->course[p] = now;
        inquiry->uptake[p] = alkaline;
    }
    const double whole = inquiry->course[last];
    for (size_t p = 0; p < e->count; p++) {
        inquiry->course[p] /= whole;
        inquiry->uptake[p] /= alkaline > 0.0 ? alkaline : 1.0;
    }
}

static void weigh_runs(const struct wa_inquiry *inquiry, struct wa_diagnosis *diagnosis)
{
    const struct wa_fit *fit = &inquiry->bases[0]->fit;
    struct wa_suspicion *suspicion = &diagnosis->suspicions[WA_FAULT_RUNS];
    const struct wa_runs_test test =
        wa_runs_test(fit->residual, fit->outlier, inquiry->experiment->count);
    suspicion->weighed = true;
    suspicion->explains = true;
    suspicion->statistic = -log(fmax(test.chance, 1e-300));
    suspicion->value = (double)test.runs;
}

static bool is_beyond(const struct wa_suspicion *suspicion)
{
    return suspicion->weighed && suspicion->explains && suspicion->statistic > suspicion->threshold;
}

/* Say what is beyond its threshold, of the faults that refits weigh only those that come near the
 * best, and of the residuals only when nothing else was said. */
static enum wa_status say(const struct wa_inquiry *inquiry, struct wa_diagnosis *diagnosis,
                          struct wa_error *error)
{
    struct wa_suspicion *all = diagnosis->suspicions;
    double best = -INFINITY;
    bool any = false;
    for (int k = 0; k < WA_FAULT_KINDS; k++) {
        if (is_beyond(&all[k]) && k != WA_FAULT_FEW_POINTS && k != WA_FAULT_RUNS) {
            best = fmax(best, all[k].log_evidence);
        }
    }
    for (int k = 0; k < WA_FAULT_KINDS; k++) {
        const bool beyond = is_beyond(&all[k]);
        all[k].said =
            beyond && (k == WA_FAULT_FEW_POINTS ||
                       (k == WA_FAULT_RUNS ? !any : all[k].log_evidence > best - rival_within));
        any = any || all[k].said;
        all[k].sentence = all[k].said ? wa_fault_sentence(inquiry, &all[k]) : NULL;
        if (all[k].said && all[k].sentence == NULL) {
            return wa_fail_memory(error);
        }
    }
    return WA_OK;
}

static enum wa_status weigh(struct wa_inquiry *inquiry, struct wa_diagnosis *diagnosis,
                            struct wa_error *error)
{
    choose_bases(inquiry);
    set_course(inquiry);
    weigh_runs(inquiry, diagnosis);
    wa_weigh_jump(inquiry, diagnosis);
    enum wa_status status = wa_weigh_whole_run(inquiry, diagnosis, error);
    if (status == WA_OK) {
        status = wa_weigh_rows(inquiry, diagnosis, error);
    }
    return status == WA_OK ? say(inquiry, diagnosis, error) : status;
}

enum wa_status wa_diagnose(const struct wa_run *run, const struct wa_experiment *experiment,
                           const struct wa_proton_study *study, double log_rival,
                           struct wa_diagnosis *diagnosis, struct wa_error *error)
{
    *diagnosis = (struct wa_diagnosis){0};
    for (int k = 0; k < WA_FAULT_KINDS; k++) {
        struct wa_suspicion *suspicion = &diagnosis->suspicions[k];
        *suspicion = (struct wa_suspicion){.kind = (enum wa_fault_kind)k,
                                           .code = kinds[k].code,
                                           .threshold = kinds[k].threshold,
                                           .value = NAN,
                                           .u = NAN};
    }
    if (study->count == 0 || experiment->count < 4) {
        return WA_OK;
    }
    struct wa_inquiry inquiry = {
        .run = run, .experiment = experiment, .study = study, .log_evidence = log_rival};
    inquiry.course = calloc(experiment->count, sizeof *inquiry.course);
    inquiry.uptake = calloc(experiment->count, sizeof *inquiry.uptake);
    enum wa_status status = inquiry.course != NULL && inquiry.uptake != NULL
                                ? weigh(&inquiry, diagnosis, error)
                                : wa_fail_memory(error);
    free(inquiry.course);
    free(inquiry.uptake);
    if (status != WA_OK) {
        wa_diagnosis_free(diagnosis);
    }
    return status;
}

void wa_diagnosis_free(struct wa_diagnosis *diagnosis)
{
    if (diagnosis != NULL) {
        for (int k = 0; k < WA_FAULT_KINDS; k++) {
            free(diagnosis->suspicions[k].sentence);
            diagnosis->suspicions[k].sentence = NULL;
        }
    }
}
