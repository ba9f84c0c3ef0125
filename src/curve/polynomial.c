#include "curve/curve_internal.h"

#include <gsl/gsl_linalg.h>
#include <math.h>
#include <stdlib.h>

enum { COEFFICIENTS_MAX = 5 };

struct curve_polynomial {
    size_t rows_max;
    double *design;
    double *right;
    double *residual;
};

struct curve_polynomial *curve_polynomial_new(size_t rows_max)
{
    struct curve_polynomial *polynomial = malloc(sizeof *polynomial);
    if (polynomial == NULL) {
        return NULL;
    }
    polynomial->rows_max = rows_max;
    polynomial->design = malloc(rows_max * (COEFFICIENTS_MAX + 2) * sizeof(double));
    if (polynomial->design == NULL) {
        free(polynomial);
        return NULL;
    }
    polynomial->right = polynomial->design + rows_max * COEFFICIENTS_MAX;
    polynomial->residual = polynomial->right + rows_max;
    return polynomial;
}

void curve_polynomial_free(struct curve_polynomial *polynomial)
{
    if (polynomial != NULL) {
        free(polynomial->design);
        free(polynomial);
    }
}

/* Row `row` of the inverse of the upper triangle R has the squared length that is the variance
 * factor of coefficient `row`. False when R is singular to working precision. */
static bool row_variance(const gsl_matrix *triangle, size_t columns, size_t row, double *variance)
{
    double inverse[COEFFICIENTS_MAX] = {0.0};
    const double largest = fabs(gsl_matrix_get(triangle, 0, 0));
    *variance = 0.0;
    for (size_t j = row; j < columns; j++) {
        const double diagonal = gsl_matrix_get(triangle, j, j);
        if (!(fabs(diagonal) > 1e-12 * largest)) {
            return false;
        }
        double sum = j == row ? 1.0 : 0.0;
        for (size_t k = row; k < j; k++) {
            sum -= inverse[k] * gsl_matrix_get(triangle, k, j);
        }
        inverse[j] = sum / diagonal;
        *variance += inverse[j] * inverse[j];
    }
    return true;
}

static void fill_design(struct curve_polynomial *polynomial, const double *volume,
                        const double *reading, size_t rows, size_t columns, double at, double scale)
{
    for (size_t i = 0; i < rows; i++) {
        const double x = (volume[i] - at) / scale;
        double power = 1.0;
        for (size_t j = 0; j < columns; j++) {
            polynomial->design[i * columns + j] = power;
            power *= x;
        }
        polynomial->right[i] = reading[i];
    }
}

bool curve_polynomial_fit(struct curve_polynomial *polynomial, const double *volume,
                          const double *reading, size_t first, size_t last, double at, int degree,
                          double value[3], double variance_factor[3], double *residual_square)
{
    const size_t rows = last - first + 1;
    const size_t columns = (size_t)degree + 1;
    const double scale = fmax(fabs(volume[first] - at), fabs(volume[last] - at));
    if (rows < columns || rows > polynomial->rows_max || !(scale > 0.0)) {
        return false;
    }
    fill_design(polynomial, volume + first, reading + first, rows, columns, at, scale);
    double tau_values[COEFFICIENTS_MAX], solution_values[COEFFICIENTS_MAX];
    gsl_matrix_view design = gsl_matrix_view_array(polynomial->design, rows, columns);
    gsl_vector_view right = gsl_vector_view_array(polynomial->right, rows);
    gsl_vector_view residual = gsl_vector_view_array(polynomial->residual, rows);
    gsl_vector_view tau = gsl_vector_view_array(tau_values, columns);
    gsl_vector_view solution = gsl_vector_view_array(solution_values, columns);
    gsl_linalg_QR_decomp(&design.matrix, &tau.vector);
    double factor[3] = {0.0, 0.0, 0.0};
    for (size_t j = columns; j-- > 0;) {
        double variance;
        if (!row_variance(&design.matrix, columns, j, &variance)) {
            return false;
        }
        if (j < 3) {
            factor[j] = variance;
        }
    }
    gsl_linalg_QR_lssolve(&design.matrix, &tau.vector, &right.vector, &solution.vector,
                          &residual.vector);
    const double unit[3] = {1.0, 1.0 / scale, 2.0 / (scale * scale)};
    for (size_t j = 0; j < 3; j++) {
        value[j] = j < columns ? solution_values[j] * unit[j] : 0.0;
        variance_factor[j] = factor[j] * unit[j] * unit[j];
    }
    if (residual_square != NULL) {
        *residual_square = 0.0;
        for (size_t i = 0; i < rows; i++) {
            *residual_square += polynomial->residual[i] * polynomial->residual[i];
        }
    }
    return true;
}

/* The point nearest to a volume. */
static size_t nearest_point(const double *volume, size_t count, double at)
{
    size_t low = 0, high = count - 1;
    while (high - low > 1) {
        const size_t middle = low + (high - low) / 2;
        if (volume[middle] <= at) {
            low = middle;
        } else {
            high = middle;
        }
    }
    return fabs(volume[high] - at) < fabs(volume[low] - at) ? high : low;
}

enum wa_status wa_local_polynomial(const double *volume, const double *reading, size_t count,
                                   double at, size_t half_width, int degree, double value[3],
                                   double variance_factor[3], struct wa_error *error)
{
    if (degree < 1 || degree > 4) {
        return wa_fail(error, WA_ERROR_CALL, NULL, 0,
                       "The degree of the smoothing polynomial is %d; it must lie between 1 and 4.",
                       degree);
    }
    if (count < 2 || !isfinite(at)) {
        return wa_fail(error, WA_ERROR_INPUT, NULL, 0,
                       "There are only %zu points, too few to smooth; measure more.", count);
    }
    const size_t width = half_width >= count / 2 ? count : 2 * half_width + 1;
    const size_t centre = nearest_point(volume, count, at);
    size_t first = centre > half_width ? centre - half_width : 0;
    first = first + width > count ? count - width : first;
    struct curve_polynomial *polynomial = curve_polynomial_new(width);
    if (polynomial == NULL) {
        return wa_fail_memory(error);
    }
    const bool fitted = curve_polynomial_fit(polynomial, volume, reading, first, first + width - 1,
                                             at, degree, value, variance_factor, NULL);
    curve_polynomial_free(polynomial);
    if (!fitted) {
        return wa_fail(
            error, WA_ERROR_INPUT, NULL, 0,
            "There are too few different volumes near %.3f mL for a polynomial of degree "
            "%d; use more points or a lower degree.",
            at, degree);
    }
    return WA_OK;
}
