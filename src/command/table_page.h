/* The page about one acid, as text. */
#ifndef WHICHACID_COMMAND_TABLE_PAGE_H
#define WHICHACID_COMMAND_TABLE_PAGE_H

#include "command/table_internal.h"

/** What a page is about. */
struct acid_page {
    const struct wa_table *table;
    int acid;
    double temperature_C;
    double ionic_strength; /**< mol/L */
};

#define PAGE_CONCENTRATION 0.1 /* mol/L of the form and of the titrant */
#define VISIBLE_JUMP 0.3       /* pH within 1 % of titrant; less is no jump that an eye sees */
#define PAGE_NEAR_MAX 8        /* acids listed as easily confused */

/** Charge of the species that loses the proton of a step (from 1). */
int charge_before(const struct wa_acid *acid, int step);
/** What a calibrated pH meter shows half-way: pK + lg γ(A) - lg γ(HA). */
double pKa_as_read(const struct acid_page *page, int step);
/** The concentration constant -lg([H][A]/[HA]). */
double pKa_concentration(const struct acid_page *page, int step);
/** Systems easily taken for this one, itself left out. @return how many */
size_t page_near(const struct acid_page *page, struct wa_near near[PAGE_NEAR_MAX]);
/** Whether an indicator turns within the jump of an equivalence point. */
bool indicator_suits(const struct wa_indicator *indicator, const struct landmarks *landmarks,
                     int point);

void print_acid_page(FILE *stream, const struct acid_page *page);
/** Species fractions against pH as a plot of characters. */
void print_species_plot(FILE *stream, const struct acid_page *page);

#endif
