import { textCell as text } from '../table'
import type { ProofSheet } from './proof-sheet'

/** What is not recomputed, methods and their sources. */
export function layRemarks(sheet: ProofSheet): void {
  const { breakdown, book } = sheet.input
  const { estimation } = sheet.reach
  if (estimation.kind === 'taken over') sheet.notProven.unshift(`Covariances: ${estimation.why}.`)
  if (sheet.shrinkage && !sheet.derivesIntensity)
    sheet.notProven.push('The shrinkage intensity: a constant here.')
  sheet.notProven.push(...takenOverOfTails(sheet))
  if (breakdown.nested.length > 0)
    sheet.notProven.push('Groups within groups: they are sums of the contributions above.')
  if (breakdown.limits.length > 0)
    sheet.notProven.push('The status of limits: compare the figures above with the limits themselves.')
  if (breakdown.currency) sheet.notProven.push('The split by currency.')
  if (breakdown.factors) sheet.notProven.push('The split by factors.')
  if (typeof breakdown.bands !== 'string') sheet.notProven.push('Error bands and standard errors.')
  if (book.normality) sheet.notProven.push('Tests of normality and the condition number.')
  sheet.draft.add()
  sheet.draft.add({ 0: text('What is not recomputed here', 'section') }, 'section')
  for (const sentence of sheet.notProven) sheet.note(sentence)
  if (sheet.notProven.length === 0) sheet.note('Nothing is left out.')
  sheet.draft.add()
  sheet.draft.add({ 0: text('Methods and their sources', 'section') }, 'section')
  for (const [label, source] of sources(sheet))
    sheet.draft.add({ 0: text(label), [sheet.labels]: text(source) })
  for (const [label, value] of breakdown.settings)
    sheet.draft.add({ 0: text(label), [sheet.labels]: text(value) })
}

/** What of large losses stands as a constant, or not at all, under methods that are a multiple of the volatility. */
function takenOverOfTails(sheet: ProofSheet): readonly string[] {
  const { tails } = sheet.input.breakdown
  if (typeof tails === 'string') return []
  const { method } = tails.risk
  const parts = 'Parts of the large losses: each is the contribution above times one figure for all holdings.'
  if (method.kind === 'normal') return [parts]
  if (method.kind !== 'student') return []
  const fitted = method.degrees === null ? 'The degrees of freedom, and the' : 'The'
  return [
    `${fitted} quantile of Student’s t distribution, on which the large losses rest: taken over. Its probability alone is recomputed.`,
    parts,
  ]
}

function sources(sheet: ProofSheet): readonly (readonly [string, string])[] {
  const { breakdown } = sheet.input
  const { estimation } = sheet.reach
  const lines: (readonly [string, string])[] = [
    [
      'Contributions to risk',
      'Euler allocation: Tasche (2008), Capital Allocation to Business Units and Sub-Portfolios: the Euler Principle, arXiv:0708.2542',
    ],
    [
      'Covariance with the portfolio',
      'The covariance of a holding with a weighted sum is the weighted sum of its covariances, so that one figure for each holding takes the place of a matrix. General.',
    ],
  ]
  if (estimation.kind === 'dates') {
    if (estimation.decay !== null)
      lines.push([
        'Exponential weighting',
        'Weighted means taken off, weights over their sum. Common practice.',
      ])
    if (estimation.lags > 0)
      lines.push([
        'Lagged terms',
        'Newey & West (1987), A Simple, Positive Semi-Definite, Heteroskedasticity and Autocorrelation Consistent Covariance Matrix, Econometrica 55(3), 703-708',
      ])
    if (estimation.shrinkage)
      lines.push([
        'Shrinkage',
        {
          identity:
            'Ledoit & Wolf (2004), A Well-Conditioned Estimator for Large-Dimensional Covariance Matrices, Journal of Multivariate Analysis 88(2), 365-411',
          correlation:
            'Ledoit & Wolf (2004), Honey, I Shrunk the Sample Covariance Matrix, Journal of Portfolio Management 30(4)',
          oas: 'Chen, Wiesel, Eldar & Hero (2010), Shrinkage Algorithms for MMSE Covariance Estimation, IEEE Transactions on Signal Processing 58(10)',
        }[estimation.shrinkage.target],
      ])
  }
  if (typeof breakdown.tails !== 'string')
    lines.push([
      'Expected shortfall',
      'Acerbi & Tasche (2002), On the Coherence of Expected Shortfall, Journal of Banking & Finance 26(7); its parts: Tasche (2008)',
    ])
  return lines
}
