/* The editable reference table: acid systems, their constants by source, the forms that are
 * weighed, indicators, buffers, titrants, standards and atomic weights; and its checks.
 * Everything is plain CSV in one folder, see reference/ and DEVELOPERS.md. */
#ifndef WHICHACID_REFERENCE_H
#define WHICHACID_REFERENCE_H

#include "whichacid/error.h"

#define WA_PROTONS_MAX 12  /**< most dissociation steps of one acid system */
#define WA_PARTS_MAX 6     /**< most acid systems in one form */
#define WA_PART_WATER (-1) /**< part.acid of the key `water`: brings hydroxide, no system */

/** What a published constant holds: activities, concentrations, or the activity of the hydrogen ion
 * (read on a pH meter) with concentrations of the others. */
enum wa_constant_kind {
    WA_CONSTANT_THERMODYNAMIC,
    WA_CONSTANT_CONCENTRATION,
    WA_CONSTANT_MIXED,
};

/** One row of constants.csv as written. */
struct wa_constant_row {
    int acid; /**< index into table.acids */
    int step; /**< from 1 */
    double pKa;
    double u;
    double temperature_C;
    double ionic_strength;
    enum wa_constant_kind kind;
    bool thermodynamic;   /**< kind is WA_CONSTANT_THERMODYNAMIC */
    double enthalpy;      /**< kJ/mol, NaN when unknown */
    double heat_capacity; /**< J/(K mol), NaN when unknown */
    const char *source;   /**< key in sources.csv, or "from memory" */
    const char *note;
    bool from_user;
    bool used; /**< it entered the combination of its step */
    /** The value brought to 25 degree Celsius and zero ionic strength, and its uncertainty. */
    double pKa_standard;
    double u_standard;
    const char *file;
    long line;
};

/** One step of an acid system after its rows were combined: thermodynamic, 25 degree Celsius. */
struct wa_step {
    double pKa;
    double u;
    double enthalpy;      /**< kJ/mol; when unknown, what is usual for the kind of proton */
    double enthalpy_u;    /**< kJ/mol, standard uncertainty */
    bool enthalpy_known;  /**< some row gives it */
    double heat_capacity; /**< J/(K mol), 0 when unknown */
    int row_count;        /**< rows combined */
    double birge_ratio;   /**< how much the rows disagree: 1 or less when their u explain it */
    bool converted;       /**< some row was a concentration constant converted to I = 0 */
    bool from_memory;     /**< no row has a source */
};

/** An acid system. */
struct wa_acid {
    const char *key;
    const char *name;
    const char *other_names; /**< "; " between names */
    const char *formula;     /**< of the fully protonated species */
    int charge;              /**< of the fully protonated species */
    const char *group;       /**< "" when it stands alone */
    bool modelled;
    const char *note;
    int step_count;
    struct wa_step steps[WA_PROTONS_MAX];
    size_t constant_first; /**< its rows in table.constants stand together, by step */
    size_t constant_count;
    bool from_user; /**< the row came from a file laid over the table */
    const char *file;
    long line;
};

/** One acid system in a form. */
struct wa_form_part {
    int acid;  /**< index into table.acids, or WA_PART_WATER */
    int count; /**< molecules of it in one formula unit */
    int lost;  /**< protons already missing from these molecules in total */
};

/** A solid or liquid as weighed. */
struct wa_form {
    const char *key;
    const char *name;
    const char *other_names;
    const char *formula;
    struct wa_form_part parts[WA_PARTS_MAX];
    int part_count;
    int spectator_charge; /**< charge number of the spectator ions in one formula unit */
    double spectator_z2;  /**< sum of z^2 over those ions, for the ionic strength */
    double molar_mass;    /**< g/mol, from the formula and the atomic weights */
    double molar_mass_u;
    double published_molar_mass; /**< as a handbook prints it, NaN when the row gives none */
    double solubility_mol_L;     /**< of the form in water, NaN when unknown */
    double melting_point_C;      /**< NaN when unknown */
    const char *melting_point;   /**< as written */
    const char *cas;
    const char *hazards; /**< GHS hazard statement codes */
    const char *care;
    const char *source;
    bool modelled; /**< every part is modelled */
    bool from_user;
    const char *file;
    long line;
};

/** A titrant: what an analyst may write, and what it is. */
struct wa_titrant {
    const char *key;
    const char *name;
    const char *other_names;
    bool is_base;
    bool is_weak;
    /** Acid system of a weak titrant and of a strong acid with more than one proton (the second
     * proton of sulfuric acid is weak), else WA_PART_WATER. */
    int acid;
    int count;   /**< molecules of that system in one formula unit (4 boric acids in borax) */
    int lost;    /**< protons missing from them as added */
    int protons; /**< equivalents a mole brings (2 for sulfuric acid or barium hydroxide) */
};

struct wa_indicator {
    const char *key;
    const char *name;
    double low_pH, high_pH;
    const char *colour_acid;
    const char *colour_base;
    double pKa; /**< NaN when unknown */
    const char *source;
};

/** One row of buffers.csv: a standard solution at one temperature. */
struct wa_buffer {
    const char *key;
    const char *name;
    const char *composition;
    double temperature_C;
    double pH;
    double u;
    const char *amount; /**< molality or concentration as written */
    const char *source;
};

/** A primary standard for titrants. */
struct wa_standard {
    const char *key;
    const char *name;
    const char *formula;
    bool for_base;   /**< it standardizes bases (it is an acid); else it standardizes acids */
    double purity;   /**< mass fraction, NaN when it is not given */
    double purity_u; /**< standard uncertainty, NaN when it is not given */
    const char *drying;
    int equivalents; /**< protons given or taken by one formula unit */
    double molar_mass;
    double molar_mass_u;
    const char *source;
    const char *note;
};

struct wa_source {
    const char *key;
    const char *reference;
    const char *kind;
};

/** One finding of a check or a remark of a load. */
struct wa_table_problem {
    const char *file;
    long line;          /**< from 1, 0 when the file as a whole is meant */
    const char *column; /**< header word, "" when the row as a whole is meant */
    const char *sentence;
    bool fatal; /**< the row cannot be used */
};

/** Everything that was loaded. Strings live in `storage` and die with the table. */
struct wa_table {
    struct wa_acid *acids;
    size_t acid_count;
    struct wa_constant_row *constants;
    size_t constant_count;
    struct wa_form *forms;
    size_t form_count;
    struct wa_titrant *titrants;
    size_t titrant_count;
    struct wa_indicator *indicators;
    size_t indicator_count;
    struct wa_buffer *buffers;
    size_t buffer_count;
    struct wa_standard *standards;
    size_t standard_count;
    struct wa_source *sources;
    size_t source_count;
    struct wa_table_problem *problems;
    size_t problem_count;
    size_t overlaid_count; /**< rows of the user's that replaced or joined the table's */
    char version[17];      /**< first 16 hexadecimal digits of a hash over the files' bytes */
    struct wa_table_storage *storage; /**< opaque: strings, indexes, atomic weights */
};

/**
 * Load a table folder and lay the user's own files over it.
 * @param[in]  folder      folder with acids.csv, constants.csv, forms.csv, sources.csv,
 *                         atomic-weights.csv, titrants.csv, indicators.csv, buffers.csv,
 * standards.csv
 * @param[in]  also        files or folders of the user's, may be NULL when also_count is 0. A file
 *                         is recognised by its header words.
 * @param[out] table       to be freed with wa_table_free; untouched on failure
 * @return WA_OK, with table->problems listing rows that were not used; WA_ERROR_INPUT for a table
 *         that cannot be used at all
 */
enum wa_status wa_table_load(const char *folder, const char *const *also, size_t also_count,
                             struct wa_table *table, struct wa_error *error) WA_MUST_USE;

/** Free a table. NULL is allowed. */
void wa_table_free(struct wa_table *table);

/** Index of the acid with that key, name or other name (case and accents as written, case
 * folded), or -1. */
int wa_table_find_acid(const struct wa_table *table, const char *name);

/** Index of the form with that key, name or other name, or -1. */
int wa_table_find_form(const struct wa_table *table, const char *name);

/** Index of the indicator with that key or name, or -1. */
int wa_table_find_indicator(const struct wa_table *table, const char *name);

/** Index of the source with that key, or -1 (also for "from memory"). */
int wa_table_find_source(const struct wa_table *table, const char *key);

/** Index of the titrant an analyst's words mean ("0.1 M NaOH", "Natronlauge", "HCl"), or -1. */
int wa_table_find_titrant(const struct wa_table *table, const char *words);

/**
 * Molar mass of a formula with brackets, hydrates (· or *), and a trailing charge.
 * @param[out] u  standard uncertainty from the atomic weights, may be NULL
 */
enum wa_status wa_table_molar_mass(const struct wa_table *table, const char *formula,
                                   double *molar_mass, double *u,
                                   struct wa_error *error) WA_MUST_USE;

/** The sentence of a GHS hazard statement code ("H302"), or NULL. Owned by the table. */
const char *wa_table_hazard_sentence(const struct wa_table *table, const char *code);

/**
 * Thermodynamic pKa of a combined step at a temperature, by its enthalpy and heat capacity.
 * @param[out] u  standard uncertainty with that of the enthalpy, may be NULL
 */
double wa_step_pKa_at(const struct wa_step *step, double temperature_C, double *u);

/**
 * Thermodynamic pK from a constant at some ionic strength by the Davies equation.
 * @param[in]  pK              concentration constant -lg([H][A]/[HA]), or mixed constant
 *                             -lg(a(H)[A]/[HA])
 * @param[in]  charge          of the species that loses the proton
 * @param[in]  ionic_strength  mol/L at which the constant holds
 * @param[out] u               standard uncertainty of the conversion alone, may be NULL
 */
double wa_constant_to_zero_ionic_strength(double pK, enum wa_constant_kind kind, int charge,
                                          double ionic_strength, double temperature_C, double *u);

/** What a table holds, counted. */
struct wa_table_statistics {
    size_t acids;
    size_t acids_modelled;
    size_t acids_sourced;  /**< every step has a row with a source */
    size_t acids_enthalpy; /**< at least one step with a known enthalpy */
    size_t acids_from_user;
    size_t constants;
    size_t constants_sourced;
    size_t forms;
    size_t forms_with_cas;
    size_t forms_with_hazards;
    size_t forms_with_solubility;
    size_t forms_with_melting_point;
    size_t forms_of_several_parts;
    size_t forms_from_user;
};

/**
 * Look for mistakes that loading does not stumble over: registry numbers whose check digit is
 * wrong, molar masses that contradict the formula, sources and hazard codes nobody defined,
 * formulas with an odd number of electrons, acids that no form brings.
 * @param[in,out] table  findings are appended to table->problems, which are sorted by file and line
 */
enum wa_status wa_table_check(struct wa_table *table, struct wa_error *error) WA_MUST_USE;

/** Count what a table holds. */
void wa_table_count(const struct wa_table *table, struct wa_table_statistics *statistics);

/** Whether a CAS registry number is well formed and its check digit is right. */
bool wa_cas_is_valid(const char *cas);

/** A system that resembles a set of pKa values. */
struct wa_near {
    int acid;        /**< index into table.acids */
    int form;        /**< the form whose molar mass is nearest, -1 when no mass was asked for */
    double distance; /**< root of the mean square of the differences, in pK */
    double mass_off; /**< molar mass of the form less the one asked for, g/mol; 0 without one */
    int unmatched;   /**< further steps between 2 and 12 that nobody asked for */
};

/**
 * The systems whose steps come nearest to some pKa values, nearest first. Each value takes a step
 * of its own, in order. Steps nobody asked for count against a system that shows them in water.
 * @param[in]  pKa         in any order, may be NULL when pKa_count is 0
 * @param[in]  molar_mass  g/mol, or NaN; then forms farther than 2 % are left out
 * @param[in]  most_apart  largest distance that is still listed, in pK
 * @param[out] near        room for `room` entries
 * @return entries filled
 */
size_t wa_table_near(const struct wa_table *table, const double *pKa, size_t pKa_count,
                     double molar_mass, double most_apart, struct wa_near *near, size_t room);

/** A cell of a row to be appended: header word and text. */
struct wa_table_cell {
    const char *column;
    const char *text; /**< NULL leaves the cell empty */
};

/**
 * Append a row to a table file, in that file's own columns and separator; a file that does not
 * exist is begun with all header words of its kind. The file is replaced as a whole, so that a
 * crash leaves the old one. Text that is not UTF-8 is rewritten as UTF-8.
 * @param[in] path   the file
 * @param[in] kind   name of the table's file of that kind, such as "acids.csv"
 * @param[in] cells  in any order; a filled cell whose column the file lacks is WA_ERROR_INPUT
 */
enum wa_status wa_table_append(const char *path, const char *kind,
                               const struct wa_table_cell *cells, size_t cell_count,
                               struct wa_error *error) WA_MUST_USE;

#endif
