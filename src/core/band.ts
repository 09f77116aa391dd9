/**
 * Half the width of a two-sided 95% band in standard errors: a figure plus and minus this many of its own.
 * The 97.5% quantile of the normal distribution.
 *
 * @source NIST/SEMATECH e-Handbook of Statistical Methods, section 1.3.6.7.1, table of the normal distribution (two
 *         digits; from memory); the further digits are computed
 */
export const RISK_BAND = 1.959963984540054
