#include "command/table_page.h"

#include <math.h>
#include <string.h>

#define PLOT_COLUMNS 57 /* pH 0 to 14 in quarters */
#define PLOT_ROWS 11    /* 100 % to 0 in tenths */
#define PH_PER_COLUMN 0.25

static const char marks[] = "0123456789abc";

void print_species_plot(FILE *stream, const struct acid_page *page)
{
    const struct wa_acid *acid = &page->table->acids[page->acid];
    char plot[PLOT_ROWS][PLOT_COLUMNS + 1];
    struct wa_system system;
    double pK[WA_PROTONS_MAX];
    struct wa_medium medium = wa_medium_at(page->temperature_C);
    double gamma = pow(10.0, wa_davies_log10_gamma(page->ionic_strength, medium.debye_huckel_A,
                                                   WA_DAVIES_COEFFICIENT));
    if (acid->step_count == 0) {
        return;
    }
    for (int i = 0; i < acid->step_count; i++) {
        pK[i] = wa_step_pKa_at(&acid->steps[i], page->temperature_C, NULL);
    }
    wa_system_set(&system, acid->charge, acid->step_count, pK);
    for (int row = 0; row < PLOT_ROWS; row++) {
        memset(plot[row], ' ', PLOT_COLUMNS);
        plot[row][PLOT_COLUMNS] = '\0';
    }
    for (int column = 0; column < PLOT_COLUMNS; column++) {
        double fraction[WA_PROTONS_MAX + 1];
        wa_system_fractions(&system, pow(10.0, -column * PH_PER_COLUMN), gamma, fraction);
        for (int species = 0; species <= acid->step_count; species++) {
            long row = lround((1.0 - fraction[species]) * (PLOT_ROWS - 1));
            /* The bottom line would be all marks: species that are not there are left out. */
            if (row < PLOT_ROWS - 1) {
                plot[row][column] = marks[species];
            }
        }
    }
    fprintf(stream, "\nSpecies against pH; the mark counts the protons lost (0: charge %s%d)\n",
            acid->charge > 0 ? "+" : "", acid->charge);
    for (int row = 0; row < PLOT_ROWS; row++) {
        fprintf(stream, "  %3d %% |%s\n", 100 - 10 * row, plot[row]);
    }
    fputs("        +---+---+---+---+---+---+---+---+---+---+---+---+---+---+\n"
          "        0   1   2   3   4   5   6   7   8   9  10  11  12  13  14\n",
          stream);
}
