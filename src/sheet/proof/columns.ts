import { POSITION_HEADS } from '../wording'

/** How figures are shown. */
export const PERCENT = '0.0000%'
export const SHARE = '0.0000%'
export const RATIO = '0.0000'
export const SMALL = '0.0000E+00'
export const GAP = '0.0E+00'
export const COUNT = '#,##0'
export const PLAIN = 'General'
export const DATE = 'd mmm yyyy'

/** The columns of the table of holdings, behind its labels. */
export type Key =
  | 'measure'
  | 'base'
  | 'weight'
  | 'mean'
  | 'variance'
  | 'covariance'
  | 'shrunk variance'
  | 'shrunk covariance'
  | 'stand-alone'
  | 'marginal'
  | 'contribution'
  | 'share'
  | 'beta'
  | 'correlation'
  | 'our weight'
  | 'our stand-alone'
  | 'our marginal'
  | 'our contribution'
  | 'our share'
  | 'our beta'
  | 'our correlation'
  | 'risk gap'
  | 'ratio gap'
  | 'mark'
  | 'note'

/** The columns of the table of dates, behind the date. */
export type DateKey =
  | 'weight'
  | 'return'
  | 'centred'
  | 'multiplier'
  | 'tail'
  | 'standardised'
  | 'length'
  | 'active'
  | 'active centred'
  | 'active multiplier'

export const [WEIGHT, STAND_ALONE, MARGINAL, CONTRIBUTION, SHARE_HEAD, BETA, CORRELATION] = POSITION_HEADS

/** Heads of the table of holdings, with the widths of their columns. */
export const HEADS: { readonly [K in Key]: readonly [head: string, width: number] } = {
  measure: ['Amount', 16],
  base: ['Amount', 16],
  weight: [WEIGHT, 16],
  mean: ['Mean return', 16],
  variance: ['Variance', 16],
  covariance: ['Covariance with portfolio', 16],
  'shrunk variance': ['Variance after shrinkage', 16],
  'shrunk covariance': ['Covariance after shrinkage', 16],
  'stand-alone': [STAND_ALONE, 16],
  marginal: [MARGINAL, 20],
  contribution: [CONTRIBUTION, 16],
  share: [SHARE_HEAD, 16],
  beta: [BETA, 16],
  correlation: [CORRELATION, 16],
  'our weight': [`${WEIGHT}, Counterpoise`, 16],
  'our stand-alone': [`${STAND_ALONE}, Counterpoise`, 20],
  'our marginal': [`${MARGINAL}, Counterpoise`, 24],
  'our contribution': [`${CONTRIBUTION}, Counterpoise`, 20],
  'our share': [`${SHARE_HEAD}, Counterpoise`, 16],
  'our beta': [`${BETA}, Counterpoise`, 18],
  'our correlation': [`${CORRELATION}, Counterpoise`, 22],
  'risk gap': ['Difference, risks', 16],
  'ratio gap': ['Difference, ratios', 16],
  mark: ['Result', 12],
  note: ['Note', 36],
}
