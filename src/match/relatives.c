/* What the table lacks often resembles what it has: isomers, homologues and other salts of the same
 * kind of acid. Half of "not in the table" is taken to be such a relative: constants about those
 * of a listed acid, and its molar mass, exactly (an isomer) or nearly. */
#include "match/match_internal.h"

#include <gsl/gsl_errno.h>
#include <gsl/gsl_linalg.h>

#include <math.h>
#include <string.h>

static const double ln_sqrt_2pi = 0.91893853320467274;

#define CONSTANTS_MAX (WA_PARTS_MAX * WA_PROTONS_MAX)

/* Factor a symmetric matrix; returns ln of its determinant, or NaN. */
static double factor(double *matrix, size_t n)
{
    gsl_matrix_view view = gsl_matrix_view_array(matrix, n, n);
    double log_determinant = 0.0;
    if (gsl_linalg_cholesky_decomp1(&view.matrix) != GSL_SUCCESS) {
        return NAN;
    }
    for (size_t i = 0; i < n; i++) {
        log_determinant += 2.0 * log(matrix[i * n + i]);
    }
    return log_determinant;
}

/* Change of ln of the evidence when the priors of a fit's constants are widened by
 * WA_RELATIVE_PK_U. With the posterior N(m, S) under priors N(0, D), the likelihood is proportional
 * to N(m, S) over N(0, D); its integral over the wider N(0, D') is Gaussian. */
static double log_widened(const struct wa_fit *fit)
{
    double S[CONSTANTS_MAX * CONSTANTS_MAX], A[CONSTANTS_MAX * CONSTANTS_MAX];
    double m[CONSTANTS_MAX], b[CONSTANTS_MAX];
    int index[CONSTANTS_MAX];
    size_t n = 0;
    double sum = 0.0, square = 0.0;
    for (int i = 0; i < fit->parameter_count && n < CONSTANTS_MAX; i++) {
        if (fit->parameters[i].kind == WA_PARAMETER_PK) {
            m[n] = fit->parameters[i].value - fit->parameters[i].prior.mean;
            index[n++] = i;
        }
    }
    if (n == 0) {
        return 0.0;
    }
    for (size_t i = 0; i < n; i++) {
        for (size_t j = 0; j < n; j++) {
            S[i * n + j] = fit->covariance[index[i] * fit->parameter_count + index[j]];
        }
    }
    const double log_S = factor(S, n);
    gsl_matrix_view inverse = gsl_matrix_view_array(S, n, n);
    if (!isfinite(log_S) || gsl_linalg_cholesky_invert(&inverse.matrix) != GSL_SUCCESS) {
        return NAN;
    }
    memcpy(A, S, n * n * sizeof *A);
    for (size_t i = 0; i < n; i++) {
        const double u = fit->parameters[index[i]].prior.u;
        const double wide = hypot(u, WA_RELATIVE_PK_U);
        A[i * n + i] += 1.0 / (wide * wide) - 1.0 / (u * u);
        sum += log(u) - log(wide);
        b[i] = 0.0;
        for (size_t j = 0; j < n; j++) {
            b[i] += S[i * n + j] * m[j];
        }
        square += m[i] * b[i];
    }
    const double log_A = factor(A, n);
    gsl_matrix_view root = gsl_matrix_view_array(A, n, n);
    gsl_vector_view solved = gsl_vector_view_array(b, n);
    if (!isfinite(log_A) || gsl_linalg_cholesky_svx(&root.matrix, &solved.vector) != GSL_SUCCESS) {
        return NAN;
    }
    for (size_t i = 0; i < n; i++) {
        for (size_t j = 0; j < n; j++) {
            square -= b[i] * S[i * n + j] * m[j];
        }
    }
    return sum - 0.5 * (log_S + log_A + square);
}

static double log_mass(const struct wa_titrated_mass *mass, const struct wa_purity *purity,
                       double molar_mass, const struct wa_parameter *amount)
{
    if (!mass->known) {
        return 0.0;
    }
    const double u = hypot(amount->u, WA_RELATIVE_LN_MASS_U);
    const double off = (amount->value - log(mass->mass_g / molar_mass)) / u;
    const double broad = (amount->value - amount->prior.mean) / amount->prior.u;
    const double near = -0.5 * off * off - log(u) - ln_sqrt_2pi + 0.5 * broad * broad +
                        log(amount->prior.u) + ln_sqrt_2pi;
    return wa_log_sum(log(WA_RELATIVE_ISOMER_SHARE) + wa_log_mass_evidence(mass, purity, molar_mass,
                                                                           amount->value, amount->u,
                                                                           &amount->prior),
                      log(1.0 - WA_RELATIVE_ISOMER_SHARE) + near);
}

double wa_groups_log_relatives(const struct wa_table *table, const struct wa_titrated_mass *mass,
                               const struct wa_purity *purity, const struct wa_group_list *list)
{
    double sum = -INFINITY;
    for (size_t g = 0; g < list->count; g++) {
        const struct wa_group *group = &list->groups[g];
        const double widened = isfinite(group->log_curve) ? log_widened(group->fit) : NAN;
        if (!isfinite(widened)) {
            continue;
        }
        const int index = wa_fit_find(group->fit, WA_PARAMETER_LN_AMOUNT, 0, 0);
        const double log_curve =
            group->log_curve - (group->row_doubted ? log(WA_ROW_WRONG_SHARE) : 0.0);
        for (size_t i = 0; i < group->form_count; i++) {
            const int form = group->forms[i];
            const double weight = list->form_prior[form] + log_curve + widened +
                                  log_mass(mass, purity, table->forms[form].molar_mass,
                                           &group->fit->parameters[index]);
            sum = wa_log_sum(sum, weight);
        }
    }
    return sum - log(1.0 - list->not_in_table);
}
