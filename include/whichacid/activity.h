/* Activity coefficients and the properties of water that the equilibria need at a temperature. */
#ifndef WHICHACID_ACTIVITY_H
#define WHICHACID_ACTIVITY_H

/** Linear coefficient of the Davies equation and the standard uncertainty given to it. */
#define WA_DAVIES_COEFFICIENT 0.3
#define WA_DAVIES_COEFFICIENT_U 0.1

/** Ionic strength in mol/L beyond which a report says that the Davies equation is out of range. */
#define WA_DAVIES_LIMIT 0.5

/** Ionic strength in mol/L beyond which the coefficient is held: the linear term would otherwise
 * run away, and no equation of this kind means anything there. */
#define WA_DAVIES_HOLD 2.0

/** Water at one temperature. Plain data. */
struct wa_medium {
    double temperature_C;
    double density;        /**< g/cm3, Kell 1975 */
    double permittivity;   /**< relative, Malmberg and Maryott 1956 */
    double debye_huckel_A; /**< (L/mol)^1/2, decadic logarithm */
    double pKw;            /**< molal scale, Marshall and Franck 1981 */
};

/**
 * Properties of liquid water at 0.1 MPa.
 * @param[in] temperature_C  clamped to 0..100, where the published equations hold
 *
 * Density: G. S. Kell, J. Chem. Eng. Data 20 (1975) 97. Relative permittivity: C. G. Malmberg,
 * A. A. Maryott, J. Res. Natl. Bur. Stand. 56 (1956) 1. Ion product: W. L. Marshall, E. U. Franck,
 * J. Phys. Chem. Ref. Data 10 (1981) 295.
 */
struct wa_medium wa_medium_at(double temperature_C);

/**
 * lg of the activity coefficient of a singly charged ion by C. W. Davies (Ion Association, 1962):
 * -A (sqrt(I)/(1 + sqrt(I)) - linear_coefficient I). Multiply by z^2 for charge z.
 * @param[in] ionic_strength      mol/L, taken as 0 below 0 and as WA_DAVIES_HOLD above it
 * @param[in] debye_huckel_A      from wa_medium_at
 * @param[in] linear_coefficient  WA_DAVIES_COEFFICIENT unless it is being varied
 */
double wa_davies_log10_gamma(double ionic_strength, double debye_huckel_A,
                             double linear_coefficient);

/**
 * pK at a temperature from its value at 25 degree Celsius, an enthalpy and a constant heat
 * capacity of ionization (E. C. W. Clarke, D. N. Glew, Trans. Faraday Soc. 62 (1966) 539).
 * @param[in] enthalpy       kJ/mol at 25 degree Celsius
 * @param[in] heat_capacity  J/(K mol)
 */
double wa_pK_at_temperature(double pK, double enthalpy, double heat_capacity, double temperature_C);

#endif
